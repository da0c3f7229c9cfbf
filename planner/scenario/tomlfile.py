"""TOML files that become records: text in, one checked record out, or one message that names every problem."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from shlex import quote
from types import UnionType
from typing import Annotated, Any, TypeVar, get_args, get_origin

from pydantic import BaseModel, BeforeValidator, ValidationError
from pydantic.fields import FieldInfo

from planner.errors import ScenarioError
from planner.scenario.locate import dotted, heading, line_of
from planner.scenario.readings import closest, nearest, shown

__all__ = ["parse_as", "read_text"]

Place = tuple[str | int, ...]
Model = TypeVar("Model", bound=BaseModel)


def read_text(path: Path, new: str = "") -> str:
    """The text of a file in UTF-8, with or without the mark that some editors put at its head.

    Parameters
    ----------
    new : str
        The command that writes such a file, for the message where there is none.

    Raises
    ------
    ScenarioError
        If it cannot be read.
    """
    try:
        return path.read_text(encoding="utf-8-sig")
    except FileNotFoundError:
        remedy = f"; `{new} {quote(str(path))}` writes one to start from" if new else ""
        raise ScenarioError(f"{path}: no such file{remedy}") from None
    except UnicodeDecodeError:
        raise ScenarioError(f"{path}: not a text file in UTF-8") from None
    except OSError as error:
        raise ScenarioError(f"{path}: cannot be read: {error.strerror}") from None


def parse_as(model: type[Model], text: str, where: str, context: Mapping[str, Any] | None = None) -> Model:
    """The record in TOML text.

    Parameters
    ----------
    model : type of record
    text : str
    where : str
        Names the file in messages.
    context : mapping, optional
        Passed on to the readings of the record.

    Raises
    ------
    ScenarioError
        If the text is not TOML or breaks a rule of the record; one line per problem, in the order of the file.
    """
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise ScenarioError(_syntax_message(error, where)) from None
    try:
        return model.model_validate(tree, context=dict(context or {}))
    except ValidationError as error:
        raise ScenarioError(_all_problems(error, model, text, where)) from None


def _syntax_message(error: tomllib.TOMLDecodeError, where: str) -> str:
    match = re.fullmatch(r"(.*) \(at (?:line (\d+), column (\d+)|end of document)\)", str(error), re.DOTALL)
    if match is None or match[2] is None:
        return f"{where}: not valid TOML: {match[1] if match else error} at the end of the file"
    unquoted = match[1].startswith(("Invalid value", "Expected newline"))
    hint = '; values with units stand in quotes: "250 K"' if unquoted else ""
    return f"{where}:{match[2]}: not valid TOML in column {match[3]}: {match[1]}{hint}"


def _all_problems(error: ValidationError, model: type[BaseModel], text: str, where: str) -> str:
    items, problems = error.errors(), []
    misspelt = {_meant(item, model) for item in items if item["type"] == "extra_forbidden"}
    for item in items:
        place, message = _place_and_message(item, model)
        if item["type"] == "missing" and place in misspelt:
            continue  # it is there under another name, which is told
        problems.append((line_of(text, place) or 0, f"{heading(text, where, place)}: {message}"))
    return "\n".join(dict.fromkeys(message for _, message in sorted(problems, key=lambda problem: problem[0])))


def _meant(item: Any, model: type[BaseModel]) -> Place:
    """The place of the key that an unknown one probably stands for."""
    place, holders, _, _ = _follow(model, tuple(item["loc"]))
    return *place[:-1], closest(str(place[-1]), _known(holders)) or ""


def _place_and_message(item: Any, model: type[BaseModel]) -> tuple[Place, str]:
    place, holders, here, field = _follow(model, tuple(item["loc"]))
    if item["type"] == "missing":
        return place, f"missing; expected {_expected(place, field)}"
    if item["type"] == "extra_forbidden":
        return place, _unknown_key(model, place, holders)
    if item["type"] in ("union_tag_invalid", "union_tag_not_found"):
        kinds = " or ".join(f'"{kind}"' for record in here for kind in _kinds(record))
        return place, f"expected kind = {kinds}, got {shown(item['input'].get('kind', 'none'))}"
    cause = item.get("ctx", {}).get("error")
    if isinstance(cause, ValueError):
        return (*place, *getattr(cause, "at", ())), str(cause)
    return place, f"expected {_expected(place, field)}, got {shown(item['input'])}"


def _unknown_key(model: type[BaseModel], place: Place, holders: list[type[BaseModel]]) -> str:
    key, known = str(place[-1]), _known(holders)
    if len(place) > 1 and key in _fields(model):
        return f'unknown key; "{key}" belongs at the top of the file, above the first [table]'
    return f"unknown key{nearest(key, known) or '; known here: ' + ', '.join(known)}"


def _expected(place: Place, field: FieldInfo | None) -> str:
    """What a field wants: the phrase of its reading, or the table it is."""
    for mark in field.metadata if field else ():
        if isinstance(mark, BeforeValidator):
            return str(getattr(mark.func, "expected", "another value"))
    table = dotted(tuple(key for key in place if isinstance(key, str)))
    several = field is not None and get_origin(field.annotation) is tuple
    return f"at least one [[{table}]] table" if several else f"a [{table}] table"


def _follow(
    model: type[BaseModel], loc: Place
) -> tuple[Place, list[type[BaseModel]], list[type[BaseModel]], FieldInfo | None]:
    """Where a problem is: its place in the file, without pydantic's marks of which kind of record was tried; the
    records that may hold it; those that may stand there; and its field, None for an entry of a list."""
    place: Place = ()
    holders: list[type[BaseModel]] = []
    here: list[type[BaseModel]] = [model]
    field = None
    for key in loc:
        of_kind = [record for record in here if key in _kinds(record)]
        if len(here) > 1 and of_kind:
            here = of_kind
            continue
        place, field = (*place, key), None
        if isinstance(key, str):
            holders = here
            field = next((found for record in holders if (found := _fields(record).get(key))), None)
            here = _models_in(field.annotation) if field else []
    return place, holders, here, field


def _known(holders: list[type[BaseModel]]) -> list[str]:
    return [name for record in holders for name in _fields(record)]


def _fields(model: type[BaseModel]) -> dict[str, FieldInfo]:
    """Fields by the key that they have in the file."""
    return {field.alias or name: field for name, field in model.model_fields.items()}


def _kinds(model: type[BaseModel]) -> tuple[Any, ...]:
    """What ``kind`` may be in a record of a union."""
    return get_args(model.model_fields["kind"].annotation) if "kind" in model.model_fields else ()


def _models_in(annotation: Any) -> list[type[BaseModel]]:
    """The records inside ``Record``, ``Record | None``, ``tuple[Record, ...]`` or a union of several."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    if get_origin(annotation) in (UnionType, tuple):
        return [model for part in get_args(annotation) for model in _models_in(part)]
    return _models_in(get_args(annotation)[0]) if get_origin(annotation) is Annotated else []
