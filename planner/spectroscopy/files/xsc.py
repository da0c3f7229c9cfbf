"""HITRAN cross-section files, ``.xsc``: a header of 100 characters, then evenly spaced values, ten to a row.

The layout is that of hitran.org/docs/cross-sections-definitions (Kochanov et al. 2019, J. Quant. Spectrosc. Radiat.
Transfer 230, 172). A file may hold several tables. Values are kept as published, negative ones (noise) included.
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

__all__ = ["BAR_PER_TORR", "CrossSectionTable", "format_xsc", "parse_xsc", "read_xsc"]

BAR_PER_TORR = 1.01325 / 760.0

_HEADER = 100
_PER_ROW = 10
_COLUMN = 10
_SPELLINGS = {"cfh2cf3": "C2H2F4", "ch2fcf3": "C2H2F4", "cf3ch2f": "C2H2F4", "ch3sch3": "C2H6S", "isop": "C5H8"}
"""Formulas that HITRAN or others write differently."""

_VALUE = re.compile(rb" *-?0\.(0{2,5})(?:E[+-]00|[+-]000)")


@dataclass(frozen=True, kw_only=True, eq=False)
class CrossSectionTable:
    """One measured spectrum of one gas at one temperature and pressure.

    Attributes
    ----------
    formula : str
    from_per_cm, to_per_cm : float
        First and last of the evenly spaced wavenumbers.
    temperature_k, pressure_torr : float
        State of the sample; pressure 0 is how low pressures are often written.
    cross_section_cm2 : (point,) ndarray
        As published; noise may make it negative.
    largest_stated_cm2 : float
        What the header says is the largest value.
    resolution, common_name, broadener, reference : str
        As written in the header.
    where : str
        File and line of the header.
    """

    formula: str
    from_per_cm: float
    to_per_cm: float
    temperature_k: float
    pressure_torr: float
    cross_section_cm2: NDArray[np.float64]
    largest_stated_cm2: float
    resolution: str = ""
    common_name: str = ""
    broadener: str = ""
    reference: str = ""
    where: str

    @property
    def wavenumber_per_cm(self) -> NDArray[np.float64]:
        """Wavenumbers of the values, shape ``(point,)``."""
        return np.linspace(self.from_per_cm, self.to_per_cm, self.cross_section_cm2.size)

    @property
    def step_per_cm(self) -> float:
        """Distance of the points."""
        return (self.to_per_cm - self.from_per_cm) / (self.cross_section_cm2.size - 1)

    @cached_property
    def absorption_cm2(self) -> NDArray[np.float64]:
        """The values without negative ones, as an opacity needs them; see `spread_negatives`."""
        return spread_negatives(self.cross_section_cm2, np.ones(self.cross_section_cm2.size))

    def remarks(self) -> tuple[str, ...]:
        """What a reader of the values should know: those at or below zero, a header at odds with them."""
        at_odds = header_at_odds(self.cross_section_cm2, self.largest_stated_cm2, "cm2")
        return (*signs_of([self.cross_section_cm2]), *at_odds)


def read_xsc(path: Path) -> tuple[CrossSectionTable, ...]:
    """The tables of a ``.xsc`` file, plain or gzip; see `parse_xsc`."""
    return parse_xsc(read_whole(path), str(path))


def parse_xsc(text_or_bytes: str | bytes, where: str) -> tuple[CrossSectionTable, ...]:
    """Tables of a text in the HITRAN cross-section format.

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
        count = _count(rows[start], f"{where}:{start + 1}")
        stop = start + 1 + -(-count // _PER_ROW)
        values = _values(rows[start + 1 : stop], count, where, start + 2)
        tables.append(_table(rows[start], values, f"{where}:{start + 1}"))
        start = stop
    return tuple(tables)


def _count(header: bytes, place: str) -> int:
    if len(header) != _HEADER:
        raise LineDataError(
            f"{place}: header: expected {_HEADER} characters, got {len(header)}; is this a HITRAN .xsc file, and "
            "does the number of points above agree with its rows?"
        )
    return fixed_count(header, 40, 47, place)


def _values(rows: Sequence[bytes], count: int, where: str, first_line: int) -> NDArray[np.float64]:
    """The values of one table; the last row may be filled up with zeros."""
    expected = -(-count // _PER_ROW)
    if len(rows) < expected:
        raise LineDataError(
            f"{where}:{first_line + len(rows)}: expected {expected} rows for {count} points, the file ends after "
            f"{len(rows)}"
        )
    last = count - _PER_ROW * (expected - 1)
    rows = [row.rstrip() for row in rows]
    filled = [row.rjust(_COLUMN * _PER_ROW) for row in rows[:-1]]
    filled.append(rows[-1].rjust(_COLUMN * (last if len(rows[-1]) <= _COLUMN * last else _PER_ROW)))
    decimals = _decimals(filled[0])
    shapes, wrong = shapes_of(filled, lambda shape: _fits(shape, decimals))
    if wrong is not None:
        raise LineDataError(
            f"{where}:{first_line + wrong}: values: expected {_PER_ROW if wrong < expected - 1 else last} numbers such "
            f"as 1.234E-20 in columns of {_COLUMN}, got {rows[wrong].decode()[: _HEADER + 1]!r}"
        )
    values = numbers_of(filled, shapes)
    if np.any(values[count:]):
        raise LineDataError(f"{where}:{first_line + expected - 1}: values: expected zeros after point {count}")
    return values[:count]


def _decimals(row: bytes) -> int:
    """Decimals of the first value of a row of digits, 0 if it is not one."""
    match = _VALUE.fullmatch(re.sub(rb"\d", b"0", row[:_COLUMN]).upper())
    return len(match[1]) if match else 0


def _fits(shape: bytes, decimals: int) -> bool:
    """Whether a row consists of whole columns, each a value with the same number of decimals."""
    columns = [shape[i : i + _COLUMN] for i in range(0, len(shape), _COLUMN)]
    matches = [_VALUE.fullmatch(column) for column in columns]
    return all(match is not None and len(match[1]) == decimals for match in matches)


def _table(row: bytes, values: NDArray[np.float64], place: str) -> CrossSectionTable:
    low = fixed_number(row, "lowest wavenumber", 20, 30, place, least=0.0, positive=False)
    high = fixed_number(row, "highest wavenumber", 30, 40, place, least=0.0, positive=True)
    if not low < high:
        raise LineDataError(
            f"{place}: wavenumbers (columns 21-40): expected lowest < highest, got {low:g} and {high:g}"
        )
    return CrossSectionTable(
        formula=_formula(row, place),
        from_per_cm=low,
        to_per_cm=high,
        temperature_k=fixed_number(row, "temperature", 47, 54, place, least=0.0, positive=True),
        pressure_torr=fixed_number(row, "pressure", 54, 60, place, least=0.0, positive=False),
        cross_section_cm2=values,
        largest_stated_cm2=fixed_number(row, "largest value", 60, 70, place, least=-np.inf, positive=False),
        resolution=row[70:75].decode().strip(),
        common_name=row[75:90].decode().strip(),
        broadener=row[94:97].decode().strip(),
        reference=row[97:100].decode().strip(),
        where=place,
    )


def _formula(row: bytes, place: str) -> str:
    """The gas of a header, by its formula or else by its common name."""
    written, common = row[:20].decode().strip(), row[75:90].decode().strip()
    names = [_SPELLINGS.get(name.casefold(), name) for name in (written, common) if name]
    found = []
    for name in names:
        try:
            found.append(find_molecule(name).formula)
        except LineDataError as error:
            reason = error
    if not found:
        raise LineDataError(
            f"{place}: molecule (columns 1-20): expected a gas known here, got {written!r}"
            + (f": {reason}" if names else "")
        )
    if len(set(found)) > 1:
        raise LineDataError(f"{place}: molecule: {written!r} (columns 1-20) and {common!r} (76-90) are different gases")
    return found[0]


def format_xsc(table: CrossSectionTable) -> str:
    """A table in the HITRAN cross-section format; values are rounded to four digits, as the format wants.

    Raises
    ------
    LineDataError
        If a value or label does not fit its columns.
    """
    values = [f"{value:10.3E}" for value in table.cross_section_cm2.tolist()]
    header = (
        f"{table.formula:>20}{table.from_per_cm:10.4f}{table.to_per_cm:10.4f}{len(values):7d}{table.temperature_k:7.2f}"
        f"{table.pressure_torr:6.5g}{table.cross_section_cm2.max():10.3E}{table.resolution:>5}{table.common_name:>15}"
        f"    {table.broadener:>3}{table.reference:>3}"
    )
    if len(header) != _HEADER or any(len(value) != _COLUMN for value in values):
        raise LineDataError(f"{table.where}: {table.formula}: a value or label does not fit the columns of a .xsc file")
    rows = ["".join(values[i : i + _PER_ROW]) for i in range(0, len(values), _PER_ROW)]
    return "\n".join([header, *rows]) + "\n"
