"""Checks of how the data were handled: offsets, slopes and baselines; and whether other reductions agree."""

from __future__ import annotations

import numpy as np

from planner.claims.records import Claim
from planner.studies.checks.bench import Bench
from planner.studies.checks.findings import NEEDED_SIGMA, Check, Finding, Outcome, takes_too_much

__all__ = ["check_offsets", "check_reductions"]

_WIDE_PPM = 1e4
_BASELINE_TERMS = 3
"""A level, a slope and a bend are harmless to a narrow feature; more terms are a filter of their own."""
_WHY = "Detectors have levels of their own, and light curves trends: a step or a slope can pass for a band."
_WHY_REDUCTIONS = "The same data, reduced by somebody else, must show the same feature."


def check_offsets(claim: Claim, bench: Bench | None) -> Finding:
    """What is left of the significance with a free offset for every detector, or with a free slope."""
    tested = "significance left with a free offset for every detector, and with a free slope"
    terms = claim.search.baseline_terms
    if terms is not None and terms > _BASELINE_TERMS:
        says = (
            f"a baseline of {terms} free terms was fitted and taken out; nothing that is given tells whether it made "
            "the feature: that takes the spectrum before, or the same fit at other places"
        )
        return Finding(
            check=Check.OFFSETS, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY,
            figures={"baseline_terms": terms}, doubt=True,
        )  # fmt: skip
    if bench is None or bench.fits is None:
        missing = "star, planet or air are not given" if bench is None else bench.unweighed
        return Finding(check=Check.OFFSETS, outcome=Outcome.UNTESTED, tested=tested, says=missing, why=_WHY)
    slope = _WIDE_PPM * np.log(bench.bins.centre_um / bench.bins.centre_um.mean())
    full = bench.sigma or 0.0
    with_slope = _left(bench, [slope])
    with_offsets = _left(bench, bench.offsets) if bench.offsets else None
    left = min(with_slope, full if with_offsets is None else with_offsets, full)
    says = f"a free slope leaves {with_slope:.2g} of {full:.2g} sigma"
    if with_offsets is not None:
        says += f", a free offset between {len(bench.offsets) + 1} detectors {with_offsets:.2g}"
    elif (claim.search.detectors or 1) > 1:
        says += "; which bins belong to which detector is not told, so offsets cannot be tested"
    return Finding(
        check=Check.OFFSETS,
        outcome=Outcome.FAILED if takes_too_much(left, full) else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY,
        figures={"left_by_slope_sigma": with_slope, "left_by_offsets_sigma": with_offsets},
        left_sigma=left,
        on_data=bench.on_data,
    )


def _left(bench: Bench, more_ppm: list[np.ndarray]) -> float:
    fits = bench.fits_with(more_ppm)
    assert fits is not None
    return min(fits.sigma([bench.template_ppm]), bench.sigma or 0.0)


def check_reductions(claim: Claim) -> Finding:
    """Whether all reductions that are told of see the feature."""
    tested = "agreement of independent reductions of the same data"
    told = [(reduction, reduction.left_sigma) for reduction in claim.reductions if reduction.left_sigma is not None]
    if not told:
        says = "no other reduction is told of"
        return Finding(check=Check.REDUCTIONS, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY_REDUCTIONS)
    least, sigma = min(told, key=lambda item: item[1])
    agree = sum(value >= NEEDED_SIGMA for _, value in told)
    after = ", published later" if least.later else ""
    seen = f"sees {sigma:.2g} sigma" if sigma > 0 else "sees nothing"
    says = f"of {len(told)} told of, {least.by}{after}, {seen}"
    says += f"; {agree} of them {NEEDED_SIGMA:g} sigma or more" if agree and sigma < NEEDED_SIGMA else ""
    return Finding(
        check=Check.REDUCTIONS,
        outcome=Outcome.FAILED if sigma < NEEDED_SIGMA else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY_REDUCTIONS,
        figures={f"{reduction.by} (sigma)": value for reduction, value in told},
        left_sigma=sigma,
        decides=all(value < NEEDED_SIGMA for _, value in told),
    )
