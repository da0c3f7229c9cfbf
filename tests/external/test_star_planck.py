"""Planck's law against astropy's model and closed-form values."""

from __future__ import annotations

import astropy.units as u
import numpy as np
import pytest
from astropy.constants import sigma_sb
from astropy.modeling.models import BlackBody

from planner.star.model import blackbody_photons, solid_angle_factor


@pytest.mark.parametrize("temperature_k", [600.0, 2566.0, 5772.0, 9000.0])
def test_against_astropy(temperature_k: float) -> None:
    """astropy.modeling's BlackBody, times pi, in photons."""
    wavelength = np.geomspace(0.3, 30.0, 300) * u.um
    surface = BlackBody(temperature=temperature_k * u.K)(wavelength) * np.pi * u.sr
    photons = surface.to("photon / (s m2 um)", u.spectral_density(wavelength)).value
    assert blackbody_photons(wavelength.value, temperature_k) == pytest.approx(photons, rel=1e-9)


@pytest.mark.parametrize(
    ("wavelength_um", "temperature_k", "radiance_w_per_m2_sr_um"), [(10.0, 300.0, 9.92403), (1.0, 5772.0, 1.07362e7)]
)
def test_worked_values(wavelength_um: float, temperature_k: float, radiance_w_per_m2_sr_um: float) -> None:
    """B_lambda by hand with CODATA constants, to the six digits worked out."""
    photon_energy_j = 6.62607015e-34 * 299792458 / (wavelength_um * 1e-6)
    radiance = blackbody_photons(np.array([wavelength_um]), temperature_k)[0] * photon_energy_j / np.pi
    assert radiance == pytest.approx(radiance_w_per_m2_sr_um, rel=1e-5)


def test_stefan_boltzmann() -> None:
    """The energy of all photons is sigma T^4; the range of the sum leaves out 2e-6 of it."""
    wavelength_um = np.geomspace(0.1, 2000.0, 20001)
    energy_j = 6.62607015e-34 * 299792458 / (wavelength_um * 1e-6)
    total = np.trapezoid(blackbody_photons(wavelength_um, 3000.0) * energy_j, wavelength_um)
    assert total == pytest.approx(sigma_sb.value * 3000.0**4, rel=1e-5)


def test_sun_at_one_astronomical_unit() -> None:
    """sigma T^4 (R/d)^2 of the nominal Sun is the solar constant of IAU 2015 resolution B3, 1361 W m-2."""
    distance_pc = (1 * u.au).to_value(u.pc)
    assert sigma_sb.value * 5772.0**4 * solid_angle_factor(1.0, distance_pc) == pytest.approx(1361.0, rel=5e-4)
