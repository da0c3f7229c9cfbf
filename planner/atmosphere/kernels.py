"""Compiled loops of the transit depth, over a block of neighbouring wavenumbers.

Inner loops run over the wavenumbers of the block in single precision, so that the compiler turns them into vector
instructions; a block's arrays stay in the caches. Both kernels release the interpreter lock: the caller spreads
blocks over threads, which compiles far faster than loops made parallel by the compiler.

``contract`` allows fused multiply-add and nothing else: no result depends on reordering.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit, types

__all__ = ["exp2_single", "integrate_chords", "slant_depths"]

_matrix = types.Array(types.float32, 2, "C", readonly=True)
_counts = types.Array(types.int64, 1, "C", readonly=True)
_options = {"nogil": True, "cache": True, "fastmath": {"contract"}, "error_model": "numpy"}

_LOG2_OF_10 = np.float32(math.log2(10.0))
_LOG2_OF_E = np.float32(math.log2(math.e))
_TAYLOR = tuple(np.float32(math.log(2.0) ** n / math.factorial(n)) for n in range(7))
_ROUNDER = np.float32(1.5 * 2**23)
_BITS_OF_ONE = 127 << 23
_LEAST = np.float32(-126.0)
_MOST = np.float32(126.0)
_ONE = np.float32(1.0)
_ZERO = np.float32(0.0)


@njit(types.float32(types.float32), inline="always", **_options)
def exp2_single(x):  # type: ignore[no-untyped-def]
    """2 to the power x, for x clamped to -126..126; relative error under 3e-7 (Taylor about the nearest integer)."""
    x = min(max(x, _LEAST), _MOST)
    shifted = np.float32(x + _ROUNDER)  # the last bits of the sum hold the nearest integer
    f = x - (shifted - _ROUNDER)
    series = _TAYLOR[6]
    series = series * f + _TAYLOR[5]
    series = series * f + _TAYLOR[4]
    series = series * f + _TAYLOR[3]
    series = series * f + _TAYLOR[2]
    series = series * f + _TAYLOR[1]
    series = series * f + _TAYLOR[0]
    power = np.int32((shifted.view(np.int32) << 23) + _BITS_OF_ONE)
    return series * power.view(np.float32)


@njit(
    types.void(_matrix, types.int64, types.int64, _matrix, _counts, types.float32[:, ::1], types.float32[:, ::1]),
    **_options,
)
def slant_depths(log10_cross_section, start, count, weights, rows_seen, cross_section, depths):  # type: ignore[no-untyped-def]
    """Add one gas's chord optical depths in a block of wavenumbers.

    log10_cross_section (pressure, wavenumber); the block is ``start`` to ``start + count``.
    weights (chord, pressure) from `row_weights` times the mixing ratio, padded with zeros to a multiple of four rows.
    rows_seen (chord,): rows with a weight, rounded up to a multiple of four; the first chord sees most.
    cross_section (padded pressure, block): scratch of finite numbers. depths (chord, block): added to.
    """
    for row in range(min(log10_cross_section.shape[0], rows_seen[0])):
        source, target = log10_cross_section[row, start : start + count], cross_section[row]
        for k in range(count):
            target[k] = exp2_single(source[k] * _LOG2_OF_10)
    for chord in range(weights.shape[0]):
        weight, depth = weights[chord], depths[chord]
        for row in range(0, rows_seen[chord], 4):
            w0, w1, w2, w3 = weight[row], weight[row + 1], weight[row + 2], weight[row + 3]
            s0, s1 = cross_section[row], cross_section[row + 1]
            s2, s3 = cross_section[row + 2], cross_section[row + 3]
            for k in range(count):
                depth[k] += w0 * s0[k] + w1 * s1[k] + w2 * s2[k] + w3 * s3[k]


@njit(
    types.void(
        types.float32[:, :, ::1],
        _matrix,
        _matrix,
        _matrix,
        types.int64,
        types.int64,
        types.float32[:, ::1],
        types.float64[:, ::1],
    ),
    **_options,
)
def integrate_chords(depths, smooth, pairs, chords, start, count, sums, result):  # type: ignore[no-untyped-def]
    """Effective area, what each gas takes from the light, and slopes, from one pass over the chords of a block.

    With S gases whose shares are asked for (all optical depths referred to the chord at the bottom):

    depths (1 + S, chord, block): tabulated absorption of all other gases together, then of each of the S.
    smooth (1 + S, wavenumber): optical depth of what grows with the column, likewise.
    pairs (1 + 2 S, wavenumber): of what grows with the squared density: everything; without each of the S; the
    derivative with respect to the logarithm of each mixing ratio.
    chords (3, chord): column and squared column relative to the bottom, area weight in km2.
    sums (4 + 2 S, block): scratch. result (2 + 2 S, wavenumber): area in km2 above the opaque part; light left
    at the bottom; S areas lost without the gas; S derivatives of the area.
    """
    shares = depths.shape[0] - 1
    total, other = sums[2 + 2 * shares], sums[3 + 2 * shares]
    block = slice(start, start + count)
    for row in range(2 + 2 * shares):
        summed = sums[row]
        for k in range(count):
            summed[k] = _ZERO
    for chord in range(depths.shape[1]):
        column, squared, area = chords[0, chord], chords[1, chord], chords[2, chord]
        pair = pairs[0, block]
        for k in range(count):
            total[k] = squared * pair[k]
        for gas in range(shares + 1):
            own, smooth_own = depths[gas, chord], smooth[gas, block]
            for k in range(count):
                # four-row interpolation may undershoot zero where a table jumps
                own[k] = max(own[k], _ZERO) + column * smooth_own[k]
                total[k] += own[k]
        summed = sums[0]
        for k in range(count):
            total[k] = exp2_single(-total[k] * _LOG2_OF_E)
            summed[k] += area * (_ONE - total[k])
        if chord == 0:
            summed = sums[1]
            for k in range(count):
                summed[k] = total[k]
        for gas in range(1, shares + 1):
            summed, own, pair = sums[1 + shares + gas], depths[gas, chord], pairs[shares + gas, block]
            for k in range(count):
                summed[k] += area * total[k] * (own[k] + squared * pair[k])
            # the others are summed anew: taking this gas from the total would cancel where it dominates
            pair = pairs[gas, block]
            for k in range(count):
                other[k] = squared * pair[k]
            for also in range(shares + 1):
                if also != gas:
                    own = depths[also, chord]
                    for k in range(count):
                        other[k] += own[k]
            summed = sums[1 + gas]
            for k in range(count):
                summed[k] += area * (exp2_single(-other[k] * _LOG2_OF_E) - total[k])
    for row in range(2 + 2 * shares):
        summed, target = sums[row], result[row, block]
        for k in range(count):
            target[k] = summed[k]
