"""The Voigt function in compiled form.

``K(x, y) = Re w(x + iy)``, with w the Faddeeva function, x the distance from the line centre and y the Lorentz half
width, both in units of the 1/e half width of the Doppler profile. The normalised profile is
``K / (sqrt(pi) * doppler_1e_half_width)``.

Four rational approximations in four regions: Humlicek 1982, J. Quant. Spectrosc. Radiat. Transfer 27, 437 (his
algorithm w4; coefficients from memory, checked against scipy's Faddeeva function). The borders differ a little from
his: the two outer forms, which are the first convergents of the continued fraction, begin where they are good to
6e-5. The largest relative error of K is 9e-5 wherever K > 1e-11.
"""

from __future__ import annotations

import math

import numba

__all__ = ["ASYMPTOTE_FROM", "SECOND_FROM", "inner_voigt", "second_convergent", "voigt", "voigt_function"]

ASYMPTOTE_FROM = 15.0
"""|x + iy| from which the first convergent holds to 6e-5."""

SECOND_FROM = 6.0
"""|x| + y from which the second convergent holds to 3e-5."""

_ONE_OVER_SQRT_PI = 1.0 / math.sqrt(math.pi)


@numba.njit(error_model="numpy")
def _first_convergent(x, y):  # type: ignore[no-untyped-def]  # numba infers the types
    """Real part of ``t / (sqrt(pi) * (1/2 + t**2))`` with ``t = y - ix``."""
    x2, y2 = x * x, y * y
    half = 0.5 + y2
    return _ONE_OVER_SQRT_PI * y * (x2 + half) / (x2 * (x2 + 2.0 * y2 - 1.0) + half * half)


@numba.njit(error_model="numpy")
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


@numba.njit(error_model="numpy")
def _polynomial(coefficients, real, imag):  # type: ignore[no-untyped-def]
    """Real and imaginary part of a polynomial with real coefficients at a complex place."""
    a = b = 0.0
    for coefficient in coefficients:
        a, b = a * real - b * imag + coefficient, a * imag + b * real
    return a, b


@numba.njit(error_model="numpy")
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


@numba.njit(error_model="numpy")
def voigt_function(x, y):  # type: ignore[no-untyped-def]
    """K(x, y) of two numbers, y >= 0; to be called from compiled code."""
    if x * x + y * y >= ASYMPTOTE_FROM * ASYMPTOTE_FROM:
        return _first_convergent(x, y)
    if abs(x) + y >= SECOND_FROM:
        return second_convergent(x, y)
    return inner_voigt(x, y)


@numba.vectorize(nopython=True)
def voigt(x, y):  # type: ignore[no-untyped-def]
    """K(x, y) of arrays, broadcast; y >= 0."""
    return voigt_function(x, y)
