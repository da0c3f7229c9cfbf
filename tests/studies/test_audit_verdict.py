"""Verdicts from findings, and the checks that need no spectrum."""

from __future__ import annotations

import pytest

from planner.claims.read import parse_claim
from planner.detection.significance import one_sided_probability, one_sided_sigma
from planner.studies.audit import audit
from planner.studies.checks.chance import check_evidence, check_trials
from planner.studies.checks.findings import Check, Finding, Outcome, Standing, judge, takes_too_much
from planner.studies.checks.level import check_reductions

BARE = 'title = "x"\n[claim]\ngas = "CO"\nfrom = "4.4 um"\nto = "5 um"\n'


def finding(check, outcome, left=None, **more):
    return Finding(
        check=check, outcome=outcome, tested="t", says=f"{check.value} says", why="w", left_sigma=left, **more
    )


def told(text):
    return parse_claim(BARE + text)


def test_weakest_link_is_the_check_that_leaves_least():
    """With nothing failed it stands, and the sentence names the link and what was not tested."""
    findings = (
        finding(Check.NOISE, Outcome.PASSED, 4.5),
        finding(Check.STAR, Outcome.PASSED, 3.2),
        finding(Check.RIVALS, Outcome.UNTESTED),
    )
    standing, sentence, weakest = judge("CO", 5.0, findings)
    assert (standing, weakest) == (Standing.STANDS, Check.STAR)
    assert sentence == (
        "The detection of CO stands up to every check that could be made; weakest link, star: star says. "
        "Not tested: rivals."
    )


@pytest.mark.parametrize(
    ("findings", "standing", "weakest"),
    [
        ((finding(Check.TRIALS, Outcome.FAILED, 2.5),), Standing.OPEN, Check.TRIALS),
        ((finding(Check.TRIALS, Outcome.FAILED, 1.5),), Standing.FALLS, Check.TRIALS),
        (
            (finding(Check.SIZE, Outcome.FAILED, 0), finding(Check.STAR, Outcome.FAILED, 1)),
            Standing.FALLS,
            Check.SIZE,
        ),
        ((finding(Check.RIVALS, Outcome.FAILED, 0.5, decides=False),), Standing.OPEN, Check.RIVALS),
        (
            (finding(Check.RIVALS, Outcome.FAILED, 0.5, decides=False), finding(Check.STAR, Outcome.FAILED, 1.5)),
            Standing.FALLS,
            Check.STAR,
        ),
    ],
)
def test_failed_checks(findings, standing, weakest):
    """It falls below 2.02 sigma, unless the check leaves the feature as real as it was."""
    found = judge("CO", 5.0, findings)
    assert (found[0], found[2]) == (standing, weakest)
    assert f"weakest link, {weakest.value}: {weakest.value} says" in found[1]


def test_chance_alone_makes_nothing_stand():
    """Trials and evidence are arithmetic: with nothing else tested a claim cannot be judged, and doubts are named."""
    passed = (finding(Check.TRIALS, Outcome.PASSED, 15.0), finding(Check.EVIDENCE, Outcome.PASSED, 15.0))
    assert judge("PH3", 15.0, passed)[0] is Standing.UNTESTED
    doubted = (*passed, finding(Check.OFFSETS, Outcome.UNTESTED, doubt=True))
    assert judge("PH3", 15.0, doubted)[2] is Check.OFFSETS
    assert judge("PH3", None, ())[0] is Standing.UNTESTED


def test_a_check_is_to_blame_only_for_what_it_takes():
    """A claim of 2.9 sigma that loses 0.1 to the star fails elsewhere."""
    assert not takes_too_much(2.8, 2.9)
    assert takes_too_much(2.8, 4.0)
    assert not takes_too_much(3.1, 9.0)


@pytest.mark.parametrize(
    ("counts", "trials"), [("gases_searched = 20", 20), ("gases_searched = 4\nmodels_tried = 5", 20)]
)
def test_trials_multiply(counts, trials):
    """3 sigma after 20 trials are 1.93 (closed form), however they come about."""
    found = check_trials(told(f"significance = 3\n[search]\n{counts}"), None)
    assert found.figures["trials"] == trials
    assert found.left_sigma == pytest.approx(1.93, abs=0.006)
    assert found.outcome is Outcome.FAILED


def test_one_trial_costs_nothing():
    """And a significance beyond the smallest float is left as it is."""
    found = check_trials(told("significance = 3\n[search]\ngases_searched = 1"), None)
    assert found.left_sigma == pytest.approx(3.0, abs=1e-9)
    assert found.outcome is Outcome.PASSED
    assert check_trials(told("significance = 90\n[search]\ngases_searched = 9"), None).left_sigma == 90


def test_trials_that_are_not_told():
    """It says how many the claim could bear: p(3 sigma) over p(claimed)."""
    found = check_trials(told("significance = 4"), None)
    assert found.outcome is Outcome.UNTESTED
    bears = one_sided_probability(3) / one_sided_probability(4)
    assert f"bear about {bears:.2g}" in found.says
    assert one_sided_sigma(bears * one_sided_probability(4)) == pytest.approx(3)


@pytest.mark.parametrize(("sigma", "outcome"), [(2.0, Outcome.FAILED), (2.7, Outcome.FAILED), (3.0, Outcome.PASSED)])
def test_evidence(sigma, outcome):
    """Less than moderate at its most favourable fails."""
    assert check_evidence(told(f"significance = {sigma}"), None).outcome is outcome


def test_measured_evidence_counts_where_it_is_less():
    """A quoted Bayes factor below the bound is what is judged; one above is not believed."""
    low = check_evidence(told("significance = 4\nln_bayes_factor = 1.2"), None)
    assert low.outcome is Outcome.FAILED
    assert "as measured" in low.says
    high = check_evidence(told("significance = 2\nln_bayes_factor = 9"), None)
    assert high.outcome is Outcome.FAILED


def test_reductions():
    """One that sees nothing decides by itself; where some see it and some do not, nothing is settled."""
    none = "[[reductions]]\nby = 'A'\nsees = false\n"
    some = "[[reductions]]\nby = 'B'\nsignificance = 4\n"
    assert check_reductions(told("")).outcome is Outcome.UNTESTED
    assert check_reductions(told(some)).outcome is Outcome.PASSED
    against = check_reductions(told(none))
    assert (against.outcome, against.left_sigma, against.decides) == (Outcome.FAILED, 0.0, True)
    mixed = check_reductions(told(none + some))
    assert (mixed.outcome, mixed.decides) == (Outcome.FAILED, False)


def test_claim_without_a_planet():
    """What can be judged is judged, the rest says what is missing; all ten checks are there, in order."""
    result = audit(told("significance = 2.5\n[search]\ngases_searched = 10"))
    assert [item.check for item in result.findings] == list(Check)
    assert result.standing is Standing.FALLS
    assert result.weakest is Check.TRIALS
    assert "star, planet or air are not given" in result.finding(Check.SIZE).says
