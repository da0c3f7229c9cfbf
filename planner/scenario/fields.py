"""The kinds of value a scenario holds, as annotated types: each carries the reading that makes it."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Annotated

import astropy.units as u
from pydantic import BaseModel, BeforeValidator, ConfigDict

from planner.scenario.readings import (
    Choice,
    Ends,
    FilePath,
    Flag,
    Gas,
    GasAmounts,
    Measure,
    MixingRatio,
    MixingRatios,
    Number,
    Text,
    Whole,
)
from planner.star.photometry import BANDS

__all__ = [
    "Amounts",
    "Bar",
    "Covered",
    "Days",
    "Decades",
    "EarthMasses",
    "EarthRadii",
    "GasName",
    "HazeFactor",
    "Impact",
    "Kelvin",
    "Magnitudes",
    "Name",
    "OptionalAu",
    "OptionalCharge",
    "OptionalCount",
    "OptionalEarthMasses",
    "OptionalFile",
    "OptionalHours",
    "OptionalLogG",
    "OptionalRelative",
    "OptionalSolarMasses",
    "Parsecs",
    "PerCm",
    "Ppm",
    "Probability",
    "RatioRange",
    "Ratios",
    "Record",
    "Relative",
    "ResolvingPower",
    "Shares",
    "Sigmas",
    "Slope",
    "SolarRadii",
    "Switch",
]


class Record(BaseModel):
    """Common settings of all records: no unknown keys, nothing changed afterwards."""

    model_config = ConfigDict(frozen=True, extra="forbid")


_MASS = Measure(kind="a mass", unit=u.M_earth, example="0.7 M_earth")
_STAR_MASS = Measure(kind="a mass", unit=u.M_sun, example="0.09 M_sun")
_DISTANCE = Measure(kind="an orbital distance", unit=u.au, example="0.029 au")
_DURATION = Measure(kind="a duration", unit=u.h, example="1.5 h")
_CHARGE = Measure(kind="a duration", unit=u.h, example="30 min", zero_allowed=True)
_RELATIVE = Measure(kind="a relative width", unit=u.one, example="10 %", zero_allowed=True)
_AMOUNT = 'such as { CO2 = "400 ppm", H2O = 1e-6 }'

Name = Annotated[str, BeforeValidator(Text())]
Switch = Annotated[bool, BeforeValidator(Flag())]
GasName = Annotated[str, BeforeValidator(Gas())]
OptionalFile = Annotated[Path | None, BeforeValidator(FilePath())]

Kelvin = Annotated[float, BeforeValidator(Measure(kind="a temperature", unit=u.K, example="250 K"))]
Bar = Annotated[float, BeforeValidator(Measure(kind="a pressure", unit=u.bar, example="1 bar"))]
PerCm = Annotated[float, BeforeValidator(Measure(kind="a wavenumber", unit=u.cm**-1, example="25 cm-1"))]
Days = Annotated[float, BeforeValidator(Measure(kind="a period", unit=u.d, example="6.1 d"))]
Parsecs = Annotated[float, BeforeValidator(Measure(kind="a distance", unit=u.pc, example="12.4 pc"))]
EarthMasses = Annotated[float, BeforeValidator(_MASS)]
EarthRadii = Annotated[float, BeforeValidator(Measure(kind="a radius", unit=u.R_earth, example="1.1 R_earth"))]
SolarRadii = Annotated[float, BeforeValidator(Measure(kind="a radius", unit=u.R_sun, example="0.12 R_sun"))]
OptionalEarthMasses = Annotated[float | None, BeforeValidator(_MASS)]
OptionalSolarMasses = Annotated[float | None, BeforeValidator(_STAR_MASS)]
OptionalAu = Annotated[float | None, BeforeValidator(_DISTANCE)]
OptionalHours = Annotated[float | None, BeforeValidator(_DURATION)]
OptionalCharge = Annotated[float | None, BeforeValidator(_CHARGE)]

Relative = Annotated[float, BeforeValidator(_RELATIVE)]
OptionalRelative = Annotated[float | None, BeforeValidator(_RELATIVE)]
Decades = Annotated[
    float, BeforeValidator(Measure(kind="a width in decades", unit=u.dex, example="1 dex", zero_allowed=True))
]
Ppm = Annotated[float, BeforeValidator(Measure(kind="a depth", unit=1e-6 * u.one, example="10 ppm", zero_allowed=True))]

Impact = Annotated[float, BeforeValidator(Number(kind="a plain number of stellar radii", low=0))]
OptionalLogG = Annotated[float | None, BeforeValidator(Number(kind="a plain number, log10 of cm s-2,", low=0, high=9))]
Covered = Annotated[float, BeforeValidator(Number(kind="a share of the limb", low=0, high=1, open_low=True))]
HazeFactor = Annotated[
    float, BeforeValidator(Number(kind="a multiple of the Rayleigh scattering of N2", low=0, open_low=True))
]
Slope = Annotated[float, BeforeValidator(Number(kind="a slope such as -4,", low=-20, high=0))]
Sigmas = Annotated[float, BeforeValidator(Number(kind="a plain number of sigma", low=0, open_low=True))]
Probability = Annotated[
    float, BeforeValidator(Number(kind="a probability", low=0, high=1, open_low=True, open_high=True))
]
OptionalCount = Annotated[int | None, BeforeValidator(Whole(kind="a number of transits", low=1))]
ResolvingPower = Annotated[float, BeforeValidator(Number(kind="a resolving power", low=5, high=1e5))]

Magnitudes = Annotated[
    Mapping[str, float],
    BeforeValidator(
        Choice(
            keys=tuple(BANDS),
            value=Measure(kind="a magnitude", unit=u.mag, example="11.35 mag", any_sign=True),
            kind="a table of magnitudes",
        )
    ),
]
Shares = Annotated[
    Mapping[str, float],
    BeforeValidator(
        GasAmounts(
            expected="a table of shares such as { N2 = 0.8, CO2 = 0.2 }",
            amount=Number(kind="a share of the air", low=0, open_low=True),
        )
    ),
]
Amounts = Annotated[
    Mapping[str, float],
    BeforeValidator(
        GasAmounts(expected=f"a table of mixing ratios {_AMOUNT}", amount=MixingRatio(), empty_allowed=True)
    ),
]
Ratios = Annotated[tuple[float, ...], BeforeValidator(MixingRatios())]
RatioRange = Annotated[
    tuple[float, float],
    BeforeValidator(
        Ends(value=MixingRatio(), expected='two mixing ratios [lower, higher] such as ["1 ppm", "100 ppm"]')
    ),
]
