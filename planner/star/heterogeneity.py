"""Spots and faculae outside the transit chord: how they change the transit depth."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from planner.star.model import BLACKBODY_FROM_K, blackbody_photons, blend, package_table

__all__ = ["contamination_factor", "region_contrast", "usual_spot_temperature_k"]

Array = NDArray[np.float64]


def contamination_factor(
    spot_fraction: float, facula_fraction: float, spot_contrast: Array, facula_contrast: Array
) -> Array:
    """Observed over true transit depth when the chord crosses only the quiet photosphere.

    ``1 / (1 - fs (1 - Fs/Fp) - ff (1 - Ff/Fp))``: Rackham, Apai & Giampapa 2018, ApJ 853, 122, equation 3
    (equation number from memory).

    Parameters
    ----------
    spot_fraction, facula_fraction : float
        Shares of the disc, each from 0, together at most 1.
    spot_contrast, facula_contrast : arrays of one shape, or floats
        Flux of the region over that of the photosphere, > 0; see `region_contrast`.

    Raises
    ------
    ValueError
        On fractions out of range.
    """
    if min(spot_fraction, facula_fraction) < 0 or spot_fraction + facula_fraction > 1:
        raise ValueError(
            f"spot and facula fractions: expected each from 0 and at most 1 together, "
            f"got {spot_fraction} and {facula_fraction}"
        )
    spots = spot_fraction * (1.0 - np.asarray(spot_contrast, dtype=np.float64))
    faculae = facula_fraction * (1.0 - np.asarray(facula_contrast, dtype=np.float64))
    return 1.0 / (1.0 - spots - faculae)


def region_contrast(photosphere_k: float, region_k: float, wavelength_um: Array) -> Array:
    """Flux of a spot or facula over that of the photosphere, molecular bands included.

    Model atmospheres give the contrast for a few pairs of temperatures (``contrasts.toml``, its source stands
    there). It is carried over to other pairs as an exponent on the contrast of two blackbodies,
    ``(B(region)/B(photosphere))^q``, with q interpolated linearly in wavelength between band centres and in the
    photosphere's temperature, apart for cooler and warmer regions. q is held below the coolest pair and goes to 1
    at 6000 K above the warmest. At the tabulated pairs this gives back the table; elsewhere it is an estimate of ours.

    Parameters
    ----------
    photosphere_k, region_k : float
        Temperatures, > 0.
    wavelength_um : array, any shape
        Wavelengths.
    """
    pairs = _contrasts()["spots" if region_k < photosphere_k else "faculae"]
    columns = np.array([np.interp(wavelength_um, pairs.centre_um, column) for column in pairs.exponent])
    columns = np.concatenate([columns, np.ones((1, *columns.shape[1:]))])
    exponent = blend(columns, np.append(pairs.photosphere_k, BLACKBODY_FROM_K), photosphere_k)
    return _blackbody_contrast(wavelength_um, photosphere_k, region_k) ** exponent


def usual_spot_temperature_k(photosphere_k: float) -> float:
    """A working value for the temperature of spots, good to about 300 K.

    The lower of 0.86 T (M dwarfs: Rackham et al. 2018, ApJ 853, 122, from memory) and 0.418 T + 1620 K (F to K
    dwarfs: Rackham et al. 2019, AJ 157, 96, from memory); they meet at 3665 K. Some active late M dwarfs have
    spots only 100 to 400 K cooler than the photosphere (Barnes et al. 2016). For faculae T + 100 K is common.
    """
    return min(0.86 * photosphere_k, 0.418 * photosphere_k + 1620.0)


def _blackbody_contrast(wavelength_um: Array, photosphere_k: float, region_k: float) -> Array:
    return blackbody_photons(wavelength_um, region_k) / blackbody_photons(wavelength_um, photosphere_k)


@dataclass(frozen=True, kw_only=True, eq=False)
class _Pairs:
    """``photosphere_k`` (pair,), ``centre_um`` (band,), ``exponent`` (pair, band)."""

    photosphere_k: Array
    centre_um: Array
    exponent: Array


@cache
def _contrasts() -> dict[str, _Pairs]:
    data = package_table("contrasts.toml")
    centre_um = np.array(data["bands_um"], dtype=np.float64).mean(axis=1)
    return {kind: _pairs(centre_um, np.array(data[kind], dtype=np.float64)) for kind in ("spots", "faculae")}


def _pairs(centre_um: Array, rows: Array) -> _Pairs:
    blackbody = np.array([_blackbody_contrast(centre_um, row[0], row[1]) for row in rows])
    return _Pairs(
        photosphere_k=rows[:, 0].copy(), centre_um=centre_um, exponent=np.log(rows[:, 2:]) / np.log(blackbody)
    )
