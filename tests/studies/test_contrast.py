"""Two atmospheres told apart."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from small_system import SYSTEM

from planner.detection.significance import Measurement, one_sided_probability
from planner.detection.simulate import rate_above, simulated_significances
from planner.errors import ScenarioError
from planner.scenario import parse_scenario
from planner.studies.comparable import check_comparable
from planner.studies.contrast import Trial, contrast
from planner.studies.results import Verdict
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "{title}"
invented = true
modes = {modes}
{system}
[atmosphere]
temperature = "{temperature} K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {absorbers}
{candidates}
[goal]
threshold = 3
power = {power}
"""


def scenario(
    *candidates, title="A", absorbers='{ CO = "10 ppm" }', temperature=250, radius=0.12, power=0.5,
    modes='["grism-4-to-5-um"]',
):  # fmt: skip
    tables = "\n".join(f'[[candidates]]\ngas = "{gas}"\nmixing_ratio = {ratio}' for gas, ratio in candidates)
    return parse_scenario(
        SCENARIO.format(
            title=title, absorbers=absorbers, temperature=temperature, power=power, candidates=tables, modes=modes,
            system=SYSTEM.strip().replace("0.12 R_sun", f"{radius} R_sun"),
        ),
        f"{title}.toml",
    )  # fmt: skip


N2O, OCS = ("N2O", "3e-4"), ("OCS", "1e-4")


@pytest.fixture(scope="module")
def result():
    """Air with N2O against air with OCS."""
    return contrast(scenario(N2O), scenario(OCS, title="B"))


def test_either_can_be_ruled_out(result):
    """The number of transits is that of the harder of the two."""
    row = result.rows[0]
    assert row.verdict is Verdict.WITHIN_REACH
    both = (row.b_excluded.transits_required, row.a_excluded.transits_required)
    assert row.transits_required == max(both)
    assert row.all_known.transits_required <= min(both)


def test_letters_are_only_names(result):
    """Exchanging the scenarios exchanges the roles and changes nothing else."""
    swapped = contrast(scenario(OCS), scenario(N2O, title="B")).rows[0]
    row = result.rows[0]
    assert swapped.transits_required == row.transits_required
    assert swapped.a_excluded.snr_one_transit == pytest.approx(row.b_excluded.snr_one_transit, rel=1e-9)
    assert swapped.b_excluded.snr_limit == pytest.approx(row.a_excluded.snr_limit, rel=1e-9)


def test_same_air_is_never_told_apart():
    """Nothing differs, nothing is found."""
    row = contrast(scenario(N2O), scenario(N2O, title="B")).rows[0]
    assert row.verdict is Verdict.NO_BAND
    assert row.transits_required is None
    assert row.b_excluded.snr_one_transit == 0.0


def test_gas_against_next_to_none_of_it_is_a_plan():
    """Ruling out air without the gas, if it is there, is detecting the gas: same S/N as a plan's to 2 %."""
    row = contrast(scenario(N2O), scenario(("N2O", "1e-18"), title="B")).rows[0]
    planned = scenario(N2O)
    m = see(Workshop(planned), planned.cases[0]).measurements[0]
    assert row.b_excluded.snr_one_transit == pytest.approx(m.snr(1), rel=0.02)
    assert row.all_known.snr_one_transit == pytest.approx(m.known().snr(1), rel=0.02)


def test_candidates_are_held_and_absorbers_are_not(result):
    """What is to be told apart is held as stated; the same gas as absorber is unknown, and that costs."""
    assert (result.held_a, result.held_b) == (("N2O",), ("OCS",))
    assert not {"N2O", "OCS"} & {name for name, _ in (*result.nuisances_a, *result.nuisances_b)}
    free = scenario(("CO", '"10 ppm"'), absorbers='{ OCS = "100 ppm" }', title="B")
    row = contrast(scenario(N2O), free).rows[0]
    assert row.b_excluded.snr_one_transit < result.rows[0].b_excluded.snr_one_transit
    assert row.b_excluded.snr_limit < 0.95 * result.rows[0].b_excluded.snr_limit


def test_air_can_differ_in_temperature_alone():
    """Not only gases: the same air at another temperature."""
    row = contrast(scenario(N2O), scenario(N2O, title="B", temperature=400)).rows[0]
    assert row.all_known.snr_one_transit > 0
    assert row.b_excluded.snr_one_transit < row.all_known.snr_one_transit


def test_sets_of_gases():
    """Air with two candidates holds both at once."""
    both = contrast(scenario(N2O, OCS), scenario(("CO", '"10 ppm"'), title="B"))
    assert {gas for gas, _ in both.gases_a} == {"N2", "N2O", "OCS", "CO"}
    assert both.held_a == ("N2O", "OCS")
    assert (
        both.rows[0].transits_required
        <= contrast(scenario(N2O), scenario(("CO", '"10 ppm"'), title="B")).rows[0].transits_required
    )


def test_bins_add_up(result):
    """Shares of the bins add up to 1, and the bins that decide lie where the difference is."""
    spectrum = result.spectra[0]
    assert spectrum.share.sum() == pytest.approx(1.0)
    best = result.rows[0].best_bands[0]
    at = spectrum.from_um[np.argmax(spectrum.share)]
    assert best.from_um <= at <= best.to_um
    assert spectrum.transits == result.rows[0].transits_required


def test_combined_modes_take_part():
    """A contrast has a row for the combination of modes too."""
    modes = '["grism-4-to-5-um", "grism-2-to-4-um", "combined"]'
    rows = contrast(scenario(N2O, modes=modes), scenario(OCS, title="B", modes=modes)).rows
    assert rows[2].mode == "combined"
    assert rows[2].b_excluded.snr_one_transit > rows[0].b_excluded.snr_one_transit


# -- the statistics -------------------------------------------------------------------------------------------------


def trial(floor=6.0):
    """Two atmospheres whose unknowns differ in shape and in width."""
    x = np.linspace(-1, 1, 50)
    template = 40 * np.exp(-0.5 * ((x - 0.2) / 0.15) ** 2)
    wrong = Measurement(
        template_ppm=template, white_ppm=np.full(50, 60.0), floor_ppm2=np.eye(50) * floor**2,
        nuisances=("offset", "slope"), directions_ppm=np.array([np.full(50, 1000.0), 40 * x]),
    )  # fmt: skip
    moving = 25 * np.exp(-0.5 * ((x - 0.3) / 0.2) ** 2)
    true = replace(wrong, nuisances=("offset", "bump"), directions_ppm=np.array([np.full(50, 1000.0), moving]))
    return Trial(wrong=wrong, true=true)


@pytest.mark.parametrize("power", [0.2, 0.5, 0.9])
def test_power_of_ruling_out(power):
    """Observations of the true atmosphere, its own unknowns drawn, rule out the wrong one as often as asked for."""
    t, rng = trial(), np.random.default_rng(11)
    transits = t.transits_for(3.0, power)
    moved = rng.standard_normal((20_000, 2)) @ t.true.directions_ppm
    found = simulated_significances(t.wrong, transits, 20_000, rng, imitations_ppm=moved)
    # imitations are picked with repeats: up to twice the variance of free draws
    assert abs(rate_above(found, 3.0).errors_from(power)) < 3 * np.sqrt(2)
    assert found.std() == pytest.approx(t.width(transits), rel=0.03)
    assert t.width(transits) != pytest.approx(1.0, abs=0.1)


def test_false_exclusions():
    """Were the one to be ruled out true after all, it would be ruled out as seldom as the threshold says."""
    t = trial()
    found = simulated_significances(t.wrong, 40, 100_000, np.random.default_rng(12), amplitude=0.0)
    for sigma in (1.5, 2.0, 2.5):
        assert abs(rate_above(found, sigma).errors_from(one_sided_probability(sigma))) < 3


def test_alike_unknowns_have_width_one():
    """When both atmospheres move alike the significance has unit width, and power is that of a plan."""
    t = trial()
    same = Trial(wrong=t.wrong, true=t.wrong)
    assert same.width(17) == pytest.approx(1.0, rel=1e-9)
    assert same.transits_for(3.0, 0.9) == pytest.approx(t.wrong.transits_for(3.0 + 1.2815516), rel=1e-4)


def test_out_of_reach_stays_so():
    """A floor above the difference, at any power."""
    high = trial(floor=80.0)
    assert high.transits_for(3.0, 0.5) is None
    assert high.transits_for(3.0, 0.9) is None


# -- what is refused ------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("second", "message"),
    [
        (
            lambda: scenario(N2O, title="B", radius=0.13),
            r"B.toml:5: star: expected what stands at A.toml:5: star.*radius",
        ),
        (lambda: scenario(N2O, title="B", modes='["grism-2-to-4-um"]'), r"B.toml:4: modes: .* got another modes"),
        (lambda: scenario(N2O, title="B", power=0.9), r"goal: .* got another power"),
        (
            lambda: scenario(("N2O", "[1e-6, 1e-5]"), title="B"),
            r"B.toml:\d+: cand.*expected one mixing ratio.*got 2",
        ),
        (lambda: scenario(("N2O", 0.6), ("OCS", 0.5), title="B"), r"leave room for the background.*got a sum of 1.1"),
    ],
)
def test_refused(second, message):
    """Another planet, another question, or air that is not fixed."""
    with pytest.raises(ScenarioError, match=message):
        check_comparable(scenario(N2O), second())
