"""A choice between gases as a table that leaves as ECSV or CSV: a row per gas and mode."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from astropy.table import Column, MaskedColumn, Table

from planner.report.words import bands_text
from planner.studies.choices import ChoiceResult

__all__ = ["choice_table"]


def choice_table(result: ChoiceResult) -> Table:
    """The rows of a choice, most worth first; columns as the keys of `planner.report.choicejson`.

    What no amount or number of transits reaches is masked.
    """
    rows = result.choices
    table = Table(meta=_meta(result))
    for name in ("gas", "mode", "mixing_ratio"):
        table[name] = [getattr(row, name) for row in rows]
    for end, name in enumerate(("mixing_ratio_lowest", "mixing_ratio_highest")):
        table[name] = [row.mixing_ratio_range[end] for row in rows]
    table["tells"] = [row.tells for row in rows]
    table["verdict"] = [row.plan.verdict.value for row in rows]
    for suffix, counts in (
        ("", [row.plan.marginalised for row in rows]),
        ("_all_known", [row.plan.all_known for row in rows]),
    ):
        table["transits_required" + suffix] = _masked([count.transits_required for count in counts])
        table["hours_required" + suffix] = _masked([count.hours_required for count in counts], "h")
    for name in ("transits", "snr", "uniqueness", "wins"):
        table[name] = [getattr(row, name) for row in rows]
    for name in ("reachable_ratio", "limit_ratio", "excluded_ratio"):
        table[name] = _masked([getattr(row, name) for row in rows])
    for name in ("amplitude_bits", "detection_bits", "after_detection", "after_null"):
        table[name] = [float(getattr(row.worth, name)) for row in rows]
    for end, name in enumerate(("amplitude_bits_16", "amplitude_bits_84")):
        table[name] = [row.bits_spread[end] for row in rows]
    table["resembling"] = [row.resembling.gas if row.resembling else "" for row in rows]
    table["best_bands_um"] = [bands_text(row.plan.best_bands) for row in rows]
    return table


def _masked(values: Sequence[float | None], unit: str | None = None) -> Column:
    mask = [value is None for value in values]
    filled = np.array([0 if value is None else value for value in values])
    return MaskedColumn(filled, mask=mask, unit=unit) if any(mask) else Column(filled, unit=unit)


def _meta(result: ChoiceResult) -> dict[str, object]:
    plain = ("title", "invented", "hypothesis", "prior", "most_bits", "hours", "threshold_sigma", "power", "opinions")
    lists = ("prior_range", "without_data", "accuracy", "assumptions", "line_data", "cautions")
    return {
        **{key: getattr(result, key) for key in plain},
        **{key: list(getattr(result, key)) for key in lists},
        "nuisances": dict(result.nuisances),
        "limbcast": result.version,
    }
