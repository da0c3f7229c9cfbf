"""A plan as JSON: keys, values, and strictness."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from planner.errors import OutputError
from planner.report import jsonio
from planner.report.jsonio import plan_json, write_plan_json

COUNT_KEYS = (
    "snr_one_transit",
    "snr_limit",
    "transits_required",
    "transits_unrounded",
    "hours_required",
    "in_transit_hours_required",
)
ROW_KEYS = {
    "gas",
    "mixing_ratio",
    "mode",
    "verdict",
    "best_bands",
    *COUNT_KEYS,
    *(f"{key}_all_known" for key in COUNT_KEYS),
    "confusion",
    "uncovered",
    "saturated",
    "cautions",
    "confused_from",
    "confused_to",
    "star",
    "rivals",
    "remedies",
    "simulation",
    "spread",
}


def test_round_trip(fake_plan):
    """Every number comes back exactly as it went out."""
    tree = json.loads(plan_json(fake_plan))
    assert tree["format"] == "limbcast plan 1"
    for name in ("title", "invented", "threshold_sigma", "power", "transits_available", "version", "scale_height_ppm"):
        assert tree[name] == getattr(fake_plan, name)
    assert len(tree["rows"]) == len(fake_plan.rows)
    for entry, row in zip(tree["rows"], fake_plan.rows, strict=True):
        assert (entry["gas"], entry["mixing_ratio"], entry["mode"]) == (row.gas, row.mixing_ratio, row.mode)
        assert entry["verdict"] == row.verdict
        for suffix, counts in (("", row.marginalised), ("_all_known", row.all_known)):
            for key in COUNT_KEYS:
                value = getattr(counts, key)
                assert entry[key + suffix] == (None if value == float("inf") else value)
        assert entry["best_bands"] == [
            {"from_um": b.from_um, "to_um": b.to_um, "share": b.share} for b in row.best_bands
        ]


def test_rows_have_all_keys_and_no_other(fake_plan):
    """The layout is fixed: the same keys in every row."""
    assert all(set(entry) == ROW_KEYS for entry in json.loads(plan_json(fake_plan))["rows"])


def test_every_key_is_documented(fake_plan):
    """The module's docstring names every key of the file and of the rows."""
    for key in {*json.loads(plan_json(fake_plan)), *ROW_KEYS}:
        if not key.endswith("_all_known"):
            assert f"``{key}``" in jsonio.__doc__, key


def test_unbounded_and_unreachable_are_null(fake_plan):
    """JSON has no infinity: what is not bounded and what is never reached are null."""
    text = plan_json(fake_plan)
    assert "Infinity" not in text
    assert "NaN" not in text
    rows = json.loads(text)["rows"]
    assert rows[0]["snr_limit_all_known"] is None
    assert rows[2]["transits_required"] is None
    assert rows[2]["hours_required"] is None


def test_not_a_number_is_refused(fake_plan):
    """A NaN is a fault of the program and must not slip into a file."""
    with pytest.raises(ValueError, match="Out of range float"):
        plan_json(replace(fake_plan, scale_height_km=float("nan")))


def test_write(fake_plan, tmp_path):
    """The file holds the text; a missing folder is refused."""
    write_plan_json(fake_plan, tmp_path / "plan.json")
    assert (tmp_path / "plan.json").read_text(encoding="utf-8") == plan_json(fake_plan)
    with pytest.raises(OutputError, match="does not exist"):
        write_plan_json(fake_plan, tmp_path / "none" / "plan.json")
