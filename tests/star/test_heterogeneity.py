"""Spots and faculae outside the transit chord."""

from __future__ import annotations

import numpy as np
import pytest

from planner.star import (
    Region,
    contamination_factor,
    disc_factor,
    region_contrast,
    usual_faculae,
    usual_spot_temperature_k,
    usual_spots,
)
from planner.star.model import blackbody_photons, package_table

GRID_UM = np.geomspace(0.6, 12.0, 200)


def test_quiet_star_has_no_contamination() -> None:
    """No spots, or spots as bright as the photosphere, change nothing."""
    assert contamination_factor(0.0, 0.0, 0.3, 1.2) == 1.0
    assert contamination_factor(0.2, 0.1, 1.0, 1.0) == 1.0


def test_factor_is_disc_over_chord_brightness() -> None:
    """Half of a disc dark: the planet hides twice the share of the light."""
    assert contamination_factor(0.5, 0.0, 0.0, 1.0) == pytest.approx(2.0)
    assert contamination_factor(0.0, 0.5, 1.0, np.array([2.0, 3.0])) == pytest.approx([1 / 1.5, 1 / 2.0])


@pytest.mark.parametrize(("spots", "faculae"), [(-0.1, 0.0), (0.0, -0.1), (0.6, 0.5)])
def test_contamination_invalid(spots: float, faculae: float) -> None:
    """Shares below zero or above the whole disc are refused."""
    with pytest.raises(ValueError, match="expected each from 0 and at most 1 together"):
        contamination_factor(spots, faculae, 0.5, 1.1)


@pytest.mark.parametrize("kind", ["spots", "faculae"])
def test_contrast_gives_back_its_table(kind: str) -> None:
    """At the tabulated pairs and band centres the contrast is the tabulated one."""
    table = package_table("contrasts.toml")
    centre_um = np.array(table["bands_um"], dtype=float).mean(axis=1)
    for photosphere_k, region_k, *contrast in table[kind]:
        assert region_contrast(photosphere_k, region_k, centre_um) == pytest.approx(contrast, rel=1e-12)


def test_contrast_of_equal_temperatures_is_one() -> None:
    """A region like the photosphere cannot be seen, and nearby temperatures differ little."""
    assert region_contrast(3100.0, 3100.0, GRID_UM) == pytest.approx(1.0)
    assert region_contrast(3100.0, 3099.0, GRID_UM) == pytest.approx(1.0, abs=5e-3)


def test_contrast_of_hot_stars_is_that_of_blackbodies() -> None:
    """From 6000 K up."""
    expected = blackbody_photons(GRID_UM, 5000.0) / blackbody_photons(GRID_UM, 6200.0)
    assert region_contrast(6200.0, 5000.0, GRID_UM) == pytest.approx(expected, rel=1e-12)


def test_cooler_spots_are_darker() -> None:
    """At every wavelength, down to 0.7 of the photosphere."""
    contrast = [region_contrast(3000.0, k, GRID_UM) for k in (2100.0, 2400.0, 2700.0, 2900.0, 3100.0, 3400.0)]
    assert np.all(np.diff(contrast, axis=0) > 0)


def test_usual_spot_temperature() -> None:
    """0.86 of an M dwarf's, the other relation for warmer stars, without a jump."""
    assert usual_spot_temperature_k(3000.0) == pytest.approx(2580.0)
    assert usual_spot_temperature_k(5250.0) == pytest.approx(3814.5)
    assert usual_spot_temperature_k(3665.0) == pytest.approx(usual_spot_temperature_k(3666.0), abs=1.0)


def test_usual_regions_by_type() -> None:
    """TRAPPIST-1 as published at its own temperature; fewer spots on warmer stars; held beyond the table."""
    assert (usual_spots(2566.0).fraction, usual_faculae(2566.0).fraction) == (0.08, 0.54)
    assert usual_spots(2000.0).fraction == 0.08
    assert usual_spots(3060.0).fraction > usual_spots(4440.0).fraction > usual_spots(6000.0).fraction == 0.006
    assert usual_spots(5250.0).temperature_error_k == 300.0
    assert usual_spots(2650.0).temperature_error_k == pytest.approx(0.07 * 2650.0)
    assert usual_faculae(2650.0).temperature_k == 2750.0


def test_disc_with_both_regions() -> None:
    """The factor is that of the published formula with the contrasts of both regions; nothing there is a factor 1."""
    spots, faculae = usual_spots(3000.0), usual_faculae(3000.0)
    expected = contamination_factor(
        spots.fraction,
        faculae.fraction,
        region_contrast(3000.0, spots.temperature_k, GRID_UM),
        region_contrast(3000.0, faculae.temperature_k, GRID_UM),
    )
    assert np.array_equal(disc_factor(3000.0, spots, faculae, GRID_UM), expected)
    assert np.array_equal(disc_factor(3000.0, None, None, GRID_UM), np.ones(200))
    assert np.all(disc_factor(3000.0, spots, None, GRID_UM) > 1)
    assert np.all(disc_factor(3000.0, None, faculae, GRID_UM) < 1)


def test_region_without_contrast_changes_nothing() -> None:
    """A region like the photosphere is not seen."""
    same = Region(temperature_k=3000.0, temperature_error_k=0.0, fraction=0.5, fraction_error=0.0)
    assert disc_factor(3000.0, same, None, GRID_UM) == pytest.approx(1.0)
