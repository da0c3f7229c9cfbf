"""What the studies that vary a scenario hand to the report: frozen records, plain numbers, units in the names."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["Driver", "TransitSpread"]


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
    drivers: tuple[Driver, ...]
    """Shares of the variance of the draws' ranks in significance after ``transits_asked``, largest first; they add to
    less than 1: the rest is interplay, and what a curve of second order misses."""
