"""The command `audit`: what goes to stdout, to files and to stderr."""

from __future__ import annotations

import json

import pytest
from click.testing import CliRunner

from planner.cli import cli
from planner.commands.audit import audit

BARE = 'title = "CO somewhere"\n[claim]\ngas = "CO"\nfrom = "4.4 um"\nto = "5 um"\nsignificance = 2.5\n'
BARE += "[search]\ngases_searched = 10\n"


@pytest.fixture
def run(tmp_path):
    """The command on a claim without a planet, with more arguments."""
    path = tmp_path / "claim.toml"
    path.write_text(BARE)
    group = type(cli)(commands={"audit": audit})
    return lambda *more: CliRunner().invoke(group, ["audit", str(path), *map(str, more)])


def test_table(run):
    """The verdict comes before the checks."""
    result = run()
    assert result.exit_code == 0
    assert "CO somewhere" in result.stdout
    assert result.stdout.index("does not stand") < result.stdout.index("evidence")


def test_json_alone_on_stdout(run):
    """With - nothing but JSON is printed."""
    tree = json.loads(run("--json", "-").stdout)
    assert tree["standing"] == "does not stand"
    assert tree["weakest"] == "trials"
    assert len(tree["checks"]) == 10


def test_json_to_a_file(run, tmp_path):
    """Beside the table; the file is named on stderr."""
    path = tmp_path / "audit.json"
    result = run("--json", path)
    assert json.loads(path.read_text())["gas"] == "CO"
    assert f"wrote {path}" in result.stderr


def test_unwritable_place(run, tmp_path):
    """Refused before the work, with status 2."""
    result = run("--json", tmp_path / "none" / "audit.json")
    assert result.exit_code == 2
    assert "does not exist" in result.stderr


def test_spectrum_of_a_claim_without_a_planet(run, tmp_path):
    """A spectrum needs a model to hold it against."""
    path = tmp_path / "s.csv"
    path.write_text(
        "wavelength [um],depth [ppm],error [ppm]\n" + "".join(f"{4.4 + k / 10},5000,30\n" for k in range(6))
    )
    result = run("--spectrum", path)
    assert result.exit_code == 2
    assert "the claim lacks [star]" in result.stderr
