"""The commands that fetch and import line data, as a user types them."""

from __future__ import annotations

import pytest
from click.testing import CliRunner

from planner.commands.linefiles import fetch, import_
from planner.errors import LineDataError
from planner.spectroscopy.hitran import read_par, write_par


@pytest.fixture
def run(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("LIMBCAST_STORE", str(tmp_path / "store"))

    def invoke(command, *arguments):
        return CliRunner().invoke(command, [str(argument) for argument in arguments])

    return invoke


def test_fetch(run, service, tmp_path):
    """One gas from the service, a pair and a freon told to be fetched by hand, and what to quote."""
    result = run(
        fetch, "carbon dioxide", "N2-H2", "CFC-11", "--range", "500:1000 1/cm", "--to", "real", "--abundance", "0.001",
        "--pause", "0.5", "--service", service.address,
    )  # fmt: skip
    assert result.exit_code == 0, result.output
    assert "CO2_500-1000_hitranonline.par.gz: " in result.stdout
    assert len(read_par(tmp_path / "real" / "CO2_500-1000_hitranonline.par.gz")) > 100
    assert (
        "N2-H2: hapi offers no collision files. Download it by hand: at https://hitran.org/cia/ take" in result.stdout
    )
    assert "N2-H2_YEAR.cia or H2-N2_YEAR.cia with the newest YEAR, put it into real" in result.stdout
    assert "CCl3F (CFC-11): HITRAN has no line records of it" in result.stdout
    assert "https://hitran.org/xsc/ choose CCl3F (CFC-11)" in result.stdout
    assert "Please quote:\n  Gordon et al. 2022" in result.stdout


def test_fetch_by_hand_only(run, service):
    """Where there is nothing to fetch nothing is asked and nothing is to be quoted."""
    result = run(fetch, "CFC-12", "--range", "5:12 um", "--to", "real", "--service", service.address)
    assert result.exit_code == 0
    assert "833.333-2000 1/cm" in result.stdout
    assert "quote" not in result.stdout
    assert service.questions == []


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["CO2", "--range", "500-1000", "--to", "x"], 'expected a range such as "2000:2300 1/cm"'),
        (["CO2", "--range", "500:1000 K", "--to", "x"], 'expected a range such as "2000:2300 1/cm"'),
        (["CO2", "--range", "500:1000 1/cm"], "Missing option '--to'"),
        (["--range", "500:1000 1/cm", "--to", "x"], "Missing argument 'GAS...'"),
        (["CO2", "--range", "500:1000 1/cm", "--to", "x", "--pause", "0"], "--pause"),
        (["CO2", "--range", "500:1000 1/cm", "--to", "x", "--abundance", "2"], "--abundance"),
    ],
)
def test_fetch_usage(run, arguments, message):
    """Wrong options end with status 2 and a word on what was expected."""
    result = run(fetch, *arguments)
    assert result.exit_code == 2
    assert message in result.output


def test_names_are_checked_before_anything_is_asked(run, service):
    """A name that is not known stops the command before the first request."""
    result = run(fetch, "CO2", "unobtainium", "--range", "500:700 1/cm", "--to", "real", "--service", service.address)
    assert isinstance(result.exception, LineDataError)
    assert "unobtainium" in str(result.exception)
    assert service.questions == []


def test_import(run, service, tmp_path, make_xsc):
    """Files are described, what stands and what does not is said, and the folder is filled."""
    (tmp_path / "freon.xsc").write_text(make_xsc())
    write_par(tmp_path / "a.par", service.lines)
    result = run(import_, "freon.xsc", "a.par", "--to", "real", "--covers", "500:2500 1/cm", "--isotopologues", "1,3")
    assert result.exit_code == 0, result.output
    assert "read: a.par: 500 line records" in result.stdout
    assert "read: freon.xsc:1: cross-sections of CCl3F" in result.stdout
    assert "stands: CO2: isotopologue 1 over 500-2500 per cm from a.par" in result.stdout
    assert "stands: CO2: isotopologue 3 over 500-2500 per cm from a.par" in result.stdout
    assert "not used: a.par: CO2 isotopologue 2: " in result.stdout
    assert (tmp_path / "real" / "coverage.toml").is_file()
    assert "wrote 2 files to real" in result.stderr


def test_import_two_columns(run, tmp_path):
    """A text table with everything stated becomes a .xsc file."""
    (tmp_path / "x.csv").write_text("".join(f"{5000 + i},{1 + i}\n" for i in range(20)))
    state = ["--temperature", "298 K", "--pressure", "1 atm", "--gas", "diacetylene"]
    result = run(import_, "x.csv", "--to", "real", "--units", "nm", "1e-20 cm2", *state)
    assert result.exit_code == 0, result.output
    assert "stands: C4H2: measured cross-sections over 1992.43-2000 per cm from x.csv" in result.stdout
    assert [path.name for path in (tmp_path / "real").iterdir()] == ["x.xsc"]


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--gas", "SO2"], "a two-column file needs all of --gas, --units, --temperature and --pressure"),
        (["--edition", "HITRAN2020"], "--isotopologues and --edition say more about --covers"),
        (["--covers", "500:2500 1/cm", "--isotopologues", "1;2"], 'expected whole numbers such as "1,2,3"'),
        (["--temperature", "298"], "expected a temperature such as"),
    ],
)
def test_import_usage(run, tmp_path, arguments, message):
    """Options that do not go together are told before anything is read."""
    result = run(import_, "absent.txt", "--to", "real", *arguments)
    assert result.exit_code == 2
    assert message in result.output


def test_import_of_an_absent_file(run):
    """A path that is not there is one clear error."""
    result = run(import_, "absent.par", "--to", "real")
    assert isinstance(result.exception, LineDataError)
    assert "absent.par: expected a readable file" in str(result.exception)
