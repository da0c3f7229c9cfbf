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
    """Sentences on the windows that an answer leans on and that miss their marks or were never compared with spectra.

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
    groups: dict[tuple[str, bool, str], list[WindowQuality]] = {}
    for gas in gases:
        for band in bands:
            if band.share >= _LEANS:
                for window in embedded_quality(library, gas, band.from_um, band.to_um, table):
                    if not window.meets and (window.compared or window.strength_factor > _MATTERS):
                        groups.setdefault((window.gas, window.compared, window.basis), []).append(window)
    return tuple(_sentence(windows) for windows in groups.values())


def _sentence(windows: Sequence[WindowQuality]) -> str:
    """What is known of windows of one gas that rest on the same."""
    first, worst = windows[0], max(windows, key=lambda window: window.strength_factor)
    where = ", ".join(f"{window.from_um:.3g}-{window.to_um:.3g}" for window in windows)
    what = (
        f"misses its marks against real data ({first.basis})"
        if first.compared
        else f"was never compared with real spectra; its strength rests on: {first.basis}"
    )
    return (
        f"the embedded {first.gas} at {where} um {what}; good to a factor {worst.strength_factor:.2g}, "
        f"{worst.uncertainty_scale_heights:.2f} scale heights"
    )
