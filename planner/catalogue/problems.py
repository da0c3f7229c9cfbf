"""What pydantic found wrong with a file, as one message: file, line, key, what was expected, what came."""

from __future__ import annotations

import re
import tomllib
from types import UnionType
from typing import Any, TypeVar, get_args, get_origin

from pydantic import BaseModel, BeforeValidator, ValidationError
from pydantic.fields import FieldInfo

from planner.errors import ScenarioError
from planner.scenario.locate import heading, line_of
from planner.scenario.readings import nearest, shown

__all__ = ["parse_as"]

Place = tuple[str | int, ...]
Model = TypeVar("Model", bound=BaseModel)


def parse_as(model: type[Model], text: str, where: str) -> Model:
    """The record in TOML text; ``where`` names the file in messages.

    Raises
    ------
    ScenarioError
        If the text is not TOML or breaks a rule of the record; one line per problem, in the order of the file.
    """
    try:
        tree = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        line = re.search(r"at line (\d+)", str(error))
        raise ScenarioError(f"{where}{':' + line[1] if line else ''}: not valid TOML: {error}") from None
    try:
        return model.model_validate(tree)
    except ValidationError as error:
        raise ScenarioError(_all_problems(error, model, text, where)) from None


def _all_problems(error: ValidationError, model: type[BaseModel], text: str, where: str) -> str:
    found = []
    for item in error.errors():
        place, message = _place_and_message(item, model)
        found.append((line_of(text, place) or 0, f"{heading(text, where, place)}: {message}"))
    return "\n".join(message for _, message in sorted(found, key=lambda problem: problem[0]))


def _place_and_message(item: Any, model: type[BaseModel]) -> tuple[Place, str]:
    place: Place = tuple(item["loc"])
    if item["type"] == "missing":
        return place, f"missing; expected {_expected(model, place)}"
    if item["type"] == "extra_forbidden":
        known = [field.alias or name for name, field in _fields(_model_at(model, place[:-1])).items()]
        return place, f"unknown key{nearest(str(place[-1]), known) or '; known here: ' + ', '.join(known)}"
    cause = item.get("ctx", {}).get("error")
    if isinstance(cause, ValueError):
        return (*place, *getattr(cause, "at", ())), str(cause)
    return place, f"expected {_expected(model, place)}, got {shown(item['input'])}"


def _expected(model: type[BaseModel], place: Place) -> str:
    """What a field wants: the phrase of its reading, or the table it is."""
    field = _field_at(model, place)
    for mark in field.metadata if field else ():
        if isinstance(mark, BeforeValidator):
            return str(getattr(mark.func, "expected", "another value"))
    return f"a [{'.'.join(str(key) for key in place if isinstance(key, str))}] table"


def _fields(model: type[BaseModel] | None) -> dict[str, FieldInfo]:
    return dict(model.model_fields) if model else {}


def _field_at(model: type[BaseModel], place: Place) -> FieldInfo | None:
    """The field that a place in the file belongs to; ``None`` for an entry of a list."""
    fields = {field.alias or name: field for name, field in _fields(_model_at(model, place[:-1])).items()}
    return fields.get(str(place[-1]))


def _model_at(model: type[BaseModel], place: Place) -> type[BaseModel] | None:
    """The record that a place in the file becomes, if it becomes one."""
    if not place:
        return model
    if isinstance(place[-1], int):
        return _model_at(model, place[:-1])
    field = _field_at(model, place)
    return _model_in(field.annotation) if field else None


def _model_in(annotation: Any) -> type[BaseModel] | None:
    """The record inside ``Record``, ``Record | None`` or ``tuple[Record, ...]``."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    if get_origin(annotation) in (UnionType, tuple):
        return next((found for found in map(_model_in, get_args(annotation)) if found), None)
    return None
