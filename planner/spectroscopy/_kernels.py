"""Compiled code: the Voigt function, and the loop over lines behind `planner.spectroscopy.crosssections`.

Imported only when there is work to do: the import compiles, or loads what was compiled. All of it stands in one file,
since a kept compilation is given up only when the file of its outermost function changes.
"""

from __future__ import annotations

import math
import warnings

import numba

__all__ = ["ASYMPTOTE_FROM", "add_lines", "voigt_function"]

ASYMPTOTE_FROM = 15.0
"""|x + iy| from which the first convergent holds to 6e-5."""

SECOND_FROM = 6.0
"""|x| + y from which the second convergent holds to 3e-5."""

NEAR_CELLS = 1
"""Neighbours on either side of a line's own cell in which it is summed point by point."""

_SQRT_PI = math.sqrt(math.pi)
_ONE_OVER_SQRT_PI = 1.0 / _SQRT_PI
# Fused multiplication and addition, nothing else: no rule that could lead a quotient or a NaN astray.
_OPTIONS = {"nogil": True, "error_model": "numpy", "fastmath": {"contract"}}


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


# Coefficients of Humlicek's regions III (in powers of t) and IV (in powers of -t**2), highest power first.
_TOP_3 = (0.5642236, 3.778987, 11.96482, 20.20933, 16.4955)
_LOW_3 = (1.0, 6.699398, 21.69274, 39.27121, 38.82363, 16.4955)
_TOP_4 = (0.56419, 1.320522, 35.76683, 219.0313, 1540.787, 3321.9905, 36183.31)
_LOW_4 = (1.0, 1.841439, 61.57037, 364.2191, 2186.181, 9022.228, 24322.84, 32066.6)


@numba.njit(**_OPTIONS)
def _polynomial(coefficients, real, imag):  # type: ignore[no-untyped-def]
    """Real and imaginary part of a polynomial with real coefficients at a complex place.

    Division by the quadratic ``z**2 - 2 real z + |z|**2``: half the work of Horner's rule in complex numbers.
    """
    twice, square = 2.0 * real, real * real + imag * imag
    a = b = 0.0
    for coefficient in coefficients:
        a, b = coefficient + twice * a - square * b, a
    return a - real * b, imag * b


@numba.njit(**_OPTIONS)
def inner_voigt(x, y):  # type: ignore[no-untyped-def]
    """K inside ``|x| + y < 6``: regions III and IV of Humlicek 1982."""
    if y >= 0.195 * abs(x) - 0.176:
        a, b = _polynomial(_TOP_3, y, -x)
        c, d = _polynomial(_LOW_3, y, -x)
        return (a * c + b * d) / (c * c + d * d)
    real, imag = x * x - y * y, 2.0 * x * y  # -t**2
    a, b = _polynomial(_TOP_4, real, imag)
    a, b = a * y + b * x, b * y - a * x  # times t
    c, d = _polynomial(_LOW_4, real, imag)
    return math.exp(-real) * math.cos(imag) - (a * c + b * d) / (c * c + d * d)


@numba.njit(**_OPTIONS)
def voigt_function(x, y):  # type: ignore[no-untyped-def]
    """K(x, y) of two numbers, y >= 0; to be called from compiled code."""
    if x * x + y * y >= ASYMPTOTE_FROM * ASYMPTOTE_FROM:
        return first_convergent(x, y)
    if abs(x) + y >= SECOND_FROM:
        return second_convergent(x, y)
    return inner_voigt(x, y)


@numba.njit(**_OPTIONS)
def _first_from(values, low, high, threshold):  # type: ignore[no-untyped-def]  # numba infers the types
    """First index in [low, high) whose value is not below the threshold; high if there is none.

    A guess as if the values were evenly spaced, then single steps: quicker than bisection on any smooth grid.
    """
    if low >= high:
        return high
    span = values[high - 1] - values[low]
    guess = low + int((threshold - values[low]) / span * (high - 1 - low)) if span > 0.0 else low
    guess = min(max(guess, low), high)
    while guess > low and values[guess - 1] >= threshold:
        guess -= 1
    while guess < high and values[guess] < threshold:
        guess += 1
    return guess


@numba.njit(**_OPTIONS)
def _add_far(sums, wavenumber, low, high, centre, top1, top0, low1, low0, base, wing):  # type: ignore[no-untyped-def]
    """Add the first convergent, a quotient of polynomials in the squared distance."""
    # slices, since an index that starts at 0 spares the compiler a test for negative ones in the loop
    sums, wavenumber = sums[low:high], wavenumber[low:high]
    for j in range(sums.size):
        distance = wavenumber[j] - centre
        square = distance * distance
        value = (top1 * square + top0) / (square * (square + low1) + low0) - base
        sums[j] += value if abs(distance) <= wing else 0.0


@numba.njit(**_OPTIONS)
def _add_core(sums, wavenumber, low, high, centre, per_doppler, y, peak, base, wing):  # type: ignore[no-untyped-def]
    """Add the line where the innermost approximation may be due."""
    # slices, since an index that starts at 0 spares the compiler a test for negative ones in the loop
    sums, wavenumber = sums[low:high], wavenumber[low:high]
    for j in range(sums.size):
        distance = wavenumber[j] - centre
        x = distance * per_doppler
        shape = second_convergent(x, y) if abs(x) + y >= SECOND_FROM else inner_voigt(x, y)
        if abs(distance) <= wing:
            sums[j] += peak * shape - base


def _add_lines(  # type: ignore[no-untyped-def]
    wavenumber,
    sums,
    points,
    nodes_per_cell,
    first_edge,
    cell_width,
    cell_start,
    centre_at_rest,
    strength,
    doppler,
    lorentz_per_atm,
    shift_per_atm,
    pressure_atm,
    wing,
    subtract,
):
    """Add lines to the sums on the points of one stretch of the grid and on the nodes of its cells.

    Parameters
    ----------
    wavenumber : (point + node,) float64
        The points, ascending, then ``nodes_per_cell`` nodes for every cell; or the points alone, if all lines are
        to be summed on them.
    sums : (pressure, point + node) float64
        Added to. A cell that is far from a line gets it on its nodes, all others on their points.
    points : int
        How many points there are.
    nodes_per_cell : int
        0 if there are no nodes.
    first_edge, cell_width, cell_start
        Cell c covers ``first_edge + [c, c + 1) * cell_width`` and the points ``cell_start[c]:cell_start[c + 1]``.
        A cell is wider than the core of any line, if there are nodes.
    centre_at_rest, strength, doppler, lorentz_per_atm, shift_per_atm : (line,) float64
        Centre at no pressure, intensity, Doppler 1/e half width, Lorentz half width and shift per atm.
    pressure_atm : (pressure,) float64
    wing : float
        Distance from the shifted centre at which a line ends.
    subtract : bool
        Whether the line's value at that distance is taken off.
    """
    cells = cell_start.size - 1
    highest_atm = 0.0
    for k in range(pressure_atm.size):
        highest_atm = max(highest_atm, pressure_atm[k])
    for i in range(strength.size):
        slack = abs(shift_per_atm[i]) * highest_atm
        position = (centre_at_rest[i] - first_edge) / cell_width
        reach, sure = (wing + slack) / cell_width, (wing - slack) / cell_width
        # cells the line touches: [low, high); cells it covers whole, from afar, at every pressure: [a, b) and [c, d)
        low = max(0, math.floor(position - reach))
        high = min(cells, math.floor(position + reach) + 1)
        if low >= high:
            continue
        a = b = low
        c = d = high
        if nodes_per_cell > 0:
            own = math.floor(position)
            a = min(max(math.ceil(position - sure), low), high)
            d = max(min(math.floor(position + sure), high), a)
            b = min(max(own - NEAR_CELLS, a), d)
            c = min(max(own + NEAR_CELLS + 1, b), d)
        start, stop = cell_start[b], cell_start[c]
        core = ASYMPTOTE_FROM * doppler[i] + slack
        core_low = _first_from(wavenumber, start, stop, centre_at_rest[i] - core)
        core_high = _first_from(wavenumber, core_low, stop, centre_at_rest[i] + core)
        far = (
            (cell_start[low], cell_start[a]),
            (points + a * nodes_per_cell, points + b * nodes_per_cell),
            (start, core_low),
            (core_high, stop),
            (points + c * nodes_per_cell, points + d * nodes_per_cell),
            (cell_start[d], cell_start[high]),
            (core_low, core_high),  # only if the line is so broad that it has no core
        )
        per_doppler = 1.0 / doppler[i]
        peak = strength[i] * per_doppler / _SQRT_PI
        for k in range(pressure_atm.size):
            centre = centre_at_rest[i] + shift_per_atm[i] * pressure_atm[k]
            width = lorentz_per_atm[i] * pressure_atm[k]
            y = width * per_doppler
            base = peak * voigt_function(wing * per_doppler, y) if subtract else 0.0
            broad = y >= ASYMPTOTE_FROM
            # the first convergent with both sides of its quotient scaled from Doppler widths to wavenumbers
            half = width * width + 0.5 * doppler[i] * doppler[i]
            top1 = strength[i] * width / math.pi
            low1 = 2.0 * width * width - doppler[i] * doppler[i]
            for r in range(7 if broad else 6):
                n, m = far[r]
                _add_far(sums[k], wavenumber, n, m, centre, top1, top1 * half, low1, half * half, base, wing)
            if not broad:
                _add_core(sums[k], wavenumber, core_low, core_high, centre, per_doppler, y, peak, base, wing)


def _compiled(function, signature):  # type: ignore[no-untyped-def]
    """The function compiled for one signature, kept on disk where that is possible."""
    try:
        return numba.njit(signature, cache=True, **_OPTIONS)(function)
    except RuntimeError as error:  # numba finds no folder to write to
        warnings.warn(f"compiled code is not kept for the next run: {error}", stacklevel=2)
        return numba.njit(signature, **_OPTIONS)(function)


add_lines = _compiled(
    _add_lines,
    numba.void(
        numba.float64[::1],  # wavenumber
        numba.float64[:, ::1],  # sums
        numba.int64,
        numba.int64,
        numba.float64,
        numba.float64,
        numba.int64[::1],  # cell_start
        *[numba.float64[::1]] * 6,
        numba.float64,
        numba.boolean,
    ),
)
