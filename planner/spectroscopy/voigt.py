"""The Voigt function for arrays.

``K(x, y) = Re w(x + iy)``, with w the Faddeeva function, x the distance from the line centre and y the Lorentz half
width, both in units of the 1/e half width of the Doppler profile. The normalised profile is
``K / (sqrt(pi) * doppler_1e_half_width)``.

Four rational approximations in four regions: Humlicek 1982, J. Quant. Spectrosc. Radiat. Transfer 27, 437 (his
algorithm w4; coefficients from memory, checked against scipy's Faddeeva function). The borders differ a little from
his: the two outer forms, which are the first convergents of the continued fraction, begin where they are good to
6e-5. The largest relative error of K is 9e-5 wherever K > 1e-11.
"""

from __future__ import annotations

import numba

from planner.spectroscopy._kernels import voigt_function

__all__ = ["voigt", "voigt_function"]


@numba.vectorize(nopython=True)
def voigt(x, y):  # type: ignore[no-untyped-def]  # numba infers the types
    """K(x, y) of arrays, broadcast; y >= 0. `voigt_function` is the same for compiled code to call."""
    return voigt_function(x, y)
