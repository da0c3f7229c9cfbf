"""A contrast between two atmospheres as JSON.

One object; quantities carry their unit in the key, ``null`` stands for what no number of transits reaches and for a
limit that is not there. Significances are one-sided.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast contrast 1"``; version of the program
``a``, ``b``                            ``title``, ``air`` (list of ``gas``, ``mixing_ratio``), ``held`` (gases held as
                                        stated), ``nuisances`` (list of ``name``, ``prior``)
``invented``                            true when a target is made up
``threshold_sigma``, ``power``          significance asked for, and the probability of reaching it
``transits_available``                  or null
``transit_duration_h``                  first to fourth contact
``rows``                                one object per mode, see below
``line_data``, ``assumptions``          lists of sentences
``cautions``                            list of sentences
======================================  ==============================================================================

Each row:

======================================  ==============================================================================
``mode``, ``verdict``                   as in a plan
``transits_required``                   enough to rule out the wrong one, whichever it is, or null
``hours_required``                      as charged, or null
``b_excluded``                          if A is true: ``snr_one_transit``, ``snr_limit``, ``transits_required``,
                                        ``transits_unrounded``, ``hours_required``, ``in_transit_hours_required``
``a_excluded``, ``all_known``           the same if B is true, and with everything known
``best_bands``                          list of ``from_um``, ``to_um``, ``share`` of the information
``confusion``                           list of ``nuisance``, ``snr_left``, dearest first, and
``confused_from``, ``confused_to``      S/N with all known and with all unknown, at the transits that would do if known
``uncovered``, ``saturated``            stretches: ``gas``, ``from_um``, ``to_um``
``bins``                                lists of one length: ``from_um``, ``to_um``, ``depth_a_ppm``, ``depth_b_ppm``,
                                        ``left_ppm`` (what of A less B nothing can imitate), ``share`` (in the squared
                                        significance), ``noise_ppm`` after ``transits`` (floor included; null where
                                        there is no light)
======================================  ==============================================================================
"""

from __future__ import annotations

import json
import math
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.report.files import write_text
from planner.studies.contrasts import ContrastResult, ContrastRow, ContrastSpectrum
from planner.studies.results import Counts

__all__ = ["contrast_json", "write_contrast_json"]


def contrast_json(result: ContrastResult) -> str:
    """The contrast as indented JSON text with a newline at its end; the layout is the module's docstring."""
    tree = {
        "format": "limbcast contrast 1",
        "version": result.version,
        "a": _atmosphere(result.title_a, result.gases_a, result.held_a, result.nuisances_a),
        "b": _atmosphere(result.title_b, result.gases_b, result.held_b, result.nuisances_b),
        "invented": result.invented,
        "threshold_sigma": result.threshold_sigma,
        "power": result.power,
        "transits_available": result.transits_available,
        "transit_duration_h": result.transit_duration_h,
        "rows": [_row(row, spectrum) for row, spectrum in zip(result.rows, result.spectra, strict=True)],
        "line_data": list(result.line_data),
        "assumptions": list(result.assumptions),
        "cautions": list(result.cautions),
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_contrast_json(result: ContrastResult, path: str | Path) -> None:
    """Write `contrast_json` to a file.

    Raises
    ------
    OutputError
        If the file cannot be written.
    """
    write_text(path, contrast_json(result))


def _atmosphere(
    title: str, gases: tuple[tuple[str, float], ...], held: tuple[str, ...], nuisances: tuple[tuple[str, str], ...]
) -> dict[str, Any]:
    return {
        "title": title,
        "air": [{"gas": gas, "mixing_ratio": ratio} for gas, ratio in gases],
        "held": list(held),
        "nuisances": [{"name": name, "prior": prior} for name, prior in nuisances],
    }


def _row(row: ContrastRow, spectrum: ContrastSpectrum) -> dict[str, Any]:
    return {
        "mode": row.mode,
        "verdict": row.verdict.value,
        "transits_required": row.transits_required,
        "hours_required": row.hours_required,
        "b_excluded": _counts(row.b_excluded),
        "a_excluded": _counts(row.a_excluded),
        "all_known": _counts(row.all_known),
        "best_bands": [{"from_um": b.from_um, "to_um": b.to_um, "share": b.share} for b in row.best_bands],
        "confusion": [{"nuisance": name, "snr_left": snr} for name, snr in row.confusion],
        "confused_from": row.confused_from,
        "confused_to": row.confused_to,
        "uncovered": [{"gas": gas, "from_um": a, "to_um": b} for gas, a, b in row.uncovered_um],
        "saturated": [{"from_um": a, "to_um": b} for a, b in row.saturated_um],
        "bins": _bins(spectrum),
    }


def _bins(spectrum: ContrastSpectrum) -> dict[str, Any]:
    names = ("from_um", "to_um", "depth_a_ppm", "depth_b_ppm", "left_ppm", "share")
    return {
        "transits": spectrum.transits,
        **{name: getattr(spectrum, name).tolist() for name in names},
        "noise_ppm": _finite(np.sqrt(spectrum.noise_one_transit_ppm**2 / spectrum.transits + spectrum.floor_ppm**2)),
    }


def _finite(values: NDArray[np.float64]) -> list[float | None]:
    return [value if math.isfinite(value) else None for value in values.tolist()]


def _counts(counts: Counts) -> dict[str, Any]:
    return {key: None if value == math.inf else value for key, value in asdict(counts).items()}
