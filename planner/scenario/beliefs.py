"""What the user believes in place of the catalogue: priors of hypotheses, presences and ranges of gases."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any

from pydantic import BeforeValidator, Field, model_validator

from planner.scenario.fields import RatioRange, Record
from planner.scenario.readings import Ends, FieldProblem, Gas, Number, Text, shown

__all__ = ["Beliefs", "GasBelief", "PresenceBelief", "PriorBelief", "Sides"]

Pair = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class _ByGas:
    """A table of tables whose keys name gases; they come out as formulas."""

    expected: str = "a table for each gas, such as [beliefs.gases.CH4.life.if_true]"

    def __call__(self, value: Any) -> dict[str, Any]:
        if not isinstance(value, Mapping):
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        found: dict[str, Any] = {}
        for name, item in value.items():
            try:
                formula = Gas()(name)
            except ValueError as error:
                raise FieldProblem(str(error), (name,)) from None
            if formula in found:
                raise FieldProblem(f"{formula} is given twice", (name,))
            found[formula] = item
        return found


_CHANCE = Number(kind="a probability", low=0, high=1, open_low=True, open_high=True)
Chance = Annotated[float | None, BeforeValidator(_CHANCE)]
Chances = Annotated[
    Pair | None, BeforeValidator(Ends(value=_CHANCE, expected="two probabilities [lower, higher] such as [0.1, 0.5]"))
]
Words = Annotated[str | None, BeforeValidator(Text())]


class _Chances(Record):
    """A probability with its range; what is left out stays as the catalogue has it."""

    probability: Chance = None
    probability_range: Chances = None
    says: Words = None
    """Why."""

    @model_validator(mode="after")
    def _inside(self) -> _Chances:
        if self.probability is not None and self.probability_range is not None:
            low, high = self.probability_range
            if not low <= self.probability <= high:
                message = f"expected a value inside probability_range, {low:g} to {high:g}, got {self.probability:g}"
                raise FieldProblem(message, ("probability",))
        return self


class PriorBelief(_Chances):
    """How likely a hypothesis is before looking."""


class PresenceBelief(_Chances):
    """How likely a gas is there, and how much of it."""

    mixing_ratio_range: RatioRange | None = None


class Sides(Record):
    """A gas where a hypothesis is true, and where it is false."""

    if_true: PresenceBelief | None = None
    if_false: PresenceBelief | None = None


class GasBelief(Record):
    """A gas under the two hypotheses."""

    life: Sides = Field(default_factory=Sides)
    industry: Sides = Field(default_factory=Sides)


class Beliefs(Record):
    """The table ``[beliefs]`` of a scenario."""

    life: PriorBelief = Field(default_factory=PriorBelief)
    industry: PriorBelief = Field(default_factory=PriorBelief)
    gases: Annotated[Mapping[str, GasBelief], BeforeValidator(_ByGas())] = Field(default_factory=dict)
