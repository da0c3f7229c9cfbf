"""The command line: what each command calls, prints, writes and returns."""

from __future__ import annotations

import importlib.util
import json
import os
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path
from types import SimpleNamespace

import numpy as np
import pytest
from astropy.table import Table
from click.testing import CliRunner
from matplotlib.figure import Figure

from planner import __version__
from planner.cli import cli
from planner.errors import LineDataError, StoreError
from planner.spectroscopy.accuracyfile import AccuracyTable
from planner.studies.listrecords import CheckedList, CheckReport

COMMAND = [sys.executable, "-c", "from planner.cli import main; main()"]


@pytest.fixture(scope="module")
def result():
    """The made-up plan of the report's tests."""
    spec = importlib.util.spec_from_file_location("made_up_plan", Path(__file__).parent / "report" / "conftest.py")
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module.make_plan()


@pytest.fixture
def calls(result, monkeypatch):
    """Studies that answer at once, and the list of what they were asked."""
    asked = []

    def plan(scenario, *, lines_folder=None, progress=None, simulated=None, remedies=False, spread=None):
        more = [*([simulated] if simulated else []), *(["remedies"] if remedies else [])]
        more += [("spread", spread)] if spread else []
        asked.append(("plan", scenario.title, lines_folder, *more))
        return result

    def spectrum(scenario, *, lines_folder=None, progress=None):
        asked.append(("spectrum", scenario.title, lines_folder))
        return list(result.spectra)

    def sigma(gas, temperature_k, pressure_bar, from_per_cm, to_per_cm, step_per_cm, lines_folder=None):
        asked.append(("sigma", gas, temperature_k, pressure_bar, from_per_cm, to_per_cm, step_per_cm, lines_folder))
        return np.array([1.0, 2.0]), np.array([1e-20, 2e-20]), ("CO2: embedded, edition 1",)

    @dataclass(frozen=True)
    class Row:
        formula: str
        lines: int

    def build(formulas, progress):
        asked.append(("build", formulas))
        return ["CO2: 7 lines"]

    def check(against, progress):
        asked.append(("check", against))
        checked = CheckedList(gas="CO2", lines=7, seconds=0.1, faults=("a band is missing",) if against is None else ())
        return CheckReport(lists=(checked,), accuracy=AccuracyTable(), against=against, notices=())

    studies = {
        "plan": SimpleNamespace(plan=plan),
        "spectrum": SimpleNamespace(spectrum=spectrum),
        "sigma": SimpleNamespace(sigma=sigma),
        "linedata": SimpleNamespace(list_gases=lambda: [Row("CO2", 5)], build=build, check=check),
    }
    for name, module in studies.items():
        monkeypatch.setitem(sys.modules, f"planner.studies.{name}", module)
    return asked


@pytest.fixture
def folder(tmp_path, monkeypatch):
    """An empty working folder with a fresh scenario in it."""
    monkeypatch.chdir(tmp_path)
    outcome = run("new", "a.toml")
    assert outcome.exit_code == 0
    return tmp_path


def run(*arguments):
    return CliRunner().invoke(cli, list(arguments))


def test_help_names_every_command():
    """Help of the whole and of each command is there."""
    outcome = run("--help")
    assert outcome.exit_code == 0
    for command in ("plan", "spectrum", "sigma", "lines", "demo", "new"):
        assert command in outcome.stdout
        assert run(command, "--help").exit_code == 0
    for command in ("list", "build", "check"):
        assert run("lines", command, "--help").exit_code == 0


def test_version():
    """The version is that of the package."""
    assert run("--version").stdout == f"limbcast {__version__}\n"


def test_help_imports_nothing_heavy():
    """What makes help quick: the command line alone is loaded."""
    heavy = "import sys, planner.cli; print({'numpy', 'astropy', 'numba', 'pydantic', 'rich'} & set(sys.modules))"
    loaded = subprocess.run([sys.executable, "-c", heavy], check=True, capture_output=True, text=True).stdout
    assert loaded == "set()\n"


def test_new(folder):
    """The starting scenario is written once and never over a file that is there."""
    assert (folder / "a.toml").read_text().startswith("# A scenario")
    (folder / "a.toml").write_text("mine")
    outcome = run("new", "a.toml")
    assert outcome.exit_code == 2
    assert outcome.stderr == "a.toml: exists already; choose another name or remove it first\n"
    assert (folder / "a.toml").read_text() == "mine"


def test_plan_prints_the_table(folder, calls):
    """The table goes to stdout, nothing else does, and no file is left."""
    outcome = run("plan", "a.toml")
    assert outcome.exit_code == 0
    assert outcome.stdout.startswith("Temperate rocky planet")
    assert outcome.stderr == ""
    assert calls == [("plan", "My search", None)]
    assert os.listdir(folder) == ["a.toml"]


def test_plan_writes_everything(folder, calls, result):
    """JSON where asked, and tables, spectra and figure in the folder, which is made."""
    outcome = run("plan", "a.toml", "--lines", "mine", "--json", "r.json", "--out", "deep/out")
    assert outcome.exit_code == 0
    assert calls == [("plan", "My search", Path("mine"))]
    assert sorted(os.listdir("deep/out")) == ["plan.ecsv", "plan.json", "plan.pdf", "plan.png", "spectra.ecsv"]
    assert Path("r.json").read_bytes() == Path("deep/out/plan.json").read_bytes()
    assert len(json.loads(Path("r.json").read_text())["rows"]) == len(result.rows)
    assert Table.read("deep/out/spectra.ecsv").meta["invented"] is True
    assert "wrote deep/out/plan.json" in outcome.stderr


@pytest.mark.parametrize(("words", "draws"), [(["--simulate"], 2000), (["--simulate", "500"], 500)])
def test_plan_simulates_when_asked(folder, calls, words, draws):
    """The number of simulated observations may be left out."""
    assert run("plan", "a.toml", *words).exit_code == 0
    assert calls == [("plan", "My search", None, draws)]
    assert run("plan", "a.toml", "--simulate", "3").exit_code == 2


@pytest.mark.parametrize(("words", "draws"), [(["--spread"], 128), (["--spread", "256"], 256)])
def test_plan_spreads_when_asked(folder, calls, words, draws):
    """The number of draws may be left out."""
    assert run("plan", "a.toml", *words).exit_code == 0
    assert calls == [("plan", "My search", None, ("spread", draws))]
    assert run("plan", "a.toml", "--spread", "3").exit_code == 2


def test_plan_finds_remedies_when_asked(folder, calls):
    """All that would help is worked out on demand."""
    assert run("plan", "a.toml", "--remedies").exit_code == 0
    assert calls == [("plan", "My search", None, "remedies")]


def test_plan_json_on_stdout(folder, calls, result):
    """With a dash the JSON alone is on stdout, ready for a pipe."""
    outcome = run("plan", "a.toml", "--json", "-")
    assert json.loads(outcome.stdout)["title"] == result.title


def test_demo(folder, calls, monkeypatch):
    """The demonstration plans the shipped scenario and writes into its folder."""
    monkeypatch.setattr("planner.report.figure.plan_figure", lambda result: Figure(figsize=(1, 1)))  # to be quick
    assert run("demo").exit_code == 0
    assert calls == [("plan", "Temperate rocky planet of a cool star (invented)", None)]
    assert sorted(os.listdir("limbcast-demo")) == ["plan.ecsv", "plan.json", "plan.pdf", "plan.png", "spectra.ecsv"]


def test_spectrum(folder, calls):
    """A table, and a figure where asked."""
    outcome = run("spectrum", "a.toml", "--out", "s.csv", "--figure", "s.svg", "--transits", "10")
    assert outcome.exit_code == 0, outcome.stderr
    assert Path("s.csv").read_text().startswith("gas,mixing_ratio,mode,detector,from_um,to_um,depth_ppm,share_CH4_ppm")
    assert Path("s.svg").read_text().startswith("<?xml")
    assert outcome.stderr == "wrote s.csv, s.svg\n"


@pytest.mark.parametrize(
    ("stretch", "ends"),
    [("2000:2300 1/cm", (2000, 2300)), ("2300:2000 cm-1", (2000, 2300)), ("4:5 um", (2000, 2500))],
)
def test_sigma(folder, calls, stretch, ends):
    """Units are read at the edge; a range in wavelength is turned into wavenumbers."""
    outcome = run(
        "sigma", "CO2", "--temperature", "296 K", "--pressure", "1 atm", "--range", stretch, "--step", "1 1/m",
        "--out", "s.ecsv",
    )  # fmt: skip
    assert outcome.exit_code == 0, outcome.stderr
    name, gas, kelvin, bar, low, high, step, lines = calls[0]
    assert (name, gas, kelvin, lines) == ("sigma", "CO2", 296.0, None)
    assert (bar, low, high, step) == pytest.approx((1.01325, *ends, 0.01))
    table = Table.read("s.ecsv")
    assert (table.colnames[0], table.colnames[-1]) == ("wavenumber_per_cm", "cross_section_cm2")
    assert table.meta["provenance"] == ["CO2: embedded, edition 1"]
    assert outcome.stdout == "CO2: embedded, edition 1\n"


def test_lines(folder, calls):
    """The three line-data commands."""
    assert run("lines", "list").stdout.split() == ["formula", "lines", "CO2", "5"]
    assert run("lines", "build", "CO2", "CFC-12").stdout == "CO2: 7 lines\n"
    faulty = run("lines", "check")
    assert "a band is missing" in faulty.stdout
    assert faulty.exit_code == 1
    assert run("lines", "check", "--against", "mine").exit_code == 0
    assert run("lines", "check", "--write").exit_code == 2
    assert calls == [("build", ("CO2", "CFC-12")), ("check", None), ("check", Path("mine"))]


@pytest.mark.parametrize("error", [LineDataError("CO2.par:7: garbled"), StoreError("the store is locked")])
def test_errors_of_studies_are_one_message(folder, monkeypatch, error):
    """Whatever a study raises for the user is printed as it is, with status 2."""

    def plan(*args, **kwargs):
        raise error

    monkeypatch.setitem(sys.modules, "planner.studies.plan", SimpleNamespace(plan=plan))
    outcome = run("plan", "a.toml")
    assert (outcome.exit_code, outcome.stdout, outcome.stderr) == (2, "", f"{error}\n")


def test_faults_of_the_program_are_not_hidden(folder, monkeypatch):
    """An error that no user can mend keeps its traceback."""

    def plan(*args, **kwargs):
        raise ZeroDivisionError

    monkeypatch.setitem(sys.modules, "planner.studies.plan", SimpleNamespace(plan=plan))
    assert isinstance(run("plan", "a.toml").exception, ZeroDivisionError)


def test_interrupt(folder, monkeypatch):
    """Ctrl-C is one line and status 130; files are written whole or not at all."""

    def plan(*args, **kwargs):
        raise KeyboardInterrupt

    monkeypatch.setitem(sys.modules, "planner.studies.plan", SimpleNamespace(plan=plan))
    outcome = run("plan", "a.toml", "--json", "r.json")
    assert (outcome.exit_code, outcome.stderr) == (130, "interrupted\n")
    assert not Path("r.json").exists()


def test_closed_pipe():
    """A reader that goes away early is no reason for a traceback."""
    read, write = os.pipe()
    os.close(read)
    outcome = subprocess.run([*COMMAND, "--help"], stdout=write, stderr=subprocess.PIPE, text=True, check=False)
    os.close(write)
    assert outcome.returncode == 1
    assert outcome.stderr == ""


def test_progress_goes_to_a_terminal_only(monkeypatch, capsys):
    """A bar appears on stderr when that is a terminal, and nothing otherwise."""
    from planner.commands.options import progress_bar

    with progress_bar() as progress:
        assert progress is None
    monkeypatch.setenv("FORCE_COLOR", "1")
    with progress_bar() as progress:
        progress("reading lines", 0.5)
    shown = capsys.readouterr()
    assert shown.out == ""
    assert "reading lines" in shown.err
