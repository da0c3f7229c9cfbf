"""Records of the target: star, planet and its air.

Field names carry the unit of the float they hold; the name in the file, and for making a record in Python, is the
alias: ``Planet(name="b", mass="0.7 M_earth", ...)``. Strings with units and astropy quantities are both read.
"""

from __future__ import annotations

import math

import astropy.units as u
from pydantic import Field, model_validator

from planner.atmosphere.layers import GRAVITATION_SI, gravity_m_per_s2
from planner.scenario.fields import (
    Amounts,
    Bar,
    Covered,
    Days,
    EarthMasses,
    EarthRadii,
    HazeFactor,
    Impact,
    Kelvin,
    Magnitudes,
    Name,
    OptionalAu,
    OptionalEarthMasses,
    OptionalFile,
    OptionalHours,
    OptionalLogG,
    OptionalSolarMasses,
    Parsecs,
    PerCm,
    Record,
    Shares,
    Slope,
    SolarRadii,
    Switch,
)
from planner.scenario.readings import FieldProblem
from planner.scenario.surface import SurfaceRegion
from planner.star.heterogeneity import Region, usual_faculae, usual_spots

__all__ = ["Atmosphere", "Cloud", "Haze", "Planet", "Star"]


class Star(Record):
    """The host star. Its mass is given as such, or by its surface gravity: exactly one of the two."""

    name: Name
    temperature_k: Kelvin = Field(alias="temperature")
    """Effective temperature."""
    radius_rsun: SolarRadii = Field(alias="radius")
    given_mass_msun: OptionalSolarMasses = Field(default=None, alias="mass")
    given_log_g: OptionalLogG = Field(default=None, alias="log_g")
    distance_pc: Parsecs = Field(alias="distance")
    magnitudes: Magnitudes = Field(default_factory=dict)
    """Vega magnitudes by band; where none is given, the photons follow from radius and distance."""
    spectrum: OptionalFile = None
    """File with the user's own spectrum; ``None`` for the built-in one."""
    spectrum_at_earth: Switch = False
    """Whether that spectrum is the flux that arrives here; otherwise only its shape counts."""
    given_spots: SurfaceRegion | None = Field(default=None, alias="spots")
    given_faculae: SurfaceRegion | None = Field(default=None, alias="faculae")

    @model_validator(mode="after")
    def _one_source_of_mass(self) -> Star:
        if (self.given_mass_msun is None) == (self.given_log_g is None):
            found = "neither" if self.given_mass_msun is None else "both"
            raise ValueError(f'expected one of mass, such as "0.09 M_sun", and log_g, such as 5.2, got {found}')
        return self

    @model_validator(mode="after")
    def _a_spectrum_to_speak_of(self) -> Star:
        if self.spectrum_at_earth and self.spectrum is None:
            raise FieldProblem("expected a spectrum as well, got none", ("spectrum_at_earth",))
        return self

    @model_validator(mode="after")
    def _regions_on_the_disc(self) -> Star:
        spots, faculae = self.spots, self.faculae
        if spots is not None and spots.temperature_k >= self.temperature_k:
            raise FieldProblem(_not("cooler", self.temperature_k, spots.temperature_k), ("spots", "temperature"))
        if faculae is not None and faculae.temperature_k <= self.temperature_k:
            raise FieldProblem(_not("warmer", self.temperature_k, faculae.temperature_k), ("faculae", "temperature"))
        total = sum(region.fraction for region in (spots, faculae) if region is not None)
        if total > 1:
            place = "spots" if spots is not None else "faculae"
            message = f"expected spots and faculae that cover at most 1 of the disc together, got {total:.4g}"
            raise FieldProblem(message, (place, "covered_fraction"))
        return self

    @property
    def spots(self) -> Region | None:
        """Spots outside the chord; ``None`` for none."""
        return self.given_spots.filled(usual_spots(self.temperature_k)) if self.given_spots else None

    @property
    def faculae(self) -> Region | None:
        """Faculae outside the chord; ``None`` for none."""
        return self.given_faculae.filled(usual_faculae(self.temperature_k)) if self.given_faculae else None

    @property
    def radius_m(self) -> float:
        """Radius in metres."""
        return float(self.radius_rsun * u.R_sun.to(u.m))

    @property
    def distance_m(self) -> float:
        """Distance from us in metres."""
        return float(self.distance_pc * u.pc.to(u.m))

    @property
    def mass_kg(self) -> float:
        """Mass in kilograms."""
        if self.given_log_g is not None:
            return 10.0 ** (self.given_log_g - 2) * self.radius_m**2 / GRAVITATION_SI
        return float((self.given_mass_msun or math.nan) * u.M_sun.to(u.kg))

    @property
    def log_g(self) -> float:
        """log10 of the surface gravity in cm s-2."""
        if self.given_log_g is not None:
            return self.given_log_g
        return 2 + math.log10(gravity_m_per_s2(self.mass_kg, 1e-3 * self.radius_m))


class Planet(Record):
    """The planet and its circular orbit. A missing ``distance`` follows from period and stellar mass."""

    name: Name
    mass_mearth: EarthMasses = Field(alias="mass")
    mass_error_mearth: OptionalEarthMasses = Field(default=None, alias="mass_error")
    radius_rearth: EarthRadii = Field(alias="radius")
    """Radius at which the pressure of the atmosphere is given."""
    period_d: Days = Field(alias="period")
    impact_parameter: Impact
    given_distance_au: OptionalAu = Field(default=None, alias="distance")
    given_transit_duration_h: OptionalHours = Field(default=None, alias="transit_duration")

    @property
    def radius_m(self) -> float:
        """Radius in metres."""
        return float(self.radius_rearth * u.R_earth.to(u.m))

    @property
    def mass_kg(self) -> float:
        """Mass in kilograms."""
        return float(self.mass_mearth * u.M_earth.to(u.kg))

    @property
    def gravity_m_per_s2(self) -> float:
        """Gravity at the radius."""
        return gravity_m_per_s2(self.mass_kg, 1e-3 * self.radius_m)


class Cloud(Record):
    """A grey deck, opaque below its top, over a share of the limb."""

    top_bar: Bar = Field(alias="top")
    covered_fraction: Covered = 1.0


class Haze(Record):
    """Scattering on top of the air's own."""

    factor: HazeFactor
    """Cross-section per molecule of air at 1 um, in units of the Rayleigh cross-section of N2 there."""
    wavelength_slope: Slope = Field(default=-4.0, alias="slope")
    """``d ln(cross-section) / d ln(wavelength)``; -4 for particles much smaller than the wavelength."""


class Atmosphere(Record):
    """Isothermal air: the background fills what the absorbers and the candidate leave."""

    temperature_k: Kelvin = Field(alias="temperature")
    pressure_bar: Bar = Field(alias="pressure")
    """Pressure at the planet's radius: the surface, or the reference level when there is none."""
    surface: Switch
    """Whether the planet's radius is an opaque surface."""
    background: Shares
    """Relative share by formula; shares need not add up to 1."""
    absorbers: Amounts = Field(default_factory=dict)
    """Mixing ratio by formula."""
    cloud: Cloud | None = None
    haze: Haze | None = None
    refraction: Switch = True
    water_continuum: Switch = True
    line_wing_per_cm: PerCm = Field(default=25.0, alias="line_wing")

    @model_validator(mode="after")
    def _gases_once(self) -> Atmosphere:
        for gas in self.absorbers:
            if gas in self.background:
                raise FieldProblem(f"{gas} is a background gas already; list it once", ("absorbers", gas))
        total = sum(self.absorbers.values())
        if total >= 1:
            message = f"expected mixing ratios that leave room for the background, got a sum of {total:.6g}"
            raise FieldProblem(message, ("absorbers",))
        return self

    @model_validator(mode="after")
    def _cloud_above_the_surface(self) -> Atmosphere:
        if self.surface and self.cloud is not None and self.cloud.top_bar >= self.pressure_bar:
            message = (
                f"expected less than the surface pressure, {self.pressure_bar:g} bar, got {self.cloud.top_bar:g} bar"
            )
            raise FieldProblem(message, ("cloud", "top"))
        return self


def _not(wanted: str, photosphere_k: float, region_k: float) -> str:
    return f"expected {wanted} than the photosphere, {photosphere_k:g} K, got {region_k:g} K"
