"""What the checks share: the claimed feature as bins, errors and templates, from the claim or from its spectrum.

Without a spectrum the expected one stands in for it: the gas's template at the claimed size, without noise, with the
errors that make it exactly as significant as claimed once the unknowns of the air are marginalised. A fit of another
shape to it then tells what that significance is worth against that shape.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from math import ceil, exp, log
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy import optimize

from planner.claims.records import Claim
from planner.claims.spectrum import ObservedSpectrum
from planner.errors import RangeError
from planner.instrument.binning import Bins, make_bins
from planner.instrument.floor import floor_covariance
from planner.instrument.modefiles import read_mode
from planner.instrument.modes import Mode
from planner.instrument.noise import transit_noise
from planner.scenario.records import Case, Scenario
from planner.spectroscopy.grid import SAMPLES_PER_UNIT_LN, LogGrid
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store
from planner.star.flux import photon_flux
from planner.studies.checks.fits import Fits
from planner.studies.forward import BinnedDepth, Change, ForwardModel, opacities_of
from planner.studies.nuisances import directions
from planner.studies.observe import BinMeans, source_of_light
from planner.studies.rivals import rival_ratio

__all__ = ["MOST_RATIO", "Bench", "floor_of", "height_ppm", "make_bench"]

Array = NDArray[np.float64]
Progress = Callable[[str, float], None]

MOST_RATIO = 0.01
"""Most of a gas that is tried: a trace. More of it changes the air itself and is another claim."""
_LEAST_RATIO = 1e-10
_PER_DECADE = 1
_RESOLVING_POWER = 100.0
_NOISE_SAMPLES = 20_000
_SAMPLES_PER_BIN = 60
"""Of the forward model: the sampling noise of a bin is then about 0.2 scale heights."""
_LEVEL_PPM = 1e4
"""Prior width of the level of the whole spectrum, which no claim rests on."""


def height_ppm(template_ppm: Array) -> float:
    """Height of a template: its highest bin over its lowest, which is the level beside the band."""
    return float(np.ptp(template_ppm)) if template_ppm.size else 0.0


@dataclass(frozen=True, kw_only=True, eq=False)
class Bench:
    """One claim, ready to be checked.

    Attributes
    ----------
    bins : Bins
        Of the spectrum, or those of the mode inside the claimed range; usable ones only.
    shape_ppm : (bin,)
        Error of each bin up to a common factor, or that of the data.
    one_transit_ppm : (bin,) or None
        Predicted white noise of one transit, where a mode is named.
    """

    claim: Claim
    scenario: Scenario
    mode: Mode | None
    bins: Bins
    detectors: tuple[str, ...]
    shape_ppm: Array
    one_transit_ppm: Array | None
    observed: ObservedSpectrum | None
    model: ForwardModel
    library: LineLibrary

    # -- what the air does --------------------------------------------------------------------------------------

    @property
    def gas(self) -> str:
        """Formula of the claimed gas."""
        return self.claim.claim.gas

    def case(self, mixing_ratio: float) -> Case:
        """The claimed gas at a mixing ratio."""
        return Case(gases=(self.gas,), mixing_ratios=(mixing_ratio,))

    def template_at(self, mixing_ratio: float) -> Array:
        """Share of the claimed gas at a mixing ratio, ppm ``(bin,)``."""
        return self._template_at(mixing_ratio)

    @cached_property
    def _template_at(self) -> Callable[[float], Array]:
        def template(ratio: float) -> Array:
            return self.model.binned(self.case(ratio), shares_of=[self.gas])[0].shares_ppm[self.gas]

        return lru_cache(maxsize=64)(template)

    @cached_property
    def growth(self) -> tuple[tuple[float, float], ...]:
        """Height of the template (ratio, ppm) along mixing ratios, a point a decade up to `MOST_RATIO`."""
        count = ceil(log(MOST_RATIO / _LEAST_RATIO, 10) * _PER_DECADE) + 1
        ratios = np.geomspace(_LEAST_RATIO, MOST_RATIO, count).tolist()
        return tuple((ratio, height_ppm(self.template_at(ratio))) for ratio in ratios)

    def ratio_for(self, height: float) -> float | None:
        """Least mixing ratio whose template reaches a height; None where no trace does."""
        for (low, below), (high, above) in zip(self.growth, self.growth[1:], strict=False):
            if below < height <= above:
                share = log(height / max(below, 1e-6)) / log(above / max(below, 1e-6))
                return exp(log(low) + share * log(high / low))
        return self.growth[0][0] if height <= self.growth[0][1] else None

    @cached_property
    def mixing_ratio(self) -> float:
        """As claimed, else what makes the claimed height, else what the catalogue takes for a rival."""
        stated, amplitude = self.claim.claim.mixing_ratio, self.claim.claim.amplitude_ppm
        if stated is not None:
            return stated
        if amplitude is not None:
            return self.ratio_for(amplitude) or MOST_RATIO
        return min(rival_ratio(self.gas), MOST_RATIO)

    @cached_property
    def template_ppm(self) -> Array:
        """Of the claimed gas at its mixing ratio, stretched to the claimed height where one is claimed."""
        template = self.template_at(self.mixing_ratio)
        amplitude, height = self.claim.claim.amplitude_ppm, height_ppm(template)
        return template * (amplitude / height) if amplitude is not None and height > 0 else template

    @property
    def height_ppm(self) -> float:
        """Height of the template in use."""
        return height_ppm(self.template_ppm)

    @cached_property
    def null(self) -> BinnedDepth:
        """The air without the gas's absorption."""
        case = self.case(self.mixing_ratio)
        others = [gas for gas in self.scenario.atmosphere.absorbers if gas != self.gas]
        return self.model.binned(case, shares_of=others, transparent=case.gases)[0]

    @cached_property
    def unknowns_ppm(self) -> Array:
        """Directions of the air's unknowns and the level, for one prior width each, ``(nuisance, bin)``."""
        found = directions(self.model, self.case(self.mixing_ratio), [self.null], [])
        return np.array([*(d.per_mode_ppm[0] for d in found), np.full(len(self.bins), _LEVEL_PPM), *self.free_offsets])

    @cached_property
    def free_offsets(self) -> list[Array]:
        """Offsets that the claim says were fitted: one per detector but the first, as many as there are."""
        return self.offsets[: self.claim.search.free_offsets or 0]

    @cached_property
    def offsets(self) -> list[Array]:
        """A step of the level for every detector but the first."""
        numbers = np.unique(self.bins.detector)[1:]
        return [np.where(self.bins.detector == number, _LEVEL_PPM, 0.0) for number in numbers]

    def rival_at(self, gas: str, mixing_ratio: float) -> Array:
        """Depth that another gas would add to the air without the claimed one, ppm ``(bin,)``."""
        case = self.case(self.mixing_ratio)
        moved = self.model.binned(case, Change(added=((gas, mixing_ratio),)), transparent=case.gases)[0]
        plain = self.model.binned(case, transparent=case.gases)[0]
        return moved.depth_ppm - plain.depth_ppm

    @property
    def uncovered_share(self) -> float:
        """Share of the samples at which the claimed gas has no data."""
        return 1.0 - float(np.mean(self.model.opacities.covered(self.gas)))

    # -- what was seen ------------------------------------------------------------------------------------------

    @property
    def on_data(self) -> bool:
        """Whether there is a spectrum."""
        return self.observed is not None

    @cached_property
    def depth_ppm(self) -> Array:
        """The spectrum less the air without the gas; without one, what the claim amounts to."""
        if self.observed is None:
            return self.template_ppm
        return self.observed.depth_ppm - self.null.depth_ppm

    @cached_property
    def error_ppm(self) -> Array | None:
        """Errors of the data, or those that make the claim as significant as it says; None if it does not say."""
        if self.observed is not None:
            return self.observed.error_ppm
        sigma = self.claim.claim.sigma
        if sigma is None or self.height_ppm == 0:
            return None
        return self._scaled_for(sigma)

    @property
    def unweighed(self) -> str:
        """Why there are no errors to fit with, where there are none."""
        if self.claim.claim.sigma is None:
            return "no significance is given"
        return "what is not known of the air makes such a shape: no error makes it as significant as claimed"

    def _scaled_for(self, sigma: float) -> Array | None:
        """The shape of the errors times the factor that gives a significance; it falls as errors grow."""

        def excess(ln_factor: float) -> float:
            fits = Fits(self.template_ppm, self.shape_ppm * exp(ln_factor), self.unknowns_ppm)
            return fits.sigma([self.template_ppm]) - sigma

        centre = log(self.height_ppm / float(np.median(self.shape_ppm)) / sigma)
        low, high = centre - 12.0, centre + 6.0
        if excess(low) < 0 or excess(high) > 0:
            return None
        return self.shape_ppm * exp(optimize.brentq(excess, low, high, xtol=1e-6))

    @cached_property
    def fits(self) -> Fits | None:
        """Fits to what was seen with the air's unknowns marginalised."""
        return self.fits_with([])

    def fits_with(self, more_ppm: Sequence[Array]) -> Fits | None:
        """The same with further nuisance directions; None where the claim gives no significance."""
        if self.error_ppm is None:
            return None
        unknown = np.array([*self.unknowns_ppm, *more_ppm])
        return Fits(self.depth_ppm, self.error_ppm, unknown)

    @property
    def sigma(self) -> float | None:
        """Significance of the gas in the spectrum, or as claimed."""
        if self.observed is None or self.fits is None:
            return self.claim.claim.sigma
        amount, error = self.fits.amplitude(self.template_ppm)
        return max(0.0, amount / error)

    @property
    def weighed_sigma(self) -> float | None:
        """What chance and evidence go by: as claimed, or what the spectrum gives where that is less."""
        told = [sigma for sigma in (self.claim.claim.sigma, self.sigma) if sigma is not None]
        return min(told, default=None)


def make_bench(
    claim: Claim,
    observed: ObservedSpectrum | None = None,
    *,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
) -> Bench:
    """The bench for a claim with star, planet and air.

    Raises
    ------
    PlannerError
        If line data or the mode cannot be read or used, or no bin of the mode can.
    """
    mode = _used_part(claim) if claim.search.mode is not None else None
    scenario = claim.scenario((claim.search.mode or "near-infrared-prism",))
    bins, detectors, white = _bins(claim, scenario, mode, observed)
    if observed is not None and mode is not None:
        white = _predicted(claim, scenario, mode, bins)
    grid = LogGrid.covering(float(bins.from_um.min()), float(bins.to_um.max()))
    photons = photon_flux(source_of_light(scenario), grid.wavelength_um)
    narrowest = float(bins.width_ln.min()) * SAMPLES_PER_UNIT_LN
    index = np.arange(0, grid.count, max(1, int(narrowest / _SAMPLES_PER_BIN)))
    weights = np.tile(photons[index] * grid.wavelength_um[index], (int(bins.detector.max()) + 1, 1))
    store = Store()
    library = LineLibrary(store, lines_folder)
    opacities = opacities_of(scenario, library, store, grid, progress).selection(index, own_tables=True)
    gas = claim.claim.gas
    if not (opacities.has_data(gas) and opacities.covered(gas).any()):
        raise RangeError(
            f"{gas}: no data from {bins.from_um.min():.3g} to {bins.to_um.max():.3g} um; bring some with --lines, or "
            "leave out [atmosphere] and judge by chance alone"
        )
    means = BinMeans(weights, grid.wavelength_um[index], bins)
    shape = 1 / np.sqrt(means(photons[index]) * bins.width_ln) if white is None else white
    return Bench(
        claim=claim,
        scenario=scenario,
        mode=mode,
        bins=bins,
        detectors=detectors,
        shape_ppm=observed.error_ppm if observed is not None else shape,
        one_transit_ppm=white,
        observed=observed,
        model=ForwardModel(scenario, opacities, [means]),
        library=library,
    )


def floor_of(bench: Bench) -> Array | None:
    """Floor of the mode in the bins of the bench, ppm^2 ``(bin, bin)``."""
    return floor_covariance(bench.mode, bench.bins) if bench.mode is not None and not bench.on_data else None


def _used_part(claim: Claim) -> Mode:
    """The mode with the detectors that the claimed range touches: ramps then suit what is used of it."""
    mode, low, high = read_mode(claim.search.mode or ""), claim.claim.from_um, claim.claim.to_um
    kept = [d for d in mode.detectors if any(a < high and b > low for a, b in d.ranges_um)]
    if not kept:
        raise RangeError(f"{mode.name}: no detector sees any of {low:g} to {high:g} um; name the mode that was used")
    return mode.model_copy(update={"detectors": tuple(kept)})


def _bins(
    claim: Claim, scenario: Scenario, mode: Mode | None, observed: ObservedSpectrum | None
) -> tuple[Bins, tuple[str, ...], Array | None]:
    """Bins of the spectrum, or usable ones of the mode or plain ones in the claimed range; with them, names of the
    detectors, and the white noise of one transit where it can be predicted."""
    if observed is not None:
        bins = Bins(detector=observed.detector, from_um=observed.from_um, to_um=observed.to_um)
        return bins, observed.detectors, None
    low, high = claim.claim.from_um, claim.claim.to_um
    if mode is None:
        edges = np.geomspace(low, high, max(2, ceil(_RESOLVING_POWER * log(high / low))) + 1)
        plain = Bins(detector=np.zeros(edges.size - 1, dtype=np.int64), from_um=edges[:-1], to_um=edges[1:])
        return plain, ("the spectrum",), None
    every = make_bins(mode, _RESOLVING_POWER)
    inside = (every.centre_um >= low) & (every.centre_um <= high)
    if len(np.unique(every.detector[inside])) < len(mode.detectors):
        raise RangeError(f"{mode.name}: expected a bin on each detector from {low:g} to {high:g} um; widen the range")
    bins = _some(every, inside)
    wavelength = np.geomspace(bins.from_um.min(), bins.to_um.max(), _NOISE_SAMPLES)
    wavelength[[0, -1]] = bins.from_um.min(), bins.to_um.max()  # rounding must not leave the ends out
    noise = transit_noise(
        mode,
        bins,
        wavelength,
        photon_flux(source_of_light(scenario), wavelength),
        in_transit_s=3600 * scenario.transit_duration_h,
        out_of_transit_s=3600 * scenario.out_of_transit_h,
    )
    kept = np.isfinite(noise.depth_error_ppm) & ~noise.saturated
    if kept.sum() < 2:
        raise RangeError(
            f"{mode.name}: expected at least two usable bins from {low:g} to {high:g} um, got {int(kept.sum())} "
            f"({int(noise.saturated.sum())} saturate)"
        )
    return _some(bins, kept), tuple(detector.name for detector in mode.detectors), noise.depth_error_ppm[kept]


def _predicted(claim: Claim, scenario: Scenario, mode: Mode, bins: Bins) -> Array | None:
    """White noise of one transit in the bins of a spectrum; None where the mode cannot see all of it."""
    try:
        own, _, white = _bins(claim, scenario, mode, None)
    except RangeError:
        return None
    if white is None or bins.from_um.min() < mode.span_um[0] or bins.to_um.max() > mode.span_um[1]:
        return None
    order = np.argsort(own.centre_um)
    per_root_ln = white * np.sqrt(own.width_ln)
    return np.asarray(np.interp(bins.centre_um, own.centre_um[order], per_root_ln[order]) / np.sqrt(bins.width_ln))


def _some(bins: Bins, kept: NDArray[np.bool_]) -> Bins:
    return replace(bins, detector=bins.detector[kept], from_um=bins.from_um[kept], to_um=bins.to_um[kept])
