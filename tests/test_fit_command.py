"""The command ``limbcast fit``: what it calls, writes, keeps and says; and damaged spectra, one message each."""

from __future__ import annotations

import io
import random
import sys
from pathlib import Path
from types import SimpleNamespace

import click
import numpy as np
import pytest
from astropy.table import Table
from click.testing import CliRunner

from planner.cli import cli
from planner.commands.fit import fit
from planner.scenario import starting_scenario

COUNT = 200
ROWS = 12
CSV = "from [um],to [um],depth [ppm],error [ppm],detector\n" + "".join(
    f"{3 + 0.1 * k:.1f},{3.1 + 0.1 * k:.1f},{5000 + k},{30 + k},a\n" for k in range(ROWS)
)


def run(*arguments):
    """Through a group that turns errors into messages as the program's own does."""
    group: click.Group = type(cli)(commands={"fit": fit})
    return CliRunner().invoke(group, ["fit", *map(str, arguments)])


@pytest.fixture
def scenario(tmp_path):
    path = tmp_path / "s.toml"
    path.write_text(starting_scenario())
    return path


def table():
    """The same spectrum as an astropy table with units."""
    found = Table()
    start = 3 + 0.1 * np.arange(ROWS)
    for name, values, unit in (
        ("from", start, "um"),
        ("to", start + 0.1, "um"),
        ("depth", 5000.0 + np.arange(ROWS), "1e-6"),
        ("error", np.full(ROWS, 30.0), "1e-6"),
    ):
        found[name] = values
        found[name].unit = unit
    return found


def as_bytes(found, kind):
    file = io.BytesIO() if kind == "fits" else io.StringIO()
    found.write(file, format="fits" if kind == "fits" else "ascii.ecsv")
    return file.getvalue() if kind == "fits" else file.getvalue().encode()


def broken_rows(rng, rows):
    """Rows of text with one thing wrong."""
    row, column = rng.randrange(1, len(rows)), rng.randrange(4)
    kind = rng.choice(
        ["cell", "negative", "heading", "short", "few", "none", "twice", "overlap", "swapped", "far", "unit"]
    )
    if kind == "cell":
        rows[row][column] = rng.choice(["", "nan", "inf", "x", "3 ppm", "1e400", "--", "\x00", "1;2", "٣x"])
    elif kind == "negative":
        rows[row][rng.choice([0, 3])] = rng.choice(["0", "-1", "-30"])
    elif kind == "heading":
        rows[0][column] = rng.choice(["", "depth", "um", "flux [Jy]", "error [", "[ppm]", "to [um] [um]"])
    elif kind == "short":
        rows[row] = rows[row][: rng.randrange(1, 4)]
    elif kind == "few":
        del rows[rng.randrange(1, 4) :]
    elif kind == "none":
        del rows[1:]
    elif kind == "twice":
        rows.insert(row, rows[row])
    elif kind == "overlap":
        rows[row][1] = "3.65" if row < 6 else "4.6"
    elif kind == "swapped":
        rows[row][0], rows[row][1] = rows[row][1], rows[row][0]
    elif kind == "far":
        rows[-1][:2] = rng.choice([["30", "40"], ["100", "110"]])
        rows[1][:2] = ["0.05", "0.06"]
    else:
        rows[0][column] = f"{rows[0][column].split(' ')[0]} [{rng.choice(['kg', 'furlongs', 'K', 's'])}]"
    return rows


def broken_table(rng):
    """An astropy table with one thing wrong."""
    found = table()
    name = rng.choice(found.colnames)
    kind = rng.choice(["no unit", "other unit", "missing", "nan", "negative", "few", "swapped", "text", "wide", "more"])
    if kind == "no unit":
        found[name].unit = None
    elif kind == "other unit":
        found[name].unit = rng.choice(["kg", "s", "K"])
    elif kind == "missing":
        found.remove_column(name)
    elif kind == "nan":
        found[name][rng.randrange(ROWS)] = np.nan
    elif kind == "negative":
        found["error"][rng.randrange(ROWS)] *= -1
    elif kind == "few":
        found = found[: rng.randrange(4)]
    elif kind == "swapped":
        found["from"], found["to"] = found["to"].copy(), found["from"].copy()
    elif kind == "text":
        found[name] = [f"a{k}" for k in range(ROWS)]
    elif kind == "wide":
        found[name] = np.ones((ROWS, 2))
    else:
        found["flux"] = np.ones(ROWS)
    return found


def damaged(number):
    """File name and bytes of a damaged spectrum."""
    rng = random.Random(number)
    kind = number % 5
    if kind < 2:
        text = "\n".join(",".join(cells) for cells in broken_rows(rng, [r.split(",") for r in CSV.splitlines()]))
        return "s.csv", text.replace("\n", "\r\n" if kind else "\n").encode(rng.choice(["utf-8", "utf-8-sig"]))
    if kind == 2:
        return "s.ecsv", as_bytes(broken_table(rng), "ecsv")
    if kind == 3:
        return "s.fits", as_bytes(broken_table(rng), "fits")
    if rng.random() < 0.4:
        return "s.ecsv", as_bytes(table(), "ecsv")[: rng.randrange(1, 320)]  # in the header or the first rows
    if rng.random() < 0.7:
        return "s.fits", as_bytes(table(), "fits")[: rng.randrange(1, 6100)]  # before the end of the last row
    return "s.dat", bytes(rng.randrange(128, 256) for _ in range(200))


@pytest.mark.parametrize("number", range(COUNT))
def test_damaged_spectrum(tmp_path, scenario, number):
    """One message that begins with the file's name, status 2, nothing on stdout, no folder left behind."""
    name, data = damaged(number)
    path = tmp_path / name
    path.write_bytes(data)
    outcome = run(path, scenario, "--out", tmp_path / "out")
    assert outcome.exit_code == 2, (data[:300], outcome.exception)
    assert outcome.stdout == ""
    lines = outcome.stderr.splitlines()
    assert len(lines) == 1, outcome.stderr
    assert lines[0].startswith(f"{path}: ")
    assert len(lines[0]) < 700
    assert "Traceback" not in lines[0]
    assert not (tmp_path / "out").exists()


@pytest.fixture
def calls(monkeypatch):
    """A study that stops where it is told to, and what it was asked."""
    asked = []

    def study(scenario, observed, **more):
        asked.append((observed, more))
        raise more["keeper"].stop if hasattr(more["keeper"], "stop") else KeyboardInterrupt

    monkeypatch.setitem(sys.modules, "planner.studies.fit", SimpleNamespace(fit=study))
    return asked


GOOD = {
    "plain": CSV.encode(),
    "windows": CSV.replace("\n", "\r\n").encode(),
    "mark": CSV.encode("utf-8-sig"),
    "upside down": "\n".join([CSV.splitlines()[0], *CSV.splitlines()[:0:-1]]).encode(),
}


@pytest.mark.parametrize("kind", [*GOOD, "fits", "ecsv"])
def test_good_spectra_reach_the_study(tmp_path, scenario, calls, kind):
    """Line ends, marks, order of rows and format make no difference."""
    path = tmp_path / "s.dat"
    path.write_bytes(GOOD[kind] if kind in GOOD else as_bytes(table(), kind))
    run(path, scenario, "--out", tmp_path / "out", "--without", "methane", "--seed", "7")
    observed, more = calls[0]
    assert observed.from_um == pytest.approx(3 + 0.1 * np.arange(ROWS))
    assert observed.depth_ppm == pytest.approx(5000 + np.arange(ROWS))
    assert (more["spectrum"], more["without"], more["seed"]) == ("s.dat", "CH4", 7)


def test_interrupted_before_anything_is_kept(tmp_path, scenario, calls):
    """Says that nothing is lost but time."""
    path = tmp_path / "s.csv"
    path.write_text(CSV)
    outcome = run(path, scenario, "--out", tmp_path / "out")
    assert outcome.exit_code == 130
    assert outcome.stderr == "interrupted before sampling began; tables that were built are kept\n"


def test_interrupted_with_a_state(tmp_path, scenario, calls):
    """Says how to go on."""
    out, path = tmp_path / "out", tmp_path / "s.csv"
    path.write_text(CSV)
    out.mkdir()
    (out / "with-all.state.npz").write_bytes(b"")
    outcome = run(path, scenario, "--out", out)
    assert outcome.stderr == f"interrupted; the same command goes on from the state kept in {out}\n"


def test_unknown_gas(tmp_path, scenario):
    """The gas of --without is looked up before any work."""
    path = tmp_path / "s.csv"
    path.write_text(CSV)
    outcome = run(path, scenario, "--out", Path(tmp_path) / "out", "--without", "unobtainium")
    assert outcome.exit_code == 2
    assert "unobtainium" in outcome.stderr
