"""Smooth electronic tables and oxygen's forbidden lines: closed forms, symmetry, slow reference, refusals."""

from __future__ import annotations

import math
import tomllib

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lists.electronic import oxygen_lines, smooth_table_cross_section

TABLE = {
    "name": "test",
    "wavelength_um": [0.4, 0.5, 0.7],
    "cross_section_cm2": [1e-20, 4e-20, 1e-21],
    "cold_cross_section_cm2": [1e-21, 4e-20, 2e-21],
    "temperature_k": [300.0, 220.0],
}
SHIPPED = ["O3", "NO2", "SO2", "H2CO"]
OXYGEN = 7


def parts(formula, kind):
    """The parts of one kind in a shipped file."""
    data = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())
    return [part for part in data["part"] if part["kind"] == kind]


def slow_table(part, wavenumber_per_cm, temperature_k):
    """The interpolation written out for one wavenumber at a time."""
    held = min(max(temperature_k, 200.0), 330.0)
    wavelength, out = part["wavelength_um"], []
    for nu in wavenumber_per_cm:
        asked = 1e4 / nu
        if not wavelength[0] <= asked < wavelength[-1]:
            out.append(0.0)
            continue
        i = max(k for k in range(len(wavelength)) if wavelength[k] <= asked)
        share = (asked - wavelength[i]) / (wavelength[i + 1] - wavelength[i])

        def between(column, i=i, share=share):
            return (1.0 - share) * math.log(column[i]) + share * math.log(column[i + 1])

        value = between(part["cross_section_cm2"])
        if "cold_cross_section_cm2" in part:
            own, cold = part["temperature_k"]
            value += (between(part["cold_cross_section_cm2"]) - value) * (held - own) / (cold - own)
        out.append(math.exp(value))
    return np.array(out)


@given(temperature_k=st.floats(150.0, 600.0), shift=st.floats(0.0, 50.0))
@settings(max_examples=8, derandomize=True, deadline=None)
@pytest.mark.parametrize("formula", SHIPPED)
def test_equals_slow_reference(formula, temperature_k, shift):
    """The shipped function equals the interpolation written out, on every shipped table."""
    wavenumber = np.linspace(9000.0, 60000.0, 301) + shift
    for part in parts(formula, "smooth-table"):
        fast = smooth_table_cross_section(part, wavenumber, temperature_k)
        np.testing.assert_allclose(fast, slow_table(part, wavenumber, temperature_k), rtol=1e-9)


def test_knots_and_temperatures_are_met():
    """At a knot and a tabled temperature the value is the table's; halfway it is the geometric mean."""
    at_knots = [1e4 / 0.5, 1e4 / 0.4]
    np.testing.assert_allclose(smooth_table_cross_section(TABLE, at_knots, 300.0), [4e-20, 1e-20])
    np.testing.assert_allclose(smooth_table_cross_section(TABLE, at_knots, 220.0), [4e-20, 1e-21])
    np.testing.assert_allclose(smooth_table_cross_section(TABLE, [1e4 / 0.45], 300.0), [2e-20])
    np.testing.assert_allclose(smooth_table_cross_section(TABLE, [1e4 / 0.4], 260.0), [math.sqrt(1e-41)])


def test_held_below_200_and_above_330_k():
    """The extrapolation in temperature stops at 200 and 330 K."""
    for outside, end in ((120.0, 200.0), (600.0, 330.0)):
        assert smooth_table_cross_section(TABLE, [24000.0], outside) == smooth_table_cross_section(
            TABLE, [24000.0], end
        )


def test_tables_that_meet_do_not_count_twice():
    """The first knot is inside, the last outside: the ozone tables join without a doubled point."""
    tables = parts("O3", "smooth-table")
    joints = [1e4 / part["wavelength_um"][0] for part in tables[1:]]
    near = [joint * 1.000001 for joint in joints]
    at, beside = (sum(smooth_table_cross_section(part, nu, 295.0) for part in tables) for nu in (joints, near))
    np.testing.assert_allclose(at, beside, rtol=1e-3)


def test_zero_outside():
    """Outside its knots a table is zero."""
    assert np.array_equal(smooth_table_cross_section(TABLE, [1e4 / 0.39, 1e4 / 0.7, 1e4 / 0.8], 300.0), [0.0] * 3)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"wavelength_um": [0.4, 0.5]}, r"as many cross_section_cm2, got 2 and 3"),
        ({"wavelength_um": [0.5, 0.4, 0.7]}, r"expected ascending wavelength_um"),
        ({"cross_section_cm2": [1e-20, 0.0, 1e-20]}, r"cross_section_cm2: expected positive numbers"),
        ({"cross_section_cm2": []}, r"cross_section_cm2: expected positive numbers"),
        ({"temperature_k": [300.0]}, r"temperature_k: expected 2 positive numbers"),
        ({"temperature_k": [300.0, 300.0]}, r"at another temperature"),
        ({"cold_cross_section_cm2": [1e-20]}, r"expected 3 cold_cross_section_cm2"),
    ],
)
def test_invalid_table(change, message):
    """A table that breaks its format is refused with what was expected."""
    with pytest.raises(LineDataError, match=message):
        smooth_table_cross_section(TABLE | change, [20000.0], 300.0)


@pytest.fixture(scope="module")
def oxygen():
    """The shipped oxygen part and its lines."""
    (part,) = parts("O2", "oxygen")
    return part, oxygen_lines(part, OXYGEN)


def of_band(lines, band):
    """The lines of one band."""
    return lines.where(lines.upper_global == f"       {band['upper']}      {band['vibration']}")


def test_bands_add_up(oxygen):
    """The lines of every band add up to its stated sum."""
    part, lines = oxygen
    for band in part["band"]:
        assert of_band(lines, band).intensity_cm.sum() == pytest.approx(band["band_sum_cm"], rel=1e-12)


def test_rotational_states_allowed_by_symmetry(oxygen):
    """Odd N below; even J in b1Sigma+g and J from 2 in a1Deltag above; J changes by one at most."""
    _, lines = oxygen
    lower_n = np.array([int(label[2:5]) for label in lines.lower_local])
    lower_j = np.array([int(label[6:9]) for label in lines.lower_local])
    upper_j = ((lines.upper_weight - 1.0) / 2.0).astype(int)
    sigma = np.char.strip(lines.upper_global).astype("U1") == "b"
    assert np.all(lower_n % 2 == 1)
    assert np.all(np.abs(lower_n - lower_j) <= 1)
    assert np.all(np.abs(upper_j - lower_j) <= 1)
    assert np.all(upper_j[sigma] % 2 == 0)
    assert upper_j[~sigma].min() == 2


def test_lowest_level_is_the_zero_of_energy(oxygen):
    """Energies count from N = 1, J = 0; the triplet of N = 1 lies at 0, 2.084 and 3.961 1/cm (60 GHz lines)."""
    _, lines = oxygen
    lowest = {label[2:9]: energy for label, energy in zip(lines.lower_local, lines.lower_energy_per_cm, strict=True)}
    # 118.7503 GHz is 1- (3.9611 1/cm), 56.2648 GHz is 1+: J = 2 lies 56.2648 GHz below J = 1
    assert lowest["  1P  1"] == pytest.approx(118.7503 / 29.9792458, abs=2e-4)
    assert lowest["  1Q  2"] == pytest.approx((118.7503 - 56.2648) / 29.9792458, abs=2e-4)


def test_shares_of_a_multiplet_add_up(oxygen):
    """The Omega = 1 shares of the two mixed levels of one J add up to one (eigenvectors are orthonormal)."""
    from planner.spectroscopy.lists.electronic import _ground_levels

    part, _ = oxygen
    by_j = {}
    for level in _ground_levels(part["ground"], part["largest_n"] + 2):
        by_j.setdefault(level.j, []).append(level.perpendicular_share)
    for j in range(2, 40, 2):
        assert sum(by_j[j]) == pytest.approx(1.0, abs=1e-12)


def test_closed_form_without_spin(oxygen):
    """With the spin terms switched off, levels are those of a rigid rotor and lines of one N coincide."""
    part, _ = oxygen
    bare = {key: 0.0 if "spin" in key else value for key, value in part["ground"].items()}
    # the spin-spin term must keep its sign to define Omega; 1e-9 of it leaves the energies alone
    bare["spin_spin_per_cm"] = 1e-9
    lines = oxygen_lines(dict(part) | {"ground": bare}, OXYGEN)
    n = np.array([int(label[2:5]) for label in lines.lower_local], dtype=float)
    b, d, h = (part["ground"][k] for k in ("rotation_per_cm", "distortion_per_cm", "sextic_per_cm"))
    x = n * (n + 1.0)
    np.testing.assert_allclose(
        lines.lower_energy_per_cm, b * x - d * x**2 + h * x**3 - (2.0 * b - 4.0 * d + 8 * h), atol=1e-6
    )


def test_radiative_lifetimes_are_band_constants(oxygen):
    """The A coefficients of all lines from one upper level add up to the same rate, whatever its J (b v = 0)."""
    part, lines = oxygen
    band = of_band(lines, part["band"][0])
    rate = {}
    for weight, a in zip(band.upper_weight, band.einstein_a_per_s, strict=True):
        rate[weight] = rate.get(weight, 0.0) + a
    values = np.array([rate[w] for w in sorted(rate) if 5 <= w <= 61])
    assert np.ptp(values) < 0.02 * values.mean()


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"ground": {}}, r"the key 'rotation_per_cm' is missing"),
        ({"band": [{"upper": "c"}]}, r"expected 'a' or 'b', got 'c'"),
        ({"band": [{"upper": "b", "origin_per_cm": 1.3e4}]}, r"the key .* is missing"),
    ],
)
def test_invalid_oxygen(oxygen, change, message):
    """A part that lacks a key or names another upper state is refused."""
    with pytest.raises(LineDataError, match=message):
        oxygen_lines(dict(oxygen[0]) | change, OXYGEN)
