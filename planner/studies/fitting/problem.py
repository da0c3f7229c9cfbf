"""A fit as a likelihood over the unit cube: from a point to an atmosphere, its spectrum, and how well it does."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from numpy.typing import NDArray

from planner.errors import RangeError
from planner.scenario.records import Case, Scenario
from planner.studies.contamination import surface_factor
from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.unknowns import Unknown
from planner.studies.forward import ForwardModel
from planner.studies.vary import vary

__all__ = ["FitProblem"]

Array = NDArray[np.float64]

_IMPOSSIBLE = -1e100
"""ln likelihood of air that cannot be: one that is not bound to the planet."""
_NO_GAS = Case(gases=(), mixing_ratios=())


@dataclass(frozen=True, kw_only=True, eq=False)
class FitProblem:
    """One model of the air against the data.

    Attributes
    ----------
    scenario : Scenario
        That of `planner.studies.fitting.observed.fitted_scenario`.
    unknowns : tuple of Unknown
    model : ForwardModel
        On whatever samples.
    without : str or None
        A gas that the air lacks.
    """

    scenario: Scenario
    unknowns: tuple[Unknown, ...]
    data: LevelledData
    wavelength_um: Array
    model: ForwardModel
    without: str | None = None

    def spectrum_ppm(self, point: Array) -> Array:
        """Depth in every bin, levels of detectors apart, at a point of the unit cube.

        Raises
        ------
        RangeError
            If there can be no such air.
        """
        values, widths = self._values(point)
        changed, case = vary(self.scenario, self._case, values)
        air = _NO_GAS if self.without in case.gases else case
        depth = self.model.of(changed).binned(air)[0].depth_ppm
        return depth * surface_factor(self.scenario.star, widths, self.wavelength_um) if self._spotted else depth

    def ln_likelihood(self, point: Array) -> float:
        """At a point of the unit cube; next to nothing where there can be no such air."""
        try:
            return self.data.ln_likelihood(self.spectrum_ppm(point))
        except RangeError:
            return _IMPOSSIBLE * (1 + float(point[0]))  # no two alike, so that they have an order

    def on(self, model: ForwardModel) -> FitProblem:
        """The same on other samples."""
        return FitProblem(
            scenario=self.scenario,
            unknowns=self.unknowns,
            data=self.data,
            wavelength_um=self.wavelength_um,
            model=model,
            without=self.without,
        )

    def shown(self, points: Array) -> Array:
        """Points ``(point, parameter)`` as the values, or logarithms, that are reported."""
        return np.column_stack([u.shown(places) for u, places in zip(self.unknowns, points.T, strict=True)])

    def temperature_k(self, point: Array) -> float:
        """Temperature of the air at a point."""
        return self._values(point)[0].get("temperature", self.scenario.atmosphere.temperature_k)

    def _values(self, point: Array) -> tuple[dict[str, float], dict[str, float]]:
        """A point in the terms of `vary`, and the widths by which spots and faculae are moved.

        Gravity is what is unknown, and mass follows from it and the radius.
        """
        planet = self.scenario.planet
        values = _named(self.unknowns, point, regions=False)
        radius = values.get("radius", planet.radius_rearth) / planet.radius_rearth
        values["mass"] = planet.mass_mearth * values.pop("gravity", 1.0) * radius**2
        if "cloud top" in values:
            values["cloud_top"] = values.pop("cloud top")
        searched = self._case.gases[0]
        if searched in values:
            values["mixing_ratio"] = values.pop(searched)
        return values, _named(self.unknowns, point, regions=True)

    @property
    def _case(self) -> Case:
        return self.scenario.cases[0]

    @cached_property
    def _spotted(self) -> bool:
        return self.scenario.star.spots is not None or self.scenario.star.faculae is not None


def _named(unknowns: Sequence[Unknown], point: Array, *, regions: bool) -> dict[str, float]:
    """Values of the air, or widths of the regions, by name."""
    pairs: Mapping[str, float] = {
        unknown.name: unknown.widths(place) if regions else unknown.at(place)
        for unknown, place in zip(unknowns, point.tolist(), strict=True)
        if unknown.region == regions
    }
    return dict(pairs)
