"""What follows from a scenario's parts together."""

from __future__ import annotations

import math

import astropy.units as u
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from pydantic import ValidationError

from planner.errors import ScenarioError
from planner.scenario import Bins, Case, Cloud, Planet, Star, parse_scenario, starting_scenario

START = starting_scenario()


def _with(*changes):
    text = START
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    return parse_scenario(text)


def test_records_made_in_python():
    """Parts can be made without a file, from strings or quantities, under the names of the file."""
    planet = Planet(name="b", mass=1 * u.M_earth, radius="1 R_earth", period="1 d", impact_parameter=0)
    assert planet.gravity_m_per_s2 == pytest.approx(9.798, rel=1e-3)  # G M / R^2 with the equatorial radius
    with pytest.raises(ValidationError, match="frozen"):
        planet.mass_mearth = 2.0
    with pytest.raises(ValidationError, match="the unit is missing"):
        Cloud(top=0.1)


def test_star_mass_and_log_g_agree():
    """A star given by its mass and the same star given by its log g are one star."""
    common = {"name": "s", "temperature": "2600 K", "radius": "0.12 R_sun", "distance": "12 pc"}
    by_mass = Star(**common, mass="0.09 M_sun")
    by_gravity = Star(**common, log_g=by_mass.log_g)
    assert by_gravity.mass_kg == pytest.approx(by_mass.mass_kg, rel=1e-12)
    with pytest.raises(ValidationError, match="got neither"):
        Star(**common)
    with pytest.raises(ValidationError, match="got both"):
        Star(**common, mass="0.09 M_sun", log_g=5)


def test_cases_in_order():
    """Candidates at each ratio in the order of the file, then the sets, ratio by ratio."""
    scenario = _with(
        ('title = "My search"', 'title = "x"\ntogether = [["CFC-11", "CFC-12"]]'),
        (
            "[goal]",
            '[[candidates]]\ngas = "CFC-11"\nmixing_ratio = [1e-9, 2e-9]\n'
            '[[candidates]]\ngas = "CFC-12"\nmixing_ratio = [3e-9, 4e-9]\n[goal]',
        ),
    )
    labels = [(case.label, case.mixing_ratios) for case in scenario.cases]
    assert labels == [
        ("CH4", (2e-6,)),
        ("CH4", (1e-4,)),
        ("CCl3F", (1e-9,)),
        ("CCl3F", (2e-9,)),
        ("CCl2F2", (3e-9,)),
        ("CCl2F2", (4e-9,)),
        ("CCl3F + CCl2F2", (1e-9, 3e-9)),
        ("CCl3F + CCl2F2", (2e-9, 4e-9)),
    ]


def test_air_holds_one_candidate_at_a_time():
    """The searched gas joins absorbers and background, the other candidates stay out, all adds up to one."""
    scenario = _with(("[goal]", '[[candidates]]\ngas = "O3"\nmixing_ratio = "1 ppm"\n[goal]'))
    air = scenario.air(scenario.cases[0])
    assert air == {"CH4": 2e-6, "CO2": 4e-4, "H2O": 2e-6, "N2": pytest.approx(1 - 4.04e-4)}
    assert "CH4" not in scenario.air()


def test_air_candidate_replaces_absorber():
    """A candidate that is also listed as absorber is there once, at its own ratio."""
    scenario = _with(('gas = "CH4"\nmixing_ratio = ["2 ppm", "100 ppm"]', 'gas = "CO2"\nmixing_ratio = "1 %"'))
    assert scenario.air(scenario.cases[0])["CO2"] == 0.01


def test_air_candidate_replaces_background_gas():
    """A candidate that is part of the background leaves it; the others keep their proportion."""
    scenario = _with(
        ("{ N2 = 1.0 }", "{ N2 = 6, Ar = 2, O2 = 2 }"),
        ('gas = "CH4"\nmixing_ratio = ["2 ppm", "100 ppm"]', 'gas = "O2"\nmixing_ratio = "1 %"'),
    )
    air = scenario.air(scenario.cases[0])
    assert air["O2"] == 0.01
    assert air["N2"] / air["Ar"] == pytest.approx(3)


@given(shares=st.lists(st.floats(1e-3, 1e3), min_size=2, max_size=4), ratio=st.floats(1e-12, 0.9))
@settings(derandomize=True, deadline=None, max_examples=50)
def test_air_adds_up(shares, ratio):
    """Whatever the shares and the ratio, the mole fractions add up to one and the background keeps its proportion."""
    gases = ["N2", "Ar", "O2", "He"][: len(shares)]
    table = ", ".join(f"{gas} = {share!r}" for gas, share in zip(gases, shares, strict=True))
    scenario = _with(("{ N2 = 1.0 }", f"{{ {table} }}"))
    air = scenario.air(Case(gases=("CH4",), mixing_ratios=(ratio,)))
    assert math.fsum(air.values()) == pytest.approx(1, abs=1e-14)
    assert air["N2"] / air["Ar"] == pytest.approx(shares[0] / shares[1], rel=1e-12)


def test_molar_mass_of_dry_air():
    """N2, O2, Ar and CO2 in the proportions of dry air give 28.96 g per mol (US Standard Atmosphere 1976, table 3)."""
    scenario = _with(
        ("{ N2 = 1.0 }", "{ N2 = 0.78084, O2 = 0.20948, Ar = 0.00934 }"),
        ('{ CO2 = "400 ppm", H2O = "2 ppm" }', '{ CO2 = "314 ppm" }'),
    )
    assert scenario.molar_mass_g() == pytest.approx(28.9644, abs=0.005)


def test_distance_and_duration_are_stated_or_derived():
    """What the file states is taken; what it leaves out follows from period and stellar mass."""
    derived = parse_scenario(START)
    stated = _with(('# distance = "0.0275 au"', 'distance = "0.0275 au"'), ("# transit_d", "transit_d"))
    assert derived.orbital_distance_m == pytest.approx(stated.orbital_distance_m, rel=1e-3)
    assert stated.transit_duration_h == pytest.approx(55 / 60)
    assert derived.transit_duration_h == pytest.approx(0.891, rel=1e-3)
    assert 0 < derived.full_transit_duration_h < derived.transit_duration_h


def test_baseline():
    """The default is the larger of the transit and an hour."""
    assert parse_scenario(START).out_of_transit_h == 1.0
    assert _with(('# transit_duration = "55 min"', 'transit_duration = "70 min"')).out_of_transit_h == pytest.approx(
        7 / 6
    )
    assert _with(('# out_of_transit = "1.5 h"', 'out_of_transit = "1.5 h"')).out_of_transit_h == 1.5


def test_gravity_width():
    """Stated, else from the error of the mass, else ten per cent."""
    error = ('# mass_error = "0.05 M_earth"', 'mass_error = "0.05 M_earth"')
    stated = ("# [nuisances]", '[nuisances]\ngravity = "3 %"\n#')
    assert parse_scenario(START).gravity_fraction == 0.10
    assert _with(error).gravity_fraction == pytest.approx(0.05 / 0.85)
    assert _with(error, stated).gravity_fraction == 0.03


def test_changed_copies():
    """A changed copy keeps the rest, its own derived values, and the place of its keys."""
    scenario = parse_scenario(START, "a.toml")
    warmer = scenario.model_copy(
        update={"atmosphere": scenario.atmosphere.model_copy(update={"temperature_k": 500.0}), "bins": Bins()}
    )
    assert warmer.scale_height_km() == pytest.approx(2 * scenario.scale_height_km())
    assert warmer.place("planet", "mass") == scenario.place("planet", "mass") == "a.toml:28: planet.mass"


def test_scale_height_ppm():
    """The depth of one scale height is the ring's share of the stellar disc."""
    scenario = parse_scenario(START)
    ring = 2 * scenario.planet.radius_m * scenario.scale_height_km() * 1e3 / scenario.star.radius_m**2
    assert scenario.scale_height_ppm() == pytest.approx(1e6 * ring)


def test_range_of_a_fit():
    """Two mixing ratios in order, with or without units; a default where nothing is said."""
    assert parse_scenario(starting_scenario()).fit.mixing_ratio_range == (1e-10, 0.05)
    read = parse_scenario(starting_scenario() + '\n[fit]\nmixing_ratio_range = ["1 ppb", 0.01]\n')
    assert read.fit.mixing_ratio_range == (1e-9, 0.01)
    with pytest.raises(ScenarioError, match=r"fit.mixing_ratio_range: expected two mixing ratios \[lower, higher\]"):
        parse_scenario(starting_scenario() + "\n[fit]\nmixing_ratio_range = [0.1, 0.01]\n")
