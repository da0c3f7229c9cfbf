"""The choice between gases on a small scenario of its own: gases with smooth spectra, whose tables are made at once."""

from __future__ import annotations

import json
from itertools import pairwise

import numpy as np
import pytest
from matplotlib.figure import Figure

from planner.catalogue.sharing import sharing_bands
from planner.errors import PlannerError
from planner.report.choicefigure import chart_figure, worth_figure
from planner.report.choicejson import choice_json
from planner.report.choices import choice_text
from planner.report.choicetable import choice_table
from planner.scenario import parse_scenario
from planner.studies import survey
from planner.studies.choose import choose
from planner.studies.plan import plan
from planner.studies.rivals import rival_ratio

SCENARIO = """
title = "Bright (invented)"
invented = true
modes = ["mid-infrared-slitless"]
[star]
name = "S"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "3 pc"
[planet]
name = "P"
mass = "0.6 M_earth"
radius = "1 R_earth"
period = "5.49 d"
impact_parameter = 0.25
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = { N2 = 1.0 }
[[candidates]]
gas = "CF4"
mixing_ratio = "1 ppb"
[goal]
threshold = 5
transits_available = 100
[noise]
floor = "5 ppm"
floor_resolving_power = 100
"""
GASES = ("CFC-11", "CFC-12", "CF4")


@pytest.fixture(scope="module", autouse=True)
def store(tmp_path_factory):
    """A store of their own for these tests; rivals are sought among the gases that need no tables of lines."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("LIMBCAST_STORE", str(tmp_path_factory.mktemp("store")))
        smooth = {"CCl3F", "CCl2F2", "CF4", "CCl4", "SF6"}
        patch.setattr(survey, "sharing_bands", lambda gas: tuple(g for g in sharing_bands(gas) if g in smooth))
        yield


def industry(hours=100.0, text=SCENARIO, **more):
    return choose(parse_scenario(text), hypothesis="industry", gases=more.pop("gases", GASES), hours=hours, **more)


@pytest.fixture(scope="module")
def result():
    return industry()


def bits(result):
    return {choice.gas: float(choice.worth.amplitude_bits) for choice in result.choices}


def test_every_gas_and_mode_has_a_row_in_the_order_of_worth(result):
    """Formulas whatever the gases were called, most worth first."""
    assert {choice.gas for choice in result.choices} == {"CCl3F", "CCl2F2", "CF4"}
    worths = [float(choice.worth.amplitude_bits) for choice in result.choices]
    assert worths == sorted(worths, reverse=True)
    assert max(worths) > 0


def test_reference_is_the_middle_of_the_range_believed(result):
    """Geometric middle of the catalogue's range under the hypothesis."""
    for choice in result.choices:
        assert choice.mixing_ratio == pytest.approx(np.sqrt(np.prod(choice.mixing_ratio_range)))


def test_rivals_have_the_widths_that_they_have_in_a_plan(result):
    """One rule for the prior on a gas that may be there too, whichever study asks."""
    resembling = [choice.resembling for choice in result.choices if choice.resembling is not None]
    assert resembling
    assert all(like.mixing_ratio == rival_ratio(like.gas) for like in resembling)


def test_limits_are_in_order(result):
    """What endless transits reach is less than what the hours reach; what a null excludes is more."""
    for choice in result.choices:
        if choice.reachable_ratio is not None:
            assert choice.limit_ratio <= choice.reachable_ratio
        if choice.excluded_ratio is not None:
            assert choice.reachable_ratio < choice.excluded_ratio
        assert 0 < choice.uniqueness <= 1


def test_amplitude_tells_no_less_after_more_hours():
    """From a few transits to very many, floor and unknowns included."""
    worths = [bits(industry(hours)) for hours in (10.0, 400.0, 40_000.0)]
    for gas in worths[0]:
        told = [worth[gas] for worth in worths]
        assert all(b >= a - 1e-4 * a for a, b in pairwise(told)), (gas, told)
        assert told[-1] > 1.1 * told[0], "a test of rising figures takes figures that rise"


def test_too_few_hours_for_a_transit_tell_nothing():
    """No transit, no bits."""
    none = industry(1.0)
    assert all(choice.transits == 0 and choice.worth.amplitude_bits < 1e-12 for choice in none.choices)
    assert none.nobody_wins == 1


def test_haze_never_helps_when_all_else_is_known(result):
    """Scattering hides bands: the S/N with everything else known falls or stays."""
    hazy = industry(text=SCENARIO.replace("[[cand", "[atmosphere.haze]\nfactor = 3000\n[[cand", 1))
    clear = {choice.gas: choice.plan.all_known.snr_one_transit for choice in result.choices}
    left = [choice.plan.all_known.snr_one_transit / clear[choice.gas] for choice in hazy.choices]
    assert max(left) <= 1 + 1e-6
    assert min(left) < 0.99, "a haze that hides nothing tests nothing"


def test_spots_are_thought_of_as_in_a_plan():
    """A gas seen on a spotted star has the S/N that a plan of the same search gives it, thinned samples apart."""
    spotted = SCENARIO.replace("[planet]", "[star.spots]\n[star.faculae]\n[planet]", 1)
    (choice,) = industry(text=spotted, gases=("CF4",)).choices
    same = spotted.replace('"1 ppb"', f"{choice.mixing_ratio:.10e}")
    (row,) = plan(parse_scenario(same)).rows
    assert choice.plan.marginalised.snr_one_transit == pytest.approx(row.marginalised.snr_one_transit, rel=0.02)
    (quiet,) = industry(gases=("CF4",)).choices
    assert choice.plan.marginalised.snr_one_transit < 0.98 * quiet.plan.marginalised.snr_one_transit


def test_beliefs_of_the_scenario_take_the_place_of_the_catalogue(result):
    """Alike either way is worth nothing; a prior of one half leaves a whole bit to learn."""
    alike = "{ probability = 0.3, probability_range = [0.1, 0.5], mixing_ratio_range = ['30 ppt', '20 ppb'] }"
    text = SCENARIO + (
        f"[beliefs.industry]\nprobability = 0.5\nprobability_range = [0.4, 0.6]\n"
        f"[beliefs.gases.CFC-12.industry]\nif_true = {alike}\nif_false = {alike}\n"
    )
    ours = industry(text=text)
    assert bits(ours)["CCl2F2"] == pytest.approx(0, abs=1e-12)
    assert bits(ours)["CCl3F"] > bits(result)["CCl3F"]
    assert ours.most_bits == pytest.approx(1)


def test_patterns_hold_what_was_asked_and_what_the_literature_has(result):
    """The three gases of industry are judged together; a set that was asked for is there too."""
    assert any(set(p.gases) == {"CCl3F", "CCl2F2", "CF4"} for p in result.patterns)
    asked = industry(together=[("CFC-11", "CF4")])
    pattern = next(p for p in asked.patterns if p.how == "asked for")
    assert pattern.gases == ("CCl3F", "CF4")
    assert pattern.joint.bits <= sum(pattern.alone_bits) + 4 * pattern.joint.error
    assert pattern.joint.bits >= max(pattern.alone_bits) - 4 * pattern.joint.error


def test_shares_of_winners_add_up(result):
    """Every opinion has a winner, or finds nothing worth going for."""
    assert sum(choice.wins for choice in result.choices) + result.nobody_wins == pytest.approx(1)


def test_same_seed_same_result(result):
    """Draws are seeded."""
    again = industry()
    assert [c.bits_spread for c in again.choices] == [c.bits_spread for c in result.choices]
    assert [p.joint for p in again.patterns] == [p.joint for p in result.patterns]


def test_interpolation_is_near_what_was_computed(result):
    """The stated miss of the curve is small, and stated in per cent."""
    miss = float(result.accuracy[0].split("by ")[1].split(" %")[0])
    assert miss < 5


def test_unknown_gas_is_refused():
    """A gas that no catalogue has ends the study before it begins."""
    with pytest.raises(PlannerError, match="unobtainium"):
        industry(gases=("unobtainium",))


@pytest.mark.parametrize("width", [80, 100, 140])
def test_text_fits_the_terminal_and_says_what_is_judgement(result, width):
    """No line is longer than the terminal is wide; judgement is named."""
    text = choice_text(result, width)
    assert max(map(len, text.splitlines())) <= width
    assert "judgement" in text
    assert "The target is invented" in text
    assert "CFC-12" in text


def test_json_is_valid_and_complete(result):
    """A row per gas and mode with the keys of a plan and the worth; no number that JSON lacks."""
    tree = json.loads(choice_json(result))
    assert tree["format"] == "limbcast choose 1"
    assert len(tree["rows"]) == 3
    for key in ("transits_required", "hours_required_all_known", "amplitude_bits", "detection_bits", "uniqueness"):
        assert key in tree["rows"][0]
    assert tree["patterns"][0]["bits"] >= tree["patterns"][-1]["bits"]


def test_table_has_a_row_per_choice(result):
    """The table that leaves as ECSV, in the same order."""
    table = choice_table(result)
    assert list(table["gas"]) == [choice.gas for choice in result.choices]
    assert table.meta["hypothesis"] == "industry"


def test_figures_are_drawn_and_labels_keep_apart(result):
    """Both figures have panels, and no two names of marks overlap."""
    for figure in (worth_figure(result), chart_figure(result)):
        assert isinstance(figure, Figure)
        assert figure.axes
    figure = worth_figure(result)
    renderer = figure.canvas.get_renderer()
    names = {"CF$_{4}$", "CFC-11", "CFC-12"}
    boxes = [t.get_window_extent(renderer) for t in figure.axes[0].texts if t.get_text() in names]
    assert not any(a.overlaps(b) for i, a in enumerate(boxes) for b in boxes[:i])
