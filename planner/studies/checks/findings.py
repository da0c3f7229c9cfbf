"""What a check of a claim finds, and what all of them come to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from enum import StrEnum

from planner.detection.evidence import sigma_of_bayes_bound

__all__ = [
    "FALLS_BELOW",
    "NEEDED_SIGMA",
    "AuditResult",
    "Check",
    "Finding",
    "Outcome",
    "Standing",
    "judge",
    "takes_too_much",
]

NEEDED_SIGMA = 3.0
"""What must be left of a claim once one thing is allowed for: the least that is called evidence (common practice)."""
FALLS_BELOW = sigma_of_bayes_bound(1.0)
"""Below this, 2.02 sigma, nothing is left to speak of: the odds move by less than e whatever one believed, which is
inconclusive on Jeffreys' scale."""
_TELLING_LOSS = 0.1


class Check(StrEnum):
    """What is checked, in the order of the report."""

    SIZE = "size"
    NOISE = "noise"
    COMPANIONS = "companions"
    RIVALS = "rivals"
    TRIALS = "trials"
    EVIDENCE = "evidence"
    STAR = "star"
    OFFSETS = "offsets"
    REDUCTIONS = "reductions"
    FOLLOW_UP = "follow-up"


_CHANCE = (Check.TRIALS, Check.EVIDENCE)


class Outcome(StrEnum):
    """How a check ended."""

    PASSED = "passed"
    FAILED = "failed"
    UNTESTED = "cannot be tested"


class Standing(StrEnum):
    """How a claim stands after all checks."""

    STANDS = "stands"
    OPEN = "not settled"
    FALLS = "does not stand"
    UNTESTED = "cannot be judged"


@dataclass(frozen=True, kw_only=True)
class Finding:
    """One check: what was tested, what came of it, and why it matters."""

    check: Check
    outcome: Outcome
    tested: str
    says: str
    why: str
    figures: Mapping[str, float | str | None] = field(default_factory=dict)
    left_sigma: float | None = None
    """Significance that is left of the claim once this is allowed for; None where the check is not about that."""
    decides: bool = True
    """Whether it can sink a claim by itself. That another gas makes the shape leaves the feature as real as it was."""
    doubt: bool = False
    """Whether what could not be tested is a known way to make such a feature."""
    on_data: bool = False
    """Whether it ran on the spectrum itself, and not on the numbers of the claim."""


@dataclass(frozen=True, kw_only=True)
class AuditResult:
    """A claim with everything that was found."""

    title: str
    source: str | None
    invented: bool
    gas: str
    claimed_sigma: float | None
    standing: Standing
    verdict: str
    weakest: Check | None
    findings: tuple[Finding, ...]
    line_data: tuple[str, ...]
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]
    version: str

    def finding(self, check: Check) -> Finding:
        """What one check found."""
        return next(finding for finding in self.findings if finding.check is check)


def takes_too_much(left_sigma: float, sigma: float) -> bool:
    """Whether what is left is too little, and this check, not the claim itself, is the cause."""
    return left_sigma < NEEDED_SIGMA and left_sigma < (1 - _TELLING_LOSS) * sigma


def judge(gas: str, sigma: float | None, findings: tuple[Finding, ...]) -> tuple[Standing, str, Check | None]:
    """Standing, verdict as a sentence, and the weakest link.

    The weakest link is the check that leaves the least, one that decides before others. A claim falls where a deciding
    check leaves less than `FALLS_BELOW`, and is not settled where a check has failed otherwise. It stands only if a
    check of more than the arithmetic of chance was passed.
    """
    failed = [finding for finding in findings if finding.outcome is Outcome.FAILED]
    missing = [finding.check.value for finding in findings if finding.outcome is Outcome.UNTESTED]
    untested = f" Not tested: {', '.join(missing)}." if missing else ""
    if failed:
        sinking = [finding for finding in failed if finding.decides and _left(finding) < FALLS_BELOW]
        weakest = min(sinking or failed, key=_left)
        standing = Standing.FALLS if sinking else Standing.OPEN
        head = f"As given, the detection of {gas} {standing.value}"
        if standing is Standing.OPEN:
            head = f"As given, the detection of {gas} is {standing.value}"
        return standing, f"{head}; weakest link, {weakest.check.value}: {weakest.says}.{untested}", weakest.check
    told = [finding for finding in findings if finding.outcome is Outcome.PASSED and finding.left_sigma is not None]
    if sigma is None or all(finding.check in _CHANCE for finding in told):
        why = "no significance is given" if sigma is None else "nothing but chance could be tested"
        doubt = next((finding for finding in findings if finding.doubt), None)
        more = f"; weakest link, {doubt.check.value}: {doubt.says}" if doubt is not None else ""
        sentence = f"The detection of {gas} cannot be judged: {why}{more}.{untested}"
        return Standing.UNTESTED, sentence, doubt.check if doubt is not None else None
    weakest = min(told, key=_left)
    sentence = (
        f"The detection of {gas} stands up to every check that could be made; weakest link, {weakest.check.value}: "
        f"{weakest.says}.{untested}"
    )
    return Standing.STANDS, sentence, weakest.check


def _left(finding: Finding) -> float:
    return FALLS_BELOW if finding.left_sigma is None else finding.left_sigma
