"""Reading the gas catalogue: one TOML file per gas in ``configs/gases``, and the hypotheses they speak about."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from planner.catalogue.records import GasRecord, Hypotheses
from planner.errors import ScenarioError
from planner.resources import data_folder
from planner.scenario.tomlfile import parse_as, read_text
from planner.spectroscopy.molecules import find_molecule

__all__ = [
    "find_gas",
    "has_gas",
    "list_gases",
    "parse_gas",
    "parse_hypotheses",
    "read_catalogue",
    "read_gas",
    "read_hypotheses",
]


def list_gases() -> tuple[str, ...]:
    """Formulas of the gases that the shipped catalogue holds, sorted."""
    return tuple(sorted(path.stem for path in _folder().glob("*.toml")))


def has_gas(name: str) -> bool:
    """Whether the catalogue holds a gas, named by formula or common name.

    Raises
    ------
    LineDataError
        If no molecule goes by this name.
    """
    return find_molecule(name).formula in list_gases()


def find_gas(name: str) -> GasRecord:
    """A gas of the shipped catalogue, by formula or common name in any case of letters.

    Raises
    ------
    LineDataError
        If no molecule goes by this name.
    ScenarioError
        If the catalogue has no record of it, or the record breaks a rule.
    """
    formula = find_molecule(name).formula
    if formula not in list_gases():
        raise ScenarioError(f"gas: the catalogue has no record of {formula}; recorded: {', '.join(list_gases())}")
    return _shipped(formula)


def read_catalogue() -> dict[str, GasRecord]:
    """All gases of the shipped catalogue by formula, sorted.

    Raises
    ------
    ScenarioError
        If a record breaks a rule.
    """
    return {formula: _shipped(formula) for formula in list_gases()}


def read_gas(path: str | Path) -> GasRecord:
    """The gas in a TOML file, whose name must be the formula.

    Raises
    ------
    ScenarioError
        If the file cannot be read or breaks a rule; every problem is listed with file, line and key.
    """
    path = Path(path)
    gas = parse_gas(read_text(path), str(path))
    if gas.formula != path.stem:
        raise ScenarioError(f'{path}: formula: expected that of the file name, "{path.stem}", got "{gas.formula}"')
    return gas


def parse_gas(text: str, where: str) -> GasRecord:
    """The gas in TOML text; ``where`` names it in messages.

    Raises
    ------
    ScenarioError
        As `read_gas`.
    """
    return parse_as(GasRecord, text, where)


def read_hypotheses(path: str | Path | None = None) -> Hypotheses:
    """The hypotheses in a TOML file, or the shipped ones.

    Raises
    ------
    ScenarioError
        If the file cannot be read or breaks a rule.
    """
    path = data_folder("configs") / "hypotheses.toml" if path is None else Path(path)
    return parse_hypotheses(read_text(path), str(path))


def parse_hypotheses(text: str, where: str) -> Hypotheses:
    """The hypotheses in TOML text; ``where`` names it in messages.

    Raises
    ------
    ScenarioError
        As `read_hypotheses`.
    """
    return parse_as(Hypotheses, text, where)


@cache
def _shipped(formula: str) -> GasRecord:
    return read_gas(_folder() / f"{formula}.toml")


def _folder() -> Path:
    return data_folder("configs") / "gases"
