"""Reading scenario files: TOML text in, a checked `Scenario` out, or one message that names every problem."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from types import UnionType
from typing import Any, get_args, get_origin

from pydantic import BaseModel, BeforeValidator, ValidationError
from pydantic.fields import FieldInfo

from planner.errors import ScenarioError
from planner.resources import data_folder
from planner.scenario.locate import heading, line_of
from planner.scenario.readings import COMBINED, nearest, shown
from planner.scenario.records import Scenario

__all__ = ["parse_scenario", "read_scenario", "starting_scenario"]

Place = tuple[str | int, ...]


def read_scenario(path: str | Path) -> Scenario:
    """The scenario in a TOML file.

    Raises
    ------
    ScenarioError
        If the file cannot be read, is not TOML, or breaks a rule; every problem is listed with file, line and key.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8")
    except FileNotFoundError:
        raise ScenarioError(f"{path}: no such file; `limbcast new {path}` writes one to start from") from None
    except UnicodeDecodeError:
        raise ScenarioError(f"{path}: not a text file in UTF-8") from None
    except OSError as error:
        raise ScenarioError(f"{path}: cannot be read: {error.strerror}") from None
    scenario = parse_scenario(text, path)
    _check_files(scenario)
    return scenario


def parse_scenario(text: str, where: str | Path = "scenario") -> Scenario:
    """The scenario in TOML text; ``where`` names it in messages, and relative paths start from its folder.

    Raises
    ------
    ScenarioError
        As `read_scenario`, except that no file is looked for.
    """
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise ScenarioError(_syntax_message(error, where)) from None
    try:
        scenario = Scenario.model_validate(tree, context={"folder": Path(where).parent})
    except ValidationError as error:
        raise ScenarioError(_all_problems(error, text, where)) from None
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


def _syntax_message(error: tomllib.TOMLDecodeError, where: str | Path) -> str:
    match = re.fullmatch(r"(.*) \(at (?:line (\d+), column (\d+)|end of document)\)", str(error), re.DOTALL)
    if match is None or match[2] is None:
        return f"{where}: not valid TOML: {match[1] if match else error} at the end of the file"
    unquoted = match[1].startswith(("Invalid value", "Expected newline"))
    hint = '; values with units stand in quotes: "250 K"' if unquoted else ""
    return f"{where}:{match[2]}: not valid TOML in column {match[3]}: {match[1]}{hint}"


def _all_problems(error: ValidationError, text: str, where: str | Path) -> str:
    """One line per problem, in the order of the file."""
    problems = []
    for item in error.errors():
        place, message = _place_and_message(item)
        problems.append((line_of(text, place) or 0, f"{heading(text, str(where), place)}: {message}"))
    return "\n".join(message for _, message in sorted(problems, key=lambda problem: problem[0]))


def _place_and_message(item: Any) -> tuple[Place, str]:
    place: Place = tuple(item["loc"])
    if item["type"] == "missing":
        return place, f"missing; expected {_expected(place)}"
    if item["type"] == "extra_forbidden":
        return place, _unknown_key(place)
    cause = item.get("ctx", {}).get("error")
    if isinstance(cause, ValueError):
        return (*place, *getattr(cause, "at", ())), str(cause)
    return place, f"expected {_expected(place)}, got {shown(item['input'])}"


def _unknown_key(place: Place) -> str:
    key, known = str(place[-1]), _keys(_model_at(place[:-1]))
    if len(place) > 1 and key in _keys(Scenario):
        return f'unknown key; "{key}" belongs at the top of the file, above the first [table]'
    return f"unknown key{nearest(key, known) or '; known here: ' + ', '.join(known)}"


def _expected(place: Place) -> str:
    """What a field wants: the phrase of its reading, or the table it is."""
    field = _field_at(place)
    for mark in field.metadata if field else ():
        if isinstance(mark, BeforeValidator):
            return str(getattr(mark.func, "expected", "another value"))
    return f"a [{'.'.join(str(key) for key in place if isinstance(key, str))}] table"


def _keys(model: type[BaseModel] | None) -> list[str]:
    return [field.alias or name for name, field in model.model_fields.items()] if model else []


def _field_at(place: Place) -> FieldInfo | None:
    """The field that a place in the file belongs to; ``None`` for an entry of a list."""
    model = _model_at(place[:-1])
    fields = {field.alias or name: field for name, field in model.model_fields.items()} if model else {}
    return fields.get(str(place[-1]))


def _model_at(place: Place) -> type[BaseModel] | None:
    """The record that a place in the file becomes, if it becomes one."""
    if not place:
        return Scenario
    if isinstance(place[-1], int):
        return _model_at(place[:-1])
    field = _field_at(place)
    return _model_in(field.annotation) if field else None


def _model_in(annotation: Any) -> type[BaseModel] | None:
    """The record inside ``Record``, ``Record | None`` or ``tuple[Record, ...]``."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    if get_origin(annotation) in (UnionType, tuple):
        return next((model for model in map(_model_in, get_args(annotation)) if model), None)
    return None
