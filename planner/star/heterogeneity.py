"""Spots and faculae outside the transit chord: how they change the transit depth."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from planner.star.model import BLACKBODY_FROM_K, blackbody_photons, blend, package_table

__all__ = [
    "Region",
    "contamination_factor",
    "disc_factor",
    "region_contrast",
    "usual_faculae",
    "usual_spot_temperature_k",
    "usual_spots",
]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Region:
    """All spots, or all faculae, of a star: temperature and share of the disc, each with its one sigma."""

    temperature_k: float
    temperature_error_k: float
    fraction: float
    fraction_error: float


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


# Photosphere K, then share and its error of spots and of faculae. TRAPPIST-1: 8 +18/-7 % and 54 +16/-46 %, read in
# Rackham, Apai & Giampapa 2018, ApJ 853, 122, errors made even; M5 and M0: the same paper, from memory; K5 and F5-G2:
# Rackham, Apai & Giampapa 2019, AJ 157, 96, middles of ranges from memory. Errors of half the value where none is
# published. Temperatures of the types: Pecaut & Mamajek 2013, ApJS 208, 9, from memory.
_USUAL_COVERAGE = (
    (2566.0, 0.08, 0.125, 0.54, 0.31),
    (3060.0, 0.14, 0.07, 0.60, 0.30),
    (3850.0, 0.10, 0.05, 0.55, 0.28),
    (4440.0, 0.03, 0.015, 0.25, 0.13),
    (6000.0, 0.006, 0.003, 0.06, 0.03),
)


def usual_spots(photosphere_k: float) -> Region:
    """Spots of a dwarf that varies by 1 %, many small ones as on the Sun: a working value, good to a factor 2.

    Sources of the shares stand beside the table, interpolated linearly in temperature and held beyond its ends; the
    temperature is `usual_spot_temperature_k`, its error 300 K or half of the difference to the photosphere.
    """
    temperature_k = usual_spot_temperature_k(photosphere_k)
    fraction, error = _usual_coverage(photosphere_k, column=1)
    return Region(
        temperature_k=temperature_k,
        temperature_error_k=min(300.0, (photosphere_k - temperature_k) / 2),
        fraction=fraction,
        fraction_error=error,
    )


def usual_faculae(photosphere_k: float) -> Region:
    """Faculae that go with `usual_spots`.

    At T + 100 K (Gondoin 2008 as used by Rackham et al. 2018, ApJ 853, 122, from memory), known to half of that (a
    choice of ours).
    """
    fraction, error = _usual_coverage(photosphere_k, column=3)
    return Region(
        temperature_k=photosphere_k + 100.0, temperature_error_k=50.0, fraction=fraction, fraction_error=error
    )


def disc_factor(photosphere_k: float, spots: Region | None, faculae: Region | None, wavelength_um: Array) -> Array:
    """`contamination_factor` of a star with some spots and faculae, shape of ``wavelength_um``."""
    spot_fraction, spot_contrast = _seen(photosphere_k, spots, wavelength_um)
    facula_fraction, facula_contrast = _seen(photosphere_k, faculae, wavelength_um)
    return contamination_factor(spot_fraction, facula_fraction, spot_contrast, facula_contrast)


def _seen(photosphere_k: float, region: Region | None, wavelength_um: Array) -> tuple[float, Array]:
    """Share and contrast; a region that is not there is as good as one like the photosphere."""
    if region is None:
        return 0.0, np.ones(np.shape(wavelength_um))
    return region.fraction, region_contrast(photosphere_k, region.temperature_k, wavelength_um)


def _usual_coverage(photosphere_k: float, column: int) -> tuple[float, float]:
    rows = np.array(_USUAL_COVERAGE)
    share, error = (float(np.interp(photosphere_k, rows[:, 0], rows[:, c])) for c in (column, column + 1))
    return share, error


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
