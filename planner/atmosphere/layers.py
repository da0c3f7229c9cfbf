"""The column of air: isothermal, hydrostatic, gravity falling with height.

Heights are counted in *e-folds* of pressure above the base, ``e_folds = ln(base pressure / pressure)``. With
gravity falling as the inverse square of the radius, hydrostatic balance of an isothermal ideal gas integrates to

    e_folds = (R0 / H0) (1 - R0 / r),        r = R0 / (1 - e_folds H0 / R0),

R0 the base radius and H0 the scale height there (closed form; derived from dP/dr = -P / H(r), H(r) = H0 (r/R0)^2).
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import RangeError

__all__ = ["Air", "gravity_m_per_s2", "scale_height_km"]

# CODATA 2018 (the first two are exact)
BOLTZMANN_J_PER_K = 1.380649e-23
AVOGADRO_PER_MOL = 6.02214076e23
GRAVITATION_SI = 6.67430e-11

N2_RAYLEIGH_AT_1_UM_CM2 = 4.133e-28
"""Rayleigh cross-section of N2 at 1 um, from the refractive index and King factor of Sneep & Ubachs 2005
(JQSRT 92, 293); the constants were recalled from memory, the value agrees with Bodhaine et al. 1999 for air."""

# The highest column as a part of the way to infinity; the radius there is four times that of the base.
HIGHEST_TOP = 0.75

_POSITIVE = (
    "temperature_k",
    "base_pressure_bar",
    "base_radius_km",
    "base_gravity_m_per_s2",
    "molar_mass_g",
    "cloud_top_bar",
    "critical_radius_km",
)


def gravity_m_per_s2(mass_kg: float, radius_km: float) -> float:
    """Surface gravity ``G M / R^2``."""
    return GRAVITATION_SI * mass_kg / (radius_km * 1e3) ** 2


def scale_height_km(temperature_k: float, molar_mass_g: float, gravity_m_per_s2: float) -> float:
    """Pressure scale height ``k T / (m g)`` of an ideal gas."""
    molecule_kg = molar_mass_g * 1e-3 / AVOGADRO_PER_MOL
    return BOLTZMANN_J_PER_K * temperature_k / (molecule_kg * gravity_m_per_s2) * 1e-3


@dataclass(frozen=True, kw_only=True)
class Air:
    """An isothermal hydrostatic column with its clouds, haze and bottom.

    Attributes
    ----------
    temperature_k : float
        > 0.
    base_pressure_bar, base_radius_km, base_gravity_m_per_s2 : float
        Pressure at the base radius, that radius, and the gravity there; > 0.
    mixing_ratios : mapping of formula to float
        Volume mixing ratios of all gases, the background included; they add to 1 within 1e-9.
    molar_mass_g : float
        Mean molar mass. Given apart from the mixing ratios, so that a ratio can be changed at fixed structure.
    surface : bool
        True: the base is an opaque surface. False: the base pressure merely says where the base radius lies, and
        the column goes on below it to the highest pressure that every opacity table covers (to 10 bar when no
        gas has a table). What lies deeper counts as opaque; `TransitDepth.bottom_transmission` tells where that
        matters.
    cloud_top_bar : float or None
        Top of a grey opaque deck, None for a clear sky. A deck below the bottom does nothing.
    cloud_fraction : float
        Covered fraction of the limb, 0 to 1; of no effect without a deck.
    haze_factor, haze_slope : float
        Every molecule of the air scatters besides ``haze_factor`` times what an N2 molecule does at 1 um, going
        as wavenumber to the power ``haze_slope``. 0 for no haze.
    critical_radius_km : float or None
        Radius below which no ray reaches the observer (see `refraction_boundary`); it acts as an opaque bottom.
    """

    temperature_k: float
    base_pressure_bar: float
    base_radius_km: float
    base_gravity_m_per_s2: float
    mixing_ratios: Mapping[str, float]
    molar_mass_g: float
    surface: bool
    cloud_top_bar: float | None = None
    cloud_fraction: float = 1.0
    haze_factor: float = 0.0
    haze_slope: float = 4.0
    critical_radius_km: float | None = None

    def __post_init__(self) -> None:
        for name in _POSITIVE:
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value > 0):
                raise ValueError(f"Air.{name}: expected a positive finite number, got {value!r}")
        if not 0 <= self.cloud_fraction <= 1:
            raise ValueError(f"Air.cloud_fraction: expected a number from 0 to 1, got {self.cloud_fraction!r}")
        if not (math.isfinite(self.haze_factor) and self.haze_factor >= 0):
            raise ValueError(f"Air.haze_factor: expected a finite number >= 0, got {self.haze_factor!r}")
        if not math.isfinite(self.haze_slope):
            raise ValueError(f"Air.haze_slope: expected a finite number, got {self.haze_slope!r}")
        ratios = MappingProxyType(dict(self.mixing_ratios))
        if any(not ratio >= 0 for ratio in ratios.values()):
            raise ValueError(f"Air.mixing_ratios: expected numbers >= 0, got {dict(ratios)}")
        if not abs(math.fsum(ratios.values()) - 1) <= 1e-9:
            raise ValueError(f"Air.mixing_ratios: expected a sum of 1, got {math.fsum(ratios.values())!r}")
        object.__setattr__(self, "mixing_ratios", ratios)

    @property
    def scale_height_km(self) -> float:
        """Scale height at the base."""
        return scale_height_km(self.temperature_k, self.molar_mass_g, self.base_gravity_m_per_s2)

    @property
    def base_density_per_cm3(self) -> float:
        """Molecules per cm3 at the base pressure."""
        return self.base_pressure_bar * 1e5 / (BOLTZMANN_J_PER_K * self.temperature_k) * 1e-6

    @property
    def e_folds_to_infinity(self) -> float:
        """Where the radius diverges: R0 / H0. An isothermal column never falls below exp(-R0/H0) of its base."""
        return self.base_radius_km / self.scale_height_km

    def radius_km(self, e_folds: ArrayLike) -> NDArray[np.float64]:
        """Radius at which the pressure is ``exp(-e_folds)`` of that at the base; any shape."""
        return self.base_radius_km / (1 - np.asarray(e_folds) / self.e_folds_to_infinity)

    def check_held(self, e_folds: float) -> None:
        """Refuse a column that matters as high as this, if that is beyond four times the base radius.

        Raises
        ------
        RangeError
        """
        if e_folds > HIGHEST_TOP * self.e_folds_to_infinity:
            raise RangeError(
                f"air of {self.temperature_k:g} K and {self.molar_mass_g:g} g/mol under "
                f"{self.base_gravity_m_per_s2:.4g} m/s2: expected air that the planet can hold, got a column that "
                "reaches beyond four times the base radius; choose a lower temperature, a heavier gas or a larger mass"
            )

    def e_folds_at_pressure(self, pressure_bar: float) -> float:
        """E-folds of pressure between the base and this pressure; negative below the base."""
        return math.log(self.base_pressure_bar / pressure_bar)

    def e_folds_at_radius(self, radius_km: float) -> float:
        """E-folds of pressure between the base and this radius; negative below the base."""
        return self.e_folds_to_infinity * (1 - self.base_radius_km / radius_km)

    def haze_cross_section_cm2(self, wavenumber_per_cm: NDArray[np.float64]) -> NDArray[np.float64]:
        """Haze per molecule of air, shape as the wavenumbers."""
        relative = np.asarray(wavenumber_per_cm, dtype=np.float64) / 1e4
        return self.haze_factor * N2_RAYLEIGH_AT_1_UM_CM2 * relative**self.haze_slope
