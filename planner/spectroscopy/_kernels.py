"""Compiled code: the Voigt function, and the loop over lines behind `planner.spectroscopy.crosssections`.

Imported only when there is work to do: the import compiles, or loads what was compiled. All of it stands in one file,
since a kept compilation is given up only when the file of its outermost function changes. A first run waits for it:
hence arrays come from outside, elements are named by all their indices, and what has one caller is written into it.
"""

from __future__ import annotations

import math
import warnings

import numba
import numpy as np

__all__ = ["CUT_TERMS", "NEAR", "TERMS", "add_lines", "add_wings", "voigt_function"]

ASYMPTOTE_FROM = 15.0
"""|x + iy| from which the first convergent holds to 6e-5."""

SECOND_FROM = 6.0
"""|x| + y from which the second convergent holds to 3e-5."""

TERMS = 10
"""Powers of the inverse distance that stand for the lines of a cell, from the second power."""

NEAR = 2
"""Neighbours on either side of a line's own cell in which it is summed point by point."""

CUT_TERMS = 5
"""The same for the cells in which wings end, which are far away."""

_ONE_OVER_SQRT_PI = 1.0 / math.sqrt(math.pi)
# Fused multiplication and addition, nothing else: no rule that could lead a quotient or a NaN astray.
_OPTIONS = {"nogil": True, "error_model": "numpy", "fastmath": {"contract"}}
_WRITTEN_IN = {"inline": "always", **_OPTIONS}


@numba.njit(**_OPTIONS)
def first_convergent(x, y):  # type: ignore[no-untyped-def]  # numba infers the types
    """Real part of ``t / (sqrt(pi) * (1/2 + t**2))`` with ``t = y - ix``."""
    x2, y2 = x * x, y * y
    half = 0.5 + y2
    return _ONE_OVER_SQRT_PI * y * (x2 + half) / (x2 * (x2 + 2.0 * y2 - 1.0) + half * half)


@numba.njit(**_OPTIONS)
def second_convergent(x, y):  # type: ignore[no-untyped-def]
    """Real part of ``t * (5/2 + t**2) / (sqrt(pi) * (3/4 + 3 t**2 + t**4))`` with ``t = y - ix``."""
    real, imag = y * y - x * x, -2.0 * x * y  # t**2
    top_real = y * (2.5 + real) + x * imag
    top_imag = y * imag - x * (2.5 + real)
    low_real = 0.75 + 3.0 * real + real * real - imag * imag
    low_imag = 3.0 * imag + 2.0 * real * imag
    return _ONE_OVER_SQRT_PI * (top_real * low_real + top_imag * low_imag) / (low_real * low_real + low_imag * low_imag)


# Numerators and denominators of Humlicek's regions III (in powers of t) and IV (of -t**2), highest power first.
_HUMLICEK = np.array(
    [
        [0.0, 0.0, 0.0, 0.5642236, 3.778987, 11.96482, 20.20933, 16.4955],
        [0.0, 0.0, 1.0, 6.699398, 21.69274, 39.27121, 38.82363, 16.4955],
        [0.0, 0.56419, 1.320522, 35.76683, 219.0313, 1540.787, 3321.9905, 36183.31],
        [1.0, 1.841439, 61.57037, 364.2191, 2186.181, 9022.228, 24322.84, 32066.6],
    ]
)


@numba.njit(**_OPTIONS)
def inner_voigt(x, y):  # type: ignore[no-untyped-def]
    """K inside ``|x| + y < 6``: regions III and IV of Humlicek 1982."""
    near_axis = y < 0.195 * abs(x) - 0.176
    real, imag, row = (x * x - y * y, 2.0 * x * y, 2) if near_axis else (y, -x, 0)
    # division by the quadratic z**2 - 2 real z + |z|**2: half the work of Horner's rule in complex numbers
    twice, square = 2.0 * real, real * real + imag * imag
    a = b = c = d = 0.0
    for k in range(8):
        a, b = _HUMLICEK[row, k] + twice * a - square * b, a
        c, d = _HUMLICEK[row + 1, k] + twice * c - square * d, c
    a, b, c, d = a - real * b, imag * b, c - real * d, imag * d
    if near_axis:
        a, b = a * y + b * x, b * y - a * x  # times t
        return math.exp(-real) * math.cos(imag) - (a * c + b * d) / (c * c + d * d)
    return (a * c + b * d) / (c * c + d * d)


@numba.njit(**_OPTIONS)
def voigt_function(x, y):  # type: ignore[no-untyped-def]
    """K(x, y) of two numbers, y >= 0; to be called from compiled code."""
    if x * x + y * y >= ASYMPTOTE_FROM * ASYMPTOTE_FROM:
        return first_convergent(x, y)
    if abs(x) + y >= SECOND_FROM:
        return second_convergent(x, y)
    return inner_voigt(x, y)


@numba.njit(**_OPTIONS)
def _first_from(values, low, high, threshold, per_step):  # type: ignore[no-untyped-def]
    """First index in [low, high) whose value is not below the threshold; high if there is none.

    A guess as if the values rose by ``1 / per_step`` each, then single steps.
    """
    if low >= high:
        return high
    ahead = (threshold - values[low]) * per_step
    guess = high if ahead >= high - low else (low + math.floor(ahead) if ahead > 0.0 else low)
    while guess > low and values[guess - 1] >= threshold:
        guess -= 1
    while guess < high and values[guess] < threshold:
        guess += 1
    return guess


@numba.njit(**_WRITTEN_IN)
def _add_line(sums, points, start, stop, per_step, line, wing, taken_off):  # type: ignore[no-untyped-def]
    """Add a line on some points: by the second convergent as far as it holds, and point by point within."""
    centre, strength, doppler, width = line
    per_doppler = 1.0 / doppler
    y = width * per_doppler
    peak = strength * per_doppler * _ONE_OVER_SQRT_PI
    inside = min(max(SECOND_FROM - y, 0.0) * doppler, wing)
    # both sides of the quotient as polynomials in x**2
    a = y * y
    top = _ONE_OVER_SQRT_PI * peak * y
    top2, top1, top0 = 3.0 * a - 4.5, (3.0 * a + 1.0) * a + 5.25, ((a + 5.5) * a + 8.25) * a + 1.875
    low3, low2, low1 = 4.0 * a - 6.0, (6.0 * a - 6.0) * a + 10.5, ((4.0 * a + 6.0) * a + 9.0) * a - 4.5
    low0 = ((a + 3.0) * a + 0.75) ** 2
    # an index without sign spares the compiler a test for negative ones, which would keep it from vectors
    for j in range(np.uint64(start), np.uint64(stop)):
        distance = abs(points[j] - centre)
        s = (distance * per_doppler) ** 2
        value = top * (((s + top2) * s + top1) * s + top0) / ((((s + low3) * s + low2) * s + low1) * s + low0)
        outside = value if distance >= inside else 0.0
        sums[j] += outside - taken_off if distance <= wing else 0.0
    if inside > 0.0:
        j = _first_from(points, start, stop, centre - 1.001 * inside, per_step)
        while j < stop and points[j] - centre < inside:
            if centre - points[j] < inside:
                sums[j] += peak * inner_voigt((points[j] - centre) * per_doppler, y)
            j += 1


def _add_lines(points, sums, cell_start, first_edge, cell_width, lines, wing, moments, ends, own):  # type: ignore[no-untyped-def]
    """Add lines at one pressure to the sums on the points of one stretch of the grid.

    Parameters
    ----------
    points, sums : (point,) float64
        Places, ascending, and what is added to.
    cell_start : (cell + 1,) int64
        Cell c covers ``first_edge + [c, c + 1) * cell_width`` and the points ``cell_start[c]:cell_start[c + 1]``.
    first_edge, cell_width : float
    lines : (5, line) float64
        Shifted centre, intensity, Doppler 1/e half width, Lorentz half width, value to be taken off.
    wing : float
        Distance from the centre at which a line ends.
    moments : (cell + 2 cut, TERMS + 1)
        If empty, every line is summed on all points that it reaches. Else a wing is ``cut`` cells long, and a line is
        summed on the points of its own cell and the next ones alone; here is added what it is farther away:
        coefficients of powers of the inverse distance from the middle of its cell, and the value taken off. The
        first row is that of the cell which is ``cut`` cells before the first.
    ends : (2, point, CUT_TERMS + 1)
        The same for the lines whose wing to the right, or to the left, ends at the point, inclusive.
    own : (TERMS + 1,)
        Scratch.
    """
    cells, cut = cell_start.size - 1, (moments.shape[0] - cell_start.size + 1) // 2
    unit = 1.0 / cell_width
    near = NEAR if moments.size else math.ceil(wing * unit) + 1
    for i in range(lines.shape[1]):
        centre, strength, doppler, width, taken_off = lines[0, i], lines[1, i], lines[2, i], lines[3, i], lines[4, i]
        position = (centre - first_edge) * unit
        cell = math.floor(position)
        if moments.size and -cut <= cell < cells + cut:
            _line_moments(own, strength, position - cell - 0.5, width * unit, doppler * unit)
            own[TERMS] = taken_off
            for k in range(TERMS + 1):
                moments[cell + cut, k] += own[k]
            own[CUT_TERMS] = taken_off
            for side in range(2):
                there = cell + cut - 2 * side * cut
                if 0 <= there < cells:
                    start, stop = cell_start[there], cell_start[there + 1]
                    end = centre + wing - 2.0 * side * wing
                    j = _first_from(points, start, stop, end, (stop - start) * unit) - 1 + side
                    if start <= j < stop:
                        for k in range(CUT_TERMS + 1):
                            ends[side, j, k] += own[k]
            taken_off = 0.0
        low, high = max(0, cell - near), min(cells, cell + near + 1)
        if low < high:
            start, stop = cell_start[low], cell_start[high]
            per_step = (stop - start) * unit / (high - low)
            _add_line(sums, points, start, stop, per_step, (centre, strength, doppler, width), wing, taken_off)


@numba.njit(**_WRITTEN_IN)
def _line_moments(own, strength, place, width, doppler):  # type: ignore[no-untyped-def]
    """Coefficients of ``distance**-2, distance**-3, ...`` in the wings of a line, for lengths in cells.

    ``Im strength <(place + i width + g)**k>``, k from 1, with g normal of variance ``doppler**2 / 2``: a Voigt
    profile is the mean of ``Im 1 / (distance - place - i width - g) / pi``.
    """
    spread = 0.5 * doppler * doppler
    real, imag, real_before, imag_before = strength, 0.0, 0.0, 0.0
    for k in range(TERMS):
        real_next = place * real - width * imag + k * spread * real_before
        imag_next = place * imag + width * real + k * spread * imag_before
        real_before, imag_before, real, imag = real, imag, real_next, imag_next
        own[k] = imag


def _add_wings(points, sums, cell_start, first_edge, cell_width, moments, ends, terms, translations, fields):  # type: ignore[no-untyped-def]
    """Add what lines are farther away than the next cell.

    Parameters
    ----------
    points, sums, cell_start, first_edge, cell_width
        As in `_add_lines`.
    ends
        As there; changed.
    moments : (TERMS + 1, cell + 2 cut)
        As there, the other way round.
    terms : (cut,) int64
        How many powers of the inverse distance count at a distance of so many cells.
    translations : (cut, TERMS, power) float64
        Polynomials over a cell, of the place from -1 to 1, that stand for those powers as seen from so far to the
        right of the lines.
    fields : (power, cell)
        Zeros, for the polynomials of all cells.
    """
    cut, (powers, cells) = terms.size, fields.shape
    for apart in range(NEAR + 1, cut):
        left, right = np.uint64(cut - apart), np.uint64(cut + apart)
        for k in range(terms[apart]):
            for power in range(powers):
                one = translations[apart, k, power]
                other = one if (k + power) % 2 == 0 else -one
                for t in range(np.uint64(cells)):
                    fields[power, t] += one * moments[k, left + t] + other * moments[k, right + t]
    scale = 1.0 / (math.pi * cell_width)
    for t in range(cells):
        start, stop = cell_start[t], cell_start[t + 1]
        taken_off = 0.0
        for s in range(t + 1, t + 2 * cut):
            taken_off += moments[TERMS, s]
        middle = first_edge + (t + 0.5) * cell_width
        for j in range(start, stop):
            x = 2.0 * (points[j] - middle) / cell_width
            value = 0.0
            for power in range(powers - 1, -1, -1):
                value = value * x + fields[power, t]
            sums[j] += scale * value - taken_off
        for side in range(2):
            # what ends at a point has its share in all points farther on
            for step in range(stop - start):
                j = start + step if side else stop - 1 - step
                inverse = 1.0 / ((points[j] - middle) / cell_width + cut - 2.0 * side * cut)
                value = 0.0
                if step > 0:
                    for k in range(CUT_TERMS + 1):
                        ends[side, j, k] += ends[side, j - 1 if side else j + 1, k]
                for k in range(CUT_TERMS - 1, -1, -1):
                    value = (value + ends[side, j, k]) * inverse
                sums[j] += scale * value * inverse - ends[side, j, CUT_TERMS]


def _compiled(function, signature):  # type: ignore[no-untyped-def]
    """The function compiled for one signature, kept on disk where that is possible."""
    try:
        return numba.njit(signature, cache=True, **_OPTIONS)(function)
    except RuntimeError as error:  # numba finds no folder to write to
        warnings.warn(f"compiled code is not kept for the next run: {error}", stacklevel=2)
        return numba.njit(signature, **_OPTIONS)(function)


_NUMBERS, _TABLE, _CUBE = numba.float64[::1], numba.float64[:, ::1], numba.float64[:, :, ::1]
_STRETCH = (_NUMBERS, _NUMBERS, numba.int64[::1], numba.float64, numba.float64)  # points to cell_width
add_lines = _compiled(_add_lines, numba.void(*_STRETCH, _TABLE, numba.float64, _TABLE, _CUBE, _NUMBERS))
add_wings = _compiled(_add_wings, numba.void(*_STRETCH, _TABLE, _CUBE, numba.int64[::1], _CUBE, _TABLE))
