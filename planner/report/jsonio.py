"""A plan as JSON.

One object. Quantities carry their unit in the key; ``null`` stands for what no number of transits reaches, and for a
limit that is not there. Plain keys are marginalised over the nuisances; keys ending in ``_all_known`` take everything
but the gas as known. Significances are one-sided.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast plan 1"``; version of the program
``title``, ``invented``                 of the scenario; ``invented`` is true when the target is made up
``threshold_sigma``, ``power``          significance asked for, and the probability of reaching it
``transits_available``                  or null
``transit_duration_h``                  first to fourth contact
``charged_hours_per_transit``           transit, baseline, settling and overhead
``scale_height_km``                     at the planet's radius
``scale_height_ppm``                    transit depth of one scale height
``rows``                                one object per gas, mixing ratio and mode, see below
``line_data``, ``assumptions``          lists of sentences
``nuisances``                           list of ``name``, ``prior`` (width in words)
``spread_priors``                       the same of what the spread draws; empty unless asked for
``cautions``                            list of sentences
======================================  ==============================================================================

Each row:

======================================  ==============================================================================
``gas``, ``mixing_ratio``, ``mode``     formula, mole fraction, name of the mode
``verdict``                             ``"within reach"``, ``"more than the transits available"``,
                                        ``"unreachable (floor)"``, ``"unreachable (confusion)"``,
                                        ``"no band in range"`` or ``"saturated"``
``best_bands``                          list of ``from_um``, ``to_um``, ``share`` (of the information, all else known)
``snr_one_transit``                     expected significance of one transit
``snr_limit``                           that of infinitely many; null when nothing bounds it
``transits_required``                   smallest whole number, or null
``transits_unrounded``                  the real-valued solution, or null
``hours_required``                      as charged, or null
``in_transit_hours_required``           or null
the six above with ``_all_known``       the same with everything but the gas known
``confusion``                           list of ``nuisance``, ``snr_left``: what is left of the S/N when this alone is
                                        unknown, after as many transits as would do were all known; dearest first
``confused_from``, ``confused_to``      S/N at that number of transits with all known, and with all unknown together
``uncovered``                           list of ``gas``, ``from_um``, ``to_um``: stretches without data
``saturated``                           list of ``from_um``, ``to_um``
``cautions``                            list of sentences
``star``                                null, or what spots and faculae would do if not thought of: ``stated`` (by the
                                        scenario; else those usual for such a star), ``sigma`` of the gas feigned after
                                        ``transits`` (negative: hidden), ``of_the_gas`` (over the gas's own), ``alike``
                                        (cosine of the shapes beside all other unknowns), ``serious`` (one sigma and
                                        a fifth of the gas, or more)
``rivals``                              list of ``gas``, ``mixing_ratio``, ``snr_left`` of ``snr`` after ``transits``:
                                        gases of the catalogue that the air is not said to hold, each by itself
                                        unknown to that width; empty unless asked for
``remedies``                            list of what would help, each with ``kind`` (``"another mode as well"``,
                                        ``"a lower floor"``, ``"more of the gas"``, ``"a clearer sky"``), ``enough``,
                                        ``snr`` after ``transits``, ``says`` (the sentence) and what belongs to the
                                        kind, null elsewhere: ``mode``, ``band_um`` (from, to), ``transits_required``
                                        with each mode and ``hours_required`` in all; ``floor_factor``, ``floor_ppm``;
                                        ``mixing_ratio``; ``cloud_top_bar`` (null for no cloud at all)
``simulation``                          null, or what simulated observations gave beside what is stated: ``transits``
                                        of one observation, ``draws`` with the gas and as many without,
                                        ``power_stated``, ``power_found``, ``power_error`` (standard error),
                                        ``false_alarm_sigma`` and ``false_alarms_stated``, ``_found``, ``_error`` at it,
                                        ``sigma_anywhere``: local significance that counts as the threshold when the
                                        place of the feature was not chosen in advance; ``snr_stated`` with the gas;
                                        ``sigma_edges`` of bins, and ``counts_there``, ``counts_absent``: significances
                                        found with the gas and without
``spread``                              null, or what draws from the priors gave: ``draws``, ``seed``; ``transits_16``,
                                        ``transits_50``, ``transits_84`` (null where no number is enough);
                                        ``unreachable_share`` of the draws; ``chance_asked`` of passing the threshold
                                        with ``transits_asked`` (by the plan, or those on offer if fewer),
                                        ``chance_on_offer`` with ``transits_on_offer``; ``drivers``: list of ``name``,
                                        ``share`` in the variance of the ranks in S/N, largest first;
                                        ``transits_drawn``: of every draw, ascending, null where no number is enough;
                                        ``chances``: list of transits and the chance of passing the threshold with them
======================================  ==============================================================================
"""

from __future__ import annotations

import json
import math
from dataclasses import asdict
from pathlib import Path
from typing import Any

from planner.report.files import write_text
from planner.report.remedies import remedy_text
from planner.studies.results import Counts, PlanResult, PlanRow, Remedy

__all__ = ["plan_json", "write_plan_json"]


def plan_json(result: PlanResult) -> str:
    """The plan as indented JSON text with a newline at its end; the layout is the module's docstring."""
    tree = {
        "format": "limbcast plan 1",
        "version": result.version,
        "title": result.title,
        "invented": result.invented,
        "threshold_sigma": result.threshold_sigma,
        "power": result.power,
        "transits_available": result.transits_available,
        "transit_duration_h": result.transit_duration_h,
        "charged_hours_per_transit": result.charged_hours_per_transit,
        "scale_height_km": result.scale_height_km,
        "scale_height_ppm": result.scale_height_ppm,
        "rows": [_row(row) for row in result.rows],
        "line_data": list(result.line_data),
        "assumptions": list(result.assumptions),
        "nuisances": [{"name": name, "prior": prior} for name, prior in result.nuisances],
        "spread_priors": [{"name": name, "prior": prior} for name, prior in result.spread_priors],
        "cautions": list(result.cautions),
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_plan_json(result: PlanResult, path: str | Path) -> None:
    """Write `plan_json` to a file.

    Raises
    ------
    OutputError
        If the file cannot be written.
    """
    write_text(path, plan_json(result))


def _row(row: PlanRow) -> dict[str, Any]:
    return {
        "gas": row.gas,
        "mixing_ratio": row.mixing_ratio,
        "mode": row.mode,
        "verdict": row.verdict.value,
        "best_bands": [{"from_um": b.from_um, "to_um": b.to_um, "share": b.share} for b in row.best_bands],
        **_counts(row.marginalised, ""),
        **_counts(row.all_known, "_all_known"),
        "confusion": [{"nuisance": name, "snr_left": snr} for name, snr in row.confusion],
        "confused_from": row.confused_from,
        "confused_to": row.confused_to,
        "uncovered": [{"gas": gas, "from_um": a, "to_um": b} for gas, a, b in row.uncovered_um],
        "saturated": [{"from_um": a, "to_um": b} for a, b in row.saturated_um],
        "cautions": list(row.cautions),
        "star": asdict(row.star) if row.star else None,
        "rivals": [asdict(rival) for rival in row.rivals],
        "remedies": [_remedy(remedy, row) for remedy in row.remedies],
        "simulation": asdict(row.simulation) if row.simulation else None,
        "spread": asdict(row.spread) if row.spread else None,
    }


def _remedy(remedy: Remedy, row: PlanRow) -> dict[str, Any]:
    values = asdict(remedy) | {"kind": remedy.kind.value, "says": remedy_text(remedy, row)}
    return {key: None if value == math.inf else value for key, value in values.items()}


def _counts(counts: Counts, suffix: str) -> dict[str, float | int | None]:
    values = {
        "snr_one_transit": counts.snr_one_transit,
        "snr_limit": counts.snr_limit if math.isfinite(counts.snr_limit) else None,
        "transits_required": counts.transits_required,
        "transits_unrounded": counts.transits_unrounded,
        "hours_required": counts.hours_required,
        "in_transit_hours_required": counts.in_transit_hours_required,
    }
    return {key + suffix: value for key, value in values.items()}
