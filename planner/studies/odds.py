"""What findings say of a hypothesis: odds carried through with the ranges of everything that is judged.

Each finding changes the odds by its likelihood ratio ``P(finding | true) / P(finding | false)``; given the hypothesis
findings are taken as independent (Catling et al. 2018, Astrobiology 18, 709, for the use of Bayes' rule on a planet).
With ``g`` the chance that the gas is there as reported and K the evidence that it is (with it against without),

    P(detected | h)      proportional to  K g + (1 - g)
    P(nothing above x | h)                (1 - c) e + (1 - e)

where ``e`` is the chance of more than the limit x, excluded with confidence c. A reported significance bounds K:
``K <= -1 / (e p ln p)`` (Sellke, Bayarri & Berger 2001, Am. Stat. 55, 62); how far below the bound it lies is not
known, and K is drawn between its square root and the bound.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from math import e, log, sqrt

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner import __version__
from planner.catalogue.ledger import DETECTED, NOT_DETECTED, Evidence, Finding, Ledger
from planner.catalogue.read import find_gas, read_hypotheses
from planner.catalogue.records import Hypothesis
from planner.detection.significance import one_sided_probability
from planner.detection.worth import Occurrence
from planner.studies.beliefs import Opinions, believed_gas, believed_prior, opinions

__all__ = ["Next", "OddsResult", "Weighed", "bayes_factor_bound", "weigh"]

Array = NDArray[np.float64]

_DRAWS = 4000
_SEED = 1
_ENDS = (0.025, 0.975)
_LEAST_PROBABILITY = 1.0 / e
"""The bound holds for smaller chances of noise alone; above, there is no evidence."""


@dataclass(frozen=True, kw_only=True)
class Weighed:
    """One entry of the ledger: how many times likelier it is where the hypothesis is true. Lower, middle, higher."""

    entry: Finding | Evidence
    ratio: tuple[float, float, float]


@dataclass(frozen=True, kw_only=True)
class Next:
    """What a gas that was not looked for would do to the chance of the hypothesis, lower and higher."""

    gas: str
    could_see: float
    if_found: tuple[float, float]
    if_not: tuple[float, float]
    moves_dex: float
    """Decades between the odds with and without it, in the middle."""
    because: str
    """What the catalogue says of it beside a gas that was found; may be empty."""


@dataclass(frozen=True, kw_only=True)
class OddsResult:
    """Everything a ledger comes to. Triples are lower, middle and higher: 2.5, 50 and 97.5 % of the opinions."""

    title: str
    invented: bool
    hypothesis: str
    means: str
    opposite: str
    context: str
    prior: tuple[float, float, float]
    prior_because: str
    weighed: tuple[Weighed, ...]
    together: tuple[float, float, float]
    """Likelihood ratio of all findings."""
    posterior: tuple[float, float, float]
    prior_width_dex: float
    """Decades of odds over which the prior alone moves the answer."""
    evidence_width_dex: float
    """Decades over which the judgement of the findings alone moves it."""
    evidence_dex: float
    """Decades by which the findings move the odds, in the middle."""
    even_prior: float
    """The prior at which the findings leave the hypothesis even."""
    nexts: tuple[Next, ...]
    """What was not looked for, by how far it would move the odds."""
    relations: tuple[str, ...]
    """What the catalogue says of pairs of gases in the ledger."""
    level: int
    """Of the scale of Green et al. 2021, 0 for none; steps are those that the ledger claims."""
    opinions: int
    version: str

    @property
    def rests_on_prior(self) -> bool:
        """Whether the prior moves the answer more than the findings do."""
        return self.prior_width_dex > abs(self.evidence_dex)


def weigh(ledger: Ledger, *, seed: int = _SEED) -> OddsResult:
    """Posterior odds from a ledger, with ranges.

    Raises
    ------
    ScenarioError
        If a belief of the ledger contradicts a range that it leaves as it is.
    """
    rng = np.random.default_rng(seed)
    prior = believed_prior(ledger.beliefs, ledger.hypothesis)
    beliefs = {f.gas: believed_gas(ledger.beliefs, f.gas, ledger.hypothesis) for f in ledger.findings}
    drawn = opinions(prior, beliefs, rng, _DRAWS)
    sought = [finding for finding in ledger.findings if finding.found in (DETECTED, NOT_DETECTED)]
    logs: list[tuple[Finding | Evidence, Array]] = []
    logs += [(finding, np.log(_ratio(finding, drawn, rng))) for finding in sought]
    logs += [(item, np.log(_ratio_of_evidence(item, rng))) for item in ledger.evidence]
    total = np.sum([value for _, value in logs], axis=0) if logs else np.zeros(_DRAWS)
    before = special.logit(drawn.prior)
    return OddsResult(
        title=ledger.title,
        invented=ledger.invented,
        hypothesis=ledger.hypothesis,
        means=prior.means,
        opposite=prior.opposite,
        context=read_hypotheses().context,
        prior=_triple(drawn.prior),
        prior_because=prior.says,
        weighed=tuple(Weighed(entry=entry, ratio=_triple(np.exp(value))) for entry, value in logs),
        together=_triple(np.exp(total)),
        posterior=_triple(special.expit(before + total)),
        prior_width_dex=_width_dex(before),
        evidence_width_dex=_width_dex(total),
        evidence_dex=float(np.median(total) / log(10)),
        even_prior=float(special.expit(-np.median(total))),
        nexts=_nexts(ledger, drawn, before + total),
        relations=_relations(ledger),
        level=_level(ledger),
        opinions=_DRAWS,
        version=__version__,
    )


def bayes_factor_bound(significance_sigma: float) -> float:
    """The most that a one-sided significance can be worth as evidence, ``-1 / (e p ln p)``; 1 for ``p`` above 1/e."""
    chance = one_sided_probability(significance_sigma)
    return 1.0 if chance >= _LEAST_PROBABILITY else -1.0 / (e * chance * log(chance))


def _ratio(finding: Finding, drawn: Opinions, rng: np.random.Generator) -> Array:
    """Likelihood ratio of a finding under every opinion, ``(draw,)``."""
    kinds = (drawn.if_true[finding.gas], drawn.if_false[finding.gas])
    if finding.found == DETECTED:
        evidence = _evidence_factor(finding, rng)
        true, false = (1 + (evidence - 1) * _chance_as_reported(finding, kind) for kind in kinds)
    else:
        assert finding.limit is not None  # checked when the ledger was read
        true, false = (1 - finding.confidence * _chance_above(kind, finding.limit) for kind in kinds)
    return np.asarray(true / false)


def _evidence_factor(finding: Finding, rng: np.random.Generator) -> Array:
    """Evidence that the gas is there, drawn evenly in its logarithm, ``(draw,)``."""
    if finding.bayes_factor is not None:
        low, high = finding.bayes_factor
    else:
        assert finding.significance_sigma is not None
        high = bayes_factor_bound(finding.significance_sigma)
        low = sqrt(high)
    return np.exp(rng.uniform(log(low), log(high), _DRAWS))


def _chance_as_reported(finding: Finding, kind: Occurrence) -> Array:
    """Chance that the gas is there in the reported range; without one, that it is there at all."""
    if finding.mixing_ratio is None:
        return np.asarray(kind.probability)
    low, high = finding.mixing_ratio
    return np.asarray(_chance_above(kind, low) - _chance_above(kind, high))


def _chance_above(kind: Occurrence, mixing_ratio: float) -> Array:
    """Chance that the gas is there with more than a mixing ratio."""
    bottom, top = np.log(kind.lowest), np.log(kind.highest)
    return np.asarray(kind.probability * np.clip((top - log(mixing_ratio)) / (top - bottom), 0, 1))


def _ratio_of_evidence(item: Evidence, rng: np.random.Generator) -> Array:
    true, false = (np.exp(rng.uniform(log(low), log(high), _DRAWS)) for low, high in (item.if_true, item.if_false))
    return np.asarray(true / false)


def _nexts(ledger: Ledger, drawn: Opinions, log_odds: Array) -> tuple[Next, ...]:
    """The gases of the ledger, and their companions in the catalogue, that were not looked for."""
    settled = {finding.gas for finding in ledger.findings if finding.found in (DETECTED, NOT_DETECTED)}
    reach = {finding.gas: finding.could_see for finding in ledger.findings if finding.gas not in settled}
    for gas in settled:
        reach |= {c.gas: None for c in find_gas(gas).companions if c.gas not in settled and c.gas not in reach}
    nexts = [
        _next(gas, could_see, ledger, log_odds)
        for gas, could_see in reach.items()
        if believed_gas(ledger.beliefs, gas, ledger.hypothesis).tells
    ]
    return tuple(sorted(nexts, key=lambda item: -item.moves_dex))


def _next(gas: str, could_see: float | None, ledger: Ledger, log_odds: Array) -> Next:
    belief: Hypothesis = believed_gas(ledger.beliefs, gas, ledger.hypothesis)
    low, high = belief.presence(True).mixing_ratio_range
    limit = could_see if could_see is not None else sqrt(low * high)
    prior = believed_prior(ledger.beliefs, ledger.hypothesis)
    drawn = opinions(prior, {gas: belief}, np.random.default_rng(_SEED), _DRAWS)
    true, false = (np.clip(_chance_above(kind[gas], limit), 1e-9, None) for kind in (drawn.if_true, drawn.if_false))
    found, missed = np.log(true / false), np.log((1 - true) / (1 - false))
    return Next(
        gas=gas,
        could_see=limit,
        if_found=_ends(special.expit(log_odds + found)),
        if_not=_ends(special.expit(log_odds + missed)),
        moves_dex=abs(float(np.median(found - missed))) / log(10),
        because="; ".join(_words_on(gas, ledger)),
    )


def _words_on(gas: str, ledger: Ledger) -> list[str]:
    """What the records of the gases that were found say of a companion."""
    found = [finding.gas for finding in ledger.findings if finding.found == DETECTED]
    return [f"beside {f}, {c.seen}: {c.says}" for f in found for c in find_gas(f).companions if c.gas == gas]


def _relations(ledger: Ledger) -> tuple[str, ...]:
    """Companions of the found gases that the ledger speaks of, with what the catalogue says of them as they are."""
    as_seen: Mapping[str, str] = {DETECTED: "present", NOT_DETECTED: "absent"}
    state = {finding.gas: as_seen.get(finding.found) for finding in ledger.findings}
    return tuple(
        f"{gas} with {c.gas} {c.seen} favours {c.favours}: {c.says} [{c.flag}{': ' + c.source if c.source else ''}]"
        for gas, seen in state.items()
        if seen == "present"
        for c in find_gas(gas).companions
        if state.get(c.gas) == c.seen
    )


def _level(ledger: Ledger) -> int:
    """The highest step below which none is missing; a detected gas is the first."""
    shown = ledger.shown
    steps = (
        any(finding.found == DETECTED for finding in ledger.findings),
        shown.contamination_ruled_out,
        shown.source_demonstrated,
        shown.other_sources_implausible,
        shown.second_signal,
        shown.alternatives_ruled_out,
        shown.predictions_confirmed,
    )
    return steps.index(False) if False in steps else len(steps)


def _triple(values: Array) -> tuple[float, float, float]:
    low, middle, high = np.quantile(values, [_ENDS[0], 0.5, _ENDS[1]])
    return float(low), float(middle), float(high)


def _ends(values: Array) -> tuple[float, float]:
    low, high = np.quantile(values, _ENDS)
    return float(low), float(high)


def _width_dex(log_values: Array) -> float:
    low, high = _ends(log_values)
    return (high - low) / log(10)
