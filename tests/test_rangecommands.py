"""The commands limit and map: what they ask of the studies, print and write."""

from __future__ import annotations

import json

import pytest
from astropy.table import Table
from click.testing import CliRunner
from small_system import NARROW

from planner.cli import cli


@pytest.fixture
def folder(tmp_path, monkeypatch):
    """A working folder with a scenario in it."""
    (tmp_path / "a.toml").write_text(NARROW)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def run(*words):
    return CliRunner().invoke(cli, words)


def test_limit_prints_and_writes(folder):
    """A table on stdout, and JSON, tables and figures in the folder, which agree with each other."""
    result = run("limit", "a.toml", "--transits", "10,100", "--out", "out")
    assert result.exit_code == 0, result.stderr
    assert "detectable" in result.stdout
    tree = json.loads((folder / "out" / "limits.json").read_text())
    assert tree["format"] == "limbcast limit 1"
    (curve,) = tree["curves"]
    assert [point["transits"] for point in curve["points"]] == [10, 100]
    table = Table.read(folder / "out" / "limits.ecsv")
    assert table["detectable_ratio"].tolist() == [point["detectable_ratio"] for point in curve["points"]]
    assert len(Table.read(folder / "out" / "growth.ecsv")) == len(curve["ratios"])
    assert (folder / "out" / "limits.png").stat().st_size > 10_000
    assert (folder / "out" / "limits.pdf").read_bytes().startswith(b"%PDF")


def test_limit_as_json_on_stdout(folder):
    """Nothing but JSON where it is asked for on stdout."""
    result = run("limit", "a.toml", "--transits", "5", "--json", "-", "--confidence", "0.9")
    assert json.loads(result.stdout)["confidence"] == 0.9


@pytest.mark.parametrize("transits", ["", "a", "1,0", "1.5"])
def test_limit_wants_whole_transits(folder, transits):
    """Numbers of transits are whole and positive."""
    result = run("limit", "a.toml", "--transits", transits)
    assert result.exit_code == 2
    assert "numbers of transits" in result.stderr


def test_map_writes_figure_and_cells(folder):
    """A cell for every pair of steps, and the figure twice."""
    axes = ("--x", "mixing_ratio=1e-6:1e-4:4", "--y", "cloud_top=0.01:1:3")
    result = run("map", "a.toml", *axes, "--gas", "n2o", "--out", "out")
    assert result.exit_code == 0, result.stderr
    table = Table.read(folder / "out" / "map.ecsv")
    assert len(table) == 12
    assert str(table["cloud_top"].unit) == "bar"
    assert (folder / "out" / "map.png").stat().st_size > 10_000
    assert (folder / "out" / "map.pdf").read_bytes().startswith(b"%PDF")


@pytest.mark.parametrize("axis", ["cloud_top", "cloud_top=1", "cloud_top=a:1", "cloud_top=1:2:3:4", "cloud_top=1:2:x"])
def test_axes_are_checked(folder, axis):
    """An axis is a name with two ends and perhaps a number of steps."""
    result = run("map", "a.toml", "--x", axis, "--out", "out")
    assert result.exit_code == 2
    assert "expected an axis such as" in result.stderr


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (("--x", "colour=1:2"), "expected one of mixing_ratio, temperature"),
        (("--x", "N2O=1e-6:1e-4"), "expected one of mixing_ratio"),
        (("--x", "cloud_top=1:0.1"), "axis cloud_top: expected 0 < from < to"),
        (("--x", "CO=1e-6:2"), "axis CO: expected mixing ratios up to 0.9"),
        (("--x", "cloud_top=0.1:1"), "got cloud_top twice"),
        (("--gas", "CH4"), "a.toml:24: candidates: expected one of N2O for the gas of a map, got CH4"),
        (("--mode", "prism"), "expected one of the scenario's modes grism-4-to-5-um, got prism"),
    ],
)
def test_maps_that_cannot_be(folder, words, message):
    """One message, exit status 2, nothing computed."""
    result = run("map", "a.toml", *words, "--out", "out")
    assert result.exit_code == 2
    assert message in result.stderr
