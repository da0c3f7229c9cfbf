"""The water continuum in the 10 and 4 um windows, from two published laws.

What remains between the lines of water grows with the square of its density (self part) and with its density times
that of the other gases (foreign part). Inside the two windows, lines used beside it are cut at 25 1/cm and lowered by
their value there, which the laws hold; elsewhere there is nothing to make up for that, and lines stay whole.

* 350 to 1250 1/cm, self: Roberts, Selby & Biberman 1976 (Appl. Opt. 15, 2085), C = 1.25e-22 + 1.67e-19 exp(-7.87e-3 nu)
  cm2 per molecule and atm at 296 K with the factor exp(1800 K (1/T - 1/296 K)); numbers from memory. Their fit is of
  700 to 1250 1/cm; it holds down to 350 within a factor 2 as well.
* 2400 to 2800 1/cm, self: knots of Burch, Gryvnak & Pembrook 1971 (AFCRL-71-0124), from memory, with the same factor,
  a guess (the energy that binds two water molecules is about 1600 K). Later work finds two to three times more.
* Between the windows: a straight line in ln C. There the true continuum is up to fifty times larger, but the lines of
  the 6.3 um band hide it; the value only spares the spectrum a step. Beyond 350 and 2800 1/cm C fades.
* Foreign: 0.002 of the self part at 296 K, whatever the temperature and the partner (Roberts et al. 1976, from memory).
  Good to a factor 2.5 at 700 to 1200 1/cm; too small by 2 to 15 at 350 to 700 1/cm; a guess at 4 um.

Against a later tabulation the self part at 350 to 1250 1/cm is 1.1 to 1.8 times as large at 296 K and within a factor
2.2 from 260 to 340 K; at 2400 to 2700 1/cm it is 0.3 to 0.65 times as large. There is no continuum in the near
infrared here, and in the bands of water none worth the name.
"""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["WINDOWS_PER_CM", "water_continuum"]

_REFERENCE_K = 296.0
_COLDEST_K, _WARMEST_K = 250.0, 400.0  # a little more than the laboratory's range
_BINDING_K = 1800.0
_FOREIGN_SHARE = 0.002

_TEN_MICRON_PER_CM = (350.0, 1250.0)
WINDOWS_PER_CM = (_TEN_MICRON_PER_CM, (2400.0, 2800.0))
"""Where the laws hold, and with them what is taken off the lines at their cut; elsewhere lines stay whole."""

_TEN_MICRON_FLOOR, _TEN_MICRON_RISE, _TEN_MICRON_SLOPE_CM = 1.25e-22, 1.67e-19, 7.87e-3

# wavenumber (1/cm) and C at 296 K in cm2 per gram and atm
_FOUR_MICRON_KNOTS = (
    (2400.0, 0.187),
    (2450.0, 0.147),
    (2500.0, 0.117),
    (2550.0, 0.097),
    (2600.0, 0.087),
    (2650.0, 0.100),
    (2700.0, 0.120),
    (2750.0, 0.147),
    (2800.0, 0.174),
)
_MOLECULES_PER_GRAM = 6.02214076e23 / 18.0153
_FADE_PER_CM = 50.0


def water_continuum(
    wavenumber_per_cm: ArrayLike, temperature_k: float
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Self and foreign continuum of water.

    The absorption coefficient in 1/cm is ``n_water (self n_water + foreign n_others)``, n in molecules per cm3.

    Parameters
    ----------
    wavenumber_per_cm : (wavenumber,) array_like
    temperature_k : float
        The self part is held at its value for 250 and 400 K outside them.

    Returns
    -------
    self, foreign : (wavenumber,) ndarray
        cm5 per molecule squared.
    """
    wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))
    kelvin = min(max(temperature_k, _COLDEST_K), _WARMEST_K)
    at_reference = _self_per_atm(wavenumber)
    warmth = math.exp(_BINDING_K * (1.0 / kelvin - 1.0 / _REFERENCE_K))
    own = at_reference * warmth / _molecules_per_cm3(kelvin)
    foreign = at_reference * _FOREIGN_SHARE / _molecules_per_cm3(_REFERENCE_K)
    return own, foreign


def _molecules_per_cm3(temperature_k: float) -> float:
    """Density of a gas at 1 atm."""
    return 1.01325e6 / (1.380649e-16 * temperature_k)


def _self_per_atm(wavenumber: NDArray[np.float64]) -> NDArray[np.float64]:
    """Self coefficient at 296 K in cm2 per molecule and atm."""
    low, high = _TEN_MICRON_PER_CM
    first = np.array([nu for nu, _ in _FOUR_MICRON_KNOTS])
    log_second = np.log([value / _MOLECULES_PER_GRAM for _, value in _FOUR_MICRON_KNOTS])
    held = np.clip(wavenumber, low, first[-1])
    bridge = np.interp(held, [high, *first], [math.log(_ten_micron(high)), *log_second])
    inside = np.where(held <= high, _ten_micron(held), np.exp(bridge))
    beyond = np.maximum(np.maximum(low - wavenumber, wavenumber - first[-1]), 0.0)
    return np.asarray(inside * np.exp(-beyond / _FADE_PER_CM))


def _ten_micron(wavenumber: float | NDArray[np.float64]) -> Any:
    return _TEN_MICRON_FLOOR + _TEN_MICRON_RISE * np.exp(-_TEN_MICRON_SLOPE_CM * wavenumber)
