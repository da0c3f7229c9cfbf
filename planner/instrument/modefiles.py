"""Reading mode files: the shipped ones by name, a user's own by path."""

from __future__ import annotations

from pathlib import Path

from planner.errors import ScenarioError
from planner.instrument.modes import Mode
from planner.resources import data_folder
from planner.scenario.readings import nearest
from planner.scenario.tomlfile import parse_as, read_text

__all__ = ["list_modes", "parse_mode", "read_mode"]


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
    return parse_mode(read_text(path), str(path))


def parse_mode(text: str, where: str) -> Mode:
    """The mode in TOML text; ``where`` names it in messages.

    Raises
    ------
    ScenarioError
        One line per problem: file, line, key, what was expected, what came.
    """
    return parse_as(Mode, text, where)


def _folder() -> Path:
    return data_folder("configs") / "instruments"


def _shipped(name: str) -> Path:
    known = list_modes()
    if name not in known:
        hint = nearest(name, known) or f"; known modes: {', '.join(known)}"
        raise ScenarioError(f'mode: expected the name of a mode or a path ending in .toml, got "{name}"{hint}')
    return _folder() / f"{name}.toml"
