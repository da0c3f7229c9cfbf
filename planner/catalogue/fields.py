"""The kinds of value a gas record holds, as annotated types: each carries the reading that makes it."""

from __future__ import annotations

from typing import Annotated

import astropy.units as u
from pydantic import BeforeValidator

from planner.catalogue.readings import AmountSpan, BandRows, OneOf, PerPpb, Span
from planner.scenario.readings import Gas, Measure, MixingRatio, Number, Text

__all__ = [
    "AmountRange",
    "Amounts",
    "Chance",
    "ChanceRange",
    "Class",
    "Efficiency",
    "Epoch",
    "FlagWord",
    "GasName",
    "JudgementWord",
    "Maker",
    "OptionalAmount",
    "OptionalLifetime",
    "OptionalWarming",
    "OptionalWords",
    "Pair",
    "Question",
    "Rows",
    "Sight",
    "Subject",
    "Words",
]

Pair = tuple[float, float]

_FLAGS = ("read", "from memory", "computed", "judgement")
_EFFICIENCY = Measure(kind="a radiative efficiency", unit=u.W / u.m**2, example="0.291 W m-2")
_CHANCE = Number(kind="a probability", low=0, high=1, open_low=True, open_high=True)

Words = Annotated[str, BeforeValidator(Text())]
OptionalWords = Annotated[str | None, BeforeValidator(Text())]
GasName = Annotated[str, BeforeValidator(Gas())]
FlagWord = Annotated[str, BeforeValidator(OneOf(words=_FLAGS))]
JudgementWord = Annotated[str, BeforeValidator(OneOf(words=("judgement",)))]
Class = Annotated[str, BeforeValidator(OneOf(words=("biogenic", "industrial", "either", "abiotic")))]
Maker = Annotated[str, BeforeValidator(OneOf(words=("life", "industry", "neither")))]
Question = Annotated[str, BeforeValidator(OneOf(words=("life", "industry")))]
Sight = Annotated[str, BeforeValidator(OneOf(words=("present", "absent")))]
Epoch = Annotated[str, BeforeValidator(OneOf(words=("pre-industrial", "present")))]
Subject = Annotated[
    str, BeforeValidator(OneOf(words=("condensation", "solubility", "chemistry", "confusion", "star", "data")))
]
OptionalAmount = Annotated[
    Pair | None,
    BeforeValidator(
        Span(
            value=Measure(kind="an amount per year", unit=u.Tg / u.yr, example="500 Tg/yr"),
            kind="an amount per year",
            example="500 Tg/yr",
            single_allowed=True,
        )
    ),
]
OptionalLifetime = Annotated[
    Pair | None,
    BeforeValidator(
        Span(
            value=Measure(kind="a lifetime", unit=u.yr, example="52 yr"),
            kind="a lifetime",
            example="52 yr",
            single_allowed=True,
        )
    ),
]
Amounts = Annotated[Pair, BeforeValidator(AmountSpan())]
AmountRange = Annotated[Pair, BeforeValidator(Span(value=MixingRatio(), kind="mixing ratios", example="1 ppm"))]
Chance = Annotated[float, BeforeValidator(_CHANCE)]
ChanceRange = Annotated[Pair, BeforeValidator(Span(value=_CHANCE, kind="probabilities", example="0.1"))]
Efficiency = Annotated[float, BeforeValidator(PerPpb(value=_EFFICIENCY))]
OptionalWarming = Annotated[float | None, BeforeValidator(Number(kind="a warming potential", low=0, open_low=True))]
Rows = Annotated[tuple[tuple[float, float, float, str], ...], BeforeValidator(BandRows())]
