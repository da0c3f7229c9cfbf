"""Cross-sections of heavy molecules whose infrared lines blend: sums of smooth, lopsided contours.

A part of kind ``contours`` holds rows of seven numbers (see `contour_cross_section`). With t = T / 296 K, the
row of centre c, widths w, intensity S, energy E, exponent n and displacement d adds

    S / (h (w_left + w_right)) exp(-c2 E (1/T - 1/296 K)) f(x),   x = (nu - c - d (sqrt(t) - 1)) / (w t^n)

where w is the width of the side that nu is on, and h the integral of f from 0 to infinity: f = exp(-x^2/2) for
``gaussian`` rows (rotational lobes, Q branches) and f = exp(1 - sqrt(1 + x^2)) for ``hyperbolic`` rows, which
fall off exponentially as hot bands do. At 296 K a row therefore integrates to S. Source of the form: ours,
chosen because it fits measured cross-sections with few rows; sources of the numbers: in each file.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import LineDataError

__all__ = ["contour_cross_section"]

_REFERENCE_K = 296.0
_BESSEL_K1_OF_1 = 0.6019072301972346  # modified Bessel function K1(1), not worth an import of scipy
_SECOND_RADIATION_CM_K = 1.438777  # hc/k, CODATA 2018

# Beyond its span a part keeps its value over the margin, then fades: the fit says nothing there, and a step
# would be worse than a wrong wing.
_MARGIN_PER_CM = 15.0
_FADE_PER_CM = 10.0
_FADED_PER_CM = _MARGIN_PER_CM + 36.0 * _FADE_PER_CM

_COLUMNS = 7


def _gaussian(x: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.exp(-0.5 * x * x)


def _hyperbolic(x: NDArray[np.float64]) -> NDArray[np.float64]:
    return np.exp(1.0 - np.sqrt(1.0 + x * x))


# shape: function, its integral over one side, and the x where it has fallen below 1e-15
_SHAPES = {
    "gaussian": (_gaussian, math.sqrt(0.5 * math.pi), 8.4),
    "hyperbolic": (_hyperbolic, math.e * _BESSEL_K1_OF_1, 36.0),
}


def contour_cross_section(
    part: Mapping[str, Any], wavenumber_per_cm: ArrayLike, temperature_k: float
) -> NDArray[np.float64]:
    """Absorption cross-section of one part of kind ``contours``.

    Parameters
    ----------
    part : mapping
        ``gaussian`` and/or ``hyperbolic``: rows of centre (1/cm), left and right width (1/cm), intensity
        (cm per molecule at 296 K), energy (1/cm), exponent of the widths, displacement (1/cm).
        ``span_per_cm``: the two wavenumbers between which the sum was fitted; it is kept 15 1/cm further and
        then falls by exp(-distance / 10 1/cm). ``span_k``: the temperatures between which the law was fitted;
        a temperature outside is replaced by the nearer end.
    wavenumber_per_cm : (wavenumber,) array_like
        Ascending.
    temperature_k : float
        Gas temperature, > 0.

    Returns
    -------
    (wavenumber,) ndarray
        cm2 per molecule.

    Raises
    ------
    LineDataError
        If the part lacks a key, or a row has not seven numbers with positive widths.
    ValueError
        If the wavenumbers do not ascend.
    """
    wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))
    if np.any(np.diff(wavenumber) < 0.0):
        raise ValueError("contour_cross_section: the wavenumbers must ascend")
    low, high = _span(part, "span_per_cm")
    temperature = float(np.clip(temperature_k, *_span(part, "span_k")))
    reach = slice(*np.searchsorted(wavenumber, [low - _FADED_PER_CM, high + _FADED_PER_CM]))
    total = np.zeros_like(wavenumber)
    inside = wavenumber[reach]
    for name, row in _rows(part):
        _add_contour(total[reach], inside, name, row, temperature)
    beyond = np.maximum(low - inside, inside - high) - _MARGIN_PER_CM
    total[reach] *= np.exp(-np.maximum(beyond, 0.0) / _FADE_PER_CM)
    return total


def _add_contour(
    total: NDArray[np.float64],
    wavenumber: NDArray[np.float64],
    name: str,
    row: NDArray[np.float64],
    temperature_k: float,
) -> None:
    """Add one row to `total` in place, each side only as far as it can be seen."""
    shape, half_integral, farthest = _SHAPES[name]
    centre, left, right, intensity, energy, exponent, displacement = row
    ratio = temperature_k / _REFERENCE_K
    centre += displacement * (math.sqrt(ratio) - 1.0)
    boltzmann = math.exp(-_SECOND_RADIATION_CM_K * energy * (1.0 / temperature_k - 1.0 / _REFERENCE_K))
    height = intensity * boltzmann / (half_integral * (left + right))
    left, right = left * ratio**exponent, right * ratio**exponent
    begin, middle, end = np.searchsorted(wavenumber, [centre - farthest * left, centre, centre + farthest * right])
    total[begin:middle] += height * shape((wavenumber[begin:middle] - centre) / left)
    total[middle:end] += height * shape((wavenumber[middle:end] - centre) / right)


def _rows(part: Mapping[str, Any]) -> Iterator[tuple[str, NDArray[np.float64]]]:
    """The rows of a part, each with the name of its shape."""
    if not any(part.get(name) for name in _SHAPES):
        raise LineDataError(
            f"part {part.get('name', '?')!r}: expected rows under 'gaussian' or 'hyperbolic', got neither"
        )
    for name in _SHAPES:
        for number, values in enumerate(part.get(name, []), 1):
            row = np.asarray(values, dtype=np.float64)
            if row.shape != (_COLUMNS,) or not np.all(np.isfinite(row)) or min(row[1], row[2]) <= 0.0:
                raise LineDataError(
                    f"part {part.get('name', '?')!r}, {name} row {number}: expected {_COLUMNS} finite numbers "
                    f"with positive widths, got {list(values)}"
                )
            yield name, row


def _span(part: Mapping[str, Any], key: str) -> tuple[float, float]:
    """Two ascending numbers of a part."""
    value = part.get(key)
    if not isinstance(value, (list, tuple)) or len(value) != 2 or not value[0] < value[1]:
        raise LineDataError(f"part {part.get('name', '?')!r}: {key}: expected two ascending numbers, got {value!r}")
    return float(value[0]), float(value[1])
