"""Photons of a star at Earth: scaling, joins, limits of the built-in spectrum."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import RangeError, ScenarioError
from planner.star import Star, StarSpectrum, magnitude_scales, photon_flux, star_cautions
from planner.star.model import blackbody_photons, late_type_ratio, solid_angle_factor
from planner.star.photometry import BANDS, band_edges_um, band_grid_um, band_mean, catalogue_flux, join_scales

GRID_UM = np.geomspace(0.6, 12.0, 400)


def late_star(**more: object) -> Star:
    """An invented late dwarf."""
    return Star(**{"temperature_k": 2900.0, "radius_rsun": 0.15, **more})


def flat_spectrum(*, at_earth: bool) -> StarSpectrum:
    """The same photons at every wavelength."""
    return StarSpectrum(wavelength_um=[0.3, 20.0], photons_per_s_m2_um=[4e6, 4e6], at_earth=at_earth)


@pytest.mark.parametrize("band", BANDS)
def test_one_magnitude_is_given_back(band: str) -> None:
    """A star scaled to one magnitude has that magnitude, in any band."""
    star = late_star(magnitudes={band: 9.3})
    grid = band_grid_um(band)
    assert band_mean(grid, photon_flux(star, grid)) == pytest.approx(catalogue_flux(band, 9.3), rel=1e-9)


def test_two_magnitudes_are_given_back() -> None:
    """J and Ks lie within the stretches they rule, so that both are met at once."""
    star = late_star(magnitudes={"Ks": 8.0, "J": 9.1})
    for band, magnitude in star.magnitudes.items():
        grid = band_grid_um(band)
        assert band_mean(grid, photon_flux(star, grid)) == pytest.approx(catalogue_flux(band, magnitude), rel=1e-9)


def test_join_holds_and_is_smooth() -> None:
    """The scale is J's below 1.5 um and Ks's above 1.8 um, and nowhere jumps or overshoots."""
    scale = join_scales({"J": 2.0, "Ks": 3.0}, GRID_UM)
    assert np.all(scale[GRID_UM < 1.5] == 2.0)
    assert scale[GRID_UM > 1.8] == pytest.approx(3.0)
    fine = join_scales({"J": 2.0, "Ks": 3.0}, np.linspace(1.4, 1.9, 5001))
    assert np.all(np.diff(fine) >= -1e-12)
    assert np.diff(fine).max() < 1e-3


def test_bands_are_in_order_and_their_stretches_apart() -> None:
    """The join needs stretches that ascend and do not overlap."""
    ends = [end for band in BANDS.values() for end in band.anchors_um]
    assert ends == sorted(ends)


def test_distance_only_without_magnitudes() -> None:
    """The distance sets the scale alone, and is not looked at beside a magnitude."""
    near, far = late_star(distance_pc=5.0), late_star(distance_pc=10.0)
    assert photon_flux(near, GRID_UM) == pytest.approx(4 * photon_flux(far, GRID_UM))
    near, far = (late_star(distance_pc=d, magnitudes={"J": 10.0}) for d in (5.0, 10.0))
    assert np.array_equal(photon_flux(near, GRID_UM), photon_flux(far, GRID_UM))


def test_neither_magnitude_nor_distance_is_refused() -> None:
    """Nothing would set the scale."""
    with pytest.raises(ScenarioError, match="a magnitude such as J or Ks, or a distance, got neither"):
        photon_flux(late_star(), GRID_UM)


def test_hot_star_is_a_blackbody() -> None:
    """From 6000 K up the ratio is one everywhere."""
    assert np.all(late_type_ratio(GRID_UM, 6000.0) == 1.0)
    assert np.all(late_type_ratio(GRID_UM, 9000.0) == 1.0)
    star = Star(temperature_k=6500.0, radius_rsun=1.3, distance_pc=100.0)
    expected = blackbody_photons(GRID_UM, 6500.0) * solid_angle_factor(1.3, 100.0)
    assert photon_flux(star, GRID_UM) == pytest.approx(expected, rel=1e-12)


def test_ratio_is_held_at_its_ends() -> None:
    """Below the coolest column, and beyond the first and last band, nothing is extrapolated."""
    assert np.array_equal(late_type_ratio(GRID_UM, 2000.0), late_type_ratio(GRID_UM, 2566.0))
    assert late_type_ratio(np.array([0.3]), 3000.0) == late_type_ratio(np.array([0.625]), 3000.0)
    assert late_type_ratio(np.array([28.0]), 3000.0) == late_type_ratio(np.array([11.75]), 3000.0)


def test_ratio_between_columns_is_linear() -> None:
    """Half way between two columns lies half way between their values, also on the way to 6000 K."""
    for low, high in ((3000.0, 3500.0), (4000.0, 6000.0)):
        middle = late_type_ratio(GRID_UM, (low + high) / 2)
        assert middle == pytest.approx((late_type_ratio(GRID_UM, low) + late_type_ratio(GRID_UM, high)) / 2)


@settings(max_examples=30, derandomize=True, deadline=None)
@given(st.floats(1500, 12000), st.floats(0.3, 28.0))
def test_flux_is_positive_and_finite(temperature_k: float, wavelength_um: float) -> None:
    """No temperature or wavelength of interest gives zero, infinity or a negative flux."""
    star = Star(temperature_k=temperature_k, radius_rsun=1.0, distance_pc=10.0)
    flux = photon_flux(star, np.array([wavelength_um]))[0]
    assert np.isfinite(flux)
    assert flux > 0


def test_own_spectrum_as_at_earth_is_taken_as_it_stands() -> None:
    """Neither magnitudes nor the distance touch it."""
    star = late_star(spectrum=flat_spectrum(at_earth=True), magnitudes={"J": 3.0}, distance_pc=1.0)
    assert photon_flux(star, GRID_UM) == pytest.approx(4e6)


def test_own_spectrum_is_scaled_to_the_magnitude() -> None:
    """Its level does not matter then, only its shape."""
    star = late_star(spectrum=flat_spectrum(at_earth=False), magnitudes={"Ks": 7.0})
    assert photon_flux(star, GRID_UM) == pytest.approx(catalogue_flux("Ks", 7.0))


def test_own_spectrum_at_the_surface_is_diluted() -> None:
    """Without a magnitude the flux at the surface falls with (R/d)^2."""
    star = late_star(spectrum=flat_spectrum(at_earth=False), distance_pc=12.0)
    assert photon_flux(star, GRID_UM) == pytest.approx(4e6 * solid_angle_factor(0.15, 12.0))


def test_own_spectrum_must_cover_what_is_asked() -> None:
    """Wavelengths and bands beyond its ends are refused with both ranges named."""
    short = StarSpectrum(wavelength_um=[0.6, 2.0], photons_per_s_m2_um=[1.0, 1.0], at_earth=False)
    with pytest.raises(RangeError, match=r"star\.spectrum: .*cover 0\.6 to 12 um, got 0\.6 to 2 um"):
        photon_flux(late_star(spectrum=short, distance_pc=5.0), GRID_UM)
    with pytest.raises(RangeError, match=r"star\.magnitudes\.Ks: .*2\.028 to 2\.29 um"):
        photon_flux(late_star(spectrum=short, magnitudes={"Ks": 8.0}), np.array([1.0]))


def test_own_spectrum_narrower_than_band_samples_is_integrated_whole() -> None:
    """A spike between the samples of the band counts with its full area."""
    low, high = band_edges_um("J")
    x = np.array([0.5, 1.23456, 1.234561, 1.234562, 5.0])
    spike = StarSpectrum(wavelength_um=x, photons_per_s_m2_um=[1.0, 1.0, 1e6 + 1, 1.0, 1.0], at_earth=False)
    mean = catalogue_flux("J", 10.0) / magnitude_scales(late_star(spectrum=spike, magnitudes={"J": 10.0}))["J"]
    assert mean == pytest.approx(1.0 + 1e6 * 1e-6 / (high - low), rel=1e-6)


def test_dark_band_is_refused() -> None:
    """A band without light cannot be scaled to a magnitude."""
    dark = StarSpectrum(wavelength_um=[0.3, 2.5, 2.6, 6.0], photons_per_s_m2_um=[0, 0, 1, 1], at_earth=False)
    with pytest.raises(ScenarioError, match="expected light in this band"):
        photon_flux(late_star(spectrum=dark, magnitudes={"J": 8.0}), np.array([3.0]))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"temperature_k": 0.0}, r"star\.temperature_k: expected a finite number greater than zero, got 0"),
        ({"radius_rsun": float("nan")}, r"star\.radius_rsun: .*got nan"),
        ({"distance_pc": -3.0}, r"star\.distance_pc"),
        ({"magnitudes": {"KS": 9.0}}, r'out of U, B, V, .* got "KS"; did you mean "Ks"\?'),
        ({"magnitudes": {"J": float("inf")}}, r"star\.magnitudes\.J: expected a finite magnitude, got inf"),
    ],
)
def test_star_invalid(change: dict[str, object], message: str) -> None:
    """Bad numbers and bands are named when the record is made."""
    with pytest.raises(ScenarioError, match=message):
        late_star(**change)


def test_surface_gravity() -> None:
    """The Sun's is 4.438; a given one is kept."""
    assert Star(temperature_k=5772, radius_rsun=1, mass_msun=1).surface_log_g == pytest.approx(4.438)
    assert late_star(log_g=5.1, mass_msun=0.1).surface_log_g == 5.1
    assert late_star().surface_log_g is None


def test_cautions() -> None:
    """Each weak point of the flux has its sentence, and a sound case has none."""
    assert star_cautions(late_star(magnitudes={"J": 9.0}), 1.0, 5.0) == ()
    assert "20 to 40 %" in star_cautions(late_star(), 0.6, 5.0)[0]
    assert "held below" in star_cautions(late_star(temperature_k=2300.0), 1.0, 5.0)[0]
    assert "above 12.3 um" in star_cautions(late_star(), 5.0, 14.0)[0]
    assert "log g is 2.00" in star_cautions(late_star(log_g=2.0), 1.0, 5.0)[0]
    assert "give a W1 or W2" in star_cautions(late_star(temperature_k=5800.0), 1.0, 5.0)[0]
    assert "J and Ks disagree" in star_cautions(late_star(magnitudes={"J": 7.0, "Ks": 8.0}), 1.0, 5.0)[0]
