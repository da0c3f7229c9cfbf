"""Reading mode files: the shipped ones by name, a user's own by path."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

from pydantic import BaseModel, BeforeValidator, ValidationError

from planner.errors import ScenarioError
from planner.instrument.modes import Floor, Mode, Photometer, Spectrometer, Telescope
from planner.resources import data_folder
from planner.scenario.locate import line_of
from planner.scenario.readings import nearest, shown

__all__ = ["list_modes", "parse_mode", "read_mode"]

Place = tuple[str | int, ...]

_KINDS: dict[str, type[BaseModel]] = {"spectrometer": Spectrometer, "photometer": Photometer}
_TABLES: dict[str, type[BaseModel]] = {"telescope": Telescope, "floor": Floor}


def list_modes() -> tuple[str, ...]:
    """Names of the shipped modes, sorted."""
    return tuple(sorted(path.stem for path in _folder().glob("*.toml")))


def read_mode(name_or_path: str | Path) -> Mode:
    """A shipped mode by name, or the mode in a file whose name ends in ``.toml``.

    Raises
    ------
    ScenarioError
        If there is no such mode or file, or the file breaks a rule.
    """
    path = Path(name_or_path)
    if path.suffix != ".toml":
        path = _shipped(str(name_or_path))
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise ScenarioError(f"{path}: expected a file with an instrument mode, got: {error}") from None
    return parse_mode(text, str(path))


def parse_mode(text: str, where: str) -> Mode:
    """The mode in TOML text; ``where`` names it in messages.

    Raises
    ------
    ScenarioError
        One line per problem: file, line, key, what was expected, what came.
    """
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        line = re.search(r"at line (\d+)", str(error))
        raise ScenarioError(f"{where}{':' + line[1] if line else ''}: not valid TOML: {error}") from None
    try:
        return Mode.model_validate(tree)
    except ValidationError as error:
        problems = [_problem(item, text, where) for item in error.errors()]
        raise ScenarioError("\n".join(dict.fromkeys(problems))) from None


def _folder() -> Path:
    return data_folder("configs") / "instruments"


def _shipped(name: str) -> Path:
    known = list_modes()
    if name not in known:
        hint = nearest(name, known) or f"; known modes: {', '.join(known)}"
        raise ScenarioError(f'mode: expected the name of a mode or a path ending in .toml, got "{name}"{hint}')
    return _folder() / f"{name}.toml"


def _problem(item: Any, text: str, where: str) -> str:
    """One problem that pydantic found, as one line."""
    table, place = _table_and_place(item["loc"])
    line = line_of(text, place)
    head = f"{where}:{line}" if line else where
    return f"{head}: {_dotted(place) or 'the mode'}: {_message(item, table, place)}"


def _message(item: Any, table: type[BaseModel], place: Place) -> str:
    expected = _expected(table, place)
    match item["type"]:
        case "missing":
            return f"missing; expected {expected}"
        case "extra_forbidden":
            known = _keys(table)
            return f"unknown key{nearest(str(place[-1]), known) or '; known here: ' + ', '.join(known)}"
        case "union_tag_invalid" | "union_tag_not_found":
            return f'expected kind = "spectrometer" or "photometer", got {shown(item["input"].get("kind", "none"))}'
        case "value_error":
            return str(item["ctx"]["error"])
        case _:
            return f"expected {expected}, got {shown(item['input'])}"


def _table_and_place(loc: tuple[str | int, ...]) -> tuple[type[BaseModel], Place]:
    """The record that a problem belongs to, and its place in the file, without pydantic's marks of the kind."""
    table: type[BaseModel] = Mode
    place: Place = ()
    for position, key in enumerate(loc):
        if position == 2 and place[0] == "detector" and key in _KINDS:
            table = _KINDS[str(key)]
            continue
        if position == 0 and len(loc) > 1:
            table = _TABLES.get(str(key), Mode)
        place = (*place, key)
    return table, place


def _keys(table: type[BaseModel]) -> list[str]:
    return [field.alias or name for name, field in table.model_fields.items()]


def _expected(table: type[BaseModel], place: Place) -> str:
    """What a field wants: the phrase of its reading, or the table it is."""
    fields = {field.alias or name: field for name, field in table.model_fields.items()}
    field = fields.get(str(place[-1])) if place else None
    for mark in field.metadata if field else ():
        if isinstance(mark, BeforeValidator):
            return str(getattr(mark.func, "expected", "another value"))
    if place and place[-1] == "detector":
        return "at least one [[detector]] table"
    return f"a [{_dotted(place)}] table"


def _dotted(place: Place) -> str:
    """``detector[1].read_noise``; entries are counted from 1, as a reader of the file would."""
    text = ""
    for key in place:
        text += f"[{key + 1}]" if isinstance(key, int) else f".{key}" if text else key
    return text
