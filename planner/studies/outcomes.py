"""What the studies that vary a scenario hand to the report: frozen records, plain numbers, units in the names."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

__all__ = ["Driver", "LimitCurve", "LimitPoint", "LimitResult", "MapAxis", "MapResult", "Obstacle", "TransitSpread"]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Driver:
    """A number that is not known exactly, and its share in the spread of the answer."""

    name: str
    share: float


@dataclass(frozen=True, kw_only=True)
class TransitSpread:
    """One search over the priors of all that is not known exactly.

    Transits at 16, 50 and 84 % of the draws are whole numbers, or ``None`` where no number is enough. Chances are
    those of passing the threshold, averaged over the draws.
    """

    draws: int
    seed: int
    transits_16: int | None
    transits_50: int | None
    transits_84: int | None
    unreachable_share: float
    """Of the draws: no number of transits is enough."""
    transits_asked: int
    """What the plan of the scenario as it stands asks for; those on offer where it asks for more or finds no number."""
    chance_asked: float
    transits_on_offer: int
    chance_on_offer: float
    transits_drawn: tuple[int | None, ...]
    """Of every draw, ascending; ``None``, last, where no number is enough."""
    chances: tuple[tuple[int, float], ...]
    """Of passing the threshold after some numbers of transits, ascending."""
    drivers: tuple[Driver, ...]
    """Shares of the variance of the draws' ranks in significance after ``transits_asked``, largest first; they add to
    less than 1: the rest is interplay, and what a curve of second order misses."""


class Obstacle(StrEnum):
    """Why no mixing ratio is detectable, however many transits."""

    CLOUDS = "clouds too high"
    CONFUSION = "confusion"
    FLOOR = "floor"
    NO_BAND = "no band in range"


@dataclass(frozen=True, kw_only=True)
class LimitPoint:
    """What some transits reach; ``None`` where no mixing ratio of the range does."""

    transits: int
    hours: float
    """Charged."""
    detectable_ratio: float | None
    """Smallest mixing ratio that passes the threshold with the chance asked for."""
    upper_limit_ratio: float | None
    """What is left of the range when nothing is seen: larger ratios are excluded at the stated confidence."""


@dataclass(frozen=True, kw_only=True, eq=False)
class LimitCurve:
    """One gas, or set of gases, with one mode. Ratios are those of the first gas; a set keeps its proportions."""

    gas: str
    mode: str
    stated_ratios: tuple[float, ...]
    """Those of the scenario."""
    points: tuple[LimitPoint, ...]
    at_best: LimitPoint
    """With all transits on offer."""
    detectable_at_all: float | None
    """After infinitely many transits; 0 where nothing bounds their significance."""
    obstacle: Obstacle | None
    """Set where that is ``None``."""
    obstacle_words: str
    ratios: Array
    """``(ratio,)``, ascending: the curve of growth."""
    feature_ppm: Array
    """Largest share of the gas in a usable bin, ``(ratio,)``."""
    snr_one_transit: Array
    snr_on_offer: Array
    """After all transits on offer, ``(ratio,)``."""
    scale_height_ppm: float


@dataclass(frozen=True, kw_only=True, eq=False)
class LimitResult:
    """Limits on every gas of a scenario with every mode."""

    title: str
    invented: bool
    threshold_sigma: float
    power: float
    confidence: float
    """Of the upper limits, one-sided."""
    curves: tuple[LimitCurve, ...]
    line_data: tuple[str, ...]
    assumptions: tuple[str, ...]
    nuisances: tuple[tuple[str, str], ...]
    cautions: tuple[str, ...]
    version: str


@dataclass(frozen=True, kw_only=True, eq=False)
class MapAxis:
    """One axis of a map.

    Attributes
    ----------
    name, label, unit : str
        As in `planner.studies.vary.PARAMETERS`.
    logarithmic : bool
    values : (step,)
        Ascending.
    stated : float or None
        That of the scenario, if it lies on the axis.
    """

    name: str
    label: str
    unit: str
    logarithmic: bool
    values: Array
    stated: float | None


@dataclass(frozen=True, kw_only=True, eq=False)
class MapResult:
    """Transits over two numbers of a scenario, all else as it stands. Arrays have shape ``(y, x)`` unless stated."""

    title: str
    invented: bool
    gas: str
    mode: str
    x: MapAxis
    y: MapAxis
    threshold_sigma: float
    power: float
    transits_on_offer: int
    charged_hours_per_transit: float
    transits_unrounded: Array
    """Infinite where no number of transits is enough."""
    snr_limit: Array
    """After infinitely many transits; infinite where nothing bounds it."""
    snr_one_transit: Array
    levels: tuple[int, ...]
    """Numbers of transits worth a contour, ascending."""
    snr_wanted: float
    """Expected significance that passes the threshold with the chance asked for."""
    snr_after: Array
    """``(level, y, x)``: expected significance after each number of transits."""
    line_data: tuple[str, ...]
    assumptions: tuple[str, ...]
    nuisances: tuple[tuple[str, str], ...]
    cautions: tuple[str, ...]
    version: str
