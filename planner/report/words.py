"""How single numbers read: mixing ratios, hours, counts, bands."""

from __future__ import annotations

import math
from collections.abc import Iterable

from planner.errors import LineDataError
from planner.spectroscopy.molecules import find_molecule
from planner.studies.results import BandShare

__all__ = ["band_text", "bands_text", "count_text", "gas_text", "hours_text", "ratio_text", "snr_text"]

_SCALES = ((1e-2, "%"), (1e-6, "ppm"), (1e-9, "ppb"), (0.0, "ppt"))
NEVER = "never"
UNBOUNDED = "none"
_MOST = 9999
"""Decades of telescope time; beyond it digits only hide the point."""


def ratio_text(mixing_ratio: float) -> str:
    """A mixing ratio in the unit that suits its size: ``350 ppm``, ``2.5 ppb``, ``503 ppt``, ``20 %``."""
    scale, unit = next((scale, unit) for scale, unit in _SCALES if mixing_ratio >= scale * (1 - 1e-12))
    number = mixing_ratio / (scale or 1e-12)
    return f"{number:.0f} {unit}" if number >= 999.5 else f"{number:.3g} {unit}"


def gas_text(gas: str) -> str:
    """A gas, or a set of gases, as people call it: ``CFC-12`` for ``CCl2F2``, ``CO2`` for ``CO2``.

    The first common name is taken where it is written in capitals, as abbreviations are.
    """
    return " + ".join(_one_gas_text(formula) for formula in gas.split(" + "))


def _one_gas_text(formula: str) -> str:
    try:
        names = find_molecule(formula).names
    except LineDataError:
        return formula
    return names[0] if names and names[0] == names[0].upper() else formula


def count_text(transits: int | None) -> str:
    """A number of transits; ``never`` when no number is enough, ``>9999`` when it might as well be."""
    if transits is None:
        return NEVER
    return _grouped(transits) if transits <= _MOST else f">{_MOST}"


def hours_text(hours: float | None) -> str:
    """Hours, with a decimal below 100; ``never`` and ``>9999`` as for counts."""
    if hours is None:
        return NEVER
    if hours < 99.95:
        return f"{hours:.1f}"
    return _grouped(round(hours)) if round(hours) <= _MOST else f">{_MOST}"


def _grouped(number: int) -> str:
    return f"{number:,d}".replace(",", " ")


def snr_text(snr: float) -> str:
    """A significance to three digits at most; ``none`` for a limit that is not there."""
    if math.isinf(snr):
        return UNBOUNDED
    return f"{snr:.2f}" if snr < 9.995 else f"{snr:.1f}" if snr < 99.95 else f"{snr:.0f}"


def band_text(from_um: float, to_um: float) -> str:
    """A stretch of wavelength, ``3.20-3.45``, with as many digits as keep its ends apart."""
    digits = 2 if to_um - from_um < 1 else 1
    return f"{from_um:.{digits}f}-{to_um:.{digits}f}"


def bands_text(bands: Iterable[BandShare]) -> str:
    """Stretches with their share of the information: ``3.20-3.45 (62 %), 2.2-2.4 (9 %)``; um is understood."""
    return ", ".join(f"{band_text(band.from_um, band.to_um)} ({100 * band.share:.0f} %)" for band in bands)
