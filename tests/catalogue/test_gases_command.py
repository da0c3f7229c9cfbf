"""The command: list, one gas, JSON, errors."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest
from click.testing import CliRunner

from planner.commands.gases import gases
from planner.errors import LineDataError, OutputError, ScenarioError


def run(*arguments: str, width: int = 80):
    return CliRunner().invoke(gases, arguments, env={"COLUMNS": str(width)}, standalone_mode=True)


@pytest.mark.parametrize("width", [80, 120])
def test_list(width: int) -> None:
    """Without a name: every gas, within the terminal."""
    result = run(width=width)
    assert result.exit_code == 0
    assert "CFC-11" in result.output
    assert max(map(len, result.output.splitlines())) <= width


def test_one_gas_by_common_name() -> None:
    """A page of the gas asked for."""
    result = run("phosphine")
    assert result.exit_code == 0
    assert result.output.startswith("PH3")


def test_json_holds_what_was_asked_for(tmp_path) -> None:
    """One gas with its name given, all without."""
    for arguments, count in ((("CFC-11",), 1), ((), 41)):
        path = tmp_path / f"{count}.json"
        assert run(*arguments, "--json", str(path)).exit_code == 0
        assert len(json.loads(path.read_text(encoding="utf-8"))["gases"]) >= count
    assert json.loads((tmp_path / "1.json").read_text(encoding="utf-8"))["gases"][0]["formula"] == "CCl3F"


@pytest.mark.parametrize(
    ("arguments", "error"),
    [
        (("unobtainium",), LineDataError),
        (("N2",), ScenarioError),
        (("CO", "--json", "/nowhere/at/all.json"), OutputError),
    ],
)
def test_errors_are_those_of_the_tree(arguments: tuple[str, ...], error: type[Exception]) -> None:
    """So that the command line prints one message and exits 2."""
    assert isinstance(run(*arguments).exception, error)


def test_import_is_light() -> None:
    """The command's module brings in neither pydantic nor astropy: help must stay quick."""
    heavy = "{'pydantic', 'astropy', 'numpy', 'rich'}"
    code = f"import sys, planner.commands.gases; print(sorted({heavy} & set(sys.modules)))"
    shown = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert shown.stdout.strip() == "[]"
