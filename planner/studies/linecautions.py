"""What to mind about the line data where an answer leans on them."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from planner.errors import LineDataError
from planner.spectroscopy.accuracyfile import AccuracyTable
from planner.spectroscopy.coverage import subtract
from planner.spectroscopy.quality import WindowQuality, window_quality
from planner.spectroscopy.sources import LineLibrary
from planner.studies.results import BandShare

__all__ = ["embedded_quality", "line_cautions"]

_LEANS = 0.1
"""A band that holds less of the information than this is not what the answer leans on."""
_MATTERS = 1.15
"""Strengths good to this factor do no harm: 0.07 scale heights."""


def embedded_quality(
    library: LineLibrary, gas: str, from_um: float, to_um: float, table: AccuracyTable | None = None
) -> list[WindowQuality]:
    """Quality of the embedded list of a gas in a stretch, where no file stands in its place."""
    try:
        imported = library.gas(gas).imported_per_cm
    except LineDataError:  # a gas without lines, such as N2
        return []
    free = subtract([(1e4 / to_um, 1e4 / from_um)], imported)
    return [window for low, high in free for window in window_quality(gas, 1e4 / high, 1e4 / low, table)]


def line_cautions(
    library: LineLibrary, gases: Iterable[str], bands: Sequence[BandShare], table: AccuracyTable | None = None
) -> tuple[str, ...]:
    """A sentence per window that an answer leans on and that misses its marks or was never compared with real spectra.

    Parameters
    ----------
    library : LineLibrary
    gases : iterable of str
        The candidates.
    bands : sequence of BandShare
        Where the information lies.
    table : AccuracyTable, optional
        By default the one that ships with the lists.
    """
    found = [
        window.caution
        for gas in gases
        for band in bands
        if band.share >= _LEANS
        for window in embedded_quality(library, gas, band.from_um, band.to_um, table)
        if window.compared or window.strength_factor > _MATTERS
    ]
    return tuple(dict.fromkeys(caution for caution in found if caution))
