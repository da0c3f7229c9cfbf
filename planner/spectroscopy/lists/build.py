"""From a molecule's constants file to its lines and smooth cross-sections.

A constants file ``linelists/FORMULA.toml`` is a sum of parts; the part's ``kind`` names the generator. Generators are
pure; this module reads the files, dispatches, and keeps built lists in the store.
"""

from __future__ import annotations

import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from importlib import import_module
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from threadpoolctl import threadpool_limits

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import Molecule, find_molecule
from planner.spectroscopy.store import Store, digest

__all__ = [
    "Constants",
    "build_lines",
    "embedded_formulas",
    "lines_from_table",
    "lines_missing",
    "part_lines",
    "read_constants",
    "smooth_cross_section",
    "table_from_lines",
]

_LINE_KINDS = {
    "linear": "linear:linear_lines",
    "linear-pi": "doublet:doublet_lines",
    "symmetric": "symmetric:symmetric_lines",
    "tetrahedral-band": "tetrahedral:tetrahedral_band_lines",
    "statistical": "statistical:statistical_lines",
    "asymmetric": "asymmetric:asymmetric_lines",
    "oxygen": "electronic:oxygen_lines",
}
_SMOOTH_KINDS = {
    "contours": "contours:contour_cross_section",
    "smooth-table": "electronic:smooth_table_cross_section",
}


@dataclass(frozen=True, kw_only=True, eq=False)
class Constants:
    """One molecule's constants file.

    Attributes
    ----------
    molecule : Molecule
    covers_per_cm : tuple of (from, to)
        Where the list holds what matters; elsewhere the gas counts as not covered.
    line_parts, smooth_parts : tuple of mappings
        The parts, by whether they make lines or cross-sections.
    sources : mapping
        What each source key of the parts stands for.
    digest : str
        Hash of the file, for provenance.
    """

    molecule: Molecule
    covers_per_cm: tuple[tuple[float, float], ...]
    line_parts: tuple[Mapping[str, Any], ...]
    smooth_parts: tuple[Mapping[str, Any], ...]
    sources: Mapping[str, str]
    digest: str


def embedded_formulas() -> list[str]:
    """Formulas of all molecules that have a constants file, sorted."""
    return sorted(path.stem for path in data_folder("linelists").glob("*.toml") if path.stem[0].isupper())


@lru_cache(maxsize=64)
def read_constants(name: str) -> Constants:
    """The constants of a molecule, by formula or common name.

    Raises
    ------
    LineDataError
        If there is no such file or it breaks the layout.
    """
    molecule = find_molecule(name)
    path = data_folder("linelists") / f"{molecule.formula}.toml"
    if not path.is_file():
        raise LineDataError(
            f"{molecule.formula}: no embedded line data; choose one of {', '.join(embedded_formulas())}, "
            "or point --lines at a folder that holds them"
        )
    return parse_constants(path.read_bytes(), path)


def parse_constants(text: bytes, where: Path) -> Constants:
    """Constants from the bytes of a file; ``where`` is named in errors."""
    try:
        table = tomllib.loads(text.decode())
        parts = table["part"]
        covers = tuple((float(a), float(b)) for a, b in table["covers_per_cm"])
        sources = {str(key): str(text) for key, text in table["sources"].items()}
        molecule = find_molecule(table["formula"])
    except (tomllib.TOMLDecodeError, AttributeError, KeyError, TypeError, ValueError) as error:
        raise LineDataError(f"{where}: not a constants file of this program: {error!r}") from error
    for number, part in enumerate(parts, 1):
        if part.get("kind") not in _LINE_KINDS | _SMOOTH_KINDS:
            known = ", ".join(sorted(_LINE_KINDS | _SMOOTH_KINDS))
            raise LineDataError(f"{where}: part {number}: kind: expected one of {known}, got {part.get('kind')!r}")
    return Constants(
        molecule=molecule,
        covers_per_cm=covers,
        line_parts=tuple(part for part in parts if part["kind"] in _LINE_KINDS),
        smooth_parts=tuple(part for part in parts if part["kind"] in _SMOOTH_KINDS),
        sources=sources,
        digest=digest(text),
    )


def build_lines(constants: Constants, store: Store) -> Lines | None:
    """All lines of a molecule; built once, then read from the store. None if it has no line parts."""
    if not constants.line_parts:
        return None
    return lines_from_table(store.fetch("lists", _key(constants), lambda: table_from_lines(_generate(constants))))


def lines_missing(constants: Constants, store: Store) -> bool:
    """Whether a molecule has line parts whose list is not in the store yet."""
    return bool(constants.line_parts) and not store.has("lists", _key(constants))


def part_lines(constants: Constants, part: Mapping[str, Any]) -> Lines:
    """The lines of one line part of a molecule, built anew.

    Raises
    ------
    LineDataError
        If the part breaks its layout, or the molecule has no HITRAN number.
    """
    number = constants.molecule.hitran_number
    if number is None:
        raise LineDataError(f"{constants.molecule.formula}: lines need a HITRAN molecule number")
    with threadpool_limits(1):  # thousands of small matrices: waiting for a second thread costs more than it gives
        lines: Lines = _function(_LINE_KINDS[part["kind"]])(part, number)
        return lines


def smooth_cross_section(
    constants: Constants, wavenumber_per_cm: NDArray[np.float64], temperature_k: float
) -> NDArray[np.float64] | None:
    """Sum of the smooth parts in cm2 per molecule, shape ``(wavenumber,)``; None if the molecule has none."""
    if not constants.smooth_parts:
        return None
    total = np.zeros(wavenumber_per_cm.size)
    for part in constants.smooth_parts:
        total += _function(_SMOOTH_KINDS[part["kind"]])(part, wavenumber_per_cm, temperature_k)
    return total


def _key(constants: Constants) -> dict[str, str]:
    return {"list": constants.digest, "generators": _generators_digest()}


def _generate(constants: Constants) -> Lines:
    return Lines.join([part_lines(constants, part) for part in constants.line_parts])


def _function(address: str) -> Callable[..., Any]:
    module, _, name = address.partition(":")
    function: Callable[..., Any] = getattr(import_module(f"planner.spectroscopy.lists.{module}"), name)
    return function


@lru_cache(maxsize=1)
def _generators_digest() -> str:
    folder = Path(__file__).parent
    return digest(*(path.read_bytes() for path in sorted(folder.glob("*.py"))))


_FIELDS = [(name, "<f8") for name in (
    "wavenumber_per_cm", "intensity_cm", "einstein_a_per_s", "air_width_per_cm_atm", "self_width_per_cm_atm",
    "lower_energy_per_cm", "temperature_exponent", "air_shift_per_cm_atm", "upper_weight", "lower_weight",
)] + [("molecule", "<i2"), ("isotopologue", "<i2")]  # fmt: skip
_LABELS = [(name, "<U15") for name in ("upper_global", "lower_global", "upper_local", "lower_local")]


def table_from_lines(lines: Lines) -> NDArray[Any]:
    """Lines as one structured array, for the store."""
    table = np.empty(len(lines), dtype=[*_FIELDS, *_LABELS])
    for name, _ in _FIELDS + _LABELS:
        table[name] = getattr(lines, name)
    return table


def lines_from_table(table: NDArray[Any]) -> Lines:
    """Inverse of :func:`table_from_lines`."""
    return Lines(**{name: table[name] for name, _ in _FIELDS + _LABELS})
