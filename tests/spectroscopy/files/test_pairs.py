"""Collision files laid over embedded coefficients."""

from __future__ import annotations

import re

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.cia import CollisionTable
from planner.spectroscopy.files.pairs import MeasuredPair

NU = np.linspace(50.0, 350.0, 301)


def block(value, temperature, low=100.0, high=300.0, where="N2-N2_2018.cia:1"):
    wavenumber = np.linspace(low, high, 201)
    values = np.broadcast_to(np.asarray(value, dtype=float), wavenumber.shape).copy()
    return CollisionTable(
        pair=("N2", "N2"), temperature_k=temperature, wavenumber_per_cm=wavenumber, coefficient_cm5=values,
        largest_stated_cm5=float(values.max()), where=where,
    )  # fmt: skip


def inside(values):
    return values[(NU >= 100) & (NU <= 300)]


def outside(values):
    return values[(NU < 100) | (NU > 300)]


def test_replaces_only_what_the_blocks_reach():
    """Between the ends of the blocks the file stands, elsewhere the embedded coefficients."""
    pair = MeasuredPair([block(2e-44, 200.0), block(1e-44, 300.0)])
    values = pair.coefficient_cm5(NU, 300.0, np.full(NU.size, 7e-44))
    np.testing.assert_allclose(inside(values), 1e-44)
    np.testing.assert_array_equal(outside(values), 7e-44)
    assert pair.intervals == ((100.0, 300.0),)


def test_power_laws_are_interpolated_exactly():
    """ln k is linear in ln T: a power law of temperature comes back at any temperature between."""
    pair = MeasuredPair([block(1e-44 * t**-1.7, t) for t in (150.0, 220.0, 330.0)])
    for temperature in (150.0, 187.0, 220.0, 301.0, 330.0):
        values = inside(pair.coefficient_cm5(NU, temperature, np.zeros(NU.size)))
        np.testing.assert_allclose(values, 1e-44 * temperature**-1.7, rtol=1e-12)


def test_zeros_are_interpolated_linearly():
    """Where one block is zero the logarithm does not serve."""
    pair = MeasuredPair([block(0.0, 200.0), block(2e-44, 300.0)])
    np.testing.assert_allclose(inside(pair.coefficient_cm5(NU, 250.0, np.zeros(NU.size))), 1e-44)


@pytest.mark.parametrize(
    ("temperature", "expected"), [(200.0, 3e-44), (170.0, 3e-44), (160.0, 7e-44), (355.0, 1e-44), (365.0, 7e-44)]
)
def test_held_a_little_beyond_its_temperatures_then_embedded(temperature, expected):
    """Up to a factor 1.2 the nearest block holds; beyond, the embedded coefficients stand again."""
    pair = MeasuredPair([block(3e-44, 200.0), block(1e-44, 300.0)])
    np.testing.assert_allclose(inside(pair.coefficient_cm5(NU, temperature, np.full(NU.size, 7e-44))), expected)


def test_held_at_all_temperatures_where_nothing_is_embedded():
    """A file is better than nothing."""
    pair = MeasuredPair([block(3e-44, 200.0)])
    np.testing.assert_allclose(inside(pair.coefficient_cm5(NU, 600.0, np.zeros(NU.size))), 3e-44)


def test_bands_of_one_file_have_their_own_temperatures():
    """Each wavenumber uses the blocks that reach it."""
    pair = MeasuredPair([block(1e-44, 200.0), block(2e-44, 300.0), block(5e-45, 298.0, 310.0, 340.0)])
    values = pair.coefficient_cm5(NU, 200.0, np.zeros(NU.size))
    assert values[NU == 200.0][0] == pytest.approx(1e-44)
    assert values[NU == 320.0][0] == pytest.approx(5e-45)
    assert values[NU == 305.0][0] == 0.0


def test_the_newer_edition_stands_where_files_overlap():
    """The year in the name decides; the older file is used where the newer ends."""
    pair = MeasuredPair([block(1e-44, 300.0), block(2e-44, 300.0, 200.0, 340.0, where="N2-N2_2021.cia:1")])
    values = pair.coefficient_cm5(NU, 300.0, np.zeros(NU.size))
    np.testing.assert_allclose([values[NU == 150.0][0], values[NU == 250.0][0]], [1e-44, 2e-44])
    assert re.search(r"of N2-N2_2021\.cia \([0-9a-f]{8}\) over 200-340 per cm \(300 K\)", pair.sentences[0])
    assert re.search(r"of N2-N2_2018\.cia \([0-9a-f]{8}\) over 100-200 per cm", pair.sentences[1])


def test_one_edition_twice_names_both_files():
    """Two files that give the same stretch without an edition to tell them apart are refused."""
    with pytest.raises(LineDataError, match=r"a\.cia and b\.cia: both give the same pair over 100-300 per cm"):
        MeasuredPair([block(1e-44, 300.0, where="a.cia:1"), block(2e-44, 200.0, where="b.cia:1")])


def test_negative_values_enter_as_zero_or_more():
    """Noise below zero is averaged with its neighbours, which keeps the integral."""
    noise = np.random.default_rng(5).normal(1e-46, 1e-46, 201)
    pair = MeasuredPair([block(noise, 300.0)])
    values = inside(pair.coefficient_cm5(NU, 300.0, np.zeros(NU.size)))
    assert values.min() >= 0
    assert values.sum() == pytest.approx(noise.sum(), rel=0.01)  # the two ends weigh half
    assert "negative" in pair.sentences[0]
