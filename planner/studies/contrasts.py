"""What a contrast between two atmospheres hands to the report."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.studies.results import BandShare, Counts, Verdict

__all__ = ["ContrastResult", "ContrastRow", "ContrastSpectrum"]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class ContrastRow:
    """Two atmospheres A and B seen with one mode."""

    mode: str
    verdict: Verdict
    transits_required: int | None
    """Enough to rule out the wrong one, whichever that is."""
    hours_required: float | None
    b_excluded: Counts
    """If A is true: significance with which B is ruled out, everything in B unknown within its priors."""
    a_excluded: Counts
    """If B is true: significance with which A is ruled out."""
    all_known: Counts
    best_bands: tuple[BandShare, ...]
    """Where the information of the harder of the two is, beside all that could imitate it."""
    confusion: tuple[tuple[str, float], ...]
    """Unknowns of the harder one that cost most: (name, S/N left if this one alone is unknown), dearest first."""
    confused_from: float
    """S/N with everything known, at the transits that would then do."""
    confused_to: float
    uncovered_um: tuple[tuple[str, float, float], ...]
    """Stretches left out since the data of a gas that differs do not cover them."""
    saturated_um: tuple[tuple[float, float], ...]


@dataclass(frozen=True, kw_only=True, eq=False)
class ContrastSpectrum:
    """Both spectra in the bins of one mode; all arrays ``(bin,)``, depths in ppm."""

    mode: str
    detector: NDArray[np.int64]
    from_um: Array
    to_um: Array
    depth_a_ppm: Array
    depth_b_ppm: Array
    left_ppm: Array
    """What of the difference no change of the unknowns can imitate, in the harder case, after `transits`."""
    share: Array
    """Share of each bin in the squared significance of that; adds up to 1, negative where a bin counts against."""
    noise_one_transit_ppm: Array
    floor_ppm: Array
    usable: NDArray[np.bool_]
    transits: int
    """Those required, else those on offer."""


@dataclass(frozen=True, kw_only=True, eq=False)
class ContrastResult:
    """Two atmospheres with all modes."""

    title_a: str
    title_b: str
    gases_a: tuple[tuple[str, float], ...]
    """The air: formula and mixing ratio, the most first."""
    gases_b: tuple[tuple[str, float], ...]
    held_a: tuple[str, ...]
    """Gases whose amounts are what is to be told apart, and so held as stated."""
    held_b: tuple[str, ...]
    invented: bool
    threshold_sigma: float
    power: float
    transits_available: int | None
    transit_duration_h: float
    rows: tuple[ContrastRow, ...]
    spectra: tuple[ContrastSpectrum, ...]
    """In the order of the rows."""
    line_data: tuple[str, ...]
    assumptions: tuple[str, ...]
    nuisances_a: tuple[tuple[str, str], ...]
    nuisances_b: tuple[tuple[str, str], ...]
    cautions: tuple[str, ...]
    version: str
