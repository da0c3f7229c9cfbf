"""What bad input gets: one clear message, exit status 2, no traceback, nothing half-written."""

from __future__ import annotations

import inspect
import os
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner

from planner import errors
from planner.cli import cli
from planner.scenario import starting_scenario

SIGMA = [
    "sigma",
    "CO2",
    "--temperature",
    "296 K",
    "--pressure",
    "1 bar",
    "--range",
    "2000:2300 1/cm",
    "--out",
    "s.ecsv",
]


def changed(old, new):
    """A scenario file with one mistake, and the command that reads it."""

    def prepare():
        text = starting_scenario()
        assert old in text
        Path("a.toml").write_text(text.replace(old, new, 1))
        return ["plan", "a.toml", "--out", "plan"]

    return prepare


def instead(*pairs):
    """The sigma command with some of its values replaced."""

    def prepare():
        command = list(SIGMA)
        for option, value in pairs:
            command[command.index(option) + 1] = value
        return command

    return prepare


def file_named(name, content, *command):
    """A command that meets a file of this content."""

    def prepare():
        Path(name).write_bytes(content)
        return list(command)

    return prepare


KINDS = {
    "unknown key": (changed("impact_parameter", "impact_parametre"), 'did you mean "impact_parameter"'),
    "unknown table": (changed("[goal]", "[gaol]"), 'gaol: unknown key; did you mean "goal"'),
    "missing key": (changed("impact_parameter = 0.25", ""), "planet.impact_parameter: missing; expected a plain"),
    "missing unit": (changed('"0.85 M_earth"', '"0.85"'), 'a.toml:28: planet.mass: expected a mass such as'),
    "wrong kind of unit": (changed('"2650 K"', '"2650 m"'), "star.temperature: expected a temperature"),
    "no such unit": (changed('"1 bar"', '"1 barr"'), '"barr" is not a unit'),
    "not finite": (changed('"5.49 d"', '"nan d"'), "planet.period: expected a finite value"),
    "negative": (changed('"12.8 pc"', '"-12.8 pc"'), "star.distance: expected a distance greater than zero"),
    "text for a switch": (changed("surface = true", 'surface = "yes"'), "atmosphere.surface: expected true or false"),
    "too much gas": (changed('"100 ppm"]', '"99.99 %"]'), "expected less than 1 together with the absorbers"),
    "absent molecule": (changed('gas = "CH4"', 'gas = "unobtainium"'), "candidates[1].gas: "),
    "larger than its star": (changed('"1.00 R_earth"', '"1.00 R_sun"'), "the planet is larger than its star"),
    "no transit": (changed("impact_parameter = 0.25", "impact_parameter = 3"), "planet.impact_parameter: no transit"),
    "grazing": (changed("impact_parameter = 0.25", "impact_parameter = 0.95"), "grazing transit"),
    "unknown mode": (changed('"near-infrared-prism"', '"near-infrared-prisms"'), 'did you mean "near-infrared-prism"'),
    "missing mode file": (changed('"near-infrared-prism"', '"mine.toml"'), "modes[1]: no such file: mine.toml"),
    "missing spectrum": (changed('# spectrum = "my', 'spectrum = "my'), "star.spectrum: no such file: my_star.ecsv"),
    "not TOML": (changed('re = "250 K"', "re = 250 K"), "not valid TOML in column"),
    "no such scenario": (lambda: ["plan", "none.toml"], "none.toml: no such file; `limbcast new none.toml`"),
    "scenario is a folder": (lambda: ["plan", "."], "cannot be read"),
    "scenario is binary": (file_named("b.toml", b"\xff\xfe\x00", "plan", "b.toml"), "b.toml: not a text file"),
    "output folder is a file": (file_named("f", b"", "demo", "--out", "f"), "f: expected a folder, got a file"),
    "output in a missing folder": (instead(("--out", "none/s.ecsv")), "the folder none does not exist"),
    "output is a folder": (lambda: Path("d.ecsv").mkdir() or instead(("--out", "d.ecsv"))(), "got a folder"),
    "ending of a table": (instead(("--out", "s.txt")), 'expected a name that ends in .ecsv or .csv, got ".txt"'),
    "ending of a figure": (
        lambda: ["spectrum", "none.toml", "--out", "s.ecsv", "--figure", "s.jpg"],
        "expected a name that ends in .png, .pdf, .svg",
    ),
    "new over a file": (file_named("a.toml", b"x", "new", "a.toml"), "a.toml: exists already"),
    "new in a missing folder": (lambda: ["new", "none/a.toml"], "the folder none does not exist"),
    "sigma without unit": (instead(("--temperature", "296")), 'expected a temperature such as "296 K", got "296"'),
    "sigma below zero": (instead(("--pressure", "-1 bar")), "expected a pressure greater than zero"),
    "sigma range": (instead(("--range", "2000-2300")), 'expected a range such as "2000:2300 1/cm"'),
    "sigma range unit": (instead(("--range", "2000:2300 kg")), 'expected a range such as "2000:2300 1/cm"'),
    "sigma range backwards zero": (instead(("--range", "0:10 1/cm")), "expected"),
    "sigma absent molecule": (instead(("sigma", "unobtainium")), "unobtainium"),
    "no such command": (lambda: ["plann"], "No such command 'plann'"),
    "no such option": (lambda: ["demo", "--fast"], "No such option"),
    "missing option": (lambda: ["spectrum", "a.toml"], "Missing option '--out'"),
}  # fmt: skip


@pytest.mark.parametrize("kind", KINDS)
def test_bad_input(kind, tmp_path, monkeypatch):
    """One message on stderr, status 2, and nothing in the folder but what was there before."""
    monkeypatch.chdir(tmp_path)
    prepare, message = KINDS[kind]
    command = prepare()
    before = sorted(os.listdir())
    outcome = CliRunner().invoke(cli, command)
    assert outcome.exit_code == 2, (outcome.exception, outcome.output)
    assert message in outcome.stderr
    assert outcome.stdout == ""
    assert "Traceback" not in outcome.stderr
    assert sorted(os.listdir()) == before


def test_unwritable_folder(tmp_path, monkeypatch):
    """A folder that cannot be written to is refused before the work begins."""
    monkeypatch.chdir(tmp_path)
    Path("a.toml").write_text(starting_scenario())
    monkeypatch.setattr(os, "access", lambda path, mode: False)  # the tests may run as root, who has every right
    for command in (["plan", "a.toml", "--out", "."], ["plan", "a.toml", "--json", "r.json"], ["new", "b.toml"]):
        outcome = CliRunner().invoke(cli, command)
        assert outcome.exit_code == 2
        assert "cannot be written to" in outcome.stderr
    assert os.listdir(tmp_path) == ["a.toml"]


def test_bad_input_of_a_true_process(tmp_path):
    """The installed command behaves as the tests in this process say."""
    (tmp_path / "bad.toml").write_text(starting_scenario().replace('"0.85 M_earth"', '"0.85"', 1))
    for name, message in {
        "none.toml": "none.toml: no such file; `limbcast new none.toml` writes one to start from\n",
        "bad.toml": 'bad.toml:28: planet.mass: expected a mass such as "0.7 M_earth", got "0.85" (the unit is missing)\n',  # noqa: E501
    }.items():
        outcome = subprocess.run(
            [sys.executable, "-c", "from planner.cli import main; main()", "plan", name],
            cwd=tmp_path, capture_output=True, text=True, check=False,
        )  # fmt: skip
        assert (outcome.returncode, outcome.stdout, outcome.stderr) == (2, "", message)


def test_every_error_is_a_planner_error():
    """The tree has one root, and the drawing in the docstring shows every branch."""
    for name in errors.__all__:
        assert issubclass(getattr(errors, name), errors.PlannerError)
        assert name in inspect.getdoc(errors)
