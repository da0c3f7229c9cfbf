"""The water continuum against a later tabulation and a laser measurement."""

from __future__ import annotations

import tomllib

import numpy as np
import pytest

from planner.spectroscopy.watercontinuum import water_continuum

REFERENCE_PER_CM3 = 2.4788e19


def tabulated(folder, wavenumber, temperature_k):
    """Self and foreign coefficients (cm5) of the reference folder's table, Mlawer et al. 2012; for checks only."""
    bands = tomllib.loads((folder / "constants" / "h2o_continuum_check.toml").read_text())["h2o_continuum"]
    (band,) = [b for b in bands if b["range"][0] <= wavenumber[0] and wavenumber[-1] <= b["range"][1]]
    radiation = wavenumber * np.tanh(1.438777 * wavenumber / (2.0 * temperature_k)) / REFERENCE_PER_CM3
    own, foreign, power = (np.interp(wavenumber, band["nu"], band[key]) for key in ("log10Cs", "log10Cf", "texp"))
    return radiation * 10.0**own * (296.0 / temperature_k) ** power, radiation * 10.0**foreign


@pytest.mark.parametrize("temperature_k", [260.0, 296.0, 340.0])
def test_self_part_at_10_um(reference_folder, temperature_k):
    """Within a factor 2.2 at 350 to 1250 1/cm: the stated quality of the law."""
    wavenumber = np.arange(350.0, 1251.0, 10.0)
    theirs, _ = tabulated(reference_folder, wavenumber, temperature_k)
    ratio = water_continuum(wavenumber, temperature_k)[0] / theirs
    print(f"self, 10 um, {temperature_k:g} K: {ratio.min():.2f} to {ratio.max():.2f}")
    assert ratio.min() > 0.75
    assert ratio.max() < 2.2


@pytest.mark.parametrize("temperature_k", [260.0, 296.0, 340.0])
def test_self_part_at_4_um(reference_folder, temperature_k):
    """Two to three times too small at 2400 to 2700 1/cm, as the module says."""
    wavenumber = np.arange(2400.0, 2701.0, 10.0)
    theirs, _ = tabulated(reference_folder, wavenumber, temperature_k)
    ratio = water_continuum(wavenumber, temperature_k)[0] / theirs
    print(f"self, 4 um, {temperature_k:g} K: {ratio.min():.2f} to {ratio.max():.2f}")
    assert ratio.min() > 0.3
    assert ratio.max() < 0.7


@pytest.mark.parametrize("temperature_k", [260.0, 296.0, 340.0])
def test_foreign_part_at_10_um(reference_folder, temperature_k):
    """Within a factor 2.5 at 700 to 1200 1/cm: the stated quality of the law."""
    wavenumber = np.arange(700.0, 1201.0, 10.0)
    _, theirs = tabulated(reference_folder, wavenumber, temperature_k)
    ratio = water_continuum(wavenumber, temperature_k)[1] / theirs
    print(f"foreign, 10 um, {temperature_k:g} K: {ratio.min():.2f} to {ratio.max():.2f}")
    assert ratio.min() > 0.4
    assert ratio.max() < 2.5


def test_at_the_carbon_dioxide_laser():
    """About 2.2e-22 cm2 per molecule and atm near 944 1/cm at 296 K (laser measurements, from memory); 25 %."""
    per_atm = water_continuum(944.2, 296.0)[0][0] * 1.01325e6 / (1.380649e-16 * 296.0)
    assert per_atm == pytest.approx(2.2e-22, rel=0.25)
