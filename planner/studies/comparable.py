"""Whether two scenarios are two atmospheres of one planet, seen alike: the condition of a contrast."""

from __future__ import annotations

from pydantic import BaseModel

from planner.errors import ScenarioError
from planner.scenario.records import Scenario

__all__ = ["amounts_of", "check_comparable"]

_SHARED = ("star", "planet", "modes", "goal", "noise", "bins")


def check_comparable(first: Scenario, second: Scenario) -> None:
    """Refuse two scenarios that differ in more than their air, or whose air is not fixed.

    Raises
    ------
    ScenarioError
        Naming the keys that differ, or the candidates that leave the air open.
    """
    for name in _SHARED:
        ours, theirs = getattr(first, name), getattr(second, name)
        if ours != theirs:
            raise ScenarioError(
                f"{second.place(name)}: expected what stands at {first.place(name)}, since a contrast is between two "
                f"atmospheres of one planet seen alike; got another {_differing(ours, theirs) or name}"
            )
    for scenario in (first, second):
        _check_air(scenario)


def amounts_of(scenario: Scenario) -> dict[str, float]:
    """Everything in the air but the background: absorbers, and the candidates all at once at their first amounts."""
    candidates = {candidate.gas: candidate.mixing_ratios[0] for candidate in scenario.candidates}
    return dict(scenario.atmosphere.absorbers) | candidates


def _check_air(scenario: Scenario) -> None:
    for index, candidate in enumerate(scenario.candidates):
        count = len(candidate.mixing_ratios)
        if count > 1:
            place = scenario.place("candidates", index, "mixing_ratio")
            raise ScenarioError(f"{place}: expected one mixing ratio, for a contrast is between two airs; got {count}")
    amounts = amounts_of(scenario)
    if sum(amounts.values()) >= 1 or not set(scenario.atmosphere.background) - set(amounts):
        raise ScenarioError(
            f"{scenario.place('candidates')}: expected candidates that leave room for the background when all of them "
            f"are in the air at once, got a sum of {sum(amounts.values()):.6g} with the absorbers"
        )


def _differing(ours: object, theirs: object) -> str:
    """The keys that differ between two records, as the file spells them; nothing for what is no record."""
    if not isinstance(ours, BaseModel) or not isinstance(theirs, BaseModel):
        return ""
    a, b = ours.model_dump(by_alias=True), theirs.model_dump(by_alias=True)
    return ", ".join(key for key in a if a[key] != b.get(key))
