"""Simulated observations in the table and the JSON of a plan."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from planner.report.jsonio import plan_json
from planner.report.table import plan_text
from planner.studies.results import Simulation

SIMULATION = Simulation(
    transits=18,
    draws=2000,
    power_stated=0.532,
    power_found=0.5275,
    power_error=0.0112,
    false_alarm_sigma=2.0,
    false_alarms_stated=0.02275,
    false_alarms_found=0.0245,
    false_alarms_error=0.0035,
    sigma_anywhere=5.81,
    snr_stated=5.08,
    sigma_edges=(-4.0, 0.0, 4.0, 8.0),
    counts_there=(0, 300, 1700),
    counts_absent=(1000, 1000, 0),
)


@pytest.fixture
def tried(fake_plan):
    """The made-up plan with its first search tried."""
    return replace(fake_plan, rows=(replace(fake_plan.rows[0], simulation=SIMULATION), *fake_plan.rows[1:]))


@pytest.mark.parametrize("width", [80, 120])
def test_block_in_the_table(tried, width):
    """Stated and found stand side by side, and nothing is cut."""
    text = plan_text(tried, width)
    block = text[text.index("Simulated observations") : text.index("Held unknown")]
    for word in ("2 000", "18", "53.2 %", "52.8±1.1", "2.27 %", "2.45±0.35", "5.8"):
        assert word in block
    assert max(map(len, text.splitlines())) <= width
    assert block.count("CH4") == 1


def test_no_block_unless_tried(fake_plan):
    """A plan without simulations does not speak of them."""
    assert "Simulated" not in plan_text(fake_plan)


def test_simulation_in_the_json(tried):
    """All figures leave as they are; null where none were made."""
    rows = json.loads(plan_json(tried))["rows"]
    assert rows[0]["simulation"]["power_found"] == 0.5275
    assert rows[0]["simulation"]["sigma_anywhere"] == 5.81
    assert rows[1]["simulation"] is None
