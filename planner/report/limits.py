"""Limits as tables and as JSON.

JSON: one object. ``null`` stands for what no mixing ratio of the range reaches. Significances are one-sided.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast limit 1"``; version of the program
``title``, ``invented``                 of the scenario
``threshold_sigma``, ``power``          as for a plan
``confidence``                          of the upper limits
``curves``                              one object per gas (or set of gases) and mode, see below
``nuisances``                           list of ``name``, ``prior`` (width in words)
``line_data``, ``assumptions``          lists of sentences
``cautions``                            list of sentences
======================================  ==============================================================================

Each curve: ``gas``, ``mode``, ``stated_ratios`` (those of the scenario), ``detectable_at_all`` (after infinitely many
transits), ``obstacle`` (null, ``"clouds too high"``, ``"confusion"``, ``"floor"`` or ``"no band in range"``) with
``obstacle_words``; ``points`` and ``at_best`` (with all transits on offer), each with ``transits``, ``hours``
(charged), ``detectable_ratio`` (smallest that passes the threshold with the chance asked for) and
``upper_limit_ratio`` (what a null result leaves); ``scale_height_ppm``; and the curve of growth as lists of one
length: ``ratios``, ``feature_ppm`` (largest share in a bin), ``snr_one_transit``, ``snr_on_offer``. Mixing ratios are
those of the first gas of a set, the others keep their proportion to it.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import asdict
from pathlib import Path
from typing import Any

import numpy as np
from astropy.table import Column, MaskedColumn, Table

from planner.report.files import write_text
from planner.studies.outcomes import LimitCurve, LimitResult

__all__ = ["growth_table", "limit_json", "limit_table", "write_limit_json"]


def limit_table(result: LimitResult) -> Table:
    """A row per gas, mode and number of transits; ratios that are not reached are masked."""
    rows = [(curve, point) for curve in result.curves for point in curve.points]
    table = Table(meta=_meta(result))
    table["gas"] = [curve.gas for curve, _ in rows]
    table["mode"] = [curve.mode for curve, _ in rows]
    table["transits"] = [point.transits for _, point in rows]
    table["hours"] = Column([point.hours for _, point in rows], unit="h")
    table["detectable_ratio"] = _masked([point.detectable_ratio for _, point in rows])
    table["upper_limit_ratio"] = _masked([point.upper_limit_ratio for _, point in rows])
    table["detectable_at_all"] = _masked([curve.detectable_at_all for curve, _ in rows])
    table["obstacle"] = [curve.obstacle.value if curve.obstacle else "" for curve, _ in rows]
    return table


def growth_table(result: LimitResult) -> Table:
    """The curves of growth one below the other, a row per mixing ratio."""
    curves, counts = result.curves, [curve.ratios.size for curve in result.curves]
    table = Table(meta=_meta(result))
    table["gas"] = np.repeat([curve.gas for curve in curves], counts)
    table["mode"] = np.repeat([curve.mode for curve in curves], counts)
    table["mixing_ratio"] = np.concatenate([curve.ratios for curve in curves])
    table["feature_ppm"] = Column(np.concatenate([curve.feature_ppm for curve in curves]), unit="1e-6")
    table["snr_one_transit"] = np.concatenate([curve.snr_one_transit for curve in curves])
    table["snr_on_offer"] = np.concatenate([curve.snr_on_offer for curve in curves])
    return table


def limit_json(result: LimitResult) -> str:
    """The limits as indented JSON text with a newline at its end; the layout is the module's docstring."""
    tree = {
        "format": "limbcast limit 1",
        "version": result.version,
        **_plain(result),
        "curves": [_curve(curve) for curve in result.curves],
        "nuisances": [{"name": name, "prior": prior} for name, prior in result.nuisances],
        "line_data": list(result.line_data),
        "assumptions": list(result.assumptions),
        "cautions": list(result.cautions),
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_limit_json(result: LimitResult, path: str | Path) -> None:
    """Write `limit_json` to a file.

    Raises
    ------
    OutputError
        If the file cannot be written.
    """
    write_text(path, limit_json(result))


def _curve(curve: LimitCurve) -> dict[str, Any]:
    return {
        "gas": curve.gas,
        "mode": curve.mode,
        "stated_ratios": list(curve.stated_ratios),
        "detectable_at_all": curve.detectable_at_all,
        "obstacle": curve.obstacle.value if curve.obstacle else None,
        "obstacle_words": curve.obstacle_words,
        "points": [asdict(point) for point in curve.points],
        "at_best": asdict(curve.at_best),
        "scale_height_ppm": curve.scale_height_ppm,
        "ratios": curve.ratios.tolist(),
        "feature_ppm": curve.feature_ppm.tolist(),
        "snr_one_transit": curve.snr_one_transit.tolist(),
        "snr_on_offer": curve.snr_on_offer.tolist(),
    }


def _plain(result: LimitResult) -> dict[str, Any]:
    keys = ("title", "invented", "threshold_sigma", "power", "confidence")
    return {key: getattr(result, key) for key in keys}


def _meta(result: LimitResult) -> dict[str, Any]:
    return {
        **_plain(result),
        "significance": "one-sided",
        "nuisances": dict(result.nuisances),
        "assumptions": list(result.assumptions),
        "line_data": list(result.line_data),
        "cautions": list(result.cautions),
        "limbcast": result.version,
    }


def _masked(values: Sequence[float | None]) -> MaskedColumn:
    return MaskedColumn([value or 0.0 for value in values], mask=[value is None for value in values])
