"""A fit as JSON.

One object; quantities carry their unit in the key, ``null`` stands for what is not there.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast fit 1"``; version of the program
``title``, ``invented``, ``spectrum``   of the scenario; name of the spectrum's file
``seed``, ``live``                      of the sampling; live points
``parameters``                          list of ``name``, ``unit``, ``prior`` (in words), ``median``, ``range_68``,
                                        ``range_95`` (two ends each), ``upper_95`` (null unless the gas is not told
                                        from none), ``low_end_share`` (posterior over prior in the lowest fifth of the
                                        prior's range); offsets of detectors last
``evidences``                           list of ``without`` (formula or null), ``ln_evidence``, ``error``,
                                        ``information``, ``parameters``, ``evaluations``, ``effective_size``
``ln_bayes``, ``ln_bayes_error``        for the gas in question, or null
``goodness``                            ``chi2``, ``bins``, ``parameters``, ``p_value``, ``neighbours``,
                                        ``neighbours_sigma``, ``largest`` (list of ``from_um``, ``to_um``, ``sigma``),
                                        ``verdict``
``recheck``                             ``draws`` on the full grid, ``effective_size``, ``ln_evidence_shift``,
                                        ``shifts`` (by parameter, in posterior widths), ``worst_ppm``
``bins``                                lists of one length: ``from_um``, ``to_um``, ``depth_ppm``, ``error_ppm``,
                                        ``best_ppm``, ``left_out_ln_density``, ``left_out_gain`` (or null),
                                        ``left_out_size``, ``trusted``, ``left_out_shift`` (by gas)
``line_data``, ``assumptions``          lists of sentences
``cautions``                            list of sentences
======================================  ==============================================================================
"""

from __future__ import annotations

import json
from dataclasses import asdict
from typing import Any

from planner.studies.fitting.records import BinReport, FitResult, Found

__all__ = ["fit_json"]


def fit_json(result: FitResult) -> str:
    """The fit as indented JSON text with a newline at its end; the layout is the module's docstring."""
    ln_bayes, error = result.ln_bayes or (None, None)
    tree = {
        "format": "limbcast fit 1",
        "version": result.version,
        "title": result.title,
        "invented": result.invented,
        "spectrum": result.spectrum,
        "seed": result.seed,
        "live": result.live,
        "parameters": [_parameter(found) for found in (*result.found, *result.offsets)],
        "evidences": [asdict(evidence) for evidence in result.evidences],
        "ln_bayes": ln_bayes,
        "ln_bayes_error": error,
        "goodness": asdict(result.goodness),
        "recheck": asdict(result.recheck) | {"shifts": dict(result.recheck.shifts)},
        "bins": _bins(result.bins),
        "line_data": list(result.line_data),
        "assumptions": list(result.assumptions),
        "cautions": list(result.cautions),
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _parameter(found: Found) -> dict[str, Any]:
    return {
        "name": found.name,
        "unit": found.unit,
        "prior": found.prior,
        "median": found.median,
        "range_68": [found.low_68, found.high_68],
        "range_95": [found.low_95, found.high_95],
        "upper_95": found.upper_95,
        "low_end_share": found.low_end_share,
    }


def _bins(bins: BinReport) -> dict[str, Any]:
    names = (
        "from_um",
        "to_um",
        "depth_ppm",
        "error_ppm",
        "best_ppm",
        "left_out_ln_density",
        "left_out_size",
        "trusted",
    )
    return {
        **{name: getattr(bins, name).tolist() for name in names},
        "left_out_gain": bins.left_out_gain.tolist() if bins.left_out_gain is not None else None,
        "left_out_shift": dict(zip(bins.gases, bins.left_out_shift.tolist(), strict=True)),
    }
