"""What the planning studies hand to the report: frozen records, plain numbers, units in the names."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from planner.studies.outcomes import TransitSpread

__all__ = [
    "BandShare",
    "BinnedSpectrum",
    "Counts",
    "PlanResult",
    "PlanRow",
    "Remedy",
    "RemedyKind",
    "Rival",
    "Simulation",
    "StarMimic",
    "Verdict",
]


class Verdict(StrEnum):
    """What a plan comes down to."""

    WITHIN_REACH = "within reach"
    TOO_MANY = "more than the transits available"
    FLOOR = "unreachable (floor)"
    CONFUSION = "unreachable (confusion)"
    NO_BAND = "no band in range"
    SATURATED = "saturated"


@dataclass(frozen=True, kw_only=True)
class BandShare:
    """A stretch of wavelength and its share of the information in one transit, all else known."""

    from_um: float
    to_um: float
    share: float


@dataclass(frozen=True, kw_only=True)
class Counts:
    """Significance and transits under one treatment of the nuisances.

    ``snr_limit`` is infinite where neither a floor nor confusion bounds it. ``transits_required`` and the hours
    are ``None`` where no number of transits is enough; ``transits_unrounded`` is the real-valued solution.
    """

    snr_one_transit: float
    snr_limit: float
    transits_required: int | None
    transits_unrounded: float | None
    hours_required: float | None
    in_transit_hours_required: float | None


@dataclass(frozen=True, kw_only=True)
class Simulation:
    """Rates among simulated observations beside those stated; errors are standard errors of what was found."""

    transits: int
    """Transits of one observation: those required, else those available."""
    draws: int
    power_stated: float
    """At this whole number of transits; a little above the power asked for, which the unrounded number gives."""
    snr_stated: float
    """Significance expected with the gas."""
    power_found: float
    power_error: float
    false_alarm_sigma: float
    false_alarms_stated: float
    false_alarms_found: float
    false_alarms_error: float
    sigma_anywhere: float
    """Local significance that counts as the threshold when a feature as wide as the best band was searched for over
    the whole mode."""
    sigma_edges: tuple[float, ...]
    """Edges of the bins in which the draws are counted; those beyond the ends count with the last."""
    counts_there: tuple[int, ...]
    """Significances found with the gas."""
    counts_absent: tuple[int, ...]
    """And without."""


class RemedyKind(StrEnum):
    """What could be otherwise."""

    MODE = "another mode as well"
    FLOOR = "a lower floor"
    AMOUNT = "more of the gas"
    SKY = "a clearer sky"


@dataclass(frozen=True, kw_only=True)
class Remedy:
    """One thing that would raise a significance, and how far it goes.

    The field that belongs to the kind is set, the others are ``None``.
    """

    kind: RemedyKind
    enough: bool
    """Whether it brings the search within reach."""
    transits: int
    """Transits that ``snr`` is for, with each mode: those required without the remedy, else those on offer."""
    snr: float
    mode: str | None = None
    band_um: tuple[float, float] | None = None
    """The stretch of the added mode that does most."""
    transits_required: int | None = None
    """With each of the modes, where a mode is added."""
    hours_required: float | None = None
    """Charged with all modes together."""
    floor_factor: float | None = None
    """On every floor of the mode, 0 to 1; 0 where even no floor is not enough."""
    floor_ppm: float | None = None
    """What the factor makes of the floor, at the resolving power that it is quoted for; ``None`` for combined modes."""
    mixing_ratio: float | None = None
    """Of the searched gas, or of the first of a set; the most that was tried where it is not enough."""
    cloud_top_bar: float | None = None
    """Infinite for no cloud at all."""


@dataclass(frozen=True, kw_only=True)
class Rival:
    """A gas of the catalogue that the air is not said to hold, and what not knowing it would cost."""

    gas: str
    mixing_ratio: float
    """Width of the prior that it was tried with."""
    snr_left: float
    """Of ``snr``, with all the other unknowns as well."""
    snr: float
    transits: int


@dataclass(frozen=True, kw_only=True)
class StarMimic:
    """What spots and faculae outside the chord would do to the search, were they not thought of."""

    stated: bool
    """Those of the scenario; otherwise those usual for such a star were tried."""
    serious: bool
    """They would feign or hide at least one sigma and a fifth of the gas."""
    transits: int
    sigma: float
    """Significance of the gas that they would feign, after that many transits; negative where they hide it."""
    of_the_gas: float
    """The same over the significance of the gas itself."""
    alike: float
    """Cosine between both shapes, beside all other unknowns: 1 for the same, -1 for the opposite."""


@dataclass(frozen=True, kw_only=True)
class PlanRow:
    """One gas at one mixing ratio with one mode."""

    gas: str
    mixing_ratio: float
    mode: str
    verdict: Verdict
    marginalised: Counts
    all_known: Counts
    best_bands: tuple[BandShare, ...]
    confusion: tuple[tuple[str, float], ...]
    """Nuisances that cost most: (name, S/N left if this one alone is unknown, at the number of transits that would
    suffice were everything known), dearest first."""
    confused_from: float
    """S/N at that number of transits were everything known: the one asked for, unless it is out of reach even then."""
    confused_to: float
    """S/N left of it when everything is unknown together."""
    uncovered_um: tuple[tuple[str, float, float], ...]
    """Stretches (gas, from, to) that a gas's data do not cover."""
    saturated_um: tuple[tuple[float, float], ...]
    cautions: tuple[str, ...]
    simulation: Simulation | None = None
    rivals: tuple[Rival, ...] = ()
    """Gases of the catalogue that were tried, dearest first."""
    remedies: tuple[Remedy, ...] = ()
    """What would help, the most first of each kind."""
    star: StarMimic | None = None
    spread: TransitSpread | None = None
    """Over the priors, where that was asked for."""


@dataclass(frozen=True, kw_only=True, eq=False)
class BinnedSpectrum:
    """Model spectrum of one row in the bins of its mode. All arrays have shape ``(bin,)``; depths in ppm."""

    gas: str
    mixing_ratio: float
    mode: str
    detector: NDArray[np.int64]
    from_um: NDArray[np.float64]
    to_um: NDArray[np.float64]
    depth_ppm: NDArray[np.float64]
    shares_ppm: Mapping[str, NDArray[np.float64]]
    """Share of each gas, the candidate first (design: depth with it less depth without its absorption)."""
    noise_one_transit_ppm: NDArray[np.float64]
    floor_ppm: NDArray[np.float64]
    """Floor of each bin (its own width taken into account)."""
    usable: NDArray[np.bool_]
    """False where saturated or not covered."""
    scale_height_ppm: float
    """Depth change of one scale height."""
    contamination_ppm: NDArray[np.float64] | None = None
    """What spots and faculae of the star add to the depth; ``None`` where the scenario states none."""


@dataclass(frozen=True, kw_only=True, eq=False)
class PlanResult:
    """All rows of a plan with what a reader needs to judge them."""

    title: str
    invented: bool
    """The target is made up (demonstration); the report says so."""
    threshold_sigma: float
    power: float
    transits_available: int | None
    transit_duration_h: float
    charged_hours_per_transit: float
    scale_height_km: float
    scale_height_ppm: float
    rows: tuple[PlanRow, ...]
    spectra: tuple[BinnedSpectrum, ...]
    """In the order of the rows."""
    line_data: tuple[str, ...]
    """One sentence per gas: embedded or imported, edition or hash, range, quality."""
    assumptions: tuple[str, ...]
    nuisances: tuple[tuple[str, str], ...]
    """(name, prior width in words)."""
    cautions: tuple[str, ...]
    version: str
    spread_priors: tuple[tuple[str, str], ...] = ()
    """What the spread draws, as the nuisances."""
