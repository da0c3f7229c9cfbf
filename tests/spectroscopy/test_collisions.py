"""Collision-induced absorption: interpolation rules, the shipped file, and refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import LineDataError
from planner.spectroscopy.collisions import (
    CollisionBand,
    collision_bands,
    collision_coefficient,
    collision_pairs,
    parse_collisions,
)

TEXT = """
[sources]
invented = "invented for this test"
[[band]]
pair = ["N2", "Ar"]
name = "rotation"
source = "invented"
flag = "guess"
square_law_below = true
temperature_k = [200.0, 400.0]
also = [{ pair = ["He", "Ar"], factor = [1.0, 0.1], source = "invented", flag = "guess" }]
knots = [[100.0, -45.0, -46.0], [200.0, -44.0, -45.0], [300.0, -46.0, -46.0]]
"""


def slow_coefficient(band, wavenumber_per_cm, temperature_k):
    """The interpolation written out for one wavenumber at a time; the tables are walked, nothing is vectorised."""
    t, nu, table = band.temperature_k, band.wavenumber_per_cm, band.log10_cm5
    kelvin = min(max(temperature_k, t[0]), t[-1])
    i = max(j for j in range(t.size) if t[j] <= kelvin)
    share = 0.0 if i == t.size - 1 else math.log(kelvin / t[i]) / math.log(t[i + 1] / t[i])
    out = []
    for x in wavenumber_per_cm:
        if x > nu[-1] or (x < nu[0] and not band.square_law_below):
            out.append(0.0)
            continue
        held = max(x, nu[0])
        k = max(j for j in range(nu.size) if nu[j] <= held)
        part = 0.0 if k == nu.size - 1 else (held - nu[k]) / (nu[k + 1] - nu[k])
        rows = [row[k] if part == 0.0 else row[k] + part * (row[k + 1] - row[k]) for row in table]
        log10 = rows[i] if share == 0.0 else rows[i] + share * (rows[i + 1] - rows[i])
        out.append(10.0**log10 * min(x / nu[0], 1.0) ** 2)
    return np.array(out)


def band(**changes):
    """A small band."""
    fields = {
        "pair": ("Ar", "N2"),
        "name": "rotation",
        "source": "invented",
        "flag": "guess",
        "temperature_k": np.array([200.0, 400.0]),
        "wavenumber_per_cm": np.array([100.0, 200.0]),
        "log10_cm5": np.array([[-45.0, -44.0], [-46.0, -45.0]]),
        "square_law_below": False,
    }
    return CollisionBand(**(fields | changes))


@pytest.mark.parametrize("pair", collision_pairs(), ids="-".join)
@given(temperature_k=st.floats(80.0, 900.0))
@settings(max_examples=5, derandomize=True, deadline=None)
def test_equals_slow_reference(pair, temperature_k):
    """The sum over bands equals the interpolation written out."""
    wavenumber = np.concatenate([np.linspace(1.0, 20000.0, 401), [400.0, 1e4 / 1.27, 2331.0]])
    slow = sum(slow_coefficient(one, wavenumber, temperature_k) for one in collision_bands(pair))
    np.testing.assert_allclose(collision_coefficient(pair, wavenumber, temperature_k), slow, rtol=1e-10, atol=1e-70)


@pytest.mark.parametrize("pair", collision_pairs(), ids="-".join)
def test_either_order_of_names(pair):
    """A pair has no order."""
    wavenumber = np.linspace(10.0, 10000.0, 101)
    assert np.array_equal(
        collision_coefficient(pair, wavenumber, 250.0), collision_coefficient(pair[::-1], wavenumber, 250.0)
    )


def test_pairs_asked_for():
    """The pairs that scenarios need most are there, each in alphabetical order."""
    pairs = set(collision_pairs())
    assert {("N2", "N2"), ("O2", "O2"), ("N2", "O2"), ("CO2", "CO2"), ("H2", "H2"), ("H2", "He"), ("H2", "N2")} <= pairs
    assert all(list(pair) == sorted(pair) for pair in pairs)


@pytest.mark.parametrize("pair", collision_pairs(), ids="-".join)
def test_shipped_bands(pair):
    """Every band has a source and a flag, and values in the range of collision-induced absorption."""
    for one in collision_bands(pair):
        assert one.flag in {"fitted", "published", "from memory", "guess"}
        assert len(one.source) > 10
        assert -60.0 < one.log10_cm5.min() < one.log10_cm5.max() < -42.0


def test_knots_and_temperatures_are_met():
    """At a knot and a tabled temperature the value is the table's; halfway in ln T it is the geometric mean."""
    one = band()
    assert one.coefficient(np.array([100.0]), 200.0)[0] == pytest.approx(1e-45)
    assert one.coefficient(np.array([150.0]), 200.0)[0] == pytest.approx(10**-44.5)
    assert one.coefficient(np.array([100.0]), math.sqrt(200.0 * 400.0))[0] == pytest.approx(10**-45.5)


def test_held_outside_its_temperatures():
    """Outside the tabled temperatures the nearest column holds."""
    one = band()
    assert np.array_equal(one.coefficient(np.array([150.0]), 50.0), one.coefficient(np.array([150.0]), 200.0))
    assert np.array_equal(one.coefficient(np.array([150.0]), 900.0), one.coefficient(np.array([150.0]), 400.0))


def test_beyond_the_knots():
    """Zero beyond the knots, or the square law below the first."""
    points = np.array([50.0, 201.0])
    assert np.array_equal(band().coefficient(points, 200.0), [0.0, 0.0])
    square = band(square_law_below=True).coefficient(points, 200.0)
    np.testing.assert_allclose(square, [0.25e-45, 0.0])


def test_parse_lends_a_band():
    """A lent band comes out once per pair, with its factor at each temperature."""
    own, lent = parse_collisions(TEXT, "test.toml")
    assert own.pair == ("Ar", "N2")
    assert lent.pair == ("Ar", "He")
    np.testing.assert_allclose(lent.log10_cm5 - own.log10_cm5, [[0.0] * 3, [-1.0] * 3])


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("knots = [[100.0, -45.0, -46.0],", "knots = [[100.0, -45.0],", r"test\.toml: not a file of collision bands"),
        ("[200.0, 400.0]", "[200.0]", r"test\.toml.*rotation: expected a table of shape"),
        ("[[100.0", "[[250.0", r"test\.toml.*must be positive and ascend"),
        ('source = "invented"\nflag', 'source = "elsewhere"\nflag', r"test\.toml.*'elsewhere'"),
        ("name =", "nombre =", r"test\.toml.*'name'"),
        ("[sources]", "[sources", r"test\.toml: not a file"),
        ("-46.0, -46.0]", "-46.0, nan]", r"test\.toml.*must be finite"),
    ],
)
def test_parse_invalid(old, new, message):
    """A file that breaks the layout is refused with its name and the fault."""
    assert old in TEXT
    with pytest.raises(LineDataError, match=message):
        parse_collisions(TEXT.replace(old, new, 1), "test.toml")


def test_unknown_pair():
    """An unknown pair is refused, with the known ones named."""
    with pytest.raises(LineDataError, match=r"expected one of .*N2-N2.* got SF6-He"):
        collision_coefficient(("SF6", "He"), [1000.0], 300.0)


def test_nitrogen_rotation_shifts_with_temperature():
    """The peak of the rotational band moves to larger wavenumbers as the gas warms."""
    wavenumber = np.arange(20.0, 300.0, 0.5)
    peaks = [
        wavenumber[collision_coefficient(("N2", "N2"), wavenumber, t).argmax()] for t in (130.0, 200.0, 300.0, 400.0)
    ]
    assert peaks == sorted(peaks)
    assert peaks[0] < peaks[-1]


def test_dimers_of_carbon_dioxide_fade_with_warmth():
    """The Fermi dyad of CO2-CO2, helped by bound pairs, weakens as the gas warms."""
    values = [collision_coefficient(("CO2", "CO2"), 1388.0, t)[0] for t in (200.0, 250.0, 300.0, 350.0)]
    assert values == sorted(values, reverse=True)
