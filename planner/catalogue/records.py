"""The record of one gas: what a planner must know beside its spectrum.

Every statement carries where it comes from: ``read`` (in the text of the source named), ``from memory`` (the source,
if named, is where it should stand), ``computed`` (from the data named) or ``judgement`` (ours, nobody's measurement).
Keys in the files are singular words, ``[[loss]]``; field names carry units and, for lists, the plural.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated, Self

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, model_validator

from planner.catalogue.fields import (
    AmountRange,
    Amounts,
    Chance,
    ChanceRange,
    Class,
    Efficiency,
    Epoch,
    FlagWord,
    GasName,
    JudgementWord,
    Maker,
    OptionalAmount,
    OptionalLifetime,
    OptionalWarming,
    OptionalWords,
    Pair,
    Question,
    Rows,
    Sight,
    Subject,
    Words,
)
from planner.scenario.readings import FieldProblem, Tables

__all__ = [
    "Abundance",
    "Band",
    "BandGroup",
    "Caution",
    "Companion",
    "FalsePositive",
    "GasRecord",
    "Greenhouse",
    "Hypotheses",
    "Hypothesis",
    "Judged",
    "Loss",
    "Origin",
    "Presence",
    "Prior",
    "Sourced",
    "Statement",
]


def _tables(name: str) -> BeforeValidator:
    return BeforeValidator(Tables(expected=f"at least one [[{name}]] table"))


class _Record(BaseModel):
    """Common settings: nothing unknown, nothing changed afterwards."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class Sourced(_Record):
    """Anything with a source and a flag. What was read or computed must name where or from what."""

    source: OptionalWords = None
    flag: FlagWord

    @model_validator(mode="after")
    def _read_where(self) -> Self:
        if self.flag in ("read", "computed") and self.source is None:
            raise FieldProblem(f'missing; what is flagged "{self.flag}" must name its source', ("source",))
        return self


class Statement(Sourced):
    """A sentence with its source."""

    says: Words


class Origin(Statement):
    """Who or what makes the gas on Earth today."""

    who: Maker
    amount_tg_per_yr: OptionalAmount = Field(default=None, alias="amount")
    """Lower and higher, in teragrams of the gas per year; equal when one value is given."""


class FalsePositive(Statement):
    """A way to the gas that could be mistaken for life, or for industry."""

    mimics: Question


class Loss(Statement):
    """What removes the gas on Earth, and how fast."""

    lifetime_yr: OptionalLifetime = Field(default=None, alias="lifetime")
    """Lower and higher; equal when one value is given."""


class Abundance(Statement):
    """How much of it Earth's air holds or held."""

    epoch: Epoch
    mixing_ratio: Amounts
    """Lower and higher mole fraction; both 0 where there was none."""


class Caution(Statement):
    """What spoils the simple picture: condensation, rain-out, chemistry, look-alikes, the star, the data."""

    about: Subject


class Companion(Statement):
    """A gas whose presence or absence changes how this one reads."""

    gas: GasName
    seen: Sight
    favours: Maker
    """What the combination speaks for: life, industry, or neither of them."""


class Greenhouse(Sourced):
    """Warming per molecule: also a measure of how strongly the gas absorbs near 10 um."""

    radiative_efficiency_w_per_m2_ppb: Efficiency = Field(alias="radiative_efficiency")
    gwp_100: OptionalWarming = None


@dataclass(frozen=True, kw_only=True)
class Band:
    """A stretch of wavelength that holds nearly all of one band or group of bands at 296 K.

    Attributes
    ----------
    from_um, to_um : float
    intensity_cm : float
        Integral of the cross-section over wavenumber, cm per molecule.
    name : str
    source, flag : str
        As in `Sourced`.
    """

    from_um: float
    to_um: float
    intensity_cm: float
    name: str
    source: str | None
    flag: str

    @property
    def mean_cross_section_cm2(self) -> float:
        """Intensity over width: the cross-section averaged over the stretch."""
        return self.intensity_cm / (1e4 / self.from_um - 1e4 / self.to_um)


class BandGroup(Sourced):
    """Bands with one source."""

    rows: Rows

    @property
    def bands(self) -> tuple[Band, ...]:
        """The rows as records."""
        return tuple(
            Band(from_um=low, to_um=high, intensity_cm=intensity, name=name, source=self.source, flag=self.flag)
            for low, high, intensity, name in self.rows
        )


class Judged(Statement):
    """A probability that nobody has measured, its range, and the reason in ``says``."""

    flag: JudgementWord
    probability: Chance
    probability_range: ChanceRange

    @model_validator(mode="after")
    def _inside(self) -> Self:
        low, high = self.probability_range
        if not low <= self.probability <= high:
            message = f"expected a value inside probability_range, {low:g} to {high:g}, got {self.probability:g}"
            raise FieldProblem(message, ("probability",))
        return self


class Presence(Judged):
    """How likely a world of one kind has the gas within the range given, and how much of it."""

    mixing_ratio_range: AmountRange
    """Lower and higher mole fraction; between them evenly in the logarithm."""


class Hypothesis(_Record):
    """The gas under a hypothesis and under its opposite; ``either_way`` where the hypothesis makes no difference."""

    if_true: Presence | None = None
    if_false: Presence | None = None
    either_way: Presence | None = None

    @model_validator(mode="after")
    def _one_way_of_saying(self) -> Self:
        both = self.if_true is not None and self.if_false is not None
        neither = self.if_true is None and self.if_false is None
        if not (both and self.either_way is None) and not (neither and self.either_way is not None):
            raise ValueError("expected either the two tables if_true and if_false, or the one table either_way")
        return self

    def presence(self, true: bool) -> Presence:
        """The gas on a world where the hypothesis is true, or false."""
        found = self.either_way or (self.if_true if true else self.if_false)
        assert found is not None  # checked when the record was made
        return found

    @property
    def tells(self) -> bool:
        """Whether the gas can say anything at all about the hypothesis."""
        return self.either_way is None


class GasRecord(_Record):
    """One gas of the catalogue."""

    formula: GasName
    gas_class: Class = Field(alias="class")
    """What it is first read as on a temperate rocky planet."""
    summary: Words
    origins: Annotated[tuple[Origin, ...], _tables("made_by")] = Field(alias="made_by")
    false_positives: Annotated[tuple[FalsePositive, ...], _tables("false_positive")] = Field(
        default=(), alias="false_positive"
    )
    losses: Annotated[tuple[Loss, ...], _tables("loss")] = Field(alias="loss")
    abundances: Annotated[tuple[Abundance, ...], _tables("abundance")] = Field(alias="abundance")
    greenhouse: Greenhouse | None = None
    cautions: Annotated[tuple[Caution, ...], _tables("caution")] = Field(default=(), alias="caution")
    companions: Annotated[tuple[Companion, ...], _tables("companion")] = Field(default=(), alias="companion")
    band_groups: Annotated[tuple[BandGroup, ...], _tables("bands")] = Field(alias="bands")
    life: Hypothesis
    industry: Hypothesis

    @property
    def bands(self) -> tuple[Band, ...]:
        """All bands, by wavelength."""
        return tuple(sorted((b for group in self.band_groups for b in group.bands), key=lambda band: band.from_um))

    @property
    def names(self) -> tuple[str, ...]:
        """Common names, the most usual first; may be empty."""
        from planner.spectroscopy.molecules import find_molecule

        return find_molecule(self.formula).names

    @property
    def lifetime_yr(self) -> Pair | None:
        """Lifetime on Earth, lower and higher: the first that the record gives."""
        return next((loss.lifetime_yr for loss in self.losses if loss.lifetime_yr is not None), None)

    def abundance(self, epoch: str) -> Abundance | None:
        """The first abundance of an epoch, ``"present"`` or ``"pre-industrial"``; None where nothing is recorded."""
        return next((item for item in self.abundances if item.epoch == epoch), None)

    def hypothesis(self, name: str) -> Hypothesis:
        """The gas under ``"life"`` or ``"industry"``."""
        return {"life": self.life, "industry": self.industry}[name]


class Prior(Judged):
    """A hypothesis about a world, and how likely it is before looking."""

    means: Words
    opposite: Words
    """What it is weighed against, in words."""


class Hypotheses(_Record):
    """The hypotheses that the catalogue speaks about, and the kind of planet it has in mind."""

    context: Words
    life: Prior
    industry: Prior
