"""Contamination by unocculted spots against worked values of Rackham, Apai & Giampapa 2018, ApJ 853, 122."""

from __future__ import annotations

import numpy as np
import pytest

from planner.star import contamination_factor, region_contrast
from planner.star.model import blackbody_photons


@pytest.mark.parametrize(
    ("spots", "spot_contrast", "faculae", "facula_contrast", "factor", "shift_ppm"),
    [
        (0.01, 0.80, 0.0, 1.0, 1.002004, 10.0),
        (0.02, 0.70, 0.0, 1.0, 1.006036, 30.2),
        (0.08, 0.80, 0.0, 1.0, 1.016260, 81.3),
        (0.08, 0.50, 0.0, 1.0, 1.041667, 208.3),
        (0.10, 0.90, 0.0, 1.0, 1.010101, 50.5),
        (0.08, 0.80, 0.54, 1.05, 0.989120, -54.4),
    ],
)
def test_worked_values(
    spots: float, spot_contrast: float, faculae: float, facula_contrast: float, factor: float, shift_ppm: float
) -> None:
    """The published formula worked by hand; shifts are those of a depth of 5000 ppm."""
    found = contamination_factor(spots, faculae, spot_contrast, facula_contrast)
    assert found == pytest.approx(factor, abs=5e-7)
    assert 5000 * (found - 1) == pytest.approx(shift_ppm, abs=0.06)


# Band means of blackbody contrasts, worked from Planck's law independently of this project.
BANDS_UM = [(0.6, 0.7), (0.7, 0.8), (0.8, 0.9), (0.9, 1), (1, 1.1), (1.1, 1.3), (1.35, 1.5), (1.5, 1.8)]
BANDS_UM += [(1.8, 2), (2, 2.4), (2.5, 3), (3, 4), (4, 5), (5, 8), (8, 12)]
BLACKBODIES = {
    (2600, 2300): [0.33, 0.38, 0.43, 0.47, 0.50, 0.55, 0.60, 0.64, 0.67, 0.70, 0.74, 0.77, 0.80, 0.83, 0.85],
    (4000, 3400): [0.38, 0.43, 0.47, 0.51, 0.54, 0.58, 0.62, 0.65, 0.68, 0.71, 0.74, 0.76, 0.78, 0.80, 0.82],
    (3000, 3100): [1.27, 1.23, 1.20, 1.18, 1.16, 1.14, 1.12, 1.11, 1.09, 1.08, 1.07, 1.06, 1.05, 1.05, 1.04],
}


@pytest.mark.parametrize("pair", BLACKBODIES)
def test_blackbody_contrasts(pair: tuple[int, int]) -> None:
    """To the half unit of the last digit given, and a little for rounding at the boundary."""
    for (low, high), expected in zip(BANDS_UM, BLACKBODIES[pair], strict=True):
        grid = np.linspace(low, high, 101)
        found = blackbody_photons(grid, pair[1]).mean() / blackbody_photons(grid, pair[0]).mean()
        assert found == pytest.approx(expected, abs=0.007)


def test_spurious_water() -> None:
    """Cool regions are darker than their blackbody in the water bands and brighter at 1.1 to 1.3 um, by 0.07-0.15."""
    water_um, window_um = np.array([1.425, 1.9, 2.75]), np.array([1.2])
    for um, sign in ((water_um, -1), (window_um, 1)):
        model = region_contrast(2600.0, 2300.0, um)
        blackbody = blackbody_photons(um, 2300.0) / blackbody_photons(um, 2600.0)
        assert np.all(sign * (model - blackbody) > 0.06)
        assert np.all(sign * (model - blackbody) < 0.16)
