"""Windows in which a list is judged: one per band region, of sensible width."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.coverage import Interval

__all__ = ["band_windows", "runs"]

Floats = NDArray[np.float64]

_GAP_PER_CM = 100.0
"""Bands nearer than this share a window; lines of HF lie 40 apart."""
_WIDEST_PER_CM = 1000.0
_CELL_PER_CM = 10.0
_SMOOTHING_CELLS = 5


def band_windows(wavenumber_per_cm: Floats, weight: Floats, reach: Interval) -> list[Interval]:
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
        From the first to the last point of each run without a gap over 100 per cm. A run that is too wide is cut in
        its middle half where least is absorbed, again and again.
    """
    inside = (wavenumber_per_cm >= reach[0]) & (wavenumber_per_cm <= reach[1])
    position, weight = wavenumber_per_cm[inside], weight[inside]
    return [window for run in runs(position) for window in _narrowed(run, position, weight)]


def runs(position_per_cm: Floats) -> list[Interval]:
    """First and last of each run of ascending points without a gap over 100 per cm; single points are left out."""
    pieces = np.split(position_per_cm, np.flatnonzero(np.diff(position_per_cm) > _GAP_PER_CM) + 1)
    return [(float(piece[0]), float(piece[-1])) for piece in pieces if piece.size > 1 and piece[-1] > piece[0]]


def _narrowed(window: Interval, position: Floats, weight: Floats) -> list[Interval]:
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
