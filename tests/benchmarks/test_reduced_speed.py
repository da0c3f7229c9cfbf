"""Forward models a minute on reduced opacity, the time to choose it, and its error; nothing is asserted about time."""

from __future__ import annotations

import time

import pytest

from planner.pool import in_threads
from planner.resources import data_folder
from planner.scenario import read_scenario
from planner.studies.domain import domain_of
from planner.studies.forward import Change
from planner.studies.reduced import _Choice, reduce_opacity
from planner.studies.spread import draw_searches
from planner.studies.workshop import Workshop

MODELS, DRAWS = 400, 64


@pytest.mark.benchmark
def test_models_a_minute(capsys):
    """The demonstration, both modes: choice of the samples, models at one temperature and at many, whole searches."""
    scenario = read_scenario(data_folder("configs") / "scenarios" / "demo.toml")
    workshop = Workshop(scenario)
    domain = domain_of(scenario, temperature=True)
    reduced = reduce_opacity(workshop, domain)  # builds the tables, which is not what is measured
    choosing, _ = timed(_Choice(workshop, domain, lambda text, share: None).make)
    model, case = reduced.model, scenario.cases[0]
    model.binned(case)
    steady, _ = timed(lambda: in_threads(lambda k: model.binned(case, Change(gravity=1 + 1e-4 * k)), range(MODELS)))
    warming, _ = timed(
        lambda: in_threads(lambda k: model.binned(case, Change(temperature=1 + 1e-4 * k)), range(MODELS))
    )
    draw_searches(reduced, case, draws=DRAWS, seed=1)  # tables at the temperatures of the draws
    searching, _ = timed(lambda: draw_searches(reduced, case, draws=DRAWS, seed=2))
    with capsys.disabled():
        print(f"\n{reduced.error.sentence}")
        print(f"choice (wall, processor): {choosing[0]:.1f} s, {choosing[1]:.1f} s")
        for name, (wall, cpu), number in (
            ("models, one temperature", steady, MODELS),
            ("models, a new temperature each", warming, MODELS),
            ("draws of a whole search, nuisances and all", searching, DRAWS),
        ):
            print(f"{name}: {60 * number / wall:.0f} a minute, {1e3 * cpu / number:.1f} ms of processor each")
    assert reduced.error.typical < 0.05


def timed(work):
    """Wall and processor time of some work, and its result."""
    wall, cpu = time.perf_counter(), time.process_time()
    result = work()
    return (time.perf_counter() - wall, time.process_time() - cpu), result
