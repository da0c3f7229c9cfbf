"""The record of a claim: only what was published, nothing worked out.

Nearly everything may be left out; a check that needs what is missing then says so. Names in files and in Python calls
are the aliases, as for scenarios.
"""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

from pydantic import BeforeValidator, Field, ValidationError, model_validator

from planner.claims.fields import (
    Count,
    Instrument,
    LogOdds,
    Micrometres,
    OptionalMicrometres,
    OptionalPpm,
    OptionalRatio,
    OptionalResolvingPower,
    OptionalSigmas,
    OptionalWords,
    OtherBands,
    Terms,
)
from planner.detection.evidence import sigma_of_bayes_bound
from planner.scenario.fields import GasName, Name, Record, Switch
from planner.scenario.readings import FieldProblem, Tables
from planner.scenario.records import Scenario
from planner.scenario.target import Atmosphere, Planet, Star

__all__ = ["Claim", "Feature", "Reduction", "Search"]

_REFERENCE_RATIO = 1e-6


class _Quoted(Record):
    """A result in any of the ways in which results are quoted."""

    amplitude_ppm: OptionalPpm = Field(default=None, alias="amplitude")
    """Height of the strongest band of the feature over the level beside it."""
    error_ppm: OptionalPpm = Field(default=None, alias="error")
    """One sigma of that amplitude."""
    quoted_sigma: OptionalSigmas = Field(default=None, alias="significance")
    ln_bayes_factor: LogOdds = None

    @property
    def sigma(self) -> float | None:
        """As quoted; else amplitude over error; else what the Bayes factor can be at most, which is generous."""
        if self.quoted_sigma is not None:
            return self.quoted_sigma
        if self.amplitude_ppm is not None and self.error_ppm is not None:
            return self.amplitude_ppm / self.error_ppm
        return sigma_of_bayes_bound(self.ln_bayes_factor) if self.ln_bayes_factor is not None else None

    @property
    def amplitude_error_ppm(self) -> float | None:
        """As quoted, else what amplitude and significance make of it."""
        if self.error_ppm is not None or self.amplitude_ppm is None or self.sigma is None:
            return self.error_ppm
        return self.amplitude_ppm / self.sigma


class Feature(_Quoted):
    """What is claimed to have been seen."""

    gas: GasName
    """Formula."""
    from_um: Micrometres = Field(alias="from")
    to_um: Micrometres = Field(alias="to")
    """Ends of the spectrum that the claim rests on."""
    feature_from_um: OptionalMicrometres = Field(default=None, alias="feature_from")
    feature_to_um: OptionalMicrometres = Field(default=None, alias="feature_to")
    """Ends of the stretch in which the gas is said to be seen, if that is only a part."""
    other_bands: OtherBands = "not told"
    """What the claim says of the other bands of the gas in its spectrum."""
    mixing_ratio: OptionalRatio = None

    @model_validator(mode="after")
    def _ends_in_order(self) -> Feature:
        if self.to_um <= self.from_um:
            raise FieldProblem(f"expected more than from, {self.from_um:g} um, got {self.to_um:g} um", ("to",))
        low, high = self.feature_from_um, self.feature_to_um
        if (low is None) != (high is None):
            raise FieldProblem("expected both feature_from and feature_to, or neither", ("feature_from",))
        if low is not None and high is not None and not self.from_um <= low < high <= self.to_um:
            message = f"expected a stretch inside {self.from_um:g} to {self.to_um:g} um, got {low:g} to {high:g} um"
            raise FieldProblem(message, ("feature_from",))
        return self


class Search(Record):
    """How it was observed and how much was tried."""

    mode: Instrument = None
    """A shipped mode by name, or the path of a file."""
    transits: Count = None
    error_per_bin_ppm: OptionalPpm = Field(default=None, alias="error_per_bin")
    bin_resolving_power: OptionalResolvingPower = None
    """Of the bins that the error belongs to."""
    gases_searched: Count = None
    bands_searched: Count = None
    models_tried: Count = None
    detectors: Count = None
    free_offsets: Terms = None
    """Offsets between detectors that were fitted along with the gas."""
    baseline_terms: Terms = None
    """Free terms of a baseline or trend in wavelength that were fitted and taken out."""


class Reduction(_Quoted):
    """What another reduction of the same data gave."""

    by: Name
    sees: Switch = True
    """Whether it sees the feature; false where only words to that effect were published."""
    later: Switch = False
    """Whether it was published after the claim, by others."""
    source: OptionalWords = None

    @property
    def left_sigma(self) -> float | None:
        """As quoted, or nothing where it sees nothing; None where it sees the feature and gives no figure."""
        return self.sigma if self.sees else 0.0


class Claim(Record):
    """A published claim. Without star, planet and air, checks that need a model spectrum cannot be made."""

    title: Name
    source: OptionalWords = None
    invented: Switch = False
    claim: Feature
    search: Search = Field(default_factory=Search)
    star: Star | None = None
    planet: Planet | None = None
    atmosphere: Atmosphere | None = None
    reductions: Annotated[
        tuple[Reduction, ...], BeforeValidator(Tables(expected="at least one [[reductions]] table"))
    ] = ()

    @property
    def modelled(self) -> bool:
        """Whether there is all that a model spectrum takes."""
        return self.star is not None and self.planet is not None and self.atmosphere is not None

    def scenario(self, modes: tuple[str | Path, ...], mixing_ratio: float | None = None) -> Scenario:
        """The claim as a scenario with the gas as its only candidate.

        Raises
        ------
        ValidationError
            If star, planet and air do not go together.
        """
        if self.star is None or self.planet is None or self.atmosphere is None:
            raise ValueError("a claim without star, planet and air makes no scenario")
        return Scenario.model_validate(
            {
                "title": self.title,
                "invented": self.invented,
                "star": self.star,
                "planet": self.planet,
                "atmosphere": self.atmosphere,
                "candidates": [
                    {"gas": self.claim.gas, "mixing_ratio": mixing_ratio or self.claim.mixing_ratio or _REFERENCE_RATIO}
                ],
                "modes": list(modes),
                "goal": {"threshold": 5},
            }
        )

    @model_validator(mode="after")
    def _makes_a_scenario(self) -> Claim:
        if not self.modelled:
            return self
        try:
            self.scenario(("near-infrared-prism",))
        except ValidationError as error:
            first = error.errors()[0]
            cause = first.get("ctx", {}).get("error")
            place = (*first["loc"], *getattr(cause, "at", ()))
            inside = place if place and place[0] != "candidates" else ("claim", "mixing_ratio")
            raise FieldProblem(str(cause or first["msg"]), inside) from None
        return self
