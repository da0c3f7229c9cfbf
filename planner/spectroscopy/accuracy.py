"""How well an embedded list stands in for a real one, measured by what a transit would show.

The figure of merit is the effective height of an isothermal atmosphere with the gas as its only absorber: N2 of
250 K over a surface at 1 bar, scale height 9 km, planet radius 5870 km. Heights are averaged in spectral bins and
compared in scale heights, because that is the size of the error a plan would inherit. A difference of 0.3 means a
factor 1.35 in the intensity of weak lines, or 1.8 in intensity times width of strong ones.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.crosssections import cross_sections
from planner.spectroscopy.lines import Lines

__all__ = [
    "MARKS",
    "Marks",
    "SmoothCrossSection",
    "WindowScore",
    "alike",
    "compare",
    "effective_heights",
    "height_spectrum",
]

Floats = NDArray[np.float64]
SmoothCrossSection = Callable[[Floats, float], Floats]
"""Smooth part of a list: (wavenumber_per_cm, temperature_k) -> cm2, the same at every pressure."""

BOLTZMANN_ERG_PER_K = 1.380649e-16
"""SI Brochure, 9th edition (2019), exact."""

_REFERENCE_TEMPERATURE_K = 250.0
_REFERENCE_SCALE_HEIGHT_CM = 9.0e5
_PLANET_RADIUS_CM = 5.870e8
_PRESSURES_BAR = np.logspace(-8.0, 0.0, 17)
_STEP_PER_CM = 0.005
_CHUNK_PER_CM = 100.0
_LEVELS = np.arange(0.0, 26.01, 0.25)
"""Heights in scale heights; the line cores of an abundant gas are opaque up to about 23."""
_VISIBLE = 0.5
"""Bins where the real list stays lower than this (in scale heights) are not judged: nothing shows there."""


@dataclass(frozen=True, kw_only=True)
class Marks:
    """Largest differences that still count as standing in, in scale heights, one entry per mixing ratio."""

    mixing_ratios: tuple[float, ...]
    percentile_90: tuple[float, ...]
    median: tuple[float, ...]
    mean: float


MARKS = Marks(
    mixing_ratios=(1e-6, 1e-4, 1e-2),
    percentile_90=(0.20, 0.25, 0.35),
    median=(0.10, 0.15, 0.20),
    mean=0.15,
)
"""The project's marks, for bins of resolving power 100."""


@dataclass(frozen=True, kw_only=True, eq=False)
class WindowScore:
    """Embedded against real in one window. Arrays have shape ``(resolving power, mixing ratio)``.

    Differences are embedded less real, in scale heights, over the bins whose real height exceeds half a scale
    height; NaN where there is no such bin.
    """

    window_per_cm: tuple[float, float]
    resolving_powers: tuple[float, ...]
    mixing_ratios: tuple[float, ...]
    bins: NDArray[np.int64]
    percentile_90: Floats
    """90th percentile of the absolute difference."""
    median: Floats
    """Median of the absolute difference."""
    mean: Floats
    """Mean of the signed difference."""

    def passes(self, marks: Marks = MARKS, resolving_power: float = 100.0) -> bool:
        """True where every mixing ratio meets the marks; those without a visible bin are not judged."""
        row = self.resolving_powers.index(resolving_power)
        columns = [self.mixing_ratios.index(ratio) for ratio in marks.mixing_ratios]
        seen = self.bins[row, columns] > 0
        within = (
            (self.percentile_90[row, columns] <= marks.percentile_90)
            & (self.median[row, columns] <= marks.median)
            & (np.abs(self.mean[row, columns]) <= marks.mean)
        )
        return bool(np.all(within | ~seen))

    def describe(self) -> str:
        """One line per resolving power: bins, 90th percentile, median and mean at each mixing ratio."""
        columns = (("p90", self.percentile_90), ("median", self.median), ("mean", self.mean))
        texts = []
        for row, power in enumerate(self.resolving_powers):
            cells = [f"{name} {_slashed(values[row], '.2f')}" for name, values in columns]
            window = f"{self.window_per_cm[0]:g}-{self.window_per_cm[1]:g}"
            texts.append(" ".join([window, f"R={power:g} bins {_slashed(self.bins[row], 'd')}", *cells]))
        return "\n".join(texts)


def compare(
    embedded: Lines | None,
    real: Lines,
    window_per_cm: tuple[float, float],
    *,
    smooth: SmoothCrossSection | None = None,
    resolving_powers: Sequence[float] = (100.0, 1000.0),
    mixing_ratios: Sequence[float] = MARKS.mixing_ratios,
    temperature_k: float = _REFERENCE_TEMPERATURE_K,
    like_with_like: bool = True,
    same_cut: bool = False,
) -> WindowScore:
    """Score an embedded list (lines, a smooth cross-section, or both) against real lines.

    Parameters
    ----------
    embedded : Lines or None
        Embedded lines; ``None`` for a list that is smooth throughout.
    real : Lines
        Lines of a published list that are complete in the window.
    window_per_cm : (float, float)
        Where to compare, ascending.
    smooth : callable, optional
        Smooth part of the embedded list.
    resolving_powers, mixing_ratios : sequences of float
        Bin widths and mixing ratios to score.
    temperature_k : float
        Temperature of the atmosphere; the scale height goes with it.
    like_with_like : bool
        Leave out embedded lines of isotopologues, or beyond the stretch, that the real list does not hold.
    same_cut : bool
        Also leave out embedded lines weaker than the weakest real one.
    """
    if embedded is not None and like_with_like:
        embedded = alike(embedded, real, same_cut=same_cut)
    ours, theirs = (
        height_spectrum(lines, *window_per_cm, mixing_ratios, smooth=part, temperature_k=temperature_k)
        for lines, part in ((embedded, smooth), (real, None))
    )
    shape = (len(resolving_powers), len(mixing_ratios))
    bins, (p90, median, mean) = np.zeros(shape, dtype=np.int64), np.full((3, *shape), np.nan)
    for row, power in enumerate(resolving_powers):
        expected = _bin_means(theirs, window_per_cm, power)
        difference = _bin_means(ours, window_per_cm, power) - expected
        for column in range(len(mixing_ratios)):
            seen = difference[column, expected[column] > _VISIBLE]
            bins[row, column] = seen.size
            if seen.size:
                p90[row, column] = np.percentile(np.abs(seen), 90.0)
                median[row, column] = np.median(np.abs(seen))
                mean[row, column] = np.mean(seen)
    return WindowScore(
        window_per_cm=window_per_cm,
        resolving_powers=tuple(resolving_powers),
        mixing_ratios=tuple(mixing_ratios),
        bins=bins,
        percentile_90=p90,
        median=median,
        mean=mean,
    )


def alike(embedded: Lines, real: Lines, *, same_cut: bool = False) -> Lines:
    """The embedded lines that the real list could hold: its isotopologues, stretch and, on request, cut-off."""
    keep = np.isin(embedded.isotopologue, np.unique(real.isotopologue))
    keep &= embedded.wavenumber_per_cm >= real.wavenumber_per_cm[0] - _STEP_PER_CM
    keep &= embedded.wavenumber_per_cm <= real.wavenumber_per_cm[-1] + _STEP_PER_CM
    if same_cut:
        keep &= embedded.intensity_cm >= real.intensity_cm.min()
    return embedded.where(keep)


def effective_heights(
    lines: Lines | None,
    from_per_cm: float,
    to_per_cm: float,
    resolving_power: float,
    mixing_ratios: Sequence[float],
    *,
    smooth: SmoothCrossSection | None = None,
    temperature_k: float = _REFERENCE_TEMPERATURE_K,
) -> Floats:
    """Mean effective height per bin, in scale heights, shape ``(mixing ratio, bin)``.

    The bins tile the window evenly in ln(wavenumber) at the resolving power nearest to the one asked for that
    fits a whole number of times, at least once.
    """
    heights = height_spectrum(lines, from_per_cm, to_per_cm, mixing_ratios, smooth=smooth, temperature_k=temperature_k)
    return _bin_means(heights, (from_per_cm, to_per_cm), resolving_power)


def height_spectrum(
    lines: Lines | None,
    from_per_cm: float,
    to_per_cm: float,
    mixing_ratios: Sequence[float],
    *,
    smooth: SmoothCrossSection | None = None,
    temperature_k: float = _REFERENCE_TEMPERATURE_K,
) -> Floats:
    """Effective height in scale heights on an even grid of the window, shape ``(mixing ratio, wavenumber)``.

    ``h = integral (1 - exp(-tau(z))) dz`` over tangent heights from the surface up, tau along the straight
    chord (e.g. Brown 2001, ApJ 553, 1006). The step is at most 0.005 cm-1; cross-sections at 17 pressures from
    1e-8 to 1 bar are interpolated in log-log and held constant above, where every line is Doppler-limited.
    """
    count = int(np.ceil((to_per_cm - from_per_cm) / _STEP_PER_CM)) + 1
    wavenumber = np.linspace(from_per_cm, to_per_cm, count)
    pieces = np.array_split(wavenumber, max(1, round((to_per_cm - from_per_cm) / _CHUNK_PER_CM)))
    columns = _chord_columns(temperature_k)
    heights = []
    for piece in pieces:
        sigma = _cross_sections_at_levels(lines, smooth, piece, temperature_k)
        depth = columns @ sigma
        heights.append(np.stack([_effective_height(ratio * depth) for ratio in mixing_ratios]))
    return np.concatenate(heights, axis=1)


def _cross_sections_at_levels(
    lines: Lines | None, smooth: SmoothCrossSection | None, wavenumber_per_cm: Floats, temperature_k: float
) -> Floats:
    """Cross-section in cm2 at every level, shape ``(level, wavenumber)``."""
    table = np.zeros((_PRESSURES_BAR.size, wavenumber_per_cm.size))
    if lines is not None and len(lines):
        table += cross_sections(lines, wavenumber_per_cm, temperature_k=temperature_k, pressures_bar=_PRESSURES_BAR)
    if smooth is not None:
        table += smooth(wavenumber_per_cm, temperature_k)
    table = np.log(np.maximum(table, 1e-60))
    position = np.interp(-_LEVELS, np.log(_PRESSURES_BAR), np.arange(_PRESSURES_BAR.size))
    below = np.minimum(position.astype(np.int64), _PRESSURES_BAR.size - 2)
    share = (position - below)[:, np.newaxis]
    return np.exp((1.0 - share) * table[below] + share * table[below + 1])


def _slashed(values: NDArray[Any], form: str) -> str:
    return "/".join("-" if np.isnan(value) else format(value, form) for value in values)


def _chord_columns(temperature_k: float) -> Floats:
    """Weights (molecules per cm2 of air) from cross-sections at levels to chord optical depths at levels.

    The chord length up to a level is exact; density times cross-section is taken linear in height between
    levels, and height quadratic in length.
    """
    scale_height = _REFERENCE_SCALE_HEIGHT_CM * temperature_k / _REFERENCE_TEMPERATURE_K
    radius = _PLANET_RADIUS_CM + scale_height * _LEVELS
    surface_density = 1.0e6 / (BOLTZMANN_ERG_PER_K * temperature_k)
    length = np.sqrt(np.maximum(radius[np.newaxis, :] ** 2 - radius[:, np.newaxis] ** 2, 0.0))
    near, far = length[:, :-1], length[:, 1:]
    with np.errstate(invalid="ignore"):
        upper_share = np.where(far > 0, (far + 2.0 * near) / (3.0 * (near + far)), 0.0)
    weights = np.zeros_like(length)
    weights[:, :-1] += 2.0 * (far - near) * (1.0 - upper_share)
    weights[:, 1:] += 2.0 * (far - near) * upper_share
    return weights * surface_density * np.exp(-_LEVELS)


def _effective_height(depth: Floats) -> Floats:
    opaque = -np.expm1(-depth)
    step = _LEVELS[1] - _LEVELS[0]
    return np.asarray(step * (opaque.sum(axis=0) - 0.5 * (opaque[0] + opaque[-1])), dtype=np.float64)


def _bin_means(heights: Floats, window_per_cm: tuple[float, float], resolving_power: float) -> Floats:
    """Mean over bins of equal width in ln(wavenumber), shape ``(mixing ratio, bin)``."""
    low, high = window_per_cm
    count = max(1, round(np.log(high / low) * resolving_power))
    edges = np.geomspace(low, high, count + 1)
    starts = np.searchsorted(np.linspace(low, high, heights.shape[1]), edges[:-1])
    sizes = np.diff(np.append(starts, heights.shape[1]))
    return np.asarray(np.add.reduceat(heights, starts, axis=1) / sizes, dtype=np.float64)
