"""Cross-sections of one gas on an even grid, for users who want the numbers themselves."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import RangeError
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store

__all__ = ["sigma"]

_MOST_POINTS = 20_000_000
_TEMPERATURE_K = (70.0, 3000.0)
_LEAST_STEP_PER_CM = 1e-5
_WING_PER_CM = 25.0


def sigma(
    gas: str,
    temperature_k: float,
    pressure_bar: float,
    from_per_cm: float,
    to_per_cm: float,
    step_per_cm: float = 0.01,
    *,
    lines_folder: Path | None = None,
) -> tuple[NDArray[np.float64], NDArray[np.float64], tuple[str, ...]]:
    """Absorption cross-section of a gas in air, without continuum and without scattering.

    Parameters
    ----------
    gas : str
        Formula or common name.
    temperature_k, pressure_bar : float
        State of the gas.
    from_per_cm, to_per_cm, step_per_cm : float
        The wavenumbers: from, to (included where the step divides the range) and the step.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.

    Returns
    -------
    wavenumber_per_cm, cross_section_cm2 : (wavenumber,)
    provenance : tuple of str
        Where the data come from.

    Raises
    ------
    RangeError
        If the range, step, temperature or pressure make no sense.
    LineDataError
        If there are no data for the gas.
    """
    if not 0 < from_per_cm < to_per_cm:
        raise RangeError(f"range: expected 0 < from < to in 1/cm, got {from_per_cm:g} to {to_per_cm:g}")
    if not _LEAST_STEP_PER_CM <= step_per_cm <= to_per_cm - from_per_cm:
        raise RangeError(
            f"step: expected {_LEAST_STEP_PER_CM:g} 1/cm or more and no more than the range, got {step_per_cm:g} 1/cm"
        )
    count = int((to_per_cm - from_per_cm) / step_per_cm + 1 + 1e-9)
    if count > _MOST_POINTS:
        raise RangeError(f"range: {count} points are more than {_MOST_POINTS}; take a wider step or a shorter range")
    if not _TEMPERATURE_K[0] <= temperature_k <= _TEMPERATURE_K[1]:
        low, high = _TEMPERATURE_K
        raise RangeError(f"temperature: expected {low:g} to {high:g} K, got {temperature_k:g} K")
    if not 0 < pressure_bar < 1000:
        raise RangeError(f"pressure: expected more than 0 and less than 1000 bar, got {pressure_bar:g} bar")
    store = Store()
    source = LineLibrary(store, lines_folder).gas(gas)
    wavenumber = np.asarray(from_per_cm + step_per_cm * np.arange(count), dtype=np.float64)
    pressure = np.array([pressure_bar])
    total = np.zeros(count)
    if source.lines is not None:
        from planner.spectroscopy.crosssections import cross_sections

        total += cross_sections(source.lines, wavenumber, temperature_k=temperature_k, pressures_bar=pressure)[0]
        total[source.measured_at(wavenumber)] = 0.0
    smooth = source.smooth_cross_section(wavenumber, temperature_k, pressure)
    total += 0.0 if smooth is None else smooth[0]
    notes = (
        f"lines: Voigt profiles in air, cut {_WING_PER_CM:g} 1/cm from the centre, TIPS partition sums; "
        "no continuum, no scattering",
    )
    return wavenumber, total, (*source.provenance, *source.partial, *notes, *store.notices)
