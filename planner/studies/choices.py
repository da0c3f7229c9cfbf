"""What the study of a choice between gases hands to the report: frozen records, units in the names."""

from __future__ import annotations

from dataclasses import dataclass

from planner.detection.pattern import PatternBits
from planner.detection.worth import Worth
from planner.studies.results import PlanRow

__all__ = ["Choice", "ChoiceResult", "Pattern", "Resembling"]


@dataclass(frozen=True, kw_only=True)
class Resembling:
    """The gas of the catalogue that is hardest to tell apart from the searched one."""

    gas: str
    mixing_ratio: float
    """Width of its prior: see `planner.studies.rivals`."""
    snr_left: float
    """Share of the S/N that is left when its amount is unknown too."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Choice:
    """One gas with one mode, for the hours given."""

    gas: str
    mode: str
    mixing_ratio: float
    """Of reference: the geometric middle of the range where the hypothesis is true."""
    mixing_ratio_range: tuple[float, float]
    tells: bool
    """Whether the catalogue has the gas say anything about the hypothesis."""
    plan: PlanRow
    """At the reference."""
    transits: int
    """That fit into the hours given."""
    snr: float
    """Expected at the reference after these transits, all unknowns marginalised."""
    reachable_ratio: float | None
    """Least mixing ratio that the hours given detect with the chance asked for; None where no amount does."""
    limit_ratio: float | None
    """The same after infinitely many transits: what floor and confusion leave."""
    excluded_ratio: float | None
    """Least mixing ratio that a null result in the hours given excludes: it would have been detected with 95 %."""
    resembling: Resembling | None
    uniqueness: float
    """Share of the S/N that is left when the amounts of all gases of the catalogue with like bands are unknown."""
    worth: Worth
    bits_spread: tuple[float, float]
    """16 % and 84 % of the opinions on prior, presence and range lie below."""
    after_detection_spread: tuple[float, float]
    """The same of the chance of the hypothesis after a detection."""
    after_null_spread: tuple[float, float]
    wins: float
    """Share of the opinions under which this gas with this mode is worth most."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Pattern:
    """Several gases in one mode, for the hours given."""

    gases: tuple[str, ...]
    mode: str
    how: str
    """Where it comes from: asked for, literature, or the greedy search."""
    snr: float
    """Of all of them together at their references, after the transits that fit; nuisances shared."""
    transits_required: int | None
    joint: PatternBits
    alone_bits: tuple[float, ...]
    """Of each member by itself."""
    droppable: tuple[str, ...]
    """Members without which less than a twentieth of the information is lost."""
    best_single: tuple[str, float]
    """The gas that is worth most by itself with this mode, in the pattern or not, and its bits."""

    @property
    def better_than_single(self) -> bool:
        """Whether it is worth clearly more than the best gas by itself."""
        return self.joint.bits > self.best_single[1] + 2 * self.joint.error


@dataclass(frozen=True, kw_only=True, eq=False)
class ChoiceResult:
    """Everything about a choice, with what a reader needs to judge it. Choices stand in the order of their worth."""

    title: str
    invented: bool
    hypothesis: str
    means: str
    opposite: str
    context: str
    prior: float
    prior_range: tuple[float, float]
    prior_because: str
    most_bits: float
    """What there is to learn at this prior."""
    hours: float
    threshold_sigma: float
    power: float
    choices: tuple[Choice, ...]
    patterns: tuple[Pattern, ...]
    without_data: tuple[str, ...]
    """Gases asked for, or of the catalogue, that there are no line data for."""
    opinions: int
    nobody_wins: float
    """Share of the opinions under which nothing is worth a thousandth of what there is to learn."""
    accuracy: tuple[str, ...]
    assumptions: tuple[str, ...]
    line_data: tuple[str, ...]
    nuisances: tuple[tuple[str, str], ...]
    cautions: tuple[str, ...]
    version: str

    def wins_of(self, gas: str) -> float:
        """Share of the opinions under which a gas is worth most, with whichever mode."""
        return sum(choice.wins for choice in self.choices if choice.gas == gas)
