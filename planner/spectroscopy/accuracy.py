"""How well an embedded list stands in for a real one, measured by what a transit would show.

The figure of merit is the effective height of `planner.spectroscopy.heights`, averaged in spectral bins and compared
in scale heights, because that is the size of the error a plan would inherit. A difference of 0.3 means a factor 1.35
in the intensity of weak lines, or 1.8 in intensity times width of strong ones.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.heights import (
    ATMOSPHERE_TEMPERATURE_K,
    SmoothCrossSection,
    bin_means,
    grey_heights,
    height_spectrum,
)
from planner.spectroscopy.lines import Lines

__all__ = [
    "MARKS",
    "STRONG_MARKS",
    "Marks",
    "WindowScore",
    "alike",
    "compare",
    "compare_cross_sections",
]

Floats = NDArray[np.float64]

_VISIBLE = 0.5
"""Bins where the real list stays lower than this (in scale heights) are not judged: nothing shows there."""
_SHIFT_PER_CM = 0.005
"""What a line may lie beyond the last real one and still be in the same stretch."""
_ABOVE_NOISE = 5.0
"""Bins whose measured mean is not this many times the noise are not judged either."""


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

STRONG_MARKS = Marks(
    mixing_ratios=(1e-9, 1e-6, 1e-4),
    percentile_90=(0.20, 0.20, 0.25),
    median=(0.10, 0.10, 0.15),
    mean=0.15,
)
"""The same for gases that absorb so strongly that parts per billion show: the mark of 1e-6 serves below it too."""


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
    temperature_k: float = ATMOSPHERE_TEMPERATURE_K,
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
    theirs = height_spectrum(real, *window_per_cm, mixing_ratios, temperature_k=temperature_k)
    ours = theirs
    if np.any(theirs > _VISIBLE):
        ours = height_spectrum(embedded, *window_per_cm, mixing_ratios, smooth=smooth, temperature_k=temperature_k)
    return _score(ours, theirs, window_per_cm, resolving_powers, mixing_ratios)


def compare_cross_sections(
    embedded_cm2: Floats,
    real_cm2: Floats,
    window_per_cm: tuple[float, float],
    *,
    noise_cm2: float = 0.0,
    resolving_powers: Sequence[float] = (100.0, 1000.0),
    mixing_ratios: Sequence[float] = STRONG_MARKS.mixing_ratios,
    temperature_k: float = ATMOSPHERE_TEMPERATURE_K,
) -> WindowScore:
    """Score an embedded cross-section against a measured one, both taken to be the same at every pressure.

    Parameters
    ----------
    embedded_cm2, real_cm2 : (wavenumber,) arrays
        0 or more, on the same even grid of the window, ends included.
    window_per_cm : (float, float)
        Ascending.
    noise_cm2 : float
        Bins where the mean of the measured values does not exceed five times this are not judged.
    resolving_powers, mixing_ratios, temperature_k
        As in `compare`.
    """
    ours = grey_heights(embedded_cm2, mixing_ratios, temperature_k=temperature_k)
    theirs = grey_heights(real_cm2, mixing_ratios, temperature_k=temperature_k)
    least = _ABOVE_NOISE * noise_cm2
    return _score(ours, theirs, window_per_cm, resolving_powers, mixing_ratios, signal=real_cm2, least=least)


def _score(
    ours: Floats,
    theirs: Floats,
    window_per_cm: tuple[float, float],
    resolving_powers: Sequence[float],
    mixing_ratios: Sequence[float],
    *,
    signal: Floats | None = None,
    least: float = 0.0,
) -> WindowScore:
    """Differences of heights, shape ``(mixing ratio, wavenumber)``, over the bins that show and whose signal counts."""
    shape = (len(resolving_powers), len(mixing_ratios))
    bins, (p90, median, mean) = np.zeros(shape, dtype=np.int64), np.full((3, *shape), np.nan)
    for row, power in enumerate(resolving_powers):
        expected = bin_means(theirs, window_per_cm, power)
        difference = bin_means(ours, window_per_cm, power) - expected
        counts = True if signal is None else bin_means(signal, window_per_cm, power) > least
        for column in range(len(mixing_ratios)):
            seen = difference[column, (expected[column] > _VISIBLE) & counts]
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
    keep &= embedded.wavenumber_per_cm >= real.wavenumber_per_cm[0] - _SHIFT_PER_CM
    keep &= embedded.wavenumber_per_cm <= real.wavenumber_per_cm[-1] + _SHIFT_PER_CM
    if same_cut:
        keep &= embedded.intensity_cm >= real.intensity_cm.min()
    return embedded.where(keep)


def _slashed(values: NDArray[Any], form: str) -> str:
    return "/".join("-" if np.isnan(value) else format(value, form) for value in values)
