"""The records of an instrument mode: telescope, detectors, floor.

Field names carry the unit of the float they hold; the key in the file is the alias, and its value a string with a
unit: ``frame_time = "0.226 s"``. Changed copies come from ``model_copy(update={"frame_time_s": 0.5})``.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Annotated, Any, Literal, Self

import astropy.units as u
import numpy as np
from numpy.typing import NDArray
from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, model_validator

from planner.scenario.readings import Measure, Number, Text, Whole, shown

__all__ = ["AnyDetector", "Detector", "Floor", "Mode", "Photometer", "Spectrometer", "Telescope", "interpolate"]

Table = tuple[tuple[float, float], ...]


@dataclass(frozen=True, kw_only=True)
class Rows:
    """Reading of a list of rows ``[wavelength in um, value]``, wavelengths ascending, values in a range."""

    value: str
    high: float = math.inf
    zero_allowed: bool = False

    @property
    def expected(self) -> str:
        ends = "from 0" if self.zero_allowed else "above 0"
        upto = f" up to {self.high:g}" if self.high < math.inf else ""
        return f"a list of rows [wavelength in um, {self.value}], wavelengths ascending, values {ends}{upto}"

    def __call__(self, value: Any) -> Table:
        rows = _pairs_of_numbers(value)
        if not rows:
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        for row in rows:
            good = row[1] >= 0 if self.zero_allowed else row[1] > 0
            if not (row[0] > 0 and good and row[1] <= self.high):
                raise ValueError(f"expected {self.expected}, got the row {list(row)}")
        for before, after in itertools.pairwise(rows):
            if after[0] <= before[0]:
                raise ValueError(f"expected {self.expected}, got {after[0]:g} um after {before[0]:g} um")
        return rows


@dataclass(frozen=True, kw_only=True)
class Ranges:
    """Reading of a list of ranges ``[from, to]`` in um, ascending and apart."""

    expected: str = "a list of ranges [from, to] in um, ascending and not overlapping"

    def __call__(self, value: Any) -> Table:
        ranges = _pairs_of_numbers(value)
        ends = [end for pair in ranges for end in pair]
        if not ends or ends[0] <= 0 or any(b <= a for a, b in ranges) or ends != sorted(ends):
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        return ranges


def _pairs_of_numbers(value: Any) -> Table:
    """The pairs in a list, or nothing if any entry is not a pair of finite numbers."""
    if not isinstance(value, list | tuple):
        return ()
    for row in value:
        if not isinstance(row, list | tuple) or len(row) != 2:
            return ()
        if any(isinstance(x, bool) or not isinstance(x, int | float) or not math.isfinite(x) for x in row):
            return ()
    return tuple((float(a), float(b)) for a, b in value)


_CHARGE = Measure(kind="a charge", unit=u.electron, example="12 electron")
_CURRENT = Measure(kind="a current", unit=u.electron / u.s, example="0.01 electron/s", zero_allowed=True)
_TIME = Measure(kind="a time", unit=u.h, example="30 min", zero_allowed=True)
_ANGLE = Measure(kind="an angle", unit=u.arcsec, example="0.1 arcsec")
_SHARE = Number(kind="a share", low=0, high=1, open_low=True)

Words = Annotated[str, BeforeValidator(Text())]
Area = Annotated[float, BeforeValidator(Measure(kind="an area", unit=u.m**2, example="25.4 m2"))]
Charge = Annotated[float, BeforeValidator(_CHARGE)]
Current = Annotated[float, BeforeValidator(_CURRENT)]
OptionalCurrent = Annotated[float | None, BeforeValidator(_CURRENT)]
Hours = Annotated[float, BeforeValidator(_TIME)]
Seconds = Annotated[float, BeforeValidator(Measure(kind="a time", unit=u.s, example="0.226 s"))]
OptionalAngle = Annotated[float | None, BeforeValidator(_ANGLE)]
Share = Annotated[float, BeforeValidator(_SHARE)]
Pixels = Annotated[float, BeforeValidator(Number(kind="a number of pixels", low=1))]
Frames = Annotated[int, BeforeValidator(Whole(kind="frames averaged in a group", low=1))]
ResetFrames = Annotated[float, BeforeValidator(Number(kind="a number of frame times", low=0))]
Groups = Annotated[int | None, BeforeValidator(Whole(kind="a number of groups", low=2))]
Excess = Annotated[float, BeforeValidator(Number(kind="a factor on the noise", low=1))]
Ppm = Annotated[float, BeforeValidator(Measure(kind="a depth", unit=1e-6 * u.one, example="10 ppm", zero_allowed=True))]
ResolvingPower = Annotated[float, BeforeValidator(Number(kind="a resolving power", low=1))]
Length = Annotated[float | None, BeforeValidator(Number(kind="a length in ln(wavelength)", low=0, open_low=True))]
RangesUm = Annotated[Table, BeforeValidator(Ranges())]
Resolution = Annotated[Table, BeforeValidator(Rows(value="resolving power"))]
Dispersion = Annotated[Table, BeforeValidator(Rows(value="nm per pixel"))]
Throughput = Annotated[Table, BeforeValidator(Rows(value="electrons per photon", high=1.0, zero_allowed=True))]
Sky = Annotated[Table | None, BeforeValidator(Rows(value="MJy/sr", zero_allowed=True))]


class _Record(BaseModel):
    """Common settings: nothing unknown, nothing changed afterwards, a source for every figure if wanted."""

    model_config = ConfigDict(frozen=True, extra="forbid")


class _Sourced(_Record):
    sources: Mapping[str, Words] = Field(default_factory=dict)
    """Where each figure comes from: key of the figure to source, with how far it is to be trusted."""

    @model_validator(mode="after")
    def _sources_belong(self) -> Self:
        known = {field.alias or name for name, field in type(self).model_fields.items()} - {"sources"}
        for key in self.sources:
            if key not in known:
                raise ValueError(f'sources: expected keys that stand in the same table, got "{key}"')
        return self


class Telescope(_Sourced):
    """What all detectors of a mode share."""

    collecting_area_m2: Area = Field(alias="collecting_area")
    settling_h: Hours = Field(alias="settling")
    """Time per visit on the target before the light curve can be used."""
    overhead_h: Hours = Field(alias="overhead")
    """Time per visit that is charged but spent off the target."""
    visible_share: Share = 1.0
    """Share of the clock time in which the target can be seen at all (occultations by the Earth)."""


class Detector(_Sourced):
    """What spectrometers and photometers share. All tables are read linearly in wavelength, ends held."""

    name: Words
    ranges_um: RangesUm
    throughput: Throughput
    """Electrons per photon that reaches the primary, everything included."""
    brightest_pixel_share: Share
    """Share of the light of one column (of the whole channel for a photometer) in its brightest pixel."""
    read_noise_e: Charge = Field(alias="read_noise")
    """Of one frame of one pixel; a correlated double sample has sqrt(2) times as much."""
    dark_current_e_per_s: Current = Field(alias="dark_current")
    full_well_e: Charge = Field(alias="full_well")
    frame_time_s: Seconds = Field(alias="frame_time")
    frames_per_group: Frames = 1
    reset_frames: ResetFrames
    """Time lost per integration, in frame times: resets and whatever else keeps the detector from collecting."""
    groups_at_most: Groups = None
    background_e_per_s: OptionalCurrent = Field(default=None, alias="background")
    """Sky and thermal electrons per pixel; in its place ``background_mjy_per_sr`` can be given."""
    background_mjy_per_sr: Sky = None
    pixel_scale_arcsec: OptionalAngle = Field(default=None, alias="pixel_scale")
    slit_width_arcsec: OptionalAngle = Field(default=None, alias="slit_width")
    """Without a slit every pixel sees the sky of the whole throughput table; only with ``background_mjy_per_sr``."""
    excess_noise: Excess = 1.0
    """Factor on the standard error of everything random: what the detector adds beyond the terms listed here."""

    @model_validator(mode="after")
    def _one_background(self) -> Self:
        if (self.background_e_per_s is None) == (self.background_mjy_per_sr is None):
            found = "neither" if self.background_e_per_s is None else "both"
            raise ValueError(
                f'expected one of background, such as "0.6 electron/s", and background_mjy_per_sr, got {found}'
            )
        if self.background_mjy_per_sr is not None and self.pixel_scale_arcsec is None:
            raise ValueError('expected pixel_scale, such as "0.1 arcsec", beside background_mjy_per_sr, got none')
        if self.background_mjy_per_sr is None and self.slit_width_arcsec is not None:
            raise ValueError("expected slit_width only beside background_mjy_per_sr: it would change nothing here")
        return self


class Spectrometer(Detector):
    """A detector, or a part of one, that records a spectrum."""

    kind: Literal["spectrometer"]
    resolving_power: Resolution
    nm_per_pixel: Dispersion
    extraction_height_pixels: Pixels


class Photometer(Detector):
    """A channel that records one number."""

    kind: Literal["photometer"]
    extraction_pixels: Pixels

    @model_validator(mode="after")
    def _one_range(self) -> Self:
        if len(self.ranges_um) != 1:
            raise ValueError(f"expected one range in ranges_um of a photometer, got {len(self.ranges_um)}")
        return self


AnyDetector = Spectrometer | Photometer
"""What the detectors of a mode are."""


class Floor(_Sourced):
    """Error that does not average down; see `planner.instrument.floor` for how it depends on the bin."""

    depth_ppm: Ppm = Field(alias="depth")
    resolving_power: ResolvingPower = 100.0
    """The resolving power at which a bin has this floor."""
    correlation_length: Length = None
    """In ln(wavelength); neighbouring elements are independent when it is not given."""


class Mode(_Record):
    """A telescope with an instrument in one setting."""

    name: Words
    summary: Words
    telescope: Telescope
    detectors: tuple[Annotated[AnyDetector, Field(discriminator="kind")], ...] = Field(alias="detector", min_length=1)
    floor: Floor

    @property
    def span_um(self) -> tuple[float, float]:
        """Shortest and longest wavelength of all detectors; there may be gaps between."""
        ends = [end for detector in self.detectors for pair in detector.ranges_um for end in pair]
        return min(ends), max(ends)


def interpolate(table: Table, wavelength_um: NDArray[np.float64] | float) -> NDArray[np.float64]:
    """A table of a detector at the given wavelengths: linear between its rows, held beyond its ends."""
    rows = np.array(table)
    return np.asarray(np.interp(wavelength_um, rows[:, 0], rows[:, 1]), dtype=np.float64)
