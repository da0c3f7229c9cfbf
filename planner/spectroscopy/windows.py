"""Windows in which a list is judged: one per band region, of sensible width."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.coverage import Interval

__all__ = ["band_windows"]

_GAP_PER_CM = 100.0
"""Bands nearer than this share a window; lines of HF lie 40 apart."""
_MARGIN_PER_CM = 5.0
_WIDEST_PER_CM = 1000.0
_CELL_PER_CM = 10.0
_SMOOTHING_CELLS = 5


def band_windows(wavenumber_per_cm: NDArray[np.float64], weight: NDArray[np.float64], reach: Interval) -> list[Interval]:
    """Band regions of a spectrum within an interval, none wider than 1000 per cm.

    Parameters
    ----------
    wavenumber_per_cm : (point,) array
        Lines, or points of a cross-section that absorb; ascending.
    weight : (point,) array
        Intensities, or cross-sections.
    reach : (from, to)
        Where the spectrum is complete.

    Returns
    -------
    list of (from, to)
        Runs without a gap over 100 per cm, 5 per cm added at either end inside the reach. A run that is too wide is
        cut in its middle half where least is absorbed, again and again.
    """
    inside = (wavenumber_per_cm >= reach[0]) & (wavenumber_per_cm <= reach[1])
    position, weight = wavenumber_per_cm[inside], weight[inside]
    if not position.size:
        return []
    breaks = [0, *(np.flatnonzero(np.diff(position) > _GAP_PER_CM) + 1).tolist(), position.size]
    windows: list[Interval] = []
    for first, last in pairwise(breaks):
        low = max(reach[0], float(position[first]) - _MARGIN_PER_CM)
        high = min(reach[1], float(position[last - 1]) + _MARGIN_PER_CM)
        if high > low:
            windows += _narrowed((low, high), position[first:last], weight[first:last])
    return windows


def _narrowed(window: Interval, position: NDArray[np.float64], weight: NDArray[np.float64]) -> list[Interval]:
    low, high = window
    if high - low <= _WIDEST_PER_CM:
        return [window]
    count = int((high - low) / _CELL_PER_CM)
    sums, edges = np.histogram(position, bins=count, range=window, weights=weight)
    smooth = np.convolve(sums, np.ones(_SMOOTHING_CELLS), mode="same")
    start = count // 4
    least = start + int(np.argmin(smooth[start : count - start]))
    cut = round(float(0.5 * (edges[least] + edges[least + 1])))
    return [*_narrowed((low, cut), position, weight), *_narrowed((cut, high), position, weight)]
