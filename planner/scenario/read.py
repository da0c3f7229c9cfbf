"""Reading scenario files: TOML text in, a checked `Scenario` out, or one message that names every problem."""

from __future__ import annotations

from pathlib import Path

from planner.errors import ScenarioError
from planner.resources import data_folder
from planner.scenario.readings import COMBINED, nearest
from planner.scenario.records import Scenario
from planner.scenario.tomlfile import parse_as, read_text

__all__ = ["parse_scenario", "read_scenario", "starting_scenario"]


def read_scenario(path: str | Path) -> Scenario:
    """The scenario in a TOML file.

    Raises
    ------
    ScenarioError
        If the file cannot be read, is not TOML, or breaks a rule; every problem is listed with file, line and key.
    """
    path = Path(path)
    scenario = parse_scenario(read_text(path, "limbcast new"), path)
    _check_files(scenario)
    return scenario


def parse_scenario(text: str, where: str | Path = "scenario") -> Scenario:
    """The scenario in TOML text; ``where`` names it in messages, and relative paths start from its folder.

    Raises
    ------
    ScenarioError
        As `read_scenario`, except that no file is looked for.
    """
    scenario = parse_as(Scenario, text, str(where), {"folder": Path(where).parent})
    scenario._text, scenario._where = text, str(where)
    return scenario


def starting_scenario() -> str:
    """Text of a commented scenario to start from."""
    return (data_folder("configs") / "scenarios" / "starting.toml").read_text(encoding="utf-8")


def _check_files(scenario: Scenario) -> None:
    """Refuse a scenario that names a file or a shipped mode that is not there."""
    from planner.instrument.modefiles import list_modes

    if scenario.star.spectrum is not None and not scenario.star.spectrum.is_file():
        raise ScenarioError(f"{scenario.place('star', 'spectrum')}: no such file: {scenario.star.spectrum}")
    known = list_modes()
    for index, mode in enumerate(scenario.modes):
        place = scenario.place("modes", index)
        if isinstance(mode, Path):
            if not mode.is_file():
                raise ScenarioError(f"{place}: no such file: {mode}")
        elif mode not in (*known, COMBINED):
            hint = nearest(mode, known) or f"; known modes: {', '.join(known)}"
            raise ScenarioError(f'{place}: expected a known mode or the path of a .toml file, got "{mode}"{hint}')
