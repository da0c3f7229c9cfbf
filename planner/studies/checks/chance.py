"""Checks 5 and 6: what a significance is worth after all that was tried, and as evidence."""

from __future__ import annotations

from math import exp

import numpy as np

from planner.claims.records import Claim
from planner.detection.evidence import STRENGTHS, even_prior, ln_bayes_bound, strength_of
from planner.detection.significance import Measurement, one_sided_probability, one_sided_sigma
from planner.detection.trials import any_of_independent, scan_probability, upcrossings_of_zero
from planner.studies.checks.bench import Bench
from planner.studies.checks.findings import NEEDED_SIGMA, Check, Finding, Outcome

__all__ = ["check_evidence", "check_trials"]

_WHY_TRIALS = (
    "Who looks for many gases in many bands with many models finds something by chance; that has to be paid for."
)
_WHY_EVIDENCE = (
    "A significance is not a probability that the gas is there: even the most favourable reading moves the odds by a "
    "bounded factor only."
)
_MODERATE_LN = STRENGTHS[1][0]
_LEAST_PROBABILITY = 1e-300
_PLACES_PER_WIDTH = 3
_ROUNDING = 1e-6


def check_trials(claim: Claim, bench: Bench | None) -> Finding:
    """Local significance after the gases, bands and models tried."""
    tested = "significance after all gases, bands and models tried, as independent trials; and were the place free"
    sigma, on_data = _sigma(claim, bench)
    search = claim.search
    counts = {"gases": search.gases_searched, "bands": search.bands_searched, "models": search.models_tried}
    told = {name: count for name, count in counts.items() if count is not None}
    if sigma is None or not told:
        missing = "no significance is given" if sigma is None else _room(sigma)
        return Finding(check=Check.TRIALS, outcome=Outcome.UNTESTED, tested=tested, says=missing, why=_WHY_TRIALS)
    trials = int(np.prod(list(told.values())))
    local = one_sided_probability(sigma)
    overall = any_of_independent(local, trials) if local > _LEAST_PROBABILITY else 0.0
    left = one_sided_sigma(overall) if overall > _LEAST_PROBABILITY else sigma
    left = max(0.0, min(left, sigma))
    scan = _scan(bench, sigma)
    words = " times ".join(f"{count} {name if count > 1 else name[:-1]}" for name, count in told.items())
    says = f"{sigma:.3g} sigma in one of {trials} trial{'s' * (trials > 1)} ({words}) are worth {left:.2g} sigma"
    if overall > 0.001:
        says += f": chance alone gives as much with {100 * overall:.2g} %"
    if scan is not None and scan > 1e-4:
        says += f"; a feature of this width anywhere in the range: {100 * scan:.2g} %"
    return Finding(
        check=Check.TRIALS,
        outcome=Outcome.FAILED if left < NEEDED_SIGMA - _ROUNDING else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY_TRIALS,
        figures={
            "trials": trials,
            "local_probability": local,
            "overall_probability": overall,
            "scan_probability": scan,
        },
        left_sigma=left,
        on_data=on_data,
    )


def _sigma(claim: Claim, bench: Bench | None) -> tuple[float | None, bool]:
    """Significance as claimed, or what the spectrum gives where that is less; and whether it is the spectrum's."""
    sigma = claim.claim.sigma if bench is None else bench.weighed_sigma
    return sigma, sigma != claim.claim.sigma


def _room(sigma: float) -> str:
    """How many trials the claim could bear, where it does not say how many there were."""
    local, needed = one_sided_probability(sigma), one_sided_probability(NEEDED_SIGMA)
    if local > needed / 2:
        return (
            f"the claim does not say how many gases, bands or models were tried; {sigma:.3g} sigma bear no second one"
        )
    count = needed / max(local, _LEAST_PROBABILITY)
    bears = f"about {count:.2g}" if count < 1e6 else "more than a million"
    return f"the claim does not say how many gases, bands or models were tried; {sigma:.3g} sigma bear {bears}"


def _scan(bench: Bench | None, sigma: float) -> float | None:
    """Chance of such an excess anywhere in the range, for a feature as wide as the claimed one (upcrossings)."""
    if bench is None or bench.error_ppm is None or bench.height_ppm == 0:
        return None
    ln = np.log(bench.bins.centre_um)
    height = bench.template_ppm - bench.template_ppm.min()
    wide = float(bench.bins.width_ln[height > 0.5 * height.max()].sum())
    places = np.arange(ln.min(), ln.max(), wide / _PLACES_PER_WIDTH)
    if places.size < 2:
        return None
    shapes = bench.height_ppm * np.exp(-4 * np.log(2) * ((ln - places[:, None]) / wide) ** 2)
    count = len(bench.bins)
    measured = Measurement(
        template_ppm=bench.template_ppm,
        white_ppm=bench.error_ppm,
        floor_ppm2=np.zeros((count, count)),
        nuisances=("level",),
        directions_ppm=np.full((1, count), 1e4),
    )
    return scan_probability(sigma, upcrossings_of_zero(measured, 1.0, shapes))


def check_evidence(claim: Claim, bench: Bench | None) -> Finding:
    """The largest Bayes factor that the significance allows, and the prior odds that it would bring to even."""
    tested = "largest Bayes factor that the significance allows, and the prior that leaves the claim even"
    sigma, on_data = _sigma(claim, bench)
    if sigma is None:
        says = "no significance is given"
        return Finding(check=Check.EVIDENCE, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY_EVIDENCE)
    bound = ln_bayes_bound(sigma)
    measured = claim.claim.ln_bayes_factor
    ln_bayes = bound if measured is None else min(measured, bound)
    factor = f"{exp(ln_bayes):.3g}" if ln_bayes < 14 else f"e^{ln_bayes:.0f}"
    origin = "at most" if measured is None else "as measured"
    prior = even_prior(ln_bayes)
    says = (
        f"{sigma:.3g} sigma move the odds by a factor of {factor} {origin}, {strength_of(ln_bayes)} evidence; who gave "
        f"the gas {'less than one in a million' if prior < 1e-6 else f'{100 * prior:.2g} %'} before is left even"
    )
    return Finding(
        check=Check.EVIDENCE,
        outcome=Outcome.FAILED if ln_bayes < _MODERATE_LN else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY_EVIDENCE,
        figures={"ln_bayes_most": bound, "ln_bayes_measured": measured, "even_prior": prior},
        left_sigma=sigma,
        on_data=on_data,
    )
