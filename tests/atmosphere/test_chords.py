"""Weights of the two integrals of a transit depth."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import exp1

from planner.atmosphere.chords import chords_through, height_rule, row_weights

ROWS = 10.0 ** np.linspace(-6, 1, 22)


@pytest.mark.parametrize(("power", "tolerance"), [(1, 1e-5), (2, 3e-4)])
def test_height_rule_at_any_cut(power, tolerance):
    """1 - exp(-tau0 exp(-n u)) integrates to (gamma + ln tau0 + E1(tau0))/n wherever the bottom lies."""
    tau0 = np.geomspace(0.01, 1e6, 400)
    u, weight = height_rule(0.0, 30.0)
    height = -np.expm1(-tau0[:, None] * np.exp(-power * u)) @ weight
    np.testing.assert_allclose(height, (np.euler_gamma + np.log(tau0) + exp1(tau0)) / power, atol=tolerance)


def test_column_against_adaptive_quadrature(make_air):
    """Column and squared column of chords at several heights, light air included."""
    for air in (make_air(), make_air(molar_mass_g=4.0)):
        chords = chords_through(air, bottom=0.0, top=20.0)
        columns, squared = chords.columns_per_cm2(), chords.squared_columns_per_cm5()
        for i in (0, 17, -1):
            b = float(air.radius_km(chords.e_folds[i]))

            def density(x, power, b=b, air=air):
                e_folds = air.e_folds_at_radius(np.hypot(x, b))
                return (air.base_density_per_cm3 * np.exp(-e_folds)) ** power

            reach = 12 * np.sqrt(b * air.scale_height_km * (b / air.base_radius_km) ** 2)
            for found, power, tolerance in ((columns[i], 1, 1e-6), (squared[i], 2, 1e-6)):
                expected = 2e5 * quad(density, 0, reach, (power,), epsrel=1e-10, limit=200)[0]
                assert found == pytest.approx(expected, rel=tolerance)


@pytest.mark.parametrize("rows", [ROWS, ROWS[::4], np.r_[1e-9, ROWS], ROWS[[0, 5, 6, 7, 21]], ROWS[-2:], ROWS[-1:]])
def test_row_weights_add_to_the_column(make_air, rows):
    """A cross-section that does not vary gets the whole column, however the rows lie."""
    chords = chords_through(make_air(), bottom=0.0, top=24.0)
    weights = row_weights(chords, rows)
    np.testing.assert_allclose(weights.sum(axis=1), chords.columns_per_cm2(), rtol=1e-9)


@pytest.mark.parametrize("rows", [ROWS, np.r_[1e-9, ROWS], ROWS[::2], ROWS[-3:]])
def test_row_weights_exact_for_cores_and_wings(make_air, rows):
    """Doppler cores, Lorentz wings and Lorentz cores (1, P, 1/P) are carried exactly between the rows."""
    air = make_air()
    chords = chords_through(air, bottom=0.0, top=24.0)
    weights = row_weights(chords, rows)
    pressure = np.maximum(np.exp(chords.ln_pressure_bar), rows[0])
    for shape in (lambda p: 1 + 3 * p, lambda p: p, lambda p: 2 + 1 / p):
        if np.any(np.diff(np.log(rows)) > 1.3) and shape(1.0) == 3:
            continue  # across a wide gap only 1 and P are exact
        direct = (chords.column_per_cm2 * shape(pressure)).sum(axis=1)
        np.testing.assert_allclose(weights @ shape(rows), direct, rtol=1e-8)


def test_no_overshoot_across_a_gap(make_air):
    """Between rows decades apart each is weighted as a share, not against the other."""
    chords = chords_through(make_air(), bottom=np.log(1e8), top=np.log(1e9))
    weights = row_weights(chords, np.r_[1e-9, ROWS])
    assert np.all(weights >= -1e-12 * chords.columns_per_cm2()[:, None])


def test_added_rows_change_nothing(make_air):
    """Splitting the tabulated intervals of a table that follows 1 and P leaves every chord as it was."""
    chords = chords_through(make_air(), bottom=0.0, top=24.0)
    fine = np.unique(np.r_[ROWS, np.sqrt(ROWS[1:] * ROWS[:-1])])
    coarse_depth, fine_depth = (row_weights(chords, rows) @ (1 + 5 * rows) for rows in (ROWS, fine))
    np.testing.assert_allclose(coarse_depth, fine_depth, rtol=1e-8)


def test_deck_cuts_the_rule(make_air):
    """Under a partial deck the opaque area and the ring weights are those of the two columns, mixed."""
    air = make_air(cloud_top_bar=0.03, cloud_fraction=0.4)
    deck = air.e_folds_at_pressure(0.03)
    chords = chords_through(air, bottom=0.0, top=20.0)
    below, above = air.radius_km(np.array([0.0, deck])) ** 2
    assert chords.opaque_area_km2 == pytest.approx(0.6 * below + 0.4 * above)
    opaque = chords.e_folds < deck
    assert chords.area_weight_km2[opaque].sum() == pytest.approx(0.6 * (above - below), rel=1e-9)


def test_closed_deck_is_the_bottom(make_air):
    """A deck that covers all is where the column starts; one below the bottom does nothing."""
    closed = chords_through(make_air(cloud_top_bar=0.03), bottom=0.0, top=20.0)
    assert closed.e_folds[0] == pytest.approx(-np.log(0.03))
    sunken = chords_through(make_air(cloud_top_bar=5.0, cloud_fraction=0.5), bottom=0.0, top=20.0)
    clear = chords_through(make_air(), bottom=0.0, top=20.0)
    np.testing.assert_array_equal(sunken.area_weight_km2, clear.area_weight_km2)
    assert sunken.opaque_area_km2 == pytest.approx(clear.opaque_area_km2)
