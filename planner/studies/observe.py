"""The observing side of a scenario: modes with their bins, noise, floor and photon weights."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import block_diag

from planner.instrument.binning import Bins, make_bins
from planner.instrument.floor import floor_covariance
from planner.instrument.modefiles import read_mode
from planner.instrument.modes import Mode
from planner.instrument.noise import Noise, photon_weights, transit_noise
from planner.scenario.readings import COMBINED
from planner.scenario.records import Scenario
from planner.spectroscopy.grid import SAMPLES_PER_UNIT_LN, LogGrid
from planner.star.flux import photon_flux
from planner.star.record import Star
from planner.star.spectrumfile import read_spectrum

__all__ = ["BinMeans", "ModeView", "observing_grid", "source_of_light", "view_modes"]

Array = NDArray[np.float64]

_STRETCHES = "saturated_um"


class BinMeans:
    """Photon-weighted means over bins of what is sampled on a wavenumber grid.

    Parameters
    ----------
    weights : (detector, wavenumber)
        Electrons per s and sample that each detector collects.
    wavelength_um : (wavenumber,)
        Descending, as the wavenumbers ascend.
    bins : Bins

    Attributes
    ----------
    start, stop : (bin,)
        The samples of each bin are ``start`` up to, not including, ``stop``.
    """

    def __init__(self, weights: Array, wavelength_um: Array, bins: Bins) -> None:
        ascending = wavelength_um[::-1]
        count = wavelength_um.size
        self.stop = count - np.searchsorted(ascending, bins.from_um, side="left")
        self.start = count - np.searchsorted(ascending, bins.to_um, side="left")
        self._detector = bins.detector
        self._weights = weights
        self._total = self._sum(np.ones(count))

    def __call__(self, samples: Array) -> Array:
        """Means of ``(..., wavenumber)`` over the bins, ``(..., bin)``."""
        return self._sum(samples) / self._total

    def _sum(self, samples: Array) -> Array:
        result = np.empty((*samples.shape[:-1], self._detector.size))
        for detector in np.unique(self._detector):
            mine = self._detector == detector
            first, last = self.start[mine].min(), self.stop[mine].max()
            running = np.zeros((*samples.shape[:-1], last - first + 1))
            np.cumsum(samples[..., first:last] * self._weights[detector, first:last], axis=-1, out=running[..., 1:])
            result[..., mine] = running[..., self.stop[mine] - first] - running[..., self.start[mine] - first]
        return result


@dataclass(frozen=True, kw_only=True, eq=False)
class ModeView:
    """One mode as it looks at one star."""

    mode: Mode
    bins: Bins
    noise: Noise
    floor_ppm2: Array
    charged_hours: float
    """Hours charged for one transit: in transit, baseline, settling and overhead."""
    grid: LogGrid
    weights: Array
    """Electrons per s and grid sample, ``(detector, wavenumber)``."""
    parts: tuple[ModeView, ...] = ()
    """The modes that are combined in this one, if it is not a single mode."""

    @property
    def transits_each(self) -> int:
        """Transits of the planet that one transit with each of the parts takes; 1 for a single mode."""
        return max(1, len(self.parts))

    def on_offer(self, scenario: Scenario) -> int:
        """Transits with this mode, or with each of its parts, that the planet's transits allow."""
        return max(1, scenario.transits_on_offer // self.transits_each)

    def means(self, stride: int = 1) -> BinMeans:
        """The bin means for every ``stride``-th sample of the grid."""
        return BinMeans(self.weights[:, ::stride], self.grid.wavelength_um[::stride], self.bins)

    @cached_property
    def detectors(self) -> tuple[str, ...]:
        """Names of the detectors, unique within the scenario; those of a combination are its parts' own."""
        if self.parts:
            return tuple(name for part in self.parts for name in part.detectors)
        return tuple(f"{self.mode.name}: {detector.name}" for detector in self.mode.detectors)


def source_of_light(scenario: Scenario) -> Star:
    """The star of a scenario as a source of photons."""
    star = scenario.star
    return Star(
        temperature_k=star.temperature_k,
        radius_rsun=star.radius_rsun,
        log_g=star.log_g,
        distance_pc=star.distance_pc,
        magnitudes=star.magnitudes,
        spectrum=read_spectrum(star.spectrum, at_earth=star.spectrum_at_earth) if star.spectrum else None,
    )


def observing_grid(scenario: Scenario, samples_per_unit_ln: int | None = None) -> LogGrid:
    """One grid over all modes of a scenario; at least 500 samples in each bin that is asked for."""
    spans = [read_mode(name).span_um for name in scenario.single_modes]
    density = samples_per_unit_ln or max(SAMPLES_PER_UNIT_LN, int(np.ceil(500 * scenario.bins.resolving_power)))
    return LogGrid.covering(min(a for a, _ in spans), max(b for _, b in spans), density)


def view_modes(scenario: Scenario, grid: LogGrid) -> list[ModeView]:
    """All modes of a scenario with their noise for its star and transit; their combination last, if it is asked for."""
    star = source_of_light(scenario)
    photons = photon_flux(star, grid.wavelength_um)
    views = [_view(scenario, read_mode(name), grid, photons) for name in scenario.single_modes]
    return [*views, _combined(views)] if scenario.combines else views


def _view(scenario: Scenario, mode: Mode, grid: LogGrid, photons: Array) -> ModeView:
    if scenario.noise is not None:
        floor = mode.floor.model_copy(
            update={
                "depth_ppm": scenario.noise.floor_ppm,
                "resolving_power": scenario.noise.floor_resolving_power,
                "correlation_length": None,
            }
        )
        mode = mode.model_copy(update={"floor": floor})
    bins = make_bins(mode, scenario.bins.resolving_power)
    wavelength = grid.wavelength_um
    noise = transit_noise(
        mode,
        bins,
        wavelength,
        photons,
        in_transit_s=3600 * scenario.transit_duration_h,
        out_of_transit_s=3600 * scenario.out_of_transit_h,
    )
    step_um = wavelength / grid.samples_per_unit_ln
    weights = np.array([photon_weights(mode, i, wavelength, photons) * step_um for i in range(len(mode.detectors))])
    return ModeView(
        mode=mode,
        bins=bins,
        noise=noise,
        floor_ppm2=floor_covariance(mode, bins),
        charged_hours=_charged_hours(scenario, mode),
        grid=grid,
        weights=weights,
    )


def _combined(parts: Sequence[ModeView]) -> ModeView:
    """As many transits with each of some modes, as one mode: all their detectors, the bins one after the other."""
    first = np.cumsum([0, *(len(part.mode.detectors) for part in parts)])[:-1]
    detectors = [
        detector.model_copy(update={"name": f"{part.mode.name}: {detector.name}"})
        for part in parts
        for detector in part.mode.detectors
    ]
    names = ", ".join(part.mode.name for part in parts)
    mode = parts[0].mode.model_copy(
        update={"name": COMBINED, "summary": f"as many transits with each of {names}", "detectors": tuple(detectors)}
    )
    return ModeView(
        mode=mode,
        bins=Bins(
            detector=np.concatenate([part.bins.detector + start for part, start in zip(parts, first, strict=True)]),
            from_um=np.concatenate([part.bins.from_um for part in parts]),
            to_um=np.concatenate([part.bins.to_um for part in parts]),
        ),
        noise=_joined_noise([part.noise for part in parts]),
        floor_ppm2=block_diag(*[part.floor_ppm2 for part in parts]),
        charged_hours=sum(part.charged_hours for part in parts),
        grid=parts[0].grid,
        weights=np.concatenate([part.weights for part in parts]),
        parts=tuple(parts),
    )


def _joined_noise(parts: Sequence[Noise]) -> Noise:
    joined = {
        f.name: np.concatenate([getattr(p, f.name) for p in parts]) for f in fields(Noise) if f.name != _STRETCHES
    }
    return Noise(**joined, saturated_um=tuple(stretch for part in parts for stretch in part.saturated_um))


def _charged_hours(scenario: Scenario, mode: Mode) -> float:
    goal, telescope = scenario.goal, mode.telescope
    settling = telescope.settling_h if goal.settling_h is None else goal.settling_h
    overhead = telescope.overhead_h if goal.overhead_h is None else goal.overhead_h
    return scenario.transit_duration_h + scenario.out_of_transit_h + settling + overhead
