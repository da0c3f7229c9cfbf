"""Transit depth: invariances, limits, shares and slopes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st
from scipy.special import voigt_profile

from planner.atmosphere import chords as chords_module
from planner.atmosphere import extent
from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.layers import Air
from planner.atmosphere.reference import reference_transit_depth
from planner.atmosphere.transmission import transit_depth
from planner.errors import RangeError

STAR_KM = 8.3e4
ROWS = 10.0 ** np.linspace(-6, 1, 22)
SIZE = 40


def line_like(formula, rows, *, seed, size=SIZE):
    """A table that behaves like lines: a core that broadens with pressure, plus wings."""
    rng = np.random.default_rng(seed)
    core, wing = 10 ** rng.uniform(-27, -18, size), 10 ** rng.uniform(-27, -21, size)
    broadened_bar = 10 ** rng.uniform(-2.5, 1, size)
    pressure = rows[:, None]
    table = core / np.sqrt(1 + (pressure / broadened_bar) ** 2) + wing * pressure
    return GasOpacity(
        formula=formula,
        pressures_bar=rows,
        log10_cross_section=np.log10(table).astype(np.float32),
        flat_cross_section_cm2=10 ** rng.uniform(-28, -26, size),
    )


def some_pairs(seed, size=SIZE):
    """N2-N2, a continuum of X with all others, and X-X."""
    rng = np.random.default_rng(seed)
    names = (("N2", "N2"), ("X", "*"), ("X", "X"))
    return [PairOpacity(first=a, second=b, coefficient_cm5=10 ** rng.uniform(-47, -43.5, size)) for a, b in names]


def wavenumbers(size=SIZE):
    return np.geomspace(1000, 3000, size)


def depth_of(air, gases, pairs=(), shares_of=(), star_km=STAR_KM):
    size = (gases[0].flat_cross_section_cm2 if gases else pairs[0].coefficient_cm5).size
    return transit_depth(
        air,
        gases,
        list(pairs),
        wavenumber_per_cm=wavenumbers(size),
        star_radius_km=star_km,
        shares_of=shares_of,
    )


def scale_height_of_depth(air, star_km=STAR_KM):
    """Depth change of one scale height at the base."""
    return 2 * air.base_radius_km * air.scale_height_km / star_km**2


def radius_km(depth, star_km=STAR_KM):
    return np.sqrt(depth) * star_km


AIRS = {
    "clear": {},
    "hazy, patchy cloud": {
        "cloud_top_bar": 0.03,
        "cloud_fraction": 0.6,
        "haze_factor": 30.0,
        "haze_slope": 3.0,
    },
    "deck": {"cloud_top_bar": 0.003},
    "refraction and patchy cloud": {
        "critical_radius_km": 5880.0,
        "cloud_top_bar": 0.01,
        "cloud_fraction": 0.3,
    },
    "light": {"molar_mass_g": 4.0, "base_gravity_m_per_s2": 10.0},
}


@pytest.mark.parametrize("name", AIRS)
def test_against_the_reference(make_air, name):
    """Depth, shares and slopes agree with the slow version to 2e-3 scale heights, most of it the reference's steps.

    Twelve tabulated pressures per decade, so that the two ways of interpolating hardly differ.
    """
    air = make_air(**AIRS[name])
    rows = 10.0 ** np.linspace(-6, 0.2, 75)
    gases = [line_like("X", rows, seed=1), line_like("N2", rows, seed=2)]
    arguments = {"wavenumber_per_cm": wavenumbers(), "star_radius_km": STAR_KM, "shares_of": ["X", "N2"]}
    fast = transit_depth(air, gases, some_pairs(3), **arguments)
    slow = reference_transit_depth(air, gases, some_pairs(3), **arguments)
    tolerance = 2e-3 * scale_height_of_depth(air)
    np.testing.assert_allclose(fast.depth, slow.depth, atol=tolerance, rtol=0)
    np.testing.assert_allclose(fast.bottom_transmission, slow.bottom_transmission, atol=2e-3)
    for formula in ("X", "N2"):
        np.testing.assert_allclose(fast.depth_without[formula], slow.depth_without[formula], atol=tolerance, rtol=0)
        np.testing.assert_allclose(fast.derivative[formula], slow.derivative[formula], atol=tolerance, rtol=0)


@pytest.mark.parametrize("name", AIRS)
def test_halved_steps_change_nothing(make_air, monkeypatch, name):
    """Half the steps along and across the chords, and a thinner top: under 1e-3 scale heights."""
    air = make_air(**AIRS[name])
    gases = [line_like("X", ROWS, seed=4), line_like("N2", ROWS, seed=5)]
    coarse = depth_of(air, gases, some_pairs(6), ["X"])
    monkeypatch.setattr(chords_module, "_PANEL_E_FOLDS", 1.0)
    monkeypatch.setattr(chords_module, "_STEPS_ALONG_CHORD", 160)
    monkeypatch.setattr(extent, "_THIN", 1e-5)
    fine = depth_of(air, gases, some_pairs(6), ["X"])
    unit = scale_height_of_depth(air)
    assert np.abs(fine.depth - coarse.depth).max() < 1e-3 * unit
    assert np.abs(fine.depth_without["X"] - coarse.depth_without["X"]).max() < 1e-3 * unit
    assert np.abs(fine.derivative["X"] - coarse.derivative["X"]).max() < 1e-3 * unit


def test_without_is_the_model_without(make_air):
    """Taking a gas's opacity out of the input gives the same depth, even where it dominates by a factor 1e8."""
    air = make_air()
    gases = [line_like("X", ROWS, seed=7), line_like("N2", ROWS, seed=8)]
    strong = replace(gases[0], log10_cross_section=gases[0].log10_cross_section + 8)
    pairs = some_pairs(9)
    shares = depth_of(air, [strong, gases[1]], pairs, ["X", "N2"])
    no_x = depth_of(air, gases[1:], pairs[:1])
    no_n2 = depth_of(air, [strong], pairs[2:])
    np.testing.assert_allclose(shares.depth_without["X"], no_x.depth, rtol=0, atol=1e-4 * scale_height_of_depth(air))
    np.testing.assert_allclose(shares.depth_without["N2"], no_n2.depth, rtol=0, atol=1e-4 * scale_height_of_depth(air))


@pytest.mark.parametrize("formula", ["X", "Y"])
def test_slope_against_finite_differences(make_air, formula):
    """Mixing ratios moved against a filler: slopes follow the chain rule, pairs with "every other gas" included."""
    ratios = {"N2": 0.6, "X": 0.1, "Y": 0.2, "filler": 0.1}
    gases = [line_like("X", ROWS, seed=10), line_like("Y", ROWS, seed=11)]
    pairs = [*some_pairs(12), PairOpacity(first="Y", second="X", coefficient_cm5=np.full(SIZE, 1e-44))]

    def model(step):
        moved = dict(ratios)
        moved[formula] += step
        moved["filler"] -= step
        return depth_of(make_air(mixing_ratios=moved), gases, pairs, ["N2", "X", "Y", "filler"])

    step = 1e-2 * ratios[formula]
    found = (model(step).depth - model(-step).depth) / (2 * step)
    slopes = model(0.0).derivative
    expected = slopes[formula] / ratios[formula] - slopes["filler"] / ratios["filler"]
    unit = scale_height_of_depth(make_air()) / ratios[formula]
    np.testing.assert_allclose(found, expected, atol=1e-3 * unit, rtol=0)
    assert np.abs(expected).max() > 0.5 * unit


def test_order_of_gases_and_samples_is_free(make_air):
    """Gases, pairs and wavenumbers in another order give the same numbers; so do samples in several blocks."""
    size = 1025  # two blocks and one wavenumber
    air = make_air()
    gases = [line_like("X", ROWS, seed=13, size=size), line_like("N2", ROWS, seed=14, size=size)]
    pairs = some_pairs(15, size)
    shares = depth_of(air, gases, pairs, ["X", "N2"])
    swapped = depth_of(air, gases[::-1], pairs[::-1], ["N2", "X"])
    tolerance = 1e-5 * scale_height_of_depth(air)
    np.testing.assert_allclose(swapped.depth, shares.depth, rtol=0, atol=tolerance)
    np.testing.assert_allclose(swapped.derivative["X"], shares.derivative["X"], rtol=0, atol=tolerance)
    order = np.random.default_rng(0).permutation(size)
    shuffled = depth_of(
        air,
        [
            replace(
                gas,
                log10_cross_section=gas.log10_cross_section[:, order],
                flat_cross_section_cm2=gas.flat_cross_section_cm2[order],
            )
            for gas in gases
        ],
        [replace(pair, coefficient_cm5=pair.coefficient_cm5[order]) for pair in pairs],
        ["X", "N2"],
    )
    for name in ("X", "N2"):
        np.testing.assert_array_equal(shuffled.depth_without[name], shares.depth_without[name][order])


def test_a_gas_in_two_halves(make_air):
    """Two gases of half the amount and the same cross-sections are one gas."""
    one = line_like("X", ROWS, seed=16)
    halves = [one, replace(one, formula="Y")]
    whole = depth_of(make_air(), [one])
    split = depth_of(make_air(mixing_ratios={"N2": 0.9, "X": 0.05, "Y": 0.05}), halves)
    np.testing.assert_allclose(split.depth, whole.depth, rtol=0, atol=1e-5 * scale_height_of_depth(make_air()))


def test_doubling_a_saturated_gas(make_air, flat_gas):
    """A saturated band rises by H ln 2 when its gas is doubled (planet large against its air)."""
    air = make_air(base_radius_km=1e7)
    star_km = 2e8

    def radius(ratio):
        doubled = replace(air, mixing_ratios={"X": ratio, "N2": 1 - ratio})
        return radius_km(depth_of(doubled, [flat_gas("X", 1e-20)], star_km=star_km).depth[0], star_km)

    assert radius(2e-3) - radius(1e-3) == pytest.approx(air.scale_height_km * np.log(2), rel=1e-4)


def test_rayleigh_slope(make_air, flat_gas):
    """Haze alone: the radius falls by 4 H per unit of ln wavelength, wherever the surface is hidden."""
    air = make_air(base_radius_km=1e7, haze_factor=1e6)
    wavenumber = np.geomspace(5000, 20000, 30)
    depth = transit_depth(air, [], [], wavenumber_per_cm=wavenumber, star_radius_km=2e8).depth
    slope = np.polyfit(np.log(1 / wavenumber), radius_km(depth, 2e8), 1)[0]
    assert slope == pytest.approx(-4 * air.scale_height_km, rel=1e-3)


@settings(derandomize=True, max_examples=25, deadline=None)
@given(
    temperature=st.floats(150, 600),
    mass=st.floats(4, 50),
    log_sigma=st.floats(-26, -17),
    ratio=st.floats(1e-6, 0.5),
)
def test_hotter_lighter_richer_is_larger(temperature, mass, log_sigma, ratio):
    """Raising temperature, lowering molar mass, adding gas: each makes the planet larger; shares keep their order."""
    x = GasOpacity(
        formula="X",
        pressures_bar=[],
        log10_cross_section=None,
        flat_cross_section_cm2=np.array([10**log_sigma]),
    )

    def model(t=temperature, m=mass, r=ratio):
        air = Air(
            temperature_k=t,
            base_pressure_bar=1.0,
            base_radius_km=6000.0,
            base_gravity_m_per_s2=9.0,
            mixing_ratios={"N2": 1 - r, "X": r},
            molar_mass_g=m,
            surface=True,
        )
        return depth_of(air, [x], shares_of=["X"])

    plain = model()
    # lower density at the base can win over a larger height while the air is thin: only where it is thick
    if plain.bottom_transmission[0] < 1e-3:
        assert model(t=1.05 * temperature).depth > plain.depth
    assert model(m=0.95 * mass).depth > plain.depth
    assert model(r=1.05 * ratio).depth > plain.depth
    assert plain.depth_without["X"] == pytest.approx((6000.0 / STAR_KM) ** 2, rel=1e-7)
    assert plain.derivative["X"] > 0


@settings(derandomize=True, max_examples=20, deadline=None)
@given(deck=st.floats(1e-5, 0.9), fraction=st.floats(0, 1))
@example(deck=0.03, fraction=0.0)
@example(deck=0.03, fraction=1.0)
@example(deck=0.999, fraction=0.5)
def test_cloud_mixes_two_columns(deck, fraction):
    """A partial deck is the mean of the clear and the closed sky; neither end is special."""
    base = {
        "temperature_k": 300.0,
        "base_pressure_bar": 1.0,
        "base_radius_km": 6000.0,
        "base_gravity_m_per_s2": 9.0,
        "mixing_ratios": {"N2": 0.99, "X": 0.01},
        "molar_mass_g": 28.0,
        "surface": True,
    }
    gases = [line_like("X", ROWS, seed=17)]
    clear, closed, mixed = (
        depth_of(Air(**base, cloud_top_bar=top, cloud_fraction=part), gases).depth
        for top, part in ((None, 1.0), (deck, 1.0), (deck, fraction))
    )
    unit = scale_height_of_depth(Air(**base))
    np.testing.assert_allclose(mixed, (1 - fraction) * clear + fraction * closed, rtol=0, atol=1e-3 * unit)


def test_cloud_hides_what_lies_below(make_air, flat_gas):
    """Weak absorption ends at the cloud top; absorption well above it does not feel the cloud."""
    air = make_air()
    gas = flat_gas("X", [1e-30, 1e-18])
    clouded = replace(air, cloud_top_bar=0.01)
    depth = depth_of(clouded, [gas]).depth
    top_km = float(air.radius_km(np.log(100.0)))
    assert radius_km(depth[0]) == pytest.approx(top_km, abs=1e-3 * air.scale_height_km)
    assert depth[1] == pytest.approx(depth_of(air, [gas]).depth[1], abs=1e-3 * scale_height_of_depth(air))


def test_refraction_boundary_acts_as_a_bottom(make_air, flat_gas):
    """Nothing shows from below the critical radius, under clear and clouded parts alike."""
    air = make_air(critical_radius_km=5900.0)
    transparent = flat_gas("X", 0.0)
    assert radius_km(depth_of(air, [transparent]).depth[0]) == pytest.approx(5900.0, rel=1e-9)
    clouded = replace(air, cloud_top_bar=0.5, cloud_fraction=0.5)
    assert radius_km(depth_of(clouded, [transparent]).depth[0]) == pytest.approx(5900.0, rel=1e-9)


def test_without_a_surface_the_base_is_only_a_label(make_air):
    """The same column labelled at another pressure gives the same depth; it goes on to the end of the tables."""
    gases = [line_like("X", ROWS, seed=18)]
    at_one = make_air(surface=False, base_pressure_bar=1.0)
    r = float(at_one.radius_km(np.log(100.0)))
    gravity = at_one.base_gravity_m_per_s2 * (at_one.base_radius_km / r) ** 2
    relabelled = replace(at_one, base_pressure_bar=0.01, base_radius_km=r, base_gravity_m_per_s2=gravity)
    here, there = depth_of(at_one, gases), depth_of(relabelled, gases)
    unit = scale_height_of_depth(at_one)
    np.testing.assert_allclose(there.depth, here.depth, rtol=0, atol=1e-3 * unit)
    np.testing.assert_allclose(there.bottom_transmission, here.bottom_transmission, atol=1e-4)
    deepest = float(at_one.radius_km(-np.log(10.0)))
    assert radius_km(here.depth.min()) > deepest
    assert radius_km(here.depth.min()) < at_one.base_radius_km


def test_interpolation_between_tabulated_pressures(make_air):
    """A forest of Voigt lines, three pressures per decade: under 0.01 scale heights everywhere, and converging."""
    rng = np.random.default_rng(19)
    size, lines = 150, 300
    wavenumber = 2000 * np.exp(np.arange(size) / 50000)
    line, strength = rng.uniform(1995, 2011, lines), 1e-19 * 10 ** (-6 * rng.random(lines))
    width = rng.uniform(0.05, 0.1, lines)
    doppler = 2000 * 6e-7

    def table(rows):
        sigma = [(strength * voigt_profile(wavenumber[:, None] - line, doppler, width * p)).sum(1) for p in rows]
        return GasOpacity(
            formula="X",
            pressures_bar=rows,
            log10_cross_section=np.log10(sigma),
            flat_cross_section_cm2=np.zeros(size),
        )

    tables = [table(10.0 ** np.linspace(-6, 0, 6 * per + 1)) for per in (3, 6, 12)]
    for ratio in (1e-3, 1e-7):
        air = make_air(mixing_ratios={"N2": 1 - ratio, "X": ratio})
        three, six, many = (depth_of(air, [each]).depth for each in tables)
        unit = scale_height_of_depth(air)
        assert np.abs(three - many).max() < 0.01 * unit
        assert np.std(three - many) < 0.003 * unit
        assert np.abs(six - many).max() < 0.002 * unit


def test_table_that_jumps_stays_sensible(make_air):
    """Where a table leaps between rows (a wing cut off) no depth falls below that without the gas."""
    table = np.full((ROWS.size, SIZE), -np.inf)
    for k in range(SIZE):
        table[k % ROWS.size :, k] = -21.0
    gas = GasOpacity(formula="X", pressures_bar=ROWS, log10_cross_section=table, flat_cross_section_cm2=np.zeros(SIZE))
    depth = depth_of(make_air(), [gas], shares_of=["X"])
    assert np.all(np.isfinite(depth.depth))
    assert np.all(depth.depth >= depth.depth_without["X"])


def test_absent_and_transparent_gases(make_air, flat_gas):
    """A gas at mixing ratio zero has no share; gases without opacity may be named; pairs with strangers are nothing."""
    air = make_air(mixing_ratios={"N2": 0.9, "X": 0.1, "Y": 0.0})
    gases = [line_like("X", ROWS, seed=20), line_like("Y", ROWS, seed=21)]
    stranger = PairOpacity(first="X", second="Z", coefficient_cm5=np.full(SIZE, 1e-40))
    depth = depth_of(air, gases, [stranger], ["Y", "N2"])
    np.testing.assert_array_equal(depth.depth, depth_of(air, gases[:1]).depth)
    for formula in ("Y", "N2"):
        np.testing.assert_allclose(depth.depth_without[formula], depth.depth, rtol=1e-12)
        np.testing.assert_array_equal(depth.derivative[formula], 0.0)


def test_tables_of_different_pressures(make_air):
    """Gases keep their own rows: one on 22 pressures and one on 9 are the same as each added by itself."""
    long, short = line_like("X", ROWS, seed=24), line_like("N2", ROWS[-9:], seed=25)
    air = make_air()
    together = depth_of(air, [long, short], shares_of=["X", "N2"])
    tolerance = 1e-4 * scale_height_of_depth(air)
    np.testing.assert_allclose(together.depth_without["N2"], depth_of(air, [long]).depth, rtol=0, atol=tolerance)
    np.testing.assert_allclose(together.depth_without["X"], depth_of(air, [short]).depth, rtol=0, atol=tolerance)
    np.testing.assert_allclose(depth_of(air, [short, long]).depth, together.depth, rtol=0, atol=tolerance)


def test_no_absorption_at_all(make_air):
    """A transparent column shows its surface."""
    depth = transit_depth(make_air(), [], [], wavenumber_per_cm=wavenumbers(3), star_radius_km=STAR_KM)
    np.testing.assert_allclose(depth.depth, (5868.0 / STAR_KM) ** 2, rtol=1e-12)
    np.testing.assert_allclose(depth.bottom_transmission, 1.0)


def test_memory_mapped_tables_are_taken(make_air, tmp_path):
    """Read-only, memory-mapped tables are used in place and give the same depth."""
    gas = line_like("X", ROWS, seed=22)
    np.save(tmp_path / "table.npy", gas.log10_cross_section)
    mapped = np.load(tmp_path / "table.npy", mmap_mode="r")
    stored = replace(gas, log10_cross_section=mapped)
    assert np.shares_memory(stored.log10_cross_section, mapped)
    np.testing.assert_array_equal(depth_of(make_air(), [stored]).depth, depth_of(make_air(), [gas]).depth)


def test_unbound_air_is_refused(make_air, flat_gas):
    """Air that still absorbs at four times the base radius belongs to no planet of that mass."""
    air = make_air(temperature_k=600.0, molar_mass_g=2.3, base_gravity_m_per_s2=2.0)
    with pytest.raises(RangeError, match="air that the planet can hold"):
        depth_of(air, [flat_gas("X", 1e-18)])
    for loose in (replace(air, cloud_top_bar=1e-12), replace(air, base_gravity_m_per_s2=0.1)):
        with pytest.raises(RangeError, match="choose a lower temperature"):
            depth_of(loose, [flat_gas("X", 0.0)])


def test_short_table_is_refused(make_air):
    """A table must reach the bottom of the column, be it surface or closed deck."""
    gas = line_like("X", ROWS[:15], seed=23)  # up to 0.046 bar
    with pytest.raises(
        RangeError, match=r"cross-sections of X: expected pressures up to 1 bar.*got a table up to 0\.04"
    ):
        depth_of(make_air(), [gas])
    with pytest.raises(RangeError, match="up to 1 bar"):
        depth_of(make_air(surface=False), [gas])
    assert depth_of(make_air(cloud_top_bar=0.01), [gas]).depth.size == SIZE
