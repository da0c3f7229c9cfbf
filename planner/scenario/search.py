"""Records of the search: candidates, the goal, noise, what is not known, bins."""

from __future__ import annotations

from dataclasses import dataclass

from pydantic import Field

from planner.scenario.fields import (
    Amounts,
    Decades,
    GasName,
    OptionalCharge,
    OptionalCount,
    OptionalHours,
    OptionalRelative,
    Ppm,
    Probability,
    RatioRange,
    Ratios,
    Record,
    Relative,
    ResolvingPower,
    Sigmas,
)

__all__ = ["Bins", "Candidate", "Case", "Fit", "Goal", "Noise", "Nuisances", "Spread"]


class Candidate(Record):
    """A gas to be searched for, at one or several mixing ratios."""

    gas: GasName
    """Formula."""
    mixing_ratios: Ratios = Field(alias="mixing_ratio")


class Goal(Record):
    """What counts as success, and what the telescope charges for one transit."""

    threshold_sigma: Sigmas = Field(alias="threshold")
    power: Probability = 0.5
    """Probability of passing the threshold that the required number of transits must give."""
    transits_available: OptionalCount = None
    given_out_of_transit_h: OptionalHours = Field(default=None, alias="out_of_transit")
    settling_h: OptionalCharge = Field(default=None, alias="settling")
    """In place of the mode's own settling time."""
    overhead_h: OptionalCharge = Field(default=None, alias="overhead")
    """In place of the mode's own charge per visit."""


class Noise(Record):
    """A floor in place of each mode's own."""

    floor_ppm: Ppm = Field(alias="floor")
    floor_resolving_power: ResolvingPower = 100.0
    """The floor is that of one element of this resolving power."""


class Nuisances(Record):
    """Prior widths (one sigma) of what is not known exactly; a width of zero means known exactly."""

    offset_ppm: Ppm = Field(default=1000.0, alias="offset")
    """Of each detector's depth scale."""
    radius_fraction: Relative = Field(default=0.05, alias="radius")
    temperature_fraction: Relative = Field(default=0.15, alias="temperature")
    given_gravity_fraction: OptionalRelative = Field(default=None, alias="gravity")
    molar_mass_fraction: Relative = Field(default=0.10, alias="molar_mass")
    cloud_top_dex: Decades = Field(default=1.0, alias="cloud_top")
    haze_dex: Decades = Field(default=1.0, alias="haze")
    absorbers_dex: Decades = Field(default=1.0, alias="absorbers")
    rivals: Amounts = Field(default_factory=dict)
    """Gases that the air lacks but might hold: width of the prior in mixing ratio, by formula."""


class Spread(Record):
    """Prior widths (one sigma) of what moves the answer and is no nuisance: a search asks for it, or it is a scale."""

    mixing_ratio_dex: Decades = Field(default=0.3, alias="mixing_ratio")
    """Of the searched gas."""
    star_radius_fraction: Relative = Field(default=0.03, alias="star_radius")
    """The planet's radius follows, since transits measure the ratio of the two."""


class Fit(Record):
    """Priors that only the fit of a spectrum has, beside those of the nuisances."""

    mixing_ratio_range: RatioRange = (1e-10, 0.05)
    """Of every gas but the background; evenly in the logarithm. Above its default end a gas widens its own lines."""


class Bins(Record):
    """Resolving power of the reported bins; a mode's own element is used where it is wider."""

    resolving_power: ResolvingPower = 100.0


@dataclass(frozen=True, kw_only=True)
class Case:
    """What one row of a plan searches for: a gas at a mixing ratio, or a set of gases together."""

    gases: tuple[str, ...]
    mixing_ratios: tuple[float, ...]

    @property
    def label(self) -> str:
        """The formulas joined by plus signs."""
        return " + ".join(self.gases)
