"""The ledger of one planet: what was found, not found and not looked for. Layout: ``configs/ledgers/starting.toml``."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated, Self

import astropy.units as u
from pydantic import BeforeValidator, Field, model_validator

from planner.catalogue.fields import GasName, Pair, Question, Words
from planner.catalogue.readings import OneOf, Span
from planner.resources import data_folder
from planner.scenario.beliefs import Beliefs
from planner.scenario.fields import Record, Switch
from planner.scenario.readings import FieldProblem, Measure, MixingRatio, Number, Tables
from planner.scenario.tomlfile import parse_as, read_text

__all__ = ["Evidence", "Finding", "Ledger", "Shown", "parse_ledger", "read_ledger", "starting_ledger"]

DETECTED, NOT_DETECTED, NOT_SOUGHT = "detected", "not detected", "not looked for"

_CHANCE = Number(kind="a probability", low=0, high=1, open_low=True)
_FACTOR = Number(kind="a Bayes factor", low=0, open_low=True)
Found = Annotated[str, BeforeValidator(OneOf(words=(DETECTED, NOT_DETECTED, NOT_SOUGHT)))]
Sigma = Annotated[
    float | None, BeforeValidator(Measure(kind="a significance", unit=u.one, example="4.1 sigma", zero_allowed=False))
]
Factors = Annotated[
    Pair | None,
    BeforeValidator(Span(value=_FACTOR, kind="a Bayes factor", example="20", single_allowed=True)),
]
Measured = Annotated[
    Pair | None, BeforeValidator(Span(value=MixingRatio(), kind="measured mixing ratios", example="20 ppm"))
]
Ratio = Annotated[float | None, BeforeValidator(MixingRatio())]
Confidence = Annotated[
    float,
    BeforeValidator(Number(kind="a confidence such as 0.95,", low=0.5, high=1, open_low=True, open_high=True)),
]
Chances = Annotated[
    Pair, BeforeValidator(Span(value=_CHANCE, kind="a probability", example="0.8", single_allowed=True))
]


class Finding(Record):
    """One gas: found, not found, or not looked for."""

    gas: GasName
    found: Found
    significance_sigma: Sigma = Field(default=None, alias="significance")
    """One-sided."""
    bayes_factor: Factors = None
    """Of air with the gas against air without, lower and higher."""
    mixing_ratio: Measured = None
    """Measured, lower and higher."""
    limit: Ratio = None
    """More than this is excluded."""
    confidence: Confidence = 0.95
    """Of the limit."""
    could_see: Ratio = None
    """What a next observation would detect."""

    @model_validator(mode="after")
    def _fits_what_was_found(self) -> Self:
        needed = {
            DETECTED: self.significance_sigma is not None or self.bayes_factor is not None,
            NOT_DETECTED: self.limit is not None,
            NOT_SOUGHT: True,
        }
        if not needed[self.found]:
            missing = {DETECTED: "a significance or a bayes_factor", NOT_DETECTED: "a limit"}[self.found]
            raise FieldProblem(f'expected {missing} for what is "{self.found}", got none', ("found",))
        belongs = {
            "significance_sigma": DETECTED,
            "bayes_factor": DETECTED,
            "mixing_ratio": DETECTED,
            "limit": NOT_DETECTED,
            "could_see": NOT_SOUGHT,
        }
        for name, kind in belongs.items():
            if getattr(self, name) is not None and self.found != kind:
                key = type(self).model_fields[name].alias or name
                raise FieldProblem(f'belongs to a gas that is "{kind}", got one that is "{self.found}"', (key,))
        return self


class Evidence(Record):
    """Anything else, with how likely it is where the hypothesis is true and where it is false, lower and higher."""

    says: Words
    if_true: Chances
    if_false: Chances


class Shown(Record):
    """What has been shown, for the levels of published frameworks."""

    contamination_ruled_out: Switch = False
    source_demonstrated: Switch = False
    other_sources_implausible: Switch = False
    second_signal: Switch = False
    alternatives_ruled_out: Switch = False
    predictions_confirmed: Switch = False


class Ledger(Record):
    """What is known about one planet that bears on a hypothesis."""

    title: Words
    invented: Switch = False
    hypothesis: Question
    findings: Annotated[tuple[Finding, ...], BeforeValidator(Tables(expected="at least one [[gas]] table"))] = Field(
        default=(), alias="gas"
    )
    evidence: Annotated[tuple[Evidence, ...], BeforeValidator(Tables(expected="at least one [[evidence]] table"))] = ()
    shown: Shown = Field(default_factory=Shown)
    beliefs: Beliefs = Field(default_factory=Beliefs)

    @model_validator(mode="after")
    def _gases_once_and_known(self) -> Self:
        from planner.catalogue.read import has_gas

        seen: set[str] = set()
        for index, finding in enumerate(self.findings):
            if finding.gas in seen:
                raise FieldProblem(f"{finding.gas} has an entry already", ("gas", index, "gas"))
            if not has_gas(finding.gas):
                message = f"the gas catalogue has no record of {finding.gas}; put it down as [[evidence]]"
                raise FieldProblem(message, ("gas", index, "gas"))
            seen.add(finding.gas)
        if not self.findings and not self.evidence:
            raise FieldProblem("expected at least one [[gas]] or [[evidence]] table, got none", ("title",))
        return self


def read_ledger(path: str | Path) -> Ledger:
    """The ledger in a TOML file.

    Raises
    ------
    ScenarioError
        If the file cannot be read or breaks a rule; every problem is listed with file, line and key.
    """
    path = Path(path)
    text = read_text(path, "limbcast new --ledger")
    return parse_ledger(text, str(path))


def parse_ledger(text: str, where: str = "ledger") -> Ledger:
    """The ledger in TOML text; ``where`` names it in messages.

    Raises
    ------
    ScenarioError
        As `read_ledger`.
    """
    return parse_as(Ledger, text, where)


def starting_ledger() -> str:
    """Text of a commented ledger to start from."""
    return (data_folder("configs") / "ledgers" / "starting.toml").read_text(encoding="utf-8")
