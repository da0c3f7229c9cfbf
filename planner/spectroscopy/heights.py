"""Effective heights of an isothermal atmosphere with one gas as its only absorber.

The atmosphere is N2 of 250 K over a surface at 1 bar, scale height 9 km, planet radius 5870 km. Heights are what a
transit shows; they come in scale heights.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.crosssections import cross_sections
from planner.spectroscopy.lines import Lines

__all__ = [
    "ATMOSPHERE_TEMPERATURE_K",
    "SmoothCrossSection",
    "bin_edges",
    "bin_means",
    "effective_heights",
    "grey_heights",
    "height_spectrum",
]

Floats = NDArray[np.float64]
SmoothCrossSection = Callable[[Floats, float], Floats]
"""Smooth part of a list: (wavenumber_per_cm, temperature_k) -> cm2, the same at every pressure."""

BOLTZMANN_ERG_PER_K = 1.380649e-16
"""SI Brochure, 9th edition (2019), exact."""

ATMOSPHERE_TEMPERATURE_K = 250.0
_SCALE_HEIGHT_CM = 9.0e5
_PLANET_RADIUS_CM = 5.870e8
_PRESSURES_BAR = np.logspace(-8.0, 0.0, 17)
_STEP_PER_CM = 0.005
_CHUNK_PER_CM = 100.0
_LEVELS = np.arange(0.0, 26.01, 0.25)
"""Heights in scale heights; the line cores of an abundant gas are opaque up to about 23."""
_LEAST_CM2 = 1e-37
"""Cross-sections below this absorb nothing; the smallest that a 32-bit number holds in full."""


def effective_heights(
    lines: Lines | None,
    from_per_cm: float,
    to_per_cm: float,
    resolving_power: float,
    mixing_ratios: Sequence[float],
    *,
    smooth: SmoothCrossSection | None = None,
    temperature_k: float = ATMOSPHERE_TEMPERATURE_K,
) -> Floats:
    """Mean effective height per bin, in scale heights, shape ``(mixing ratio, bin)``.

    The bins tile the window evenly in ln(wavenumber) at the resolving power nearest to the one asked for that
    fits a whole number of times, at least once.
    """
    heights = height_spectrum(lines, from_per_cm, to_per_cm, mixing_ratios, smooth=smooth, temperature_k=temperature_k)
    return bin_means(heights, (from_per_cm, to_per_cm), resolving_power)


def height_spectrum(
    lines: Lines | None,
    from_per_cm: float,
    to_per_cm: float,
    mixing_ratios: Sequence[float],
    *,
    smooth: SmoothCrossSection | None = None,
    temperature_k: float = ATMOSPHERE_TEMPERATURE_K,
) -> Floats:
    """Effective height in scale heights on an even grid of the window, shape ``(mixing ratio, wavenumber)``.

    ``h = integral (1 - exp(-tau(z))) dz`` over tangent heights from the surface up, tau along the straight
    chord (e.g. Brown 2001, ApJ 553, 1006). The step is at most 0.005 cm-1; cross-sections at 17 pressures from
    1e-8 to 1 bar are interpolated in log-log and held constant above, where every line is Doppler-limited.

    The exponentials are taken in 32-bit numbers, which moves a height by 2e-5 and takes a third of the time.
    """
    count = int(np.ceil((to_per_cm - from_per_cm) / _STEP_PER_CM)) + 1
    wavenumber = np.linspace(from_per_cm, to_per_cm, count)
    pieces = np.array_split(wavenumber, max(1, round((to_per_cm - from_per_cm) / _CHUNK_PER_CM)))
    columns = _chord_columns(temperature_k).astype(np.float32)
    heights = []
    for piece in pieces:
        depth = columns @ _cross_sections_at_levels(lines, smooth, piece, temperature_k)
        heights.append(np.stack([_effective_height(depth, ratio) for ratio in mixing_ratios]))
    return np.concatenate(heights, axis=1)


def grey_heights(
    cross_section_cm2: Floats, mixing_ratios: Sequence[float], *, temperature_k: float = ATMOSPHERE_TEMPERATURE_K
) -> Floats:
    """Effective height in scale heights where the cross-section is the same at every pressure.

    Parameters
    ----------
    cross_section_cm2 : (wavenumber,) array
        0 or more.
    mixing_ratios : sequence of float
    temperature_k : float
        Temperature of the atmosphere; the scale height goes with it.

    Returns
    -------
    (mixing ratio, wavenumber) array
    """
    columns = _chord_columns(temperature_k).sum(axis=1)
    sigma = cross_section_cm2.astype(np.float32)
    return np.stack([_effective_height(columns.astype(np.float32)[:, np.newaxis] * sigma, x) for x in mixing_ratios])


def bin_edges(window_per_cm: tuple[float, float], resolving_power: float) -> Floats:
    """Edges of the bins that tile a window evenly in ln(wavenumber), at least one bin."""
    low, high = window_per_cm
    return np.geomspace(low, high, max(1, round(np.log(high / low) * resolving_power)) + 1)


def bin_means(values: Floats, window_per_cm: tuple[float, float], resolving_power: float) -> Floats:
    """Means of values on an even grid of the window over the bins of `bin_edges`, shape ``(..., bin)``."""
    edges = bin_edges(window_per_cm, resolving_power)
    count = values.shape[-1]
    starts = np.searchsorted(np.linspace(*window_per_cm, count), edges[:-1])
    sizes = np.diff(np.append(starts, count))
    return np.asarray(np.add.reduceat(values, starts, axis=-1) / sizes, dtype=np.float64)


def _cross_sections_at_levels(
    lines: Lines | None, smooth: SmoothCrossSection | None, wavenumber_per_cm: Floats, temperature_k: float
) -> NDArray[np.float32]:
    """Cross-section in cm2 at every level, shape ``(level, wavenumber)``."""
    table = np.zeros((_PRESSURES_BAR.size, wavenumber_per_cm.size))
    if lines is not None and len(lines):
        table += cross_sections(lines, wavenumber_per_cm, temperature_k=temperature_k, pressures_bar=_PRESSURES_BAR)
    if smooth is not None:
        table += smooth(wavenumber_per_cm, temperature_k)
    logarithm = np.log(np.maximum(table, _LEAST_CM2)).astype(np.float32)
    position = np.interp(-_LEVELS, np.log(_PRESSURES_BAR), np.arange(_PRESSURES_BAR.size))
    below = np.minimum(position.astype(np.int64), _PRESSURES_BAR.size - 2)
    share = (position - below).astype(np.float32)[:, np.newaxis]
    at_levels = logarithm[below]
    at_levels += share * (logarithm[below + 1] - at_levels)
    return np.exp(at_levels, out=at_levels)


def _chord_columns(temperature_k: float) -> Floats:
    """Weights (molecules per cm2 of air) from cross-sections at levels to chord optical depths at levels.

    The chord length up to a level is exact; density times cross-section is taken linear in height between
    levels, and height quadratic in length.
    """
    scale_height = _SCALE_HEIGHT_CM * temperature_k / ATMOSPHERE_TEMPERATURE_K
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


def _effective_height(depth: NDArray[np.float32], mixing_ratio: float) -> Floats:
    """Heights from the optical depths of the pure gas at every level, shape ``(wavenumber,)``."""
    clear = np.exp(depth * np.float32(-mixing_ratio))
    lost = clear.sum(axis=0, dtype=np.float64) - 0.5 * (clear[0] + clear[-1])
    return np.asarray((_LEVELS[1] - _LEVELS[0]) * (_LEVELS.size - 1 - lost), dtype=np.float64)
