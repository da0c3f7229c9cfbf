"""Spots and faculae of the star, outside the chord of the transit, as a scenario states them."""

from __future__ import annotations

from typing import Annotated

import astropy.units as u
from pydantic import BeforeValidator, Field

from planner.scenario.fields import Record
from planner.scenario.readings import Measure, Number
from planner.star.heterogeneity import Region

__all__ = ["SurfaceRegion"]

OptionalKelvin = Annotated[float | None, BeforeValidator(Measure(kind="a temperature", unit=u.K, example="2300 K"))]
OptionalWidth = Annotated[
    float | None, BeforeValidator(Measure(kind="a temperature", unit=u.K, example="100 K", zero_allowed=True))
]
OptionalCovered = Annotated[float | None, BeforeValidator(Number(kind="a share of the disc", low=0, high=1))]


class SurfaceRegion(Record):
    """All spots, or all faculae; what is not given is usual for the star."""

    temperature_k: OptionalKelvin = Field(default=None, alias="temperature")
    temperature_error_k: OptionalWidth = Field(default=None, alias="temperature_error")
    covered_fraction: OptionalCovered = None
    """Share of the disc."""
    covered_fraction_error: OptionalCovered = None

    def filled(self, usual: Region) -> Region:
        """The region with the usual values where none are given."""
        return Region(
            temperature_k=_either(self.temperature_k, usual.temperature_k),
            temperature_error_k=_either(self.temperature_error_k, usual.temperature_error_k),
            fraction=_either(self.covered_fraction, usual.fraction),
            fraction_error=_either(self.covered_fraction_error, usual.fraction_error),
        )


def _either(given: float | None, usual: float) -> float:
    return usual if given is None else given
