"""HITRAN collision files, ``.cia``: blocks of one temperature, each a header of 100 characters and rows of two numbers.

The layout is that of hitran.org/cia (Richard et al. 2012, J. Quant. Spectrosc. Radiat. Transfer 113, 1276; Karman et
al. 2019, Icarus 328, 160). A row is a wavenumber in 1/cm, a coefficient in cm5 per molecule squared and sometimes its
uncertainty, which is checked and not kept. Coefficients are kept as published, negative ones (noise) included.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.files.disk import read_whole
from planner.spectroscopy.files.rows import (
    fixed_count,
    fixed_number,
    header_at_odds,
    numbers_of,
    printable_rows,
    shapes_of,
    signs_of,
)
from planner.spectroscopy.files.spread import spread_negatives
from planner.spectroscopy.molecules import find_molecule

__all__ = ["CollisionTable", "Pair", "parse_cia", "read_cia"]

Pair = tuple[str, str]

_HEADER = 100
_ROW = re.compile(rb" *0+\.(0+) +-?0\.(0+)(?:E[+-]00|E?[+-]000)(?: +-?0*\.0+(?:E[+-]00|E?[+-]000)?)? *")
_ENDS_APART_PER_CM = 1.0  # headers round their range, some to whole numbers
NOT_GASES_HERE = {"air": "Air", "h": "H"}
"""Partners in published pairs that no scenario can name: their files are checked, and not used."""


@dataclass(frozen=True, kw_only=True, eq=False)
class CollisionTable:
    """Collision-induced absorption of one pair at one temperature.

    Attributes
    ----------
    pair : (str, str)
        Formulas in alphabetical order.
    temperature_k : float
    wavenumber_per_cm : (point,) ndarray
        Ascending, not always evenly spaced.
    coefficient_cm5 : (point,) ndarray
        As published; noise may make it negative.
    largest_stated_cm5 : float
        What the header says is the largest value.
    comment, reference : str
        As written in the header.
    where : str
        File and line of the header.
    """

    pair: Pair
    temperature_k: float
    wavenumber_per_cm: NDArray[np.float64]
    coefficient_cm5: NDArray[np.float64]
    largest_stated_cm5: float
    comment: str = ""
    reference: str = ""
    where: str

    @property
    def usable(self) -> bool:
        """Whether both partners are gases that a scenario can name."""
        return not any(partner in NOT_GASES_HERE.values() for partner in self.pair)

    @cached_property
    def absorption_cm5(self) -> NDArray[np.float64]:
        """The coefficients without negative ones, as an opacity needs them; see `spread_negatives`."""
        return spread_negatives(self.coefficient_cm5, np.gradient(self.wavenumber_per_cm))

    def remarks(self) -> tuple[str, ...]:
        """What a reader of the values should know: those at or below zero, a header at odds with them."""
        at_odds = header_at_odds(self.coefficient_cm5, self.largest_stated_cm5, "cm5")
        return (*signs_of([self.coefficient_cm5]), *at_odds)


def read_cia(path: Path) -> tuple[CollisionTable, ...]:
    """The blocks of a ``.cia`` file, plain or gzip; see `parse_cia`."""
    return parse_cia(read_whole(path), str(path))


def parse_cia(text_or_bytes: str | bytes, where: str) -> tuple[CollisionTable, ...]:
    """Blocks of a text in the HITRAN collision format.

    Parameters
    ----------
    text_or_bytes : str or bytes
    where : str
        Name of the source, used in messages.

    Raises
    ------
    LineDataError
        On the first header or row that breaks the format, with file, line and field.
    """
    rows = printable_rows(text_or_bytes, where)
    tables = []
    start = 0
    while start < len(rows):
        place = f"{where}:{start + 1}"
        if len(rows[start]) != _HEADER:
            raise LineDataError(
                f"{place}: header: expected 100 characters, got {len(rows[start])}; is this a HITRAN .cia file, and "
                "does the number of points above agree with its rows?"
            )
        stop = start + 1 + fixed_count(rows[start], 40, 47, place)
        tables.append(_table(rows[start], rows[start + 1 : stop], stop - start - 1, where, start + 1))
        start = stop
    return tuple(tables)


def _table(header: bytes, rows: Sequence[bytes], count: int, where: str, line: int) -> CollisionTable:
    place = f"{where}:{line}"
    pair = _pair(header[:20].decode().strip(), place)
    low = fixed_number(header, "lowest wavenumber", 20, 30, place, least=0.0, positive=False)
    high = fixed_number(header, "highest wavenumber", 30, 40, place, least=0.0, positive=True)
    temperature = fixed_number(header, "temperature", 47, 54, place, least=0.0, positive=True)
    largest = fixed_number(header, "largest value", 54, 64, place, least=-np.inf, positive=False)
    wavenumber, coefficient = _columns(rows, count, where, line + 1)
    if abs(wavenumber[0] - low) > _ENDS_APART_PER_CM or abs(wavenumber[-1] - high) > _ENDS_APART_PER_CM:
        raise LineDataError(
            f"{place}: wavenumbers (columns 21-40): expected those of the rows, {wavenumber[0]:g} and "
            f"{wavenumber[-1]:g}, got {low:g} and {high:g}"
        )
    return CollisionTable(
        pair=pair,
        temperature_k=temperature,
        wavenumber_per_cm=wavenumber,
        coefficient_cm5=coefficient,
        largest_stated_cm5=largest,
        comment=header[70:97].decode().strip(),
        reference=header[97:100].decode().strip(),
        where=place,
    )


def _columns(
    rows: Sequence[bytes], count: int, where: str, first_line: int
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Wavenumbers and coefficients of one block, shape ``(count,)`` each."""
    first = _ROW.fullmatch(re.sub(rb"\d", b"0", rows[0]).upper()) if rows else None
    decimals = (len(first[1]), len(first[2])) if first else (0, 0)
    shapes, wrong = shapes_of(rows, lambda shape: _fits(shape, decimals))
    if wrong is not None:
        raise LineDataError(
            f"{where}:{first_line + wrong}: row: expected a wavenumber and a coefficient such as 250.0000  1.234E-46, "
            f"written alike in all rows of the block, got {rows[wrong].decode()!r}"
        )
    if len(rows) < count:
        raise LineDataError(
            f"{where}:{first_line + len(rows)}: expected {count} rows as the header says, the file ends after "
            f"{len(rows)}"
        )
    if len({shape.count(b".") for shape in shapes}) > 1:  # uncertainties are left out here and there
        rows = [b" ".join(row.split()[:2]) for row in rows]
    numbers = numbers_of(rows, shapes).reshape(count, -1)
    wavenumber, coefficient = numbers[:, 0].copy(), numbers[:, 1].copy()
    back = np.flatnonzero(np.diff(wavenumber) <= 0)
    if back.size:
        raise LineDataError(
            f"{where}:{first_line + back[0] + 1}: wavenumber: expected more than {wavenumber[back[0]]:g} of the row "
            f"above, got {wavenumber[back[0] + 1]:g}"
        )
    return wavenumber, coefficient


def _fits(shape: bytes, decimals: tuple[int, int]) -> bool:
    match = _ROW.fullmatch(shape)
    return match is not None and (len(match[1]), len(match[2])) == decimals


def _pair(written: str, place: str) -> Pair:
    """Formulas of a pair such as ``N2-H2``; ``H2-CH4 (equilibrium)`` carries a word that is dropped."""
    names = re.sub(r"\(.*\)|_\w+", "", written).strip().split("-")
    if len(names) != 2:
        raise LineDataError(f"{place}: pair (columns 1-20): expected two gases such as N2-H2, got {written!r}")
    try:
        first, second = sorted(NOT_GASES_HERE.get(n.casefold()) or find_molecule(n).formula for n in names)
    except LineDataError as error:
        raise LineDataError(f"{place}: pair (columns 1-20): expected two gases, got {written!r}: {error}") from None
    return first, second
