"""Zero points, and the magnitudes and mid-infrared fluxes of a real late-type star."""

from __future__ import annotations

import numpy as np
import pytest

from planner.star import Star, photon_flux
from planner.star.model import blackbody_photons, solid_angle_factor
from planner.star.photometry import BANDS, band_grid_um, band_mean, catalogue_flux

# TRAPPIST-1: radius and temperature Agol et al. 2021, PSJ 2, 1; 2MASS magnitudes; distance from Gaia.
RADIUS_RSUN, TEMPERATURE_K, DISTANCE_PC = 0.1192, 2566.0, 12.47
CATALOGUE = {"J": 11.354, "H": 10.718, "Ks": 10.296}
PLANCK_J_S = 6.62607015e-34


def trappist(**more: object) -> Star:
    return Star(**{"temperature_k": TEMPERATURE_K, "radius_rsun": RADIUS_RSUN, **more})


def magnitude(band: str, photons_at_grid: np.ndarray) -> float:
    return float(-2.5 * np.log10(band_mean(band_grid_um(band), photons_at_grid) / catalogue_flux(band, 0.0)))


@pytest.mark.parametrize(
    ("band", "jansky", "photons", "tolerance"),
    [
        # Cohen, Wheaton & Megeath 2003, AJ 126, 1090 (from memory); photons from F_lambda at the isophotal wavelength.
        # F_nu and F_lambda of H do not convert into each other better than 2 %.
        ("J", 1594.0, 1.945e10, 0.002),
        ("H", 1024.0, 9.479e9, 0.021),
        ("Ks", 666.7, 4.655e9, 0.002),
        # Jarrett et al. 2011, ApJ 735, 112 (from memory); F_nu and F_lambda agree to 1 to 2 %.
        ("W1", 309.54, None, 0.02),
        ("W2", 171.787, None, 0.02),
        # Bessell, Castelli & Plez 1998, A&A 333, 231, table A2 (from memory); effective wavelengths blur it by 3 %.
        ("V", 3636.0, 9.96e10, 0.03),
        ("R", 3064.0, None, 0.03),
        ("I", 2416.0, None, 0.03),
    ],
)
def test_zero_points(band: str, jansky: float, photons: float | None, tolerance: float) -> None:
    """Photons of magnitude zero against the published frequency flux, F_nu / (h lambda), and worked photon rates."""
    found = catalogue_flux(band, 0.0)
    assert found == pytest.approx(jansky * 1e-26 / (PLANCK_J_S * BANDS[band].centre_um), rel=tolerance)
    if photons is not None:
        assert found == pytest.approx(photons, rel=5e-4)


def test_blackbody_magnitudes() -> None:
    """A blackbody of this star has J, H, Ks of 11.70, 10.92, 10.39 (worked at single wavelengths, hence 0.02)."""
    for band, expected in {"J": 11.70, "H": 10.92, "Ks": 10.39}.items():
        grid = band_grid_um(band)
        photons = blackbody_photons(grid, TEMPERATURE_K) * solid_angle_factor(RADIUS_RSUN, DISTANCE_PC)
        assert magnitude(band, photons) == pytest.approx(expected, abs=0.02)


def test_model_magnitudes_against_the_grid_itself() -> None:
    """The full model spectrum has 11.20, 10.62, 10.34; straight lines between band means cost up to 0.04 mag."""
    for band, expected in {"J": 11.20, "H": 10.62, "Ks": 10.34}.items():
        photons = photon_flux(trappist(distance_pc=DISTANCE_PC), band_grid_um(band))
        assert magnitude(band, photons) == pytest.approx(expected, abs=0.04)


def test_model_magnitudes_against_the_catalogue() -> None:
    """2MASS: 11.354, 10.718, 10.296. The model is known to err by up to 15 % in a band, 0.16 mag."""
    for band, expected in CATALOGUE.items():
        photons = photon_flux(trappist(distance_pc=DISTANCE_PC), band_grid_um(band))
        assert magnitude(band, photons) == pytest.approx(expected, abs=0.16)


@pytest.mark.parametrize(
    ("centre_um", "width_um", "model_mjy", "measured_mjy", "blackbody_mjy"),
    [(12.8, 2.47, 3.51, 3.40, 5.11), (15.0, 2.92, 2.60, 2.56, 3.86)],
)
def test_mid_infrared_fluxes(
    centre_um: float, width_um: float, model_mjy: float, measured_mjy: float, blackbody_mjy: float
) -> None:
    """Measured: Greene et al. 2023 and Ducrot et al. 2024, from memory, +/- 4 %; the model errs by 5 %.

    Means over box filters in frequency, widths from memory. Both lie beyond the last band, whose ratio is held; the
    full model is met to 6 %.
    """
    grid_um = np.linspace(centre_um - width_um / 2, centre_um + width_um / 2, 501)

    def mean_mjy(photons: np.ndarray) -> float:
        # F_nu is photons times h lambda; dnu goes as dlambda / lambda^2
        f_nu_mjy = photons * PLANCK_J_S * grid_um * 1e29
        return float(np.trapezoid(f_nu_mjy / grid_um**2, grid_um) / np.trapezoid(1 / grid_um**2, grid_um))

    blackbody = blackbody_photons(grid_um, TEMPERATURE_K) * solid_angle_factor(RADIUS_RSUN, DISTANCE_PC)
    assert mean_mjy(blackbody) == pytest.approx(blackbody_mjy, rel=0.003)
    by_distance = mean_mjy(photon_flux(trappist(distance_pc=DISTANCE_PC), grid_um))
    assert by_distance == pytest.approx(model_mjy, rel=0.06)
    assert by_distance == pytest.approx(measured_mjy, rel=0.09)


@pytest.mark.parametrize(
    ("temperature_k", "correction_ks", "correction_j"),
    [(2600.0, 3.01, 2.14), (2800.0, 2.92, 2.06), (3000.0, 2.83, 2.00), (3500.0, 2.61, 1.78), (4000.0, 2.43, 1.61)],
)
def test_bolometric_corrections(temperature_k: float, correction_ks: float, correction_j: float) -> None:
    """BC of the BT-Settl grid (log g 5.0, bolometric magnitude of the Sun 4.74), to 0.05 mag.

    Empirically BC_Ks is about 2.6 to 2.85 from 3800 to 3000 K (Mann et al. 2015, ApJ 804, 64, from memory).
    """
    star = Star(temperature_k=temperature_k, radius_rsun=1.0, distance_pc=10.0)
    bolometric = 4.74 - 10 * np.log10(temperature_k / 5772.0)
    for band, expected in (("Ks", correction_ks), ("J", correction_j)):
        assert bolometric - magnitude(band, photon_flux(star, band_grid_um(band))) == pytest.approx(expected, abs=0.05)


def test_anchors_meet_the_catalogue_magnitudes() -> None:
    """Scaled to the catalogue, the star has its catalogue magnitudes in all three bands.

    H rules over 1.6 to 1.7 um only, and the joins to J and Ks, whose scales are 5 % lower and 13 % higher, reach
    over half of its box: up to 0.02 mag there.
    """
    star = trappist(magnitudes=CATALOGUE)
    for band, expected in CATALOGUE.items():
        assert magnitude(band, photon_flux(star, band_grid_um(band))) == pytest.approx(expected, abs=0.02)


def test_blackbody_misjudges_late_stars() -> None:
    """At 2566 K a blackbody gives 1.5 times too few photons at 1.0 to 1.3 um and 1.6 times too many at 4.4 to 8.5 um.

    Band means of BT-Settl models (Allard et al. 2012; Baraffe et al. 2015), worked apart from this project, to 10 %.
    """
    for low_um, high_um, expected in ((1.0, 1.3, 1.5), (4.4, 8.5, 1 / 1.6)):
        grid_um = np.linspace(low_um, high_um, 500)
        blackbody = blackbody_photons(grid_um, TEMPERATURE_K) * solid_angle_factor(RADIUS_RSUN, DISTANCE_PC)
        model = photon_flux(trappist(distance_pc=DISTANCE_PC), grid_um)
        assert band_mean(grid_um, model) / band_mean(grid_um, blackbody) == pytest.approx(expected, rel=0.1)
