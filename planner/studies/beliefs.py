"""What is believed of gases and hypotheses before looking: the catalogue's judgement, and opinions within it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner.catalogue.read import find_gas, read_hypotheses
from planner.catalogue.records import Hypothesis, Presence, Prior
from planner.detection.worth import Occurrence
from planner.errors import ScenarioError
from planner.scenario.beliefs import Beliefs, PresenceBelief, PriorBelief

__all__ = [
    "MOST_RATIO",
    "OPINIONS",
    "SHIFT_DEX",
    "Opinions",
    "believed_gas",
    "believed_prior",
    "occurrence",
    "opinions",
    "span",
]

Array = NDArray[np.float64]

OPINIONS = 400
"""Draws of priors, presences and ranges."""
SHIFT_DEX = 0.5
"""Each end of a range of mixing ratios is moved by up to this, either way: ranges have no ranges of their own."""
MOST_RATIO = 0.5
"""Mixing ratios are taken up to here: beyond, the gas is the air and not a trace in it."""
_LEAST_DEX = 0.1


@dataclass(frozen=True, kw_only=True, eq=False)
class Opinions:
    """Draws of everything that is judged: the prior ``(draw,)`` and, by gas, the occurrences either way."""

    prior: Array
    if_true: Mapping[str, Occurrence]
    if_false: Mapping[str, Occurrence]


def believed_prior(beliefs: Beliefs, hypothesis: str) -> Prior:
    """The prior of ``"life"`` or ``"industry"``: the user's word where there is one, else the shipped one.

    Raises
    ------
    ScenarioError
        If the user's probability lies outside a range that is left as it is.
    """
    prior: Prior = getattr(read_hypotheses(), hypothesis)
    given: PriorBelief = getattr(beliefs, hypothesis)
    return prior.model_copy(update=_update(f"beliefs.{hypothesis}", prior, given))


def believed_gas(beliefs: Beliefs, gas: str, hypothesis: str) -> Hypothesis:
    """A gas under a hypothesis: the user's word where there is one, else the catalogue's.

    Raises
    ------
    ScenarioError
        As `believed_prior`.
    """
    ours = find_gas(gas).hypothesis(hypothesis)
    if gas not in beliefs.gases:
        return ours
    sides = getattr(beliefs.gases[gas], hypothesis)
    merged: dict[str, Presence] = {}
    for side, true in (("if_true", True), ("if_false", False)):
        presence, given = ours.presence(true), getattr(sides, side)
        place = f"beliefs.gases.{gas}.{hypothesis}.{side}"
        merged[side] = presence.model_copy(update=_update(place, presence, given)) if given else presence
    if sides.if_true is None and sides.if_false is None:
        return ours
    return Hypothesis(if_true=merged["if_true"], if_false=merged["if_false"])


def _update(place: str, ours: Prior | Presence, given: PriorBelief | PresenceBelief) -> dict[str, object]:
    """The fields that the scenario gives."""
    update = {name: value for name, value in dict(given).items() if value is not None}
    low, high = update.get("probability_range", ours.probability_range)
    central = update.get("probability", ours.probability)
    if not low <= central <= high:
        raise ScenarioError(
            f"{place}: expected a probability inside its range, {low:g} to {high:g}, got {central:g}; "
            "give probability and probability_range together"
        )
    return update


def occurrence(presence: Presence) -> Occurrence:
    """The central judgement of a presence."""
    low, high = presence.mixing_ratio_range
    return Occurrence(probability=presence.probability, lowest=low, highest=min(high, MOST_RATIO))


def span(belief: Hypothesis) -> tuple[float, float]:
    """The lowest and highest mixing ratio that any opinion on a gas holds possible."""
    ranges = [belief.presence(true).mixing_ratio_range for true in (True, False)]
    shift = 10**SHIFT_DEX
    return min(low for low, _ in ranges) / shift, min(max(high for _, high in ranges) * shift, MOST_RATIO)


def opinions(
    prior: Prior, gases: Mapping[str, Hypothesis], rng: np.random.Generator, draws: int = OPINIONS
) -> Opinions:
    """Opinions drawn within the ranges that the judgements state.

    A probability is drawn evenly in its log odds, half of the draws below the central value and half above it. A gas
    that makes no difference to the hypothesis gets the same draw either way.
    """
    drawn_prior = _probabilities(prior.probability, prior.probability_range, rng, draws)
    true, false = {}, {}
    for gas, belief in gases.items():
        true[gas] = _occurrences(belief.presence(True), rng, draws)
        false[gas] = _occurrences(belief.presence(False), rng, draws) if belief.tells else true[gas]
    return Opinions(prior=drawn_prior, if_true=true, if_false=false)


def _occurrences(presence: Presence, rng: np.random.Generator, draws: int) -> Occurrence:
    probability = _probabilities(presence.probability, presence.probability_range, rng, draws)
    low, high = (np.log10(end) + rng.uniform(-SHIFT_DEX, SHIFT_DEX, draws) for end in presence.mixing_ratio_range)
    high = np.minimum(high, np.log10(MOST_RATIO))
    return Occurrence(probability=probability, lowest=10 ** np.minimum(low, high - _LEAST_DEX), highest=10**high)


def _probabilities(central: float, between: tuple[float, float], rng: np.random.Generator, draws: int) -> Array:
    ends = special.logit([between[0], central, between[1]])
    return np.asarray(special.expit(np.interp(rng.random(draws), [0, 0.5, 1], ends)))
