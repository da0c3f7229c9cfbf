"""Tables that leave as ECSV (units and metadata in the header) or CSV, by the ending of the file's name."""

from __future__ import annotations

import io
import math
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
from astropy.table import Column, MaskedColumn, Table
from numpy.typing import NDArray

from planner.errors import OutputError
from planner.report.files import write_text
from planner.report.words import bands_text
from planner.studies.results import BinnedSpectrum, Counts, PlanResult

__all__ = ["check_table_name", "plan_meta", "plan_table", "sigma_table", "spectra_table", "write_table"]

_FORMATS = {".ecsv": "ascii.ecsv", ".csv": "ascii.csv"}
_COUNTS = {
    "snr_one_transit": (None, float),
    "snr_limit": (None, float),
    "transits_required": (None, int),
    "transits_unrounded": (None, float),
    "hours_required": ("h", float),
    "in_transit_hours_required": ("h", float),
}


def write_table(table: Table, path: str | Path) -> None:
    """Write a table as ECSV or CSV.

    Raises
    ------
    OutputError
        If the name ends in neither ``.ecsv`` nor ``.csv``, or the file cannot be written.
    """
    path = Path(path)
    check_table_name(path)
    text = io.StringIO()
    table.write(text, format=_FORMATS[path.suffix.lower()])
    write_text(path, text.getvalue())


def check_table_name(path: Path) -> None:
    """Refuse a name whose ending is not that of a table.

    Raises
    ------
    OutputError
        Naming the endings that are known.
    """
    if path.suffix.lower() not in _FORMATS:
        raise OutputError(f'{path}: expected a name that ends in .ecsv or .csv, got "{path.suffix or path.name}"')


def plan_table(result: PlanResult) -> Table:
    """The rows of a plan.

    What no number of transits reaches is masked; a limit that is not there is infinite. Columns as the keys of
    `planner.report.jsonio`; ``best_bands_um`` and ``costs_most`` are text.
    """
    rows = result.rows
    table = Table(meta=plan_meta(result))
    table["gas"] = [row.gas for row in rows]
    table["mixing_ratio"] = [row.mixing_ratio for row in rows]
    table["mode"] = [row.mode for row in rows]
    table["verdict"] = [row.verdict.value for row in rows]
    _add_counts(table, [row.marginalised for row in rows], "")
    _add_counts(table, [row.all_known for row in rows], "_all_known")
    table["best_bands_um"] = [bands_text(row.best_bands) for row in rows]
    table["costs_most"] = [row.confusion[0][0] if row.confusion else "" for row in rows]
    return table


def spectra_table(spectra: Sequence[BinnedSpectrum], meta: Mapping[str, Any] | None = None) -> Table:
    """Spectra one below the other, a row per bin.

    ``share_<GAS>_ppm`` is the gas's share; it is masked in the spectra of air that lacks the gas. ``depth_ppm`` is
    the transit depth with all gases, ``scale_height_ppm`` the depth of one scale height. ``contamination_ppm``, there
    if the scenario states spots or faculae, is what they add to the depth.
    """
    gases = list(dict.fromkeys(gas for spectrum in spectra for gas in spectrum.shares_ppm))
    counts = [spectrum.from_um.size for spectrum in spectra]
    table = Table(meta=dict(meta or {}))
    for name in ("gas", "mixing_ratio", "mode"):
        table[name] = np.repeat([getattr(spectrum, name) for spectrum in spectra], counts)
    table["detector"] = _joined(spectra, "detector")
    for name, unit in (("from_um", "um"), ("to_um", "um"), ("depth_ppm", "1e-6")):
        table[name] = Column(_joined(spectra, name), unit=unit)
    for gas in gases:
        table[f"share_{gas}_ppm"] = _share(spectra, gas)
    surface = ["contamination_ppm"] if any(s.contamination_ppm is not None for s in spectra) else []
    for name in (*surface, "noise_one_transit_ppm", "floor_ppm"):
        table[name] = Column(_joined(spectra, name), unit="1e-6")
    table["usable"] = _joined(spectra, "usable")
    heights = np.repeat([spectrum.scale_height_ppm for spectrum in spectra], counts)
    table["scale_height_ppm"] = Column(heights, unit="1e-6")
    return table


def sigma_table(
    wavenumber_per_cm: NDArray[np.float64], cross_section_cm2: NDArray[np.float64], meta: Mapping[str, Any]
) -> Table:
    """Cross-sections: the wavenumber first, the cross-section last; both of shape ``(wavenumber,)``."""
    table = Table(meta=dict(meta))
    table["wavenumber_per_cm"] = Column(wavenumber_per_cm, unit="cm-1")
    table["cross_section_cm2"] = Column(cross_section_cm2, unit="cm2")
    return table


def plan_meta(result: PlanResult) -> dict[str, Any]:
    """What a reader of the table must know beside the rows."""
    return {
        "title": result.title,
        "invented": result.invented,
        "threshold_sigma": result.threshold_sigma,
        "power": result.power,
        "significance": "one-sided",
        "transits_available": result.transits_available,
        "transit_duration_h": result.transit_duration_h,
        "charged_hours_per_transit": result.charged_hours_per_transit,
        "scale_height_km": result.scale_height_km,
        "scale_height_ppm": result.scale_height_ppm,
        "nuisances": dict(result.nuisances),
        "assumptions": list(result.assumptions),
        "line_data": list(result.line_data),
        "cautions": list(result.cautions),
        "limbcast": result.version,
    }


def _add_counts(table: Table, counts: Sequence[Counts], suffix: str) -> None:
    for name, (unit, kind) in _COUNTS.items():
        values = [getattr(count, name) for count in counts]
        mask = [value is None for value in values]
        filled = [kind(0) if value is None else kind(value) for value in values]
        column = MaskedColumn(filled, mask=mask, unit=unit) if any(mask) else Column(filled, unit=unit)
        table[name + suffix] = column


def _joined(spectra: Sequence[BinnedSpectrum], name: str) -> NDArray[Any]:
    return np.concatenate([getattr(spectrum, name) for spectrum in spectra])


def _share(spectra: Sequence[BinnedSpectrum], gas: str) -> Column:
    parts = [np.asarray(s.shares_ppm.get(gas, np.full(s.from_um.size, math.nan))) for s in spectra]
    values = np.concatenate(parts)
    lacking = np.isnan(values)
    if lacking.any():
        return MaskedColumn(np.where(lacking, 0.0, values), mask=lacking, unit="1e-6")
    return Column(values, unit="1e-6")
