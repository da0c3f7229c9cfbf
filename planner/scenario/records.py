"""The scenario as a whole: its parts, what follows from them together, and the checks that need several of them."""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path
from typing import Annotated

import astropy.units as u
from pydantic import BeforeValidator, Field, PrivateAttr, model_validator

from planner.atmosphere import layers
from planner.scenario import geometry
from planner.scenario.beliefs import Beliefs
from planner.scenario.fields import Name, Record, Switch
from planner.scenario.locate import heading
from planner.scenario.readings import COMBINED, FieldProblem, ModeNames, Sets, Tables
from planner.scenario.search import Bins, Candidate, Case, Fit, Goal, Noise, Nuisances, Spread
from planner.scenario.target import Atmosphere, Cloud, Haze, Planet, Star

__all__ = [
    "Atmosphere",
    "Bins",
    "Candidate",
    "Case",
    "Cloud",
    "Fit",
    "Goal",
    "Haze",
    "Noise",
    "Nuisances",
    "Planet",
    "Scenario",
    "Spread",
    "Star",
]

Place = tuple[str | int, ...]

_DISTANCE_TOLERANCE = 0.2
"""Largest relative difference between a stated orbital distance and Kepler's third law: 0.2 is 70 % in stellar mass,
beyond any published error and below the slip of a unit or a digit."""
_DURATION_FACTOR = 2.0
"""Largest ratio between a stated transit duration and the circular one; eccentricity 0.6 reaches 2."""
_YEARS = 5.0
"""Years of a mission over which transits are counted; visibility is not considered."""


class Scenario(Record):
    """Everything the user states about one target and one search."""

    title: Name
    invented: Switch = False
    """The target is made up; every output says so."""
    star: Star
    planet: Planet
    atmosphere: Atmosphere
    candidates: Annotated[tuple[Candidate, ...], BeforeValidator(Tables(expected="at least one [[candidates]] table"))]
    together: Annotated[tuple[tuple[str, ...], ...], BeforeValidator(Sets())] = ()
    """Sets of candidates, as formulas, that are also judged as one."""
    modes: Annotated[tuple[str | Path, ...], BeforeValidator(ModeNames())]
    """Shipped modes by their short name (str), own files as paths; ``"combined"`` for all of them together as well."""
    goal: Goal
    noise: Noise | None = None
    nuisances: Nuisances = Field(default_factory=Nuisances)
    spread: Spread = Field(default_factory=Spread)
    fit: Fit = Field(default_factory=Fit)
    bins: Bins = Field(default_factory=Bins)
    beliefs: Beliefs = Field(default_factory=Beliefs)
    """In place of the gas catalogue's, for the choice between gases."""

    _text: str = PrivateAttr(default="")
    _where: str = PrivateAttr(default="scenario")

    def place(self, *keys: str | int) -> str:
        """Where a key stands, for the head of a message: ``demo.toml:14: planet.mass``."""
        return heading(self._text, self._where, keys)

    @property
    def single_modes(self) -> tuple[str | Path, ...]:
        """The modes without their combination."""
        return tuple(mode for mode in self.modes if mode != COMBINED)

    @property
    def combines(self) -> bool:
        """Whether all modes together are asked for as well."""
        return COMBINED in self.modes

    # -- geometry -----------------------------------------------------------------------------------------------

    @property
    def orbital_distance_m(self) -> float:
        """Distance between star and planet, as stated or by Kepler's third law."""
        if self.planet.given_distance_au is not None:
            return float(self.planet.given_distance_au * u.au.to(u.m))
        return self._kepler_distance_m

    @property
    def _kepler_distance_m(self) -> float:
        return geometry.orbital_distance_m(
            period_s=float(self.planet.period_d * u.d.to(u.s)), star_mass_kg=self.star.mass_kg
        )

    @property
    def radius_ratio(self) -> float:
        """Radius of the planet over that of the star."""
        return self.planet.radius_m / self.star.radius_m

    @property
    def transit_duration_h(self) -> float:
        """T14 in hours, as stated or of a circular orbit."""
        if self.planet.given_transit_duration_h is not None:
            return self.planet.given_transit_duration_h
        return self._contact_time_h(geometry.transit_duration_s)

    @property
    def full_transit_duration_h(self) -> float:
        """T23 in hours, of a circular orbit."""
        return self._contact_time_h(geometry.full_transit_duration_s)

    def _contact_time_h(self, duration_s: Callable[..., float]) -> float:
        seconds = duration_s(
            period_s=float(self.planet.period_d * u.d.to(u.s)),
            star_radius_m=self.star.radius_m,
            distance_m=self.orbital_distance_m,
            radius_ratio=self.radius_ratio,
            impact_parameter=self.planet.impact_parameter,
        )
        return seconds / 3600

    @property
    def out_of_transit_h(self) -> float:
        """Hours of baseline per transit: as stated, else the larger of T14 and 1 h."""
        if self.goal.given_out_of_transit_h is not None:
            return self.goal.given_out_of_transit_h
        return max(self.transit_duration_h, 1.0)

    @property
    def transits_on_offer(self) -> int:
        """Transits that can be asked for: as stated, else all that the orbit has in five years."""
        if self.goal.transits_available is not None:
            return self.goal.transits_available
        return math.floor(_YEARS * 365.25 / self.planet.period_d)

    def equilibrium_temperature_k(self, albedo: float = 0.0) -> float:
        """Temperature in balance with the starlight, heat spread over the whole planet."""
        return geometry.equilibrium_temperature_k(
            star_temperature_k=self.star.temperature_k,
            star_radius_m=self.star.radius_m,
            distance_m=self.orbital_distance_m,
            albedo=albedo,
        )

    # -- air ----------------------------------------------------------------------------------------------------

    @property
    def cases(self) -> tuple[Case, ...]:
        """Every candidate at each of its mixing ratios, then every set; the n-th ratios of a set go together."""
        single = [
            Case(gases=(candidate.gas,), mixing_ratios=(ratio,))
            for candidate in self.candidates
            for ratio in candidate.mixing_ratios
        ]
        ratios = {candidate.gas: candidate.mixing_ratios for candidate in self.candidates}
        joint = [
            Case(gases=gases, mixing_ratios=amounts)
            for gases in self.together
            for amounts in zip(*(ratios[gas] for gas in gases), strict=True)
        ]
        return (*single, *joint)

    def air(self, case: Case | None = None) -> dict[str, float]:
        """Mixing ratio of every gas, adding up to 1: the searched gases, other absorbers, background.

        A searched gas takes the place of an absorber or background gas of the same name; the background fills the
        rest in the proportion of its shares. Without a case: absorbers and background alone.
        """
        searched = dict(zip(case.gases, case.mixing_ratios, strict=True)) if case else {}
        fixed = searched | {g: x for g, x in self.atmosphere.absorbers.items() if g not in searched}
        shares = {g: s for g, s in self.atmosphere.background.items() if g not in searched}
        rest = (1 - sum(fixed.values())) / sum(shares.values())
        return fixed | {gas: share * rest for gas, share in shares.items()}

    def molar_mass_g(self, case: Case | None = None) -> float:
        """Mean molar mass of the air in g per mol."""
        from planner.spectroscopy.molecules import find_molecule

        return sum(x * find_molecule(gas).molar_mass_g for gas, x in self.air(case).items())

    def scale_height_km(self, case: Case | None = None) -> float:
        """Scale height at the planet's radius."""
        return layers.scale_height_km(
            self.atmosphere.temperature_k, self.molar_mass_g(case), self.planet.gravity_m_per_s2
        )

    def scale_height_ppm(self, case: Case | None = None) -> float:
        """Transit depth of one scale height."""
        return geometry.scale_height_ppm(
            scale_height_km=self.scale_height_km(case),
            radius_m=self.planet.radius_m,
            star_radius_m=self.star.radius_m,
        )

    @property
    def gravity_fraction(self) -> float:
        """Prior width of gravity: as stated, else the relative error of the mass, else 10 %."""
        if self.nuisances.given_gravity_fraction is not None:
            return self.nuisances.given_gravity_fraction
        if self.planet.mass_error_mearth is not None:
            return self.planet.mass_error_mearth / self.planet.mass_mearth
        return 0.10

    # -- checks -------------------------------------------------------------------------------------------------

    @model_validator(mode="after")
    def _planet_crosses_the_star(self) -> Scenario:
        k, b = self.radius_ratio, self.planet.impact_parameter
        if k >= 1:
            message = (
                f"the planet is larger than its star ({self.star.radius_m / self.planet.radius_m:.3g} planet radii)"
            )
            raise FieldProblem(f"{message}; look at the units of both", ("planet", "radius"))
        if b >= 1 + k:
            raise FieldProblem(f"no transit: expected less than 1 + Rp/R* = {1 + k:.4g}, got {b:g}", _IMPACT)
        if b > 1 - k:
            message = f"grazing transit: expected at most 1 - Rp/R* = {1 - k:.4g}, got {b:g}"
            raise FieldProblem(f"{message}; partial overlap is not modelled", _IMPACT)
        return self

    @model_validator(mode="after")
    def _orbit_fits_the_star(self) -> Scenario:
        distance, kepler, radius = self.orbital_distance_m, self._kepler_distance_m, self.star.radius_m
        if abs(distance / kepler - 1) > _DISTANCE_TOLERANCE:
            au_m = u.au.to(u.m)
            message = f"the period and the star's mass give {kepler / au_m:.4g} au, got {distance / au_m:.4g} au"
            raise FieldProblem(message, ("planet", "distance"))
        if distance <= radius * (1 + self.radius_ratio):
            raise FieldProblem(
                f"the orbit lies inside the star ({distance / radius:.3g} stellar radii)", ("planet", "period")
            )
        circular = self._contact_time_h(geometry.transit_duration_s)
        if not 1 / _DURATION_FACTOR <= self.transit_duration_h / circular <= _DURATION_FACTOR:
            message = f"the orbit gives about {circular:.3g} h, got {self.transit_duration_h:.3g} h"
            raise FieldProblem(message, ("planet", "transit_duration"))
        return self

    @model_validator(mode="after")
    def _candidates_once(self) -> Scenario:
        gases = [candidate.gas for candidate in self.candidates]
        for index, gas in enumerate(gases):
            if gas in gases[:index]:
                message = f"{gas} is a candidate already; give its mixing ratios as one list"
                raise FieldProblem(message, ("candidates", index, "gas"))
        return self

    @model_validator(mode="after")
    def _sets_of_candidates(self) -> Scenario:
        lengths = {candidate.gas: len(candidate.mixing_ratios) for candidate in self.candidates}
        for index, gases in enumerate(self.together):
            for gas in gases:
                if gas not in lengths:
                    raise FieldProblem(
                        f"{gas} is not among the candidates; add a [[candidates]] table", ("together", index)
                    )
            if len({lengths[gas] for gas in gases}) > 1:
                counts = ", ".join(f"{gas} {lengths[gas]}" for gas in gases)
                message = f"expected as many mixing ratios for each gas of the set, got {counts}"
                raise FieldProblem(message, ("together", index))
        return self

    @model_validator(mode="after")
    def _air_adds_up(self) -> Scenario:
        for index, candidate in enumerate(self.candidates):
            if not set(self.atmosphere.background) - {candidate.gas}:
                message = f"{candidate.gas} is the whole background; name another background gas to search for it"
                raise FieldProblem(message, ("candidates", index, "gas"))
        for case in self.cases:
            self._check_case(case)
        return self

    def _check_case(self, case: Case) -> None:
        if not set(self.atmosphere.background) - set(case.gases):
            raise FieldProblem(f"{case.label} are the whole background", ("together",))
        others = sum(x for gas, x in self.atmosphere.absorbers.items() if gas not in case.gases)
        total = sum(case.mixing_ratios) + others
        if total >= 1:
            index = [candidate.gas for candidate in self.candidates].index(case.gases[0])
            message = f"expected less than 1 together with the absorbers, got {total:.6g}; the rest is the background"
            raise FieldProblem(message, ("candidates", index, "mixing_ratio"))

    @model_validator(mode="after")
    def _rivals_are_absent(self) -> Scenario:
        for gas in self.nuisances.rivals:
            if gas in self.atmosphere.absorbers or gas in self.atmosphere.background:
                raise FieldProblem(f"{gas} is in the air already; a rival is absent", ("nuisances", "rivals", gas))
        return self


_IMPACT: Place = ("planet", "impact_parameter")
