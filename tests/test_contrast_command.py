"""The command ``limbcast contrast``."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest
from click.testing import CliRunner
from small_system import SYSTEM

from planner.cli import cli

SCENARIO = """
title = "{title}"
invented = true
modes = ["grism-4-to-5-um"]
{system}
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
[[candidates]]
gas = "{gas}"
mixing_ratio = "100 ppm"
[goal]
threshold = 3
"""


@pytest.fixture
def folder(tmp_path, monkeypatch):
    """Two airs of one planet, and one of another."""
    for name, gas, distance in (("a", "N2O", "12.8 pc"), ("b", "OCS", "12.8 pc"), ("far", "OCS", "20 pc")):
        system = SYSTEM.strip().replace("12.8 pc", distance)
        (tmp_path / f"{name}.toml").write_text(SCENARIO.format(title=name, gas=gas, system=system))
    monkeypatch.chdir(tmp_path)
    return tmp_path


def run(*words):
    return CliRunner().invoke(cli, ["contrast", *words])


def test_prints_and_writes(folder):
    """The table on stdout; JSON, bins and figure in the folder; what was written on stderr."""
    outcome = run("a.toml", "b.toml", "--out", "out", "--json", "c.json")
    assert outcome.exit_code == 0, outcome.output
    assert outcome.stdout.startswith("A  a")
    assert sorted(os.listdir("out")) == ["contrast.ecsv", "contrast.json", "contrast.pdf", "contrast.png"]
    assert Path("c.json").read_text() == Path("out/contrast.json").read_text()
    assert "wrote out/contrast.json" in outcome.stderr


def test_json_on_stdout(folder):
    """Nothing but the JSON."""
    outcome = run("a.toml", "b.toml", "--json", "-")
    assert json.loads(outcome.stdout)["b"]["title"] == "b"


def test_two_planets_are_refused(folder):
    """One message, status 2, and nothing written."""
    outcome = run("a.toml", "far.toml", "--out", "out")
    assert outcome.exit_code == 2
    assert outcome.stderr.startswith("far.toml:5: star: expected what stands at a.toml:5: star")
    assert "another distance" in outcome.stderr
    assert not Path("out/contrast.json").exists()


def test_help_loads_nothing_heavy():
    """The command imports what it needs when it runs."""
    heavy = "import sys, planner.commands.contrast; print({'numpy', 'astropy', 'numba', 'pydantic'} & set(sys.modules))"
    assert subprocess.run([sys.executable, "-c", heavy], check=True, capture_output=True, text=True).stdout == "set()\n"
