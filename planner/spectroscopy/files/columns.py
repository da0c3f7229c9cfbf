"""Cross-sections in two columns of text, with units that the user states; they are kept as ``.xsc`` tables.

Rows hold a wavenumber or a vacuum wavelength and a cross-section, separated by blanks, a tab, a comma or a semicolon;
what follows a ``#`` is a comment. The first column ascends or descends throughout.
"""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.files.rows import printable_rows
from planner.spectroscopy.files.xsc import CrossSectionTable

__all__ = ["evenly_spaced", "parse_columns"]

_SEPARATORS = re.compile(r"[ \t,;]+")
_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[EeDd][+-]?\d{1,3})?")
_EVEN_WITHIN = 0.05
"""Part of a step by which a printed wavenumber may be off an even grid through rounding."""
_MOST_POINTS = 5_000_000


def parse_columns(
    text_or_bytes: str | bytes, where: str, *, x_unit: str, y_unit: str
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Ascending wavenumbers (1/cm) and cross-sections (cm2 per molecule), shape ``(row,)`` each.

    Parameters
    ----------
    text_or_bytes : str or bytes
    where : str
        Name of the source, used in messages.
    x_unit : str
        Unit of the first column: a wavenumber, vacuum wavelength, frequency or photon energy.
    y_unit : str
        Unit of the second: an area, a number in front allowed, such as ``"1e-20 cm2"``.

    Raises
    ------
    LineDataError
        If a unit is not of its kind, or on the first row that breaks the layout, with file and line.
    """
    data = text_or_bytes.encode() if isinstance(text_or_bytes, str) else text_or_bytes
    numbers, lines = [], []
    for line, row in enumerate(printable_rows(data.replace(b"\t", b" "), where), start=1):
        content = row.decode().partition("#")[0].strip()
        if content:
            numbers.append(_row(content, f"{where}:{line}"))
            lines.append(line)
    if len(numbers) < 2:
        raise LineDataError(f"{where}: expected at least two rows of two numbers, got {len(numbers)}")
    x, y = np.array(numbers).T
    _check_order(x, where, lines)
    wavenumber, cross_section = _in_per_cm(x, x_unit), y * _factor(y_unit)
    order = np.argsort(wavenumber)
    return wavenumber[order], cross_section[order]


def evenly_spaced(
    wavenumber_per_cm: NDArray[np.float64],
    cross_section_cm2: NDArray[np.float64],
    *,
    formula: str,
    temperature_k: float,
    pressure_torr: float,
    where: str,
) -> tuple[CrossSectionTable, str]:
    """A table on even wavenumbers, and a sentence that says what was done to get it.

    Values that stand on an even grid, within the rounding of their wavenumbers, are kept. Others are interpolated
    linearly to the finest spacing that the table has.

    Raises
    ------
    LineDataError
        If that would take more than five million points.
    """
    low, high = float(wavenumber_per_cm[0]), float(wavenumber_per_cm[-1])
    even = np.linspace(low, high, wavenumber_per_cm.size)
    if np.max(np.abs(wavenumber_per_cm - even)) <= _EVEN_WITHIN * (even[1] - even[0]):
        values, sentence = cross_section_cm2, "evenly spaced as it stands"
    else:
        step = float(np.min(np.diff(wavenumber_per_cm)))
        count = int(np.ceil((high - low) / step * (1 - 1e-9))) + 1
        if count > _MOST_POINTS:
            raise LineDataError(
                f"{where}: the closest points are {step:.3g} per cm apart, which takes {count} even points; thin it out"
            )
        values = np.interp(np.linspace(low, high, count), wavenumber_per_cm, cross_section_cm2)
        sentence = f"interpolated linearly from {wavenumber_per_cm.size} to {count} evenly spaced points"
    table = CrossSectionTable(
        formula=formula,
        from_per_cm=low,
        to_per_cm=high,
        temperature_k=temperature_k,
        pressure_torr=pressure_torr,
        cross_section_cm2=values,
        largest_stated_cm2=float(values.max()),
        where=where,
    )
    return table, sentence


def _row(content: str, place: str) -> list[float]:
    words = _SEPARATORS.split(content)
    if len(words) != 2 or not all(_NUMBER.fullmatch(word) for word in words):
        raise LineDataError(f"{place}: expected two numbers, got {content!r}; comments begin with #")
    values = [float(re.sub("[Dd]", "E", word)) for word in words]
    if not np.all(np.isfinite(values)) or values[0] <= 0:
        raise LineDataError(f"{place}: expected finite numbers, the first greater than 0, got {content!r}")
    return values


def _check_order(x: NDArray[np.float64], where: str, lines: list[int]) -> None:
    steps = np.diff(x)
    wrong = np.flatnonzero(steps <= 0 if steps[0] > 0 else steps >= 0)
    if wrong.size:
        raise LineDataError(
            f"{where}:{lines[wrong[0] + 1]}: first column: expected it to "
            f"{'ascend' if steps[0] > 0 else 'descend'} as it begins, got {x[wrong[0] + 1]:g} after {x[wrong[0]]:g}"
        )


def _in_per_cm(x: NDArray[np.float64], unit: str) -> NDArray[np.float64]:
    import astropy.units as u

    try:
        return np.asarray(u.Quantity(x, u.Unit(unit)).to_value(1 / u.cm, u.spectral()))
    except (ValueError, TypeError) as error:
        raise LineDataError(
            f'unit of the first column: expected one such as "1/cm" or "nm", got {unit!r}: {error}'
        ) from error


def _factor(unit: str) -> float:
    import astropy.units as u

    try:
        return float(u.Quantity(1.0, u.Unit(unit)).to_value(u.cm**2))
    except (ValueError, TypeError) as error:
        raise LineDataError(
            f'unit of the second column: expected an area per molecule such as "cm2", got {unit!r}: {error}'
        ) from error
