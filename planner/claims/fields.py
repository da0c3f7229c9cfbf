"""The kinds of value a claim holds beside those of scenarios."""

from __future__ import annotations

from typing import Annotated

import astropy.units as u
from pydantic import BeforeValidator

from planner.catalogue.readings import OneOf
from planner.scenario.readings import Measure, MixingRatio, Number, Text, Whole

__all__ = [
    "Count",
    "Instrument",
    "LogOdds",
    "Micrometres",
    "OptionalMicrometres",
    "OptionalPpm",
    "OptionalRatio",
    "OptionalResolvingPower",
    "OptionalSigmas",
    "OptionalWords",
    "OtherBands",
    "Terms",
]

_WAVELENGTH = Measure(kind="a wavelength", unit=u.um, example="4.3 um")
_DEPTH = Measure(kind="a depth", unit=1e-6 * u.one, example="250 ppm")


Micrometres = Annotated[float, BeforeValidator(_WAVELENGTH)]
OptionalMicrometres = Annotated[float | None, BeforeValidator(_WAVELENGTH)]
OptionalPpm = Annotated[float | None, BeforeValidator(_DEPTH)]
OptionalSigmas = Annotated[
    float | None, BeforeValidator(Number(kind="a number of sigma", low=0, high=1000, open_low=True))
]
LogOdds = Annotated[float | None, BeforeValidator(Number(kind="ln of a Bayes factor", low=0, high=1e5, open_low=True))]
OptionalRatio = Annotated[float | None, BeforeValidator(MixingRatio())]
OptionalResolvingPower = Annotated[float | None, BeforeValidator(Number(kind="a resolving power", low=5, high=1e5))]
OptionalWords = Annotated[str | None, BeforeValidator(Text())]
Instrument = Annotated[
    str | None, BeforeValidator(Text(expected="an instrument mode, a short name or the path of a .toml file"))
]
Count = Annotated[int | None, BeforeValidator(Whole(kind="a count", low=1))]
Terms = Annotated[int | None, BeforeValidator(Whole(kind="a count", low=0))]
OtherBands = Annotated[str, BeforeValidator(OneOf(words=("seen", "not seen", "not told")))]
