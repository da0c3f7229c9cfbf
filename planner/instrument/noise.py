"""The random error of the transit depth in each bin, for one transit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.errors import RangeError
from planner.instrument.background import background_e_per_s
from planner.instrument.binning import Bins
from planner.instrument.modes import AnyDetector, Mode, Photometer, interpolate
from planner.instrument.ramps import choose_groups, slope_variance_terms

__all__ = ["Noise", "photon_weights", "transit_noise"]

Array = NDArray[np.float64]

RAMPS_AT_LEAST = 10
"""Ramps within the shorter of the two stretches of the light curve, so that it is sampled (a choice of ours)."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Noise:
    """White noise of one transit.

    Attributes
    ----------
    electrons_per_s : (bin,)
        Of the star, collected in the bin while the detector integrates.
    depth_error_ppm : (bin,)
        Standard error of the transit depth from one transit; infinite where saturated or without light.
    saturated : (bin,) bool
        The brightest pixel of the bin overflows the full well within the ramp.
    star_share, background_share, read_share : (bin,)
        Shares of the variance: photons of the star; of sky, telescope and dark current; read noise.
    groups : (detector,) int
        Groups of a ramp.
    duty : (detector,)
        Share of the clock time, while the target is seen, that the slopes span: (n - 1) group times out of the
        cycle of n groups and the resets.
    saturated_um : tuple of (from, to)
        The saturated stretches, neighbouring bins of a detector joined.
    """

    electrons_per_s: Array
    depth_error_ppm: Array
    saturated: NDArray[np.bool_]
    star_share: Array
    background_share: Array
    read_share: Array
    groups: NDArray[np.int64]
    duty: Array
    saturated_um: tuple[tuple[float, float], ...]


def photon_weights(mode: Mode, detector: int, wavelength_um: Array, photons_per_s_m2_um: Array) -> Array:
    """Electrons s-1 um-1 that a detector collects at each wavelength; 0 outside its ranges.

    Parameters
    ----------
    mode : Mode
    detector : int
        Index into ``mode.detectors``.
    wavelength_um, photons_per_s_m2_um : arrays of one shape
        Wavelengths in any order, and the photons that arrive.
    """
    record = mode.detectors[detector]
    inside = np.zeros(np.shape(wavelength_um), dtype=bool)
    for low_um, high_um in record.ranges_um:
        inside |= (wavelength_um >= low_um) & (wavelength_um <= high_um)
    return np.where(inside, _electrons(mode, record, wavelength_um, photons_per_s_m2_um), 0.0)


def transit_noise(
    mode: Mode,
    bins: Bins,
    wavelength_um: Array,
    photons_per_s_m2_um: Array,
    in_transit_s: float,
    out_of_transit_s: float,
) -> Noise:
    """Noise of the depth in each bin from one transit.

    The depth is one less the ratio of the mean rates in and out of transit; with rate f and variance per integration
    v, its variance is ``(v / N_in + v / N_out) / f^2`` over the integrations in each stretch. v is the variance of
    an up-the-ramp slope (`planner.instrument.ramps`), added over the pixels of the bin, with the photons of the
    star, the background and the dark current in it at their actual rates. The standard error is multiplied by the
    detector's ``excess_noise``. Depths are taken as small against one; limb darkening, the fit of a light curve and
    what it trades against systematics are left out.

    A detector has one number of groups, set by its brightest pixel at 0.8 of the full well, at least two, at most
    the mode's own limit and such that ten ramps fit into the shorter stretch. Bins with a pixel above the full
    well are saturated: with two groups a pixel between 0.8 and 1 of the well is still used.

    Parameters
    ----------
    mode : Mode
    bins : Bins
        Of this mode, at least one on each detector.
    wavelength_um, photons_per_s_m2_um : arrays, shape (sample,)
        The star's spectrum, wavelengths ascending or descending, over all bins; linear in between.
    in_transit_s, out_of_transit_s : float
        Clock times on the target, > 0.

    Raises
    ------
    RangeError
        If the spectrum does not cover the bins.
    ValueError
        If a time is not positive, or a detector has no bin.
    """
    if not (in_transit_s > 0 and out_of_transit_s > 0):
        raise ValueError(f"expected times greater than zero, got {in_transit_s} and {out_of_transit_s}")
    if set(bins.detector) != set(range(len(mode.detectors))):
        raise ValueError(f"bins: expected bins on each of the {len(mode.detectors)} detectors of {mode.name}")
    spectrum = _ascending(wavelength_um, photons_per_s_m2_um)
    _check_covered(bins, spectrum[0])
    parts = [
        _detector_noise(mode, index, bins, spectrum, in_transit_s, out_of_transit_s)
        for index in range(len(mode.detectors))
    ]
    return _assembled(bins, parts)


@dataclass(frozen=True, kw_only=True, eq=False)
class _Part:
    """Noise of one detector; arrays over its own bins, which stand at ``index``."""

    index: NDArray[np.intp]
    rate: Array
    error_ppm: Array
    saturated: NDArray[np.bool_]
    shares: Array
    groups: int
    duty: float


def _detector_noise(
    mode: Mode, number: int, bins: Bins, spectrum: tuple[Array, Array], in_s: float, out_s: float
) -> _Part:
    detector = mode.detectors[number]
    index = np.flatnonzero(bins.detector == number)
    low_um, high_um = bins.from_um[index], bins.to_um[index]
    light = _Light(mode, detector, spectrum, np.concatenate([low_um, high_um]))
    rate = light.between(low_um, high_um)
    brightest = light.brightest_pixel(low_um, high_um)

    group_s = detector.frames_per_group * detector.frame_time_s
    groups = choose_groups(
        brightest_e_per_s=float(brightest.max()),
        full_well_e=detector.full_well_e,
        group_time_s=group_s,
        at_most=_most_groups(detector, min(in_s, out_s)),
    )
    cycle_s = groups * group_s + detector.reset_frames * detector.frame_time_s
    saturated = brightest * groups * group_s > detector.full_well_e

    terms = _variance_terms(mode, detector, groups, low_um, high_um, rate)
    total = terms.sum(axis=0)
    integrations_s = cycle_s / mode.telescope.visible_share * (1 / in_s + 1 / out_s)
    with np.errstate(divide="ignore", invalid="ignore"):
        relative = np.sqrt(total * integrations_s) / ((groups - 1) * group_s * rate)
        error_ppm = np.where(saturated | (rate <= 0), np.inf, 1e6 * detector.excess_noise * relative)
    return _Part(
        index=index,
        rate=rate,
        error_ppm=error_ppm,
        saturated=saturated,
        shares=terms / total,
        groups=groups,
        duty=(groups - 1) * group_s / cycle_s,
    )


def _most_groups(detector: AnyDetector, stretch_s: float) -> int:
    """The longest ramp that the mode allows and that still samples the light curve, in groups; at least 2."""
    frames = stretch_s / RAMPS_AT_LEAST / detector.frame_time_s - detector.reset_frames
    sampled = max(2, int(frames / detector.frames_per_group))
    return sampled if detector.groups_at_most is None else min(sampled, detector.groups_at_most)


def _variance_terms(
    mode: Mode, detector: AnyDetector, groups: int, low_um: Array, high_um: Array, rate: Array
) -> Array:
    """Variance per integration of the electrons over the slope: star, background with dark, read noise; ``(3, bin)``.

    The slope variance of a pixel is linear in its rate, so that adding over pixels needs only the sums.
    """
    read_factor, rate_factor_s = slope_variance_terms(groups, detector.frames_per_group, detector.frame_time_s)
    pixels = _pixels(detector, low_um, high_um)
    centre_um = np.sqrt(low_um * high_um)
    unwanted = background_e_per_s(detector, mode.telescope.collecting_area_m2, centre_um)
    unwanted = unwanted + detector.dark_current_e_per_s
    return np.array(
        [rate_factor_s * rate, rate_factor_s * pixels * unwanted, read_factor * pixels * detector.read_noise_e**2]
    )


def _pixels(detector: AnyDetector, low_um: Array, high_um: Array) -> Array:
    """Pixels that a bin is extracted from; columns by Simpson's rule over the dispersion."""
    if isinstance(detector, Photometer):
        return np.full(low_um.shape, detector.extraction_pixels)
    ends = [1e3 / interpolate(detector.nm_per_pixel, x) for x in (low_um, (low_um + high_um) / 2, high_um)]
    columns = (high_um - low_um) * (ends[0] + 4 * ends[1] + ends[2]) / 6
    return columns * detector.extraction_height_pixels


class _Light:
    """Electrons of the star on one detector, as a running integral over wavelength."""

    def __init__(self, mode: Mode, detector: AnyDetector, spectrum: tuple[Array, Array], edges_um: Array) -> None:
        self._mode, self._detector = mode, detector
        low, high = edges_um.min(), edges_um.max()
        inside = (spectrum[0] > low) & (spectrum[0] < high)
        # with the edges among the samples the integral of the linear interpolant is exact up to the throughput
        self._x_um = np.union1d(spectrum[0][inside], edges_um)
        electrons = _electrons(mode, detector, self._x_um, np.interp(self._x_um, *spectrum))
        steps = np.diff(self._x_um) * (electrons[1:] + electrons[:-1]) / 2
        self._sum = np.concatenate([[0.0], np.cumsum(steps)])

    def between(self, low_um: Array, high_um: Array) -> Array:
        """Electrons s-1 between each pair of wavelengths."""
        return np.interp(high_um, self._x_um, self._sum) - np.interp(low_um, self._x_um, self._sum)

    def brightest_pixel(self, low_um: Array, high_um: Array) -> Array:
        """Electrons s-1 of the brightest pixel in each bin, background and dark current included."""
        detector = self._detector
        if isinstance(detector, Photometer):
            star = self.between(low_um, high_um) * detector.brightest_pixel_share
            return star + self._unwanted(np.sqrt(low_um * high_um))
        half_um = interpolate(detector.nm_per_pixel, self._x_um) * 0.5e-3
        column = self.between(self._x_um - half_um, self._x_um + half_um)
        pixel = column * detector.brightest_pixel_share + self._unwanted(self._x_um)
        first, last = np.searchsorted(self._x_um, low_um), np.searchsorted(self._x_um, high_um)
        return np.array([pixel[a : b + 1].max() for a, b in zip(first, last, strict=True)])

    def _unwanted(self, wavelength_um: Array) -> Array:
        area_m2 = self._mode.telescope.collecting_area_m2
        return background_e_per_s(self._detector, area_m2, wavelength_um) + self._detector.dark_current_e_per_s


def _electrons(mode: Mode, detector: AnyDetector, wavelength_um: Array, photons: Array) -> Array:
    """Electrons s-1 um-1, ranges of the detector not looked at."""
    return mode.telescope.collecting_area_m2 * interpolate(detector.throughput, wavelength_um) * photons


def _ascending(wavelength_um: Array, photons: Array) -> tuple[Array, Array]:
    order = np.argsort(wavelength_um, kind="stable")
    return np.asarray(wavelength_um)[order], np.asarray(photons)[order]


def _check_covered(bins: Bins, wavelength_um: Array) -> None:
    """Refuse a spectrum that ends within a bin; half a per mille of wavelength is forgiven to a grid's last step."""
    low, high = float(bins.from_um.min()), float(bins.to_um.max())
    if wavelength_um[0] > low * 1.0005 or wavelength_um[-1] < high * 0.9995:
        raise RangeError(
            f"spectrum: expected wavelengths from {low:.4g} to {high:.4g} um for the bins of the mode, "
            f"got {wavelength_um[0]:.4g} to {wavelength_um[-1]:.4g} um"
        )


def _assembled(bins: Bins, parts: list[_Part]) -> Noise:
    order = np.argsort(np.concatenate([part.index for part in parts]))

    def joined(name: str) -> Array:
        return np.concatenate([getattr(part, name) for part in parts], axis=-1)[..., order]

    saturated = joined("saturated").astype(bool)
    star, background, read = joined("shares")
    return Noise(
        electrons_per_s=joined("rate"),
        depth_error_ppm=joined("error_ppm"),
        saturated=saturated,
        star_share=star,
        background_share=background,
        read_share=read,
        groups=np.array([part.groups for part in parts]),
        duty=np.array([part.duty for part in parts]),
        saturated_um=_stretches(bins, saturated),
    )


def _stretches(bins: Bins, mask: NDArray[np.bool_]) -> tuple[tuple[float, float], ...]:
    """The marked bins as (from, to), neighbours on one detector joined."""
    stretches: list[tuple[float, float]] = []
    marked = np.flatnonzero(mask)
    for position, index in enumerate(marked):
        low, high = float(bins.from_um[index]), float(bins.to_um[index])
        before = marked[position - 1] if position else None
        touches = before is not None and bins.detector[before] == bins.detector[index] and bins.to_um[before] == low
        if touches:
            stretches[-1] = (stretches[-1][0], high)
        else:
            stretches.append((low, high))
    return tuple(stretches)
