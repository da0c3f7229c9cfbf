"""Time to choose between all gases of the catalogue with three modes, tables stored; nothing is asserted about time."""

from __future__ import annotations

import time

import pytest

from planner.catalogue.read import list_gases
from planner.resources import data_folder
from planner.scenario import read_scenario
from planner.studies.choose import choose

MODES = ("near-infrared-prism", "mid-infrared-slitless", "grating-3-to-5-um")


@pytest.mark.benchmark
def test_choose_speed(capsys):
    """The demonstration planet; the first run builds what the store lacks."""
    scenario = read_scenario(data_folder("configs") / "scenarios" / "demo.toml").model_copy(update={"modes": MODES})
    with capsys.disabled():
        for run in ("first", "tables stored"):
            wall_s, cpu_s = time.perf_counter(), time.process_time()
            result = choose(scenario)
            wall_s, cpu_s = time.perf_counter() - wall_s, time.process_time() - cpu_s
            print(
                f"\nchoose, {len(list_gases())} gases, 3 modes, {run}: {wall_s:.1f} s, {cpu_s:.1f} s of processor time"
            )
            assert len(result.choices) + 3 * len(result.without_data) == 3 * len(list_gases())
