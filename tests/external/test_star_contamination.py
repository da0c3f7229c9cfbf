"""Spots and faculae of whole stars against published statements on real ones."""

from __future__ import annotations

import numpy as np
import pytest

from planner.star import Region, contamination_factor, disc_factor, usual_faculae, usual_spots

BANDS_UM = np.linspace(0.8, 5.0, 200)


def test_trappist_1_contaminates_more_than_its_planets_show():
    """Signals of the star 1 to 15 times those of the planets (Rackham, Apai & Giampapa 2018, ApJ 853, 122, read).

    Spots 8 %, faculae 54 % of the disc (read there). Features of a planet like e: 0.5 % deep, 80 ppm for five scale
    heights of N2 air (16 ppm each, closed form with Agol et al. 2021). The paper's range goes over all planets and
    wavelengths, so only the range itself is asked for.
    """
    spots, faculae = usual_spots(2566.0), usual_faculae(2566.0)
    assert (spots.fraction, faculae.fraction) == (0.08, 0.54)
    bias_ppm = 5000 * (disc_factor(2566.0, spots, faculae, BANDS_UM) - 1)
    assert 1 < np.ptp(bias_ppm) / 80 < 15


def test_typical_sun_like_star_makes_no_water():
    """No molecular features from typically active F and G stars (Rackham et al. 2019, AJ 157, 96, read).

    Asked for as less than 10 ppm on a depth of 1 % between the water band at 1.4 um and the window at 1.25 um: the
    precision of a good spectrum of one transit.
    """
    spots, faculae = usual_spots(5770.0), usual_faculae(5770.0)
    band, window = disc_factor(5770.0, spots, faculae, np.array([1.4, 1.25]))
    assert abs(1e6 * 0.01 * (band - window)) < 10


def test_spots_alone_feign_water_on_a_cool_dwarf():
    """Cool spots that are not crossed deepen the transit in water bands (same paper as the first, read): positive."""
    spots = usual_spots(3000.0)
    band, window = disc_factor(3000.0, spots, None, np.array([1.425, 1.2]))
    assert band > window


@pytest.mark.parametrize(
    ("spots", "contrast", "shift_ppm"), [(0.08, 0.80, 81.3), (0.02, 0.70, 30.2), (0.08, 0.50, 208.3)]
)
def test_worked_shifts_through_a_whole_star(spots, contrast, shift_ppm):
    """A region whose temperature gives the worked contrast at 2 um shifts a depth of 5000 ppm as worked by hand."""
    from scipy import optimize

    from planner.star import region_contrast

    at_um = np.array([2.2])
    kelvin = optimize.brentq(lambda k: region_contrast(3000.0, k, at_um)[0] - contrast, 2000.0, 2999.0)
    region = Region(temperature_k=kelvin, temperature_error_k=0.0, fraction=spots, fraction_error=0.0)
    assert 5000 * (disc_factor(3000.0, region, None, at_um)[0] - 1) == pytest.approx(shift_ppm, abs=0.06)
    assert contamination_factor(spots, 0.0, contrast, 1.0) == pytest.approx(1 + shift_ppm / 5000, abs=2e-5)
