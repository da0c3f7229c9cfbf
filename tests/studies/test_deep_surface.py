"""Surfaces under more than 10 bar, where the tables need more rows."""

from __future__ import annotations

import numpy as np
import pytest
from small_system import NARROW

from planner.scenario import parse_scenario
from planner.spectroscopy.opacity import pressure_rows
from planner.studies.workshop import Workshop


def test_rows_reach_what_is_asked_for():
    """Three a decade, the usual ones unchanged, and none more than needed."""
    usual, deep = pressure_rows(), pressure_rows(92.0)
    assert usual[-1] == pytest.approx(10.0)
    assert deep[: usual.size] == pytest.approx(usual, rel=1e-12)
    assert deep[-2] < 92.0 <= deep[-1]
    assert np.diff(np.log10(deep[1:])) == pytest.approx(1 / 3)


def test_deep_surface_without_refraction():
    """Under 92 bar the air is opaque far above the surface, in every bin; under 0.1 bar it is not."""
    heights = []
    for pressure in ("92 bar", "0.1 bar"):
        text = NARROW.replace('"1 bar"', f'"{pressure}"').replace(
            "surface = true", "surface = true\nrefraction = false"
        )
        scenario = parse_scenario(text)
        case = scenario.cases[0]
        depth = Workshop(scenario).thin.binned(case)[0].depth_ppm
        bare = 1e6 * scenario.radius_ratio**2
        heights.append((depth - bare) / scenario.scale_height_ppm(case))
    assert heights[0].min() > 1.0 > heights[1].min()
