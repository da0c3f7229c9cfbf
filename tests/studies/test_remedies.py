"""What would help: each piece of advice, followed, does what it says."""

from __future__ import annotations

import numpy as np
import pytest
from small_system import SYSTEM

from planner.detection.significance import Measurement
from planner.scenario import parse_scenario
from planner.studies import remedies
from planner.studies.forward import Change
from planner.studies.plan import plan
from planner.studies.results import RemedyKind, Verdict
from planner.studies.rivals import LEAST_RATIO, absent_rivals, rival_directions, rival_ratio, try_rivals
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "Small"
invented = true
modes = ["grism-4-to-5-um"]
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {{ CO = "10 ppm" }}
cloud = {{ top = "{top} bar" }}
[[candidates]]
gas = "N2O"
mixing_ratio = {ratio}
[goal]
threshold = 3
transits_available = {transits}
[noise]
floor = "{floor} ppm"
"""


def scenario(top=0.02, ratio=3e-6, floor=15, transits=1000):
    return parse_scenario(SCENARIO.format(top=top, ratio=ratio, floor=floor, transits=transits) + SYSTEM)


@pytest.fixture(scope="module")
def advised():
    """The row of a search that floor and clouds hinder, with all advice; one more mode is on offer."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(remedies, "list_modes", lambda: ("medium-grating-3-to-5-um", "grism-4-to-5-um"))
        return plan(scenario(), remedies=True).rows[0]


def the(row, kind):
    return next(remedy for remedy in row.remedies if remedy.kind is kind)


def unrounded(**changed):
    """S/N after the transits on offer, from a plan of the changed scenario."""
    found = scenario(**changed)
    return see(Workshop(found), found.cases[0]).measurements[0].snr(found.transits_on_offer)


def test_search_is_out_of_reach(advised):
    """The example needs help, of every kind."""
    assert advised.verdict in (Verdict.FLOOR, Verdict.CONFUSION, Verdict.TOO_MANY)
    assert {remedy.kind for remedy in advised.remedies} == set(RemedyKind)
    assert advised.confused_to < advised.confused_from


def test_advised_floor_is_enough(advised):
    """With the floor advised the goal is met at the transits on offer, to rounding."""
    remedy = the(advised, RemedyKind.FLOOR)
    assert remedy.enough
    assert 0 < remedy.floor_ppm < 15
    assert unrounded(floor=remedy.floor_ppm) == pytest.approx(3.0, rel=5e-3)


def test_advised_amount_is_enough(advised):
    """With the mixing ratio advised the goal is met, to what was solved for and the thinned samples cost."""
    remedy = the(advised, RemedyKind.AMOUNT)
    assert remedy.enough
    assert remedy.mixing_ratio > 3e-6
    assert unrounded(ratio=remedy.mixing_ratio) == pytest.approx(3.0, rel=0.05)


def test_advised_sky(advised):
    """The sky advised does what is said of it, whether that is enough or not."""
    remedy = the(advised, RemedyKind.SKY)
    if remedy.enough and np.isfinite(remedy.cloud_top_bar):
        assert unrounded(top=remedy.cloud_top_bar) == pytest.approx(3.0, rel=0.05)
    else:
        assert remedy.cloud_top_bar == np.inf
        assert remedy.snr == pytest.approx(see_clear(), rel=0.05)


def see_clear():
    clear = scenario()
    clear = clear.model_copy(update={"atmosphere": clear.atmosphere.model_copy(update={"cloud": None})})
    return see(Workshop(clear), clear.cases[0]).measurements[0].snr(1000)


def test_advised_mode_is_a_joint_measurement(advised):
    """The S/N told for another mode is that of both modes planned together."""
    remedy = the(advised, RemedyKind.MODE)
    assert remedy.mode == "medium-grating-3-to-5-um"
    both = scenario()
    both = both.model_copy(update={"modes": ("grism-4-to-5-um", "medium-grating-3-to-5-um")})
    joined = Measurement.join(see(Workshop(both), both.cases[0]).measurements)
    assert remedy.snr == pytest.approx(joined.snr(1000), rel=0.05)
    low, high = remedy.band_um
    assert 2.8 <= low < high <= 5.2


def test_other_mode_of_the_scenario_needs_no_asking():
    """What the scenario has already is told without --remedies."""
    both = scenario()
    both = both.model_copy(update={"modes": ("grism-4-to-5-um", "medium-grating-3-to-5-um")})
    row = plan(both).rows[0]
    assert the(row, RemedyKind.MODE).mode == "medium-grating-3-to-5-um"
    assert {remedy.kind for remedy in row.remedies} == {RemedyKind.MODE, RemedyKind.FLOOR}
    assert row.rivals == ()


def test_hopeless_floor_says_so():
    """Where photons are too few, no floor at all is named as not enough."""
    row = plan(scenario(ratio=1e-8, transits=2)).rows[0]
    remedy = the(row, RemedyKind.FLOOR)
    assert not remedy.enough
    assert remedy.floor_factor == 0.0
    assert remedy.snr < 3.0


def test_within_reach_needs_no_change():
    """A search that succeeds is not told of lower floors, nor of more gas."""
    row = plan(scenario(top=0.3, ratio=1e-5, floor=1)).rows[0]
    assert row.verdict is Verdict.WITHIN_REACH
    assert row.remedies == ()
    assert row.confused_from == pytest.approx(3.0, rel=1e-4)
    assert row.confused_to < 3.0


# -- rivals ---------------------------------------------------------------------------------------------------------


def test_rivals_come_from_the_catalogue(advised):
    """Gases that share bands and are not in the air were tried, dearest first, and cost something or nothing."""
    assert advised.rivals
    assert not {"N2O", "CO", "N2"} & {rival.gas for rival in advised.rivals}
    left = [rival.snr_left for rival in advised.rivals]
    assert left == sorted(left)
    assert all(rival.snr_left <= rival.snr * (1 + 1e-9) for rival in advised.rivals)


def test_rival_named_by_the_scenario_costs_the_same(advised):
    """Naming the dearest rival in the scenario, at the width it was tried with, gives the S/N that was told."""
    dearest = advised.rivals[0]
    named = scenario()
    named = named.model_copy(
        update={"nuisances": named.nuisances.model_copy(update={"rivals": {dearest.gas: dearest.mixing_ratio}})}
    )
    measured = see(Workshop(named), named.cases[0]).measurements[0]
    assert f"rival {dearest.gas}" in measured.nuisances
    assert measured.snr(dearest.transits) == pytest.approx(dearest.snr_left, rel=1e-6)
    assert dearest.gas not in absent_rivals(Workshop(named), named.cases[0])


def test_rival_ratio():
    """Today's amount for industrial gases; a part in a million at least for others."""
    assert rival_ratio("CCl3F") < 1e-9
    assert rival_ratio("C2H2") == LEAST_RATIO
    assert rival_ratio("CO2") > 3e-4


def test_rival_direction_is_a_difference_of_spectra():
    """Depth with the rival on top less depth without, the searched gas transparent."""
    workshop = Workshop(scenario())
    case = workshop.scenario.cases[0]
    found = rival_directions(workshop.thin, case, ["OCS"])["OCS"][0]
    with_it, without = (
        workshop.thin.binned(case, change, transparent=case.gases)[0].depth_ppm
        for change in (Change(added=(("OCS", rival_ratio("OCS")),)), Change())
    )
    assert np.array_equal(found, with_it - without)
    assert found.max() > 0


def test_rival_of_the_same_shape_takes_all():
    """A rival that looks like the gas leaves next to nothing, one that looks like nothing leaves all."""
    bump = np.exp(-(np.linspace(-3, 3, 30) ** 2))
    m = Measurement(
        template_ppm=30 * bump, white_ppm=np.full(30, 20.0), floor_ppm2=np.zeros((30, 30)),
        directions_ppm=np.zeros((0, 30)),
    )  # fmt: skip
    rivals = try_rivals(m, {"OCS": np.zeros(30), "CO2": 3000 * bump}, 10)
    assert [rival.gas for rival in rivals] == ["CO2", "OCS"]
    assert rivals[0].snr_left < 0.1
    assert rivals[1].snr_left == pytest.approx(m.snr(10))
