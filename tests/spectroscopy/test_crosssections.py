"""Cross-sections of lines: closed forms, invariances, the slow reference, bad arguments."""

from __future__ import annotations

import math

import numba
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import LineDataError, RangeError
from planner.spectroscopy import crosssections
from planner.spectroscopy.crosssections import cross_sections, line_intensities, reference_cross_sections
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import isotopologue_mass_g, partition_sum

ATM = 1.01325  # bar
METHANE = 6


def one_line(**changes) -> Lines:
    """One invented line of methane at 3000 per cm."""
    base = {
        "molecule": METHANE,
        "isotopologue": 1,
        "wavenumber_per_cm": 3000.0,
        "intensity_cm": 1e-20,
        "lower_energy_per_cm": 500.0,
        "air_width_per_cm_atm": 0.06,
        "self_width_per_cm_atm": 0.09,
        "temperature_exponent": 0.7,
    }
    return Lines.make(**base | changes)


def random_lines(n: int, low: float, high: float, seed: int = 1) -> Lines:
    rng = np.random.default_rng(seed)
    return Lines.make(
        molecule=METHANE,
        isotopologue=1 + np.arange(n) % 3,
        wavenumber_per_cm=rng.uniform(low, high, n),
        intensity_cm=10.0 ** rng.uniform(-28, -19, n),
        lower_energy_per_cm=rng.uniform(0.0, 3000.0, n),
        air_width_per_cm_atm=rng.uniform(0.03, 0.12, n),
        self_width_per_cm_atm=rng.uniform(0.05, 0.3, n),
        temperature_exponent=rng.uniform(0.4, 0.9, n),
        air_shift_per_cm_atm=rng.uniform(-0.01, 0.01, n),
    )


def doppler_half_width(temperature_k: float) -> float:
    """1/e half width at 3000 per cm, by hand: nu sqrt(2 k T / m) / c, constants of CODATA 2018."""
    mass_kg = isotopologue_mass_g(METHANE, 1) * 1.66053906660e-27
    return 3000.0 * math.sqrt(2.0 * 1.380649e-23 * temperature_k / mass_kg) / 299792458.0


# ---------------------------------------------------------------- closed forms


@pytest.mark.parametrize("pressure_bar", [1e-5, 0.01, 0.1, 1.0])
def test_area_of_a_line(pressure_bar):
    """The integral of a line over its wings is its intensity, less the known rest of the Lorentz wings."""
    grid = np.linspace(2974.0, 3026.0, 260001)
    value = cross_sections(one_line(), grid, temperature_k=296.0, pressures_bar=[pressure_bar])[0]
    beyond_the_cut = 1.0 - 2.0 / math.pi * math.atan(25.0 / (0.06 * pressure_bar / ATM))
    area = np.sum(0.5 * (value[1:] + value[:-1]) * np.diff(grid))
    assert area == pytest.approx(1e-20 * (1.0 - beyond_the_cut), rel=1e-4)


def test_pure_doppler_line():
    """At no pressure a line is a Gaussian of thermal width."""
    width = doppler_half_width(400.0)
    grid = np.linspace(2999.98, 3000.02, 101)
    value = cross_sections(one_line(), grid, temperature_k=400.0, pressures_bar=[0.0])[0]
    strength = line_intensities(one_line(), 400.0)[0]
    gauss = strength / (math.sqrt(math.pi) * width) * np.exp(-(((grid - 3000.0) / width) ** 2))
    np.testing.assert_allclose(value, gauss, rtol=1e-4)


def test_pure_lorentz_line():
    """At ten atmospheres a line is a Lorentz profile, the Doppler width being 1 % of it, out to the cut."""
    grid = np.linspace(2974.0, 3026.0, 5201)
    value = cross_sections(one_line(), grid, temperature_k=296.0, pressures_bar=[10.0 * ATM])[0]
    distance, width = grid - 3000.0, 0.6
    lorentz = np.where(abs(distance) < 25.0, 1e-20 * width / math.pi / (distance**2 + width**2), 0.0)
    away = abs(abs(distance) - 25.0) > 1e-6
    np.testing.assert_allclose(value[away], lorentz[away], rtol=3e-4)


def test_doubled_pressure_doubles_the_far_wing():
    """Far from the centre a line grows in proportion to pressure."""
    grid = np.concatenate([np.linspace(2976.0, 2990.0, 50), np.linspace(3010.0, 3024.0, 50)])
    low, high = cross_sections(one_line(), grid, temperature_k=250.0, pressures_bar=[0.05, 0.1])
    np.testing.assert_allclose(high, 2.0 * low, rtol=1e-6)


def test_width_in_a_mixture():
    """The width is that of air times its factor and share, plus the self width times its share, times (296/T)**n."""
    width = (296.0 / 200.0) ** 0.7 * (0.06 * 1.3 * 0.75 + 0.09 * 0.25) * 10.0
    value = cross_sections(
        one_line(),
        [3000.0],
        temperature_k=200.0,
        pressures_bar=[10.0 * ATM],
        self_fraction=0.25,
        width_factor=1.3,
    )[0, 0]
    strength = line_intensities(one_line(), 200.0)[0]
    correction = 1.0 - 0.5 * (doppler_half_width(200.0) / width) ** 2  # of the Voigt peak for a small Doppler width
    assert value == pytest.approx(strength / (math.pi * width) * correction, rel=1e-5)


def test_pressure_shift():
    """A line is centred at its wavenumber plus shift times pressure in atmospheres."""
    grid = np.linspace(2999.0, 3001.0, 20001)
    lines = one_line(air_shift_per_cm_atm=-0.01)
    values = cross_sections(lines, grid, temperature_k=296.0, pressures_bar=[0.0, ATM, 5.0 * ATM])
    np.testing.assert_allclose(grid[values.argmax(axis=1)], [3000.0, 2999.99, 2999.95], atol=1.01e-4)


def test_cut_and_subtraction():
    """A line ends at the cut; with subtraction it comes down to zero there and lacks its value at the cut elsewhere."""
    grid = np.array([2994.9, 2995.1, 2999.0, 3004.9, 3004.9999, 3005.1])
    kwargs = {"temperature_k": 296.0, "pressures_bar": [ATM], "wing_per_cm": 5.0}
    plain = cross_sections(one_line(), grid, **kwargs)[0]
    less = cross_sections(one_line(), grid, subtract_at_wing=True, **kwargs)[0]
    at_cut = 1e-20 * 0.06 / math.pi / (25.0 + 0.06**2)
    assert plain[0] == plain[5] == less[0] == less[5] == 0.0
    np.testing.assert_allclose(plain[1:5] - less[1:5], at_cut, rtol=1e-4)
    assert 0.0 <= less[4] < 1e-3 * at_cut


@pytest.mark.parametrize("temperature_k", [150.0, 296.0, 600.0])
def test_intensity_by_hand(temperature_k):
    """Intensity at a temperature: partition sums, Boltzmann factor and stimulated emission, written out."""
    c2, nu, energy, t, t0 = 1.438776877, 3000.0, 500.0, temperature_k, 296.0
    expected = (
        1e-20
        * (partition_sum(METHANE, 1, t0) / partition_sum(METHANE, 1, t))
        * (math.exp(-c2 * energy / t) / math.exp(-c2 * energy / t0))
        * ((1.0 - math.exp(-c2 * nu / t)) / (1.0 - math.exp(-c2 * nu / t0)))
    )
    assert line_intensities(one_line(), temperature_k)[0] == pytest.approx(expected, rel=1e-12)


def test_intensity_with_unknown_lower_energy():
    """A lower energy of -1 stands for unknown: the line follows the partition sum as one of the ground state."""
    unknown = line_intensities(one_line(lower_energy_per_cm=-1.0), 200.0)
    assert unknown == line_intensities(one_line(lower_energy_per_cm=0.0), 200.0)


# ---------------------------------------------------------------- invariances


def test_order_of_lines():
    """The order in which lines are given does not matter."""
    lines = random_lines(200, 2990.0, 3010.0)
    grid = np.linspace(2995.0, 3005.0, 1001)
    kwargs = {"temperature_k": 250.0, "pressures_bar": [0.1]}
    shuffled = lines.where(np.random.default_rng(2).permutation(len(lines)))
    np.testing.assert_array_equal(cross_sections(lines, grid, **kwargs), cross_sections(shuffled, grid, **kwargs))


def test_parts_of_a_list_add_up():
    """The cross-section of a list is the sum of those of its parts."""
    lines = random_lines(200, 2990.0, 3010.0)
    grid = np.linspace(2995.0, 3005.0, 1001)
    kwargs = {"temperature_k": 250.0, "pressures_bar": [0.1, 3.0]}
    half = np.arange(200) % 2 == 0
    parts = cross_sections(lines.where(half), grid, **kwargs) + cross_sections(lines.where(~half), grid, **kwargs)
    np.testing.assert_allclose(parts, cross_sections(lines, grid, **kwargs), rtol=1e-4)


def test_split_grid():
    """A grid computed in pieces gives the numbers of the whole, to the 3e-5 of the interpolation."""
    lines = random_lines(500, 2900.0, 3100.0)
    grid = np.linspace(2950.0, 3050.0, 10001)
    kwargs = {"temperature_k": 250.0, "pressures_bar": [1e-4, 0.1, 3.0]}
    whole = cross_sections(lines, grid, **kwargs)
    pieces = [cross_sections(lines, part, **kwargs) for part in np.split(grid, [1, 500, 777, 5000])]
    np.testing.assert_allclose(np.concatenate(pieces, axis=1), whole, rtol=3e-5)


def test_pressures_alone_or_together():
    """Each pressure gets the same numbers whatever other pressures are asked for, in any order."""
    lines = random_lines(300, 2900.0, 3100.0)
    grid = np.linspace(2950.0, 3050.0, 5001)
    pressures = [1.0, 1e-6, 10.0, 0.0, 0.01]
    together = cross_sections(lines, grid, temperature_k=250.0, pressures_bar=pressures)
    for row, pressure in zip(together, pressures, strict=True):
        alone = cross_sections(lines, grid, temperature_k=250.0, pressures_bar=[pressure])[0]
        np.testing.assert_allclose(row, alone, rtol=1e-4)


def test_number_of_threads(monkeypatch):
    """The number of threads does not change a bit of the result."""
    lines = random_lines(300, 2900.0, 3100.0)
    grid = np.linspace(2950.0, 3050.0, 20001)
    results = []
    for threads in (1, 3):
        monkeypatch.setattr(crosssections, "_threads", lambda threads=threads: threads)
        results.append(cross_sections(lines, grid, temperature_k=250.0, pressures_bar=[0.01, 1.0]))
    np.testing.assert_array_equal(*results)


# ---------------------------------------------------------------- the slow reference

GRIDS = {
    "even": np.linspace(3000.0, 3100.0, 10001),
    "logarithmic": np.exp(np.linspace(math.log(2990.0), math.log(3110.0), 2000)),
    "coarse": np.linspace(2900.0, 3200.0, 61),
    "fine": np.linspace(3049.9, 3050.1, 5001),
    "uneven": np.concatenate([np.linspace(3000.0, 3020.0, 3000), np.linspace(3030.0, 3200.0, 40)]),
    "two points": np.array([3010.0, 3077.7]),
    "one point": np.array([3050.0]),
}


@pytest.mark.parametrize("name", GRIDS)
@pytest.mark.parametrize("wing_per_cm", [0.3, 25.0, 200.0])
@pytest.mark.parametrize("subtract", [False, True])
def test_reference(name, wing_per_cm, subtract):
    """On any grid, with any wing, at 1e-10 to 30 bar, the fast sum equals the slow one to 1e-4 of each value."""
    lines, grid = random_lines(60, 2980.0, 3120.0), GRIDS[name]
    kwargs = {
        "temperature_k": 250.0,
        "pressures_bar": [0.0, 1e-10, 1e-6, 1e-3, 0.1, 1.0, 30.0],
        "wing_per_cm": wing_per_cm,
        "self_fraction": 0.1,
        "width_factor": 1.2,
    }
    slow = reference_cross_sections(lines, grid, subtract_at_wing=subtract, **kwargs)
    fast = cross_sections(lines, grid, subtract_at_wing=subtract, **kwargs)
    # what is subtracted counts with its own error, 1e-4 of the value without subtraction
    plain = reference_cross_sections(lines, grid, **kwargs)
    # and six Doppler widths from its centre a line's Gaussian, 2e-16 of its peak, is let go
    peak = line_intensities(lines, 250.0).max() / (math.sqrt(math.pi) * doppler_half_width(250.0))
    assert np.all(np.abs(fast - slow) <= 1e-4 * plain + 1e-15 * peak)


def test_reference_many_stretches():
    """Many lines over many stretches of the grid, weak and strong: the same to 1e-4."""
    lines, grid = random_lines(300, 2700.0, 3300.0, seed=5), np.linspace(2800.0, 3200.0, 13001)
    kwargs = {"temperature_k": 500.0, "pressures_bar": [0.003, 2.0]}
    slow, fast = reference_cross_sections(lines, grid, **kwargs), cross_sections(lines, grid, **kwargs)
    np.testing.assert_allclose(fast, slow, rtol=1e-4, atol=1e-10 * slow.max())


@pytest.mark.parametrize("cut", [8, 9, 25, 70])
@pytest.mark.parametrize("subtract", [False, True])
def test_series_of_any_cells(monkeypatch, cut, subtract):
    """However wide the cells whose lines share a series, up to lines that just converge: 3e-5 from sums without."""
    lines, grid = random_lines(400, 2960.0, 3140.0, seed=7), np.linspace(3000.0, 3100.0, 3001)
    widest_atm = 25.0 / cut / crosssections._LORENTZ_WIDTHS / 0.3
    kwargs = {"temperature_k": 296.0, "self_fraction": 1.0, "pressures_bar": [1e-6, 0.01, widest_atm * ATM]}
    monkeypatch.setattr(crosssections, "_cells_in_a_wing", lambda points, lines, wing: 0)
    plain = cross_sections(lines, grid, **kwargs)
    one = cross_sections(lines, grid, subtract_at_wing=subtract, **kwargs)
    monkeypatch.setattr(crosssections, "_cells_in_a_wing", lambda points, lines, wing: cut)
    other = cross_sections(lines, grid, subtract_at_wing=subtract, **kwargs)
    assert np.all(np.abs(other - one) <= 3e-5 * plain)
    assert np.any(other != one)


@settings(derandomize=True, deadline=None, max_examples=60)
@given(
    seed=st.integers(0, 10**6),
    first=st.floats(100.0, 20000.0),
    span=st.floats(1e-3, 300.0),
    points=st.integers(1, 300),
    wing=st.floats(0.01, 100.0),
    pressure=st.floats(0.0, 20.0),
    temperature=st.floats(100.0, 1000.0),
)
def test_reference_property(seed, first, span, points, wing, pressure, temperature):
    """Random lists, random uneven grids, any wing, pressure and temperature: the slow reference to 1e-4."""
    rng = np.random.default_rng(seed)
    lines = random_lines(5, first, first + span, seed)
    grid = first + span * np.unique(rng.uniform(0.0, 1.0, points))
    kwargs = {"temperature_k": temperature, "pressures_bar": [pressure], "wing_per_cm": wing}
    slow, fast = reference_cross_sections(lines, grid, **kwargs), cross_sections(lines, grid, **kwargs)
    peak = line_intensities(lines, temperature).max() / (first / 3000.0 * doppler_half_width(temperature))
    assert np.all(np.abs(fast - slow) <= 1e-4 * slow + 1e-15 * peak)


# ---------------------------------------------------------------- shapes and bad arguments


def test_shape_and_emptiness():
    """Rows are pressures; no line, no line near, no pressure and no point give zeros or nothing."""
    kwargs = {"temperature_k": 296.0}
    grid = [2999.0, 3000.0, 3001.0]
    assert cross_sections(one_line(), grid, pressures_bar=[0.1, 1.0], **kwargs).shape == (2, 3)
    none = one_line().where(np.zeros(1, dtype=bool))
    for function in (cross_sections, reference_cross_sections):
        assert not function(none, grid, pressures_bar=[1.0], **kwargs).any()
        assert not function(one_line(), [5000.0, 5001.0], pressures_bar=[1.0], **kwargs).any()
        assert function(one_line(), grid, pressures_bar=[], **kwargs).shape == (0, 3)
        assert function(one_line(), [], pressures_bar=[1.0], **kwargs).shape == (1, 0)


def test_any_kind_of_array():
    """Grids that are read-only, strided or of whole numbers are as good as others."""
    grid = np.arange(2990.0, 3010.0, 0.5)
    kwargs = {"temperature_k": 296.0, "pressures_bar": [0.1]}
    expected = cross_sections(one_line(), grid, **kwargs)
    strided = np.repeat(grid, 2)[::2]
    strided.flags.writeable = False
    np.testing.assert_array_equal(cross_sections(one_line(), strided, **kwargs), expected)
    whole = cross_sections(one_line(), np.arange(2990, 3010), **kwargs)
    np.testing.assert_allclose(whole, expected[:, ::2], rtol=1e-12)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"wavenumber_per_cm": [2.0, 1.0]}, "strictly ascending"),
        ({"wavenumber_per_cm": [1.0, 1.0]}, "strictly ascending"),
        ({"wavenumber_per_cm": [-1.0, 1.0]}, "positive wavenumbers"),
        ({"wavenumber_per_cm": [1.0, math.nan]}, "wavenumber_per_cm"),
        ({"wavenumber_per_cm": [[1.0, 2.0]]}, "wavenumber_per_cm"),
        ({"pressures_bar": [-1.0]}, "pressures_bar: expected a list of pressures of 0 or more"),
        ({"pressures_bar": [math.inf]}, "pressures_bar"),
        ({"pressures_bar": 1.0}, "pressures_bar"),
        ({"temperature_k": 0.0}, "temperature_k: expected a temperature above 0 K, got 0.0"),
        ({"temperature_k": math.nan}, "temperature_k"),
        ({"temperature_k": 2600.0}, "temperature: expected 1 to 2500 K"),
        ({"self_fraction": 1.1}, "self_fraction: expected a fraction from 0 to 1, got 1.1"),
        ({"self_fraction": -0.1}, "self_fraction"),
        ({"width_factor": 0.0}, "width_factor"),
        ({"wing_per_cm": 0.0}, "wing_per_cm: expected a distance above 0"),
        ({"wing_per_cm": math.inf}, "wing_per_cm"),
    ],
)
def test_bad_arguments(change, message):
    """An argument out of range is an error that names it, from the fast and the slow function alike."""
    kwargs = {"wavenumber_per_cm": [1.0, 2.0], "pressures_bar": [1.0], "temperature_k": 296.0} | change
    for function in (cross_sections, reference_cross_sections):
        with pytest.raises(RangeError, match=message):
            function(one_line(), **kwargs)


def test_isotopologue_without_partition_sum():
    """Lines whose partition sum is not known are an error, not a guess."""
    with pytest.raises(LineDataError, match="TIPS-2021 has none"):
        cross_sections(one_line(molecule=10, isotopologue=3), [3000.0], temperature_k=296.0, pressures_bar=[1.0])


def test_unwritable_cache(monkeypatch):
    """Where compiled code cannot be kept, it is compiled for this run and a warning says so."""
    from planner.spectroscopy import _kernels

    real = numba.njit

    def refusing(*args, **kwargs):
        if kwargs.pop("cache", False):
            raise RuntimeError("no locator available")
        return real(*args, **kwargs)

    monkeypatch.setattr(numba, "njit", refusing)
    with pytest.warns(UserWarning, match="not kept for the next run: no locator available"):
        compiled = _kernels._compiled(lambda x: x + 1.0, numba.float64(numba.float64))
    assert compiled(1.0) == 2.0
