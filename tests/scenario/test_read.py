"""Scenario files as a whole: the shipped ones, defaults, and every kind of mistake with its place."""

from __future__ import annotations

import re

import pytest

from planner.errors import ScenarioError
from planner.resources import data_folder
from planner.scenario import (
    Atmosphere,
    Bins,
    Candidate,
    Cloud,
    Goal,
    Haze,
    Noise,
    Nuisances,
    Planet,
    Scenario,
    Star,
    parse_scenario,
    read_scenario,
    starting_scenario,
)
from planner.scenario.beliefs import Beliefs, GasBelief, PresenceBelief, PriorBelief, Sides
from planner.scenario.search import Fit, Spread
from planner.scenario.surface import SurfaceRegion

DEMO = (data_folder("configs") / "scenarios" / "demo.toml").read_text()


def test_shipped_scenarios_are_read():
    """Every scenario that ships is valid and says whether it is invented."""
    paths = sorted((data_folder("configs") / "scenarios").glob("*.toml"))
    assert {path.name for path in paths} >= {"demo.toml", "starting.toml"}
    assert all(read_scenario(path).invented for path in paths)


def test_starting_scenario_states_the_defaults():
    """Optional keys stand in the starting file as comments, with the value that holds when they are left out."""
    start = parse_scenario(starting_scenario())
    for key, value in {
        "power": start.goal.power,
        "line_wing": start.atmosphere.line_wing_per_cm,
        "slope": -4,
        "offset": start.nuisances.offset_ppm,
        "radius": start.nuisances.radius_fraction * 100,
        "temperature": start.nuisances.temperature_fraction * 100,
        "gravity": start.gravity_fraction * 100,
        "molar_mass": start.nuisances.molar_mass_fraction * 100,
        "cloud_top": start.nuisances.cloud_top_dex,
        "haze": start.nuisances.haze_dex,
        "absorbers": start.nuisances.absorbers_dex,
        "mixing_ratio": start.spread.mixing_ratio_dex,
        "star_radius": start.spread.star_radius_fraction * 100,
        "resolving_power": start.bins.resolving_power,
    }.items():
        assert re.search(rf'^# {key} = "?{value:g}\b', starting_scenario(), re.MULTILINE), key


def test_starting_scenario_with_every_optional_key():
    """The commented keys of the starting file are keys that the reader knows."""
    lines = starting_scenario().splitlines()
    skip = ("# together", "# spectrum")
    text = "\n".join(
        re.sub(r"^# ((?:\w+ = |\[).*)$", r"\1", line) if not line.startswith(skip) else line for line in lines
    )
    scenario = parse_scenario(text)
    assert scenario.noise is not None
    assert scenario.noise.floor_ppm == 10
    assert scenario.atmosphere.cloud is not None
    assert scenario.atmosphere.cloud.top_bar == 0.1
    assert scenario.atmosphere.haze is not None
    assert scenario.nuisances.rivals == {"C2H2": 1e-6}
    assert scenario.goal.transits_available == 50


MISTAKES = {
    "unit missing": (
        'mass = "0.85 M_earth"',
        'mass = "0.85"',
        'planet.mass: expected a mass such as "0.7 M_earth", got',
    ),
    "plain number": ('mass = "0.85 M_earth"', "mass = 0.85", "planet.mass: expected a mass .* unit is missing"),
    "wrong kind of unit": ('mass = "0.85 M_earth"', 'mass = "0.85 K"', 'planet.mass: expected a mass .* got "0.85 K"'),
    "no such unit": ('mass = "0.85 M_earth"', 'mass = "0.85 M_erth"', '"M_erth" is not a unit'),
    "not a number": ('mass = "0.85 M_earth"', 'mass = "nan M_earth"', "planet.mass: expected a finite value"),
    "infinite": ('period = "5.49 d"', 'period = "inf d"', "planet.period: expected a finite value"),
    "negative": ('temperature = "250 K"', 'temperature = "-250 K"', "atmosphere.temperature: .* greater than zero"),
    "unknown key": ("mass_error", "mas_error", 'planet.mas_error: unknown key; did you mean "mass_error"'),
    "unknown table": ("[goal]", "[goals]", 'goals: unknown key; did you mean "goal"'),
    "misplaced top key": ("[goal]", "modes = []\n[goal]", "belongs at the top of the file"),
    "switch": ("surface = true", "surface = 1", "atmosphere.surface: expected true or false, got 1"),
    "text": ('name = "Nowhere 1"', "name = 1", "star.name: expected a string in quotes, got 1"),
    "table for a value": ('period = "5.49 d"', "period.days = 5", "planet.period: expected a period .* got a table"),
    "value for a table": ("[atmosphere]", "[[atmosphere]]", "atmosphere: expected a .atmosphere. table"),
    "range": ("power = 0.5", "power = 1.0", "goal.power: expected a probability above 0 below 1, got 1.0"),
    "count": ("transits_available = 100", "transits_available = 0", "goal.transits_available: .* whole number"),
    "ratio": ('mixing_ratio = "100 ppm"', "mixing_ratio = -1", r"candidates\[1\].mixing_ratio: expected a mixing"),
    "too much gas": ('mixing_ratio = "100 ppm"', "mixing_ratio = 0.9999", "less than 1 together with the absorbers"),
    "too many absorbers": ('"400 ppm"', '"100 %"', "atmosphere.absorbers: .* room for the background"),
    "unknown gas": ('gas = "CFC-12"', 'gas = "CFC-122"', r"candidates\[2\].gas: .*CFC-122.*CFC-12"),
    "gas twice": ('gas = "O3"', 'gas = "methane"', r"candidates\[3\].gas: CH4 is a candidate already"),
    "absorber twice": ('H2O = "2 ppm"', "N2 = 1e-3", "atmosphere.absorbers.N2: N2 is a background gas already"),
    "whole background": ("{ N2 = 1.0 }", "{ O3 = 1.0 }", r"candidates\[3\].gas: O3 is the whole background"),
    "larger than its star": ('"1.00 R_earth"', '"1.00 R_sun"', "planet.radius: the planet is larger than its star"),
    "grazing": ("impact_parameter = 0.25", "impact_parameter = 0.99", "planet.impact_parameter: grazing transit"),
    "no transit": ("impact_parameter = 0.25", "impact_parameter = 1.2", "planet.impact_parameter: no transit"),
    "third law": ('"5.49 d"', '"5.49 d"\ndistance = "0.275 au"', "planet.distance: the period and the star's mass"),
    "inside the star": ('"5.49 d"', '"20 min"', "planet.period: the orbit lies inside the star"),
    "duration": ('"5.49 d"', '"5.49 d"\ntransit_duration = "55 h"', "planet.transit_duration: the orbit gives"),
    "two masses": ('"0.092 M_sun"', '"0.092 M_sun"\nlog_g = 5', "star: expected one of mass.* got both"),
    "unknown band": ("{ J =", "{ j =", 'star.magnitudes: expected keys out of .* did you mean "J"'),
    "magnitude": ('"11.28 mag"', '"11.28"', "star.magnitudes.J: expected a magnitude"),
    "no modes": ('modes = ["near', 'modes = []\n# ["near', "modes: expected a list of instrument modes"),
    "cloud in the ground": (
        "[goal]",
        '[atmosphere.cloud]\ntop = "2 bar"\n[goal]',
        "atmosphere.cloud.top: expected less",
    ),
    "rival in the air": ("[goal]", "[nuisances]\nrivals = { CO2 = 1e-6 }\n[goal]", "nuisances.rivals.CO2: .* rival"),
    "set of others": ("[star]", 'together = [["O2", "O3"]]\n[star]', r"together\[1\]: O2 is not among the candidates"),
    "uneven set": ("[star]", 'together = [["CH4", "CFC-12"]]\n[star]', r"together\[1\]: .* CH4 1, CCl2F2 2"),
    "flux without file": (
        "[planet]",
        "spectrum_at_earth = true\n[planet]",
        "star.spectrum_at_earth: expected a spectrum",
    ),
    "syntax": ('mass = "0.85 M_earth"', "mass = 0.85 M_earth", "not valid TOML in column 13: .*quotes"),
    "key twice": ('radius = "1.00 R_earth"', 'mass = "1 M_earth"', "not valid TOML .*overwrite"),
    "open string": ('period = "5.49 d"', 'period = "5.49 d', "not valid TOML"),
}


@pytest.mark.parametrize("kind", MISTAKES)
def test_mistakes(kind):
    """Each mistake is one message that names the file, the line it stands on and the key."""
    old, new, message = MISTAKES[kind]
    assert DEMO.count(old) >= 1
    changed = DEMO.replace(old, new, 1)
    with pytest.raises(ScenarioError, match=message) as caught:
        parse_scenario(changed, "demo.toml")
    assert str(caught.value).startswith("demo.toml:")


@pytest.mark.parametrize(
    ("kind", "text"),
    [("unit missing", 'mass = "0.85"'), ("unknown key", "mas_error"), ("unknown gas", "CFC-122"), ("grazing", "0.99")],
)
def test_mistakes_name_the_line(kind, text):
    """The line in the message is the line of the mistake."""
    old, new, _ = MISTAKES[kind]
    changed = DEMO.replace(old, new, 1)
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(changed, "demo.toml")
    line = int(str(caught.value).split(":")[1])
    assert text in changed.splitlines()[line - 1]


def test_all_mistakes_at_once_in_order():
    """Several mistakes come together, one per line, in the order of the file."""
    changed = DEMO.replace('"0.85 M_earth"', '"0.85"').replace("threshold = 5\n", "").replace('"2650 K"', '"2650 m"')
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(changed, "demo.toml")
    lines = str(caught.value).splitlines()
    assert [re.sub(r"^demo.toml:\d+: ([\w.]+):.*", r"\1", line) for line in lines] == [
        "star.temperature",
        "planet.mass",
        "goal.threshold",
    ]
    assert lines[2] == "demo.toml:45: goal.threshold: missing; expected a plain number of sigma above 0"


def test_missing_table_says_which():
    """An empty file lists the tables it lacks."""
    with pytest.raises(ScenarioError, match=r"scenario: star: missing; expected a \[star\] table"):
        parse_scenario("")


def test_read_scenario_invalid(tmp_path):
    """Files that are not there, not text, or folders are said to be so."""
    with pytest.raises(ScenarioError, match="no such file; `limbcast new"):
        read_scenario(tmp_path / "none.toml")
    (tmp_path / "binary.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(ScenarioError, match="not a text file in UTF-8"):
        read_scenario(tmp_path / "binary.toml")
    with pytest.raises(ScenarioError, match="cannot be read: Is a directory"):
        read_scenario(tmp_path)


def test_paths_are_relative_to_the_scenario(tmp_path):
    """Own spectra and modes are looked for beside the scenario, and missing ones refused with their line."""
    changed = DEMO.replace('"mid-infrared-slitless"', '"mine.toml"').replace(
        "[planet]", 'spectrum = "star.ecsv"\n[planet]'
    )
    path = tmp_path / "mine_too.toml"
    path.write_text(changed)
    with pytest.raises(ScenarioError, match=r"mine_too.toml:17: star.spectrum: no such file: .*star.ecsv"):
        read_scenario(path)
    (tmp_path / "star.ecsv").touch()
    with pytest.raises(ScenarioError, match=r"mine_too.toml:7: modes\[2\]: no such file: .*mine.toml"):
        read_scenario(path)
    (tmp_path / "mine.toml").touch()
    scenario = read_scenario(path)
    assert scenario.star.spectrum == tmp_path / "star.ecsv"
    assert scenario.modes == ("near-infrared-prism", tmp_path / "mine.toml")


def test_every_key_is_documented():
    """The README beside the scenarios has a line for every key, and names no key that is not read."""
    text = (data_folder("configs") / "README.md").read_text().split("## Scenario files")[1]
    documented = {
        key for row in re.findall(r"^\| (`.*?`) \|", text, re.MULTILINE) for key in re.findall(r"`(\w+)`", row)
    }
    records = [Scenario, Star, SurfaceRegion, Planet, Atmosphere, Cloud, Haze, Candidate, Goal, Noise, Nuisances, Bins]
    records += [Spread, Fit, Beliefs, GasBelief, Sides, PriorBelief, PresenceBelief]
    keys = {field.alias or name for record in records for name, field in record.model_fields.items()}
    # "haze" is a table of the atmosphere and a key of the nuisances
    tables = {
        "star",
        "spots",
        "faculae",
        "planet",
        "atmosphere",
        "cloud",
        "candidates",
        "goal",
        "noise",
        "nuisances",
        "spread",
        "fit",
        "bins",
        *("beliefs", "life", "industry", "gases", "if_true", "if_false"),
    }
    assert documented == keys - tables
