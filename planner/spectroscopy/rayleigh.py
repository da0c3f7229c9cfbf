"""Rayleigh scattering of gases from their refractive index and King factor.

    sigma = 24 pi^3 nu^4 / N^2 [(n^2 - 1) / (n^2 + 2)]^2 F        (Naus & Ubachs 2000, Opt. Lett. 25, 347, eq. 1)

with nu in 1/cm and N the number density at which the index n holds. H2 alone is given as a cross-section.

Indices are from memory unless a check is named: N2, O2, Ar, CO2, CO, N2O, SF6 as collected by Sneep & Ubachs 2005
(JQSRT 92, 293), with the King factors there (O2: Bates 1984); CH4 He et al. 2021 (ACP 21, 14927), because the 2005
one is 15 to 25 % too high in sigma; He Cuthbertson & Cuthbertson 1932, which holds at 0 Celsius; H2 Dalgarno &
Williams 1962 (ApJ 136, 690); H2O Ciddor 1996 (Appl. Opt. 35, 1566) with a depolarisation of 3e-4; NH3, SO2, H2S
and Ne one handbook value each (0 Celsius, sodium light), without dispersion or anisotropy, good to 10 %.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import RangeError

__all__ = ["king_factor", "rayleigh_cross_section", "rayleigh_gases"]

_PER_CM3_AT_0_C = 2.6867811e19  # at 1 atm, 273.15 K
_PER_CM3_AT_15_C = 2.5469174e19  # at 1 atm, 288.15 K
_VAPOUR_PER_CM3 = 1333.0 / (1.380649e-23 * 293.15) * 1e-6  # Ciddor's standard vapour: 1333 Pa, 20 Celsius

# The shortest wavelength of any fit is near 0.2 um; the poles of CO and CO2 begin at 0.15 um.
_LARGEST_PER_CM = 55_000.0


@dataclass(frozen=True, kw_only=True)
class _Refraction:
    """(n - 1) 1e8 = sum of powers of nu^2 plus sum of strength / (pole^2 - nu^2), at one number density.

    The King factor is a ratio of polynomials in nu^2. The record holds from `above_per_cm` upwards.
    """

    number_per_cm3: float
    powers: tuple[float, ...] = (0.0,)
    resonances: tuple[tuple[float, float], ...] = ()  # strength, squared pole
    king: tuple[float, ...] = (1.0,)
    king_divisor: tuple[float, ...] = (1.0,)
    above_per_cm: float = 0.0


_KING_N2 = (1.034, 3.17e-12)
_REFRACTIONS: dict[str, tuple[_Refraction, ...]] = {
    "N2": (
        _Refraction(
            number_per_cm3=_PER_CM3_AT_15_C,
            powers=(6498.2,),
            resonances=((307.43305e12, 14.4e9),),
            king=_KING_N2,
        ),
        _Refraction(
            number_per_cm3=_PER_CM3_AT_15_C,
            powers=(5677.465,),
            resonances=((318.81874e12, 14.4e9),),
            king=_KING_N2,
            above_per_cm=21360.0,
        ),
    ),
    "O2": (
        _Refraction(
            number_per_cm3=_PER_CM3_AT_0_C,
            powers=(20564.8,),
            resonances=((24.80899e12, 4.09e9),),
            king=(1.096, 1.385e-11, 1.448e-20),
        ),
    ),
    "Ar": (_Refraction(number_per_cm3=_PER_CM3_AT_15_C, powers=(6432.135,), resonances=((286.06021e12, 14.4e9),)),),
    "CO2": (
        # The fit's fifth term has its pole in the infrared, at 2418 1/cm. It adds less than 2e-6 of n - 1 where the
        # fit holds (below 1.7 um) and would add a false spike of scattering at 4.1 um, so it is left out.
        _Refraction(
            number_per_cm3=_PER_CM3_AT_15_C,
            resonances=(
                (1.1427e11 * 5799.25, 128908.9**2),
                (1.1427e11 * 120.05, 89223.8**2),
                (1.1427e11 * 5.3334, 75037.5**2),
                (1.1427e11 * 4.3244, 67837.7**2),
            ),
            king=(1.1364, 25.3e-12),
        ),
    ),
    "CO": (
        _Refraction(
            number_per_cm3=_PER_CM3_AT_15_C,
            powers=(22851.0,),
            resonances=((0.456e14, 71427.0**2),),
            king=(1.016,),
        ),
    ),
    "N2O": (
        _Refraction(
            number_per_cm3=_PER_CM3_AT_15_C,
            powers=(46890.0, 4.12e-6),
            king=(3.3462, 70.8e-12),
            king_divisor=(2.7692, -47.2e-12),
        ),
    ),
    "SF6": (_Refraction(number_per_cm3=_PER_CM3_AT_15_C, powers=(71517.0, 4.996e-6)),),
    "CH4": (_Refraction(number_per_cm3=_PER_CM3_AT_15_C, powers=(5476.0,), resonances=((4.1579e14, 1.1427e10),)),),
    "He": (_Refraction(number_per_cm3=_PER_CM3_AT_0_C, powers=(2283.0,), resonances=((1.8102e13, 1.5342e10),)),),
    "H2O": (
        _Refraction(
            number_per_cm3=_VAPOUR_PER_CM3,
            powers=(1.022 * 295.235, 1.022 * 2.6422e-8, -1.022 * 0.032380e-16, 1.022 * 0.004028e-24),
            king=((6.0 + 3.0 * 3e-4) / (6.0 - 7.0 * 3e-4),),
        ),
    ),
    "NH3": (_Refraction(number_per_cm3=_PER_CM3_AT_0_C, powers=(37600.0,)),),
    "SO2": (_Refraction(number_per_cm3=_PER_CM3_AT_0_C, powers=(68600.0,)),),
    "H2S": (_Refraction(number_per_cm3=_PER_CM3_AT_0_C, powers=(63400.0,)),),
    "Ne": (_Refraction(number_per_cm3=_PER_CM3_AT_0_C, powers=(6710.0,)),),
}
# sigma / nu^4 of H2 as powers of nu^2; the source has 8.14e-13, 1.28e-6 and 1.61 for wavelengths in Angstrom.
_HYDROGEN = (8.14e-45, 1.28e-54, 1.61e-64)


def rayleigh_gases() -> tuple[str, ...]:
    """Formulas of the gases whose scattering is known here."""
    return (*sorted([*_REFRACTIONS, "H2"]),)


def rayleigh_cross_section(formula: str, wavenumber_per_cm: ArrayLike) -> NDArray[np.float64]:
    """Rayleigh scattering cross-section.

    A gas that is not in `rayleigh_gases` gets zero: gases enter as backgrounds, which are all there, or as traces,
    where even a tenfold cross-section at a mixing ratio of 1e-3 adds 1 % to the scattering of the air. The long-wave
    side is open (the index is nearly constant there and sigma falls as nu^4).

    Parameters
    ----------
    formula : str
        Such as ``"CO2"``.
    wavenumber_per_cm : (wavenumber,) array_like
        Vacuum wavenumbers, at most 55,000 (0.18 um).

    Returns
    -------
    (wavenumber,) ndarray
        cm2 per molecule.

    Raises
    ------
    RangeError
        If a wavenumber is above 55,000 1/cm, where the index fits end.
    """
    wavenumber = _checked(wavenumber_per_cm)
    square = wavenumber * wavenumber
    if formula == "H2":
        return square * square * _polynomial(_HYDROGEN, square)
    total = np.zeros_like(wavenumber)
    for refraction in _REFRACTIONS.get(formula, ()):
        valid = wavenumber >= refraction.above_per_cm
        total[valid] = _scattering(refraction, square[valid])
    return total


def king_factor(formula: str, wavenumber_per_cm: ArrayLike) -> NDArray[np.float64]:
    """King correction (6 + 3 rho) / (6 - 7 rho) for the depolarisation rho, shape ``(wavenumber,)``.

    Raises
    ------
    RangeError
        If the gas has no index here (H2 is given as a cross-section), or a wavenumber is above 55,000 1/cm.
    """
    if formula not in _REFRACTIONS:
        known = ", ".join(sorted(_REFRACTIONS))
        raise RangeError(f"King factor: expected one of {known}, got {formula!r}")
    wavenumber = _checked(wavenumber_per_cm)
    return _king(_REFRACTIONS[formula][-1], wavenumber * wavenumber)


def _scattering(refraction: _Refraction, square: NDArray[np.float64]) -> NDArray[np.float64]:
    """Cross-section for squared wavenumbers."""
    excess = _polynomial(refraction.powers, square)
    for strength, pole in refraction.resonances:
        excess = excess + strength / (pole - square)
    index_square = (1.0 + 1e-8 * excess) ** 2
    lorentz = (index_square - 1.0) / (index_square + 2.0)
    factor = 24.0 * math.pi**3 / refraction.number_per_cm3**2
    return factor * (square * lorentz) ** 2 * _king(refraction, square)


def _king(refraction: _Refraction, square: NDArray[np.float64]) -> NDArray[np.float64]:
    return _polynomial(refraction.king, square) / _polynomial(refraction.king_divisor, square)


def _polynomial(coefficients: tuple[float, ...], x: NDArray[np.float64]) -> NDArray[np.float64]:
    """Sum of coefficients[k] x^k."""
    total = np.zeros_like(x)
    for coefficient in reversed(coefficients):
        total = total * x + coefficient
    return total


def _checked(wavenumber_per_cm: ArrayLike) -> NDArray[np.float64]:
    wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))
    if wavenumber.size and wavenumber.max() > _LARGEST_PER_CM:
        raise RangeError(
            f"Rayleigh scattering: expected wavenumbers up to {_LARGEST_PER_CM:.0f} per cm (0.18 um), "
            f"got {wavenumber.max():.0f}; take a longer wavelength"
        )
    return wavenumber
