"""The built-in spectrum: a blackbody times the band ratios of late-type model atmospheres."""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.constants import c, h, k

__all__ = ["blackbody_photons", "late_type_ratio", "solid_angle_factor"]

Array = NDArray[np.float64]

SUN_RADIUS_M = 6.957e8  # IAU 2015 resolution B3, nominal
PARSEC_M = 3.0856775814913673e16  # IAU 2015 resolution B2
BLACKBODY_FROM_K = 6000.0
"""At and above this temperature the built-in spectrum is a plain blackbody."""


def blackbody_photons(wavelength_um: Array, temperature_k: float) -> Array:
    """Photons leaving a unit of blackbody surface, photons s-1 m-2 um-1 (hemisphere).

    Planck's law, ``2 pi c / lambda^4 / (exp(h c / lambda k T) - 1)``; never negative, 0 where the exponential
    overflows.
    """
    wavelength_m = np.asarray(wavelength_um, dtype=np.float64) * 1e-6
    exponent = np.minimum(h * c / (wavelength_m * k * temperature_k), 700.0)
    return 2 * np.pi * c / wavelength_m**4 / np.expm1(exponent) * 1e-6


def solid_angle_factor(radius_rsun: float, distance_pc: float) -> float:
    """(R/d)^2: what turns the flux at the stellar surface into the flux at Earth."""
    return float((radius_rsun * SUN_RADIUS_M / (distance_pc * PARSEC_M)) ** 2)


def late_type_ratio(wavelength_um: Array, temperature_k: float) -> Array:
    """Photon flux of a late-type dwarf over that of a blackbody of the same temperature and radius.

    Linear in wavelength between band centres and linear in temperature between the columns of
    ``late_types.toml`` (its source stands there). Held constant beyond the first and last band and below the
    coolest column; from the warmest column, 4000 K, it goes linearly to 1 at 6000 K (common practice, no source).

    Parameters
    ----------
    wavelength_um : array, any shape
        Wavelengths.
    temperature_k : float
        Effective temperature.
    """
    table = _late_types()
    columns = np.array([np.interp(wavelength_um, table.centre_um, column) for column in table.ratio])
    columns = np.concatenate([columns, np.ones((1, *columns.shape[1:]))])
    return blend(columns, np.append(table.temperature_k, BLACKBODY_FROM_K), temperature_k)


def blend(columns: Array, nodes_k: Array, temperature_k: float) -> Array:
    """Columns of shape ``(node, ...)`` interpolated linearly in temperature, held at both ends."""
    weights = [np.interp(temperature_k, nodes_k, unit) for unit in np.eye(nodes_k.size)]
    return np.tensordot(np.array(weights), columns, axes=1)


@dataclass(frozen=True, kw_only=True, eq=False)
class _LateTypes:
    """``temperature_k`` (node,), ``centre_um`` (band,), ``ratio`` (node, band)."""

    temperature_k: Array
    centre_um: Array
    ratio: Array


@cache
def _late_types() -> _LateTypes:
    data = package_table("late_types.toml")
    rows = np.array(data["bands"], dtype=np.float64)
    return _LateTypes(
        temperature_k=np.array(data["temperatures_k"], dtype=np.float64),
        centre_um=rows[:, :2].mean(axis=1),
        ratio=rows[:, 2:].T.copy(),
    )


def package_table(name: str) -> dict[str, Any]:
    """A table that ships beside this module."""
    return tomllib.loads((files("planner.star") / name).read_text(encoding="utf-8"))
