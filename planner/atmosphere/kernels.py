"""Compiled loops of the transit depth, over a block of neighbouring wavenumbers.

Inner loops run over the wavenumbers of the block in single precision, so that the compiler turns them into vector
instructions; a block's arrays stay in the caches. All kernels release the interpreter lock: the caller spreads
blocks over threads, which compiles far faster than loops made parallel by the compiler. For the same reason there are
few loops, elements are named by all their indices and no slice is assigned to: each of these costs compiling time.

``contract`` allows fused multiply-add and nothing else: no result depends on reordering.
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit, types

__all__ = ["exp2_in_place", "integrate_chords", "slant_depths"]

_vector = types.float32[::1]
_matrix = types.float32[:, ::1]
_options = {"nogil": True, "cache": True, "fastmath": {"contract"}, "error_model": "numpy"}

_MINUS_LOG2_OF_E = np.float32(-math.log2(math.e))
_T0, _T1, _T2, _T3, _T4, _T5, _T6 = (np.float32(math.log(2.0) ** n / math.factorial(n)) for n in range(7))
_ROUNDER = np.float32(1.5 * 2**23)
_BITS_OF_ONE = 127 << 23
_LEAST = np.float32(-126.0)
_MOST = np.float32(126.0)
_ONE = np.float32(1.0)
_ZERO = np.float32(0.0)


@njit(types.void(_vector, types.float32), **_options)
def exp2_in_place(values, scale):  # type: ignore[no-untyped-def]
    """Every value x becomes 2 to the power ``scale * x``, clamped to -126..126.

    The relative error is under 3e-7 (Taylor about the nearest integer).
    """
    for k in range(values.size):
        x = values[k] * scale
        x = _LEAST if x < _LEAST else (_MOST if x > _MOST else x)
        shifted = np.float32(x + _ROUNDER)  # the last bits of the sum hold the nearest integer
        f = x - (shifted - _ROUNDER)
        series = (((((_T6 * f + _T5) * f + _T4) * f + _T3) * f + _T2) * f + _T1) * f + _T0
        power = np.int32((shifted.view(np.int32) << 23) + _BITS_OF_ONE)
        values[k] = series * power.view(np.float32)


@njit(types.void(_matrix, _matrix, types.int64[::1], _matrix), **_options)
def slant_depths(cross_section, weights, rows_seen, depths):  # type: ignore[no-untyped-def]
    """Add one gas's chord optical depths in a block of wavenumbers.

    cross_section (padded pressure, block): any finite numbers in the padding.
    weights (chord, padded pressure) from `row_weights` times the mixing ratio, padded with zeros to a multiple of four
    rows. rows_seen (chord,): rows with a weight, rounded up to a multiple of four. depths (chord, block): added to.
    """
    for chord in range(weights.shape[0]):
        for row in range(0, rows_seen[chord], 4):
            w0, w1 = weights[chord, row], weights[chord, row + 1]
            w2, w3 = weights[chord, row + 2], weights[chord, row + 3]
            for k in range(depths.shape[1]):
                upper = w0 * cross_section[row, k] + w1 * cross_section[row + 1, k]
                depths[chord, k] += upper + w2 * cross_section[row + 2, k] + w3 * cross_section[row + 3, k]


@njit(types.void(types.float32[:, :, ::1], _matrix, _matrix, _matrix, _matrix, _matrix), **_options)
def integrate_chords(depths, smooth, pairs, chords, light, sums):  # type: ignore[no-untyped-def]
    """Effective area, what each gas takes from the light, and slopes, from one pass over the chords of a block.

    With S gases whose shares are asked for (all optical depths referred to the chord at the bottom):

    depths (1 + S, chord, block): tabulated absorption of all other gases together, then of each of the S; changed.
    smooth (1 + S, block): optical depth of what grows with the column, likewise.
    pairs (1 + 2 S, block): of what grows with the squared density: everything; without each of the S; the
    derivative with respect to the logarithm of each mixing ratio.
    chords (3, chord): column and squared column relative to the bottom, area weight in km2.
    light (1 + S, block): scratch.
    sums (2 + 2 S, block): added to, area in km2 above the opaque part; light left at the bottom; S areas lost without
    the gas; S derivatives of the area.
    """
    parts, size = depths.shape[0], depths.shape[2]
    for chord in range(depths.shape[1]):
        column, squared, area = chords[0, chord], chords[1, chord], chords[2, chord]
        for gas in range(parts):
            for k in range(size):
                # four-row interpolation may undershoot zero where a table jumps
                depths[gas, chord, k] = max(depths[gas, chord, k], _ZERO) + column * smooth[gas, k]
        # light that is left with all gases, and without each of the S: summed anew every time, since taking a gas
        # from the total would cancel where it dominates
        for without in range(parts):
            for k in range(size):
                light[without, k] = squared * pairs[without, k]
            for gas in range(parts):
                if gas != without or gas == 0:
                    for k in range(size):
                        light[without, k] += depths[gas, chord, k]
            exp2_in_place(light[without], _MINUS_LOG2_OF_E)
        for k in range(size):
            sums[0, k] += area * (_ONE - light[0, k])
        if chord == 0:
            for k in range(size):
                sums[1, k] += light[0, k]
        for gas in range(1, parts):
            for k in range(size):
                sums[1 + gas, k] += area * (light[gas, k] - light[0, k])
                own = depths[gas, chord, k] + squared * pairs[parts - 1 + gas, k]
                sums[parts + gas, k] += area * light[0, k] * own
