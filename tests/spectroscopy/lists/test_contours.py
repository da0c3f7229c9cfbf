"""Smooth contours: closed forms, limits, the slow reference and the shipped files."""

from __future__ import annotations

import math
import tomllib

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad, trapezoid

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lists.contours import contour_cross_section

FORMULAS = ["CCl3F", "CCl2F2", "CHClF2", "CHF3", "C2H2F4", "CCl4", "CF4", "C2F6", "C3F8"]
FORMULAS += ["SF6", "NF3", "C2H6S", "CH3SH", "CH3CN", "C5H8"]


def shipped(formula):
    """The file of one molecule as a dictionary, with its smooth parts only."""
    data = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())
    data["part"] = [part for part in data["part"] if part["kind"] == "contours"]
    return data


def one_row(shape, row, span=(0.0, 1e5)):
    """A part with a single row."""
    return {"name": "test", "span_per_cm": list(span), "span_k": [200.0, 320.0], shape: [row]}


def slow_contours(part, wavenumber_per_cm, temperature_k):
    """The law written out point by point, nothing cut short; same signature as the shipped function."""
    kelvin = min(max(temperature_k, part["span_k"][0]), part["span_k"][1])
    low, high = part["span_per_cm"]
    t = kelvin / 296.0
    out = np.zeros(len(wavenumber_per_cm))
    for i, nu in enumerate(wavenumber_per_cm):
        for shape in ("gaussian", "hyperbolic"):
            for c, left, right, s, energy, n, d in part.get(shape, []):
                centre = c + d * (math.sqrt(t) - 1.0)
                x = (nu - centre) / ((left if nu < centre else right) * t**n)
                gauss = shape == "gaussian"
                value = math.exp(-0.5 * x * x) if gauss else math.exp(1.0 - math.sqrt(1.0 + x * x))
                half = 1.2533141 if gauss else 1.6361534
                value *= s / (half * (left + right))
                out[i] += value * math.exp(-1.438777 * energy * (1.0 / kelvin - 1.0 / 296.0))
        beyond = max(low - nu, nu - high, 15.0) - 15.0
        out[i] *= math.exp(-beyond / 10.0)
    return out


@pytest.mark.parametrize("shape", ["gaussian", "hyperbolic"])
def test_integrates_to_its_intensity(shape):
    """At 296 K a row integrates to its intensity, whatever its lopsidedness."""
    part = one_row(shape, [1000.0, 3.0, 7.0, 2e-17, -90.0, 0.5, 5.0])
    wavenumber = np.arange(500.0, 1500.0, 0.01)
    assert trapezoid(contour_cross_section(part, wavenumber, 296.0), wavenumber) == pytest.approx(2e-17, rel=1e-6)


def test_half_integral_of_the_hyperbolic_shape():
    """The integral of exp(1 - sqrt(1 + x^2)) from 0 to infinity is e K1(1), checked by quadrature."""
    part = one_row("hyperbolic", [1000.0, 1.0, 1.0, 1.0, 0.0, 0.5, 0.0])
    height = contour_cross_section(part, [1000.0], 296.0)[0]
    integral = quad(lambda x: math.exp(1.0 - math.sqrt(1.0 + x * x)), 0.0, 60.0)[0]
    assert height == pytest.approx(0.5 / integral, rel=1e-7)


@given(temperature_k=st.floats(150.0, 600.0), start=st.floats(550.0, 1300.0))
@settings(max_examples=12, derandomize=True, deadline=None)
@pytest.mark.parametrize("formula", ["CCl3F", "CHF3", "SF6"])
def test_equals_slow_reference(formula, temperature_k, start):
    """The shipped function equals the law written out point by point."""
    wavenumber = start + np.linspace(0.0, 400.0, 57)
    for part in shipped(formula)["part"]:
        fast = contour_cross_section(part, wavenumber, temperature_k)
        slow = slow_contours(part, wavenumber, temperature_k)
        np.testing.assert_allclose(fast, slow, rtol=1e-6, atol=1e-12 * part["band_sum_cm"])


@pytest.mark.parametrize("formula", FORMULAS)
def test_shipped_file(formula):
    """Every file names its sources and flags, its rows add up to the stated sum, and it is never negative."""
    data = shipped(formula)
    assert data["formula"] == formula
    wavenumber = np.arange(250.0, 5000.0, 0.5)
    for part in data["part"]:
        assert part["source"] in data["sources"]
        assert part["flag"] in {"fitted", "published", "from memory", "guess"}
        rows = part.get("gaussian", []) + part.get("hyperbolic", [])
        assert sum(row[3] for row in rows) == pytest.approx(part["band_sum_cm"], rel=2e-3)
        for kelvin in (150.0, 296.0, 600.0):
            values = contour_cross_section(part, wavenumber, kelvin)
            assert np.all(np.isfinite(values))
            assert values.min() >= 0.0
    low, high = data["covers_per_cm"][0]
    if formula != "CF4":  # its nu4, the lowest band, is made of lines
        assert low < min(part["span_per_cm"][0] for part in data["part"]) + 1.0
    assert high > max(part["span_per_cm"][1] for part in data["part"]) - 1.0


@pytest.mark.parametrize("formula", FORMULAS)
def test_sum_hardly_moves_with_temperature(formula):
    """The integrated intensity stays within 8 % where it was measured: vibrations are mostly unexcited."""
    wavenumber = np.arange(250.0, 5000.0, 0.05)
    parts = shipped(formula)["part"]
    measured = parts[0].get("measured_k", [296.0])
    cold, warm = (min(measured), max(measured)) if len(measured) > 1 else parts[0]["span_k"]
    sums = [sum(trapezoid(contour_cross_section(p, wavenumber, t), wavenumber) for p in parts) for t in (cold, warm)]
    assert max(sums) / min(sums) < 1.08


def test_lobes_spread_with_temperature():
    """The P and R lobes of NF3 at 907 1/cm move apart and the band narrows in the cold."""
    part = shipped("NF3")["part"][0]
    wavenumber = np.arange(860.0, 960.0, 0.05)
    widths = []
    for kelvin in (200.0, 260.0, 320.0):
        weight = contour_cross_section(part, wavenumber, kelvin)
        mean = np.average(wavenumber, weights=weight)
        widths.append(math.sqrt(np.average((wavenumber - mean) ** 2, weights=weight)))
    assert widths == sorted(widths)


def test_held_outside_its_temperatures():
    """Beyond the span of temperatures the nearer end is used."""
    part = shipped("CCl3F")["part"][0]
    wavenumber = np.arange(800.0, 900.0, 0.1)
    for outside, end in ((150.0, 200.0), (600.0, 320.0)):
        assert np.array_equal(
            contour_cross_section(part, wavenumber, outside), contour_cross_section(part, wavenumber, end)
        )


def test_fades_beyond_its_span():
    """15 1/cm past the span the value is untouched; 10 1/cm further it has fallen by e."""
    row = [1000.0, 200.0, 200.0, 1e-17, 0.0, 0.5, 0.0]
    open_part, closed = one_row("gaussian", row), one_row("gaussian", row, span=(990.0, 1010.0))
    points = np.array([975.0, 1000.0, 1025.0, 1035.0])
    ratio = contour_cross_section(closed, points, 296.0) / contour_cross_section(open_part, points, 296.0)
    np.testing.assert_allclose(ratio, [1.0, 1.0, 1.0, math.exp(-1.0)], rtol=1e-12)


def test_grid_far_away_gives_zero():
    """A grid that does not meet the band is all zeros, of the right shape."""
    part = shipped("CCl3F")["part"][0]
    assert np.array_equal(contour_cross_section(part, np.linspace(5000.0, 6000.0, 11), 296.0), np.zeros(11))


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"gaussian": [[1000.0, -1.0, 1.0, 1e-17, 0.0, 0.5, 0.0]]}, r"gaussian row 1: expected 7 finite numbers"),
        ({"gaussian": [[1000.0, 1.0, 1.0, 1e-17]]}, r"gaussian row 1: expected 7 finite numbers"),
        ({"gaussian": []}, r"expected rows under 'gaussian' or 'hyperbolic'"),
        ({"span_k": [320.0, 200.0]}, r"span_k: expected two ascending numbers"),
        ({"span_per_cm": 5.0}, r"span_per_cm: expected two ascending numbers"),
    ],
)
def test_invalid_part(change, message):
    """A part that breaks its format is refused with what was expected."""
    part = one_row("gaussian", [1000.0, 1.0, 1.0, 1e-17, 0.0, 0.5, 0.0]) | change
    with pytest.raises(LineDataError, match=message):
        contour_cross_section(part, [1000.0], 296.0)


def test_unsorted_wavenumbers_are_refused():
    """Unsorted wavenumbers would give silently wrong sums."""
    with pytest.raises(ValueError, match="must ascend"):
        contour_cross_section(shipped("CCl3F")["part"][0], [900.0, 800.0], 296.0)
