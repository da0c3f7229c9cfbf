"""Timings of everything that is smooth on a grid of 150,000 points. Prints, asserts no time."""

from __future__ import annotations

import time
import tomllib

import numpy as np
import pytest

from planner.resources import data_folder
from planner.spectroscopy.collisions import collision_coefficient, collision_pairs
from planner.spectroscopy.lists.contours import contour_cross_section
from planner.spectroscopy.rayleigh import rayleigh_cross_section, rayleigh_gases
from planner.spectroscopy.watercontinuum import water_continuum

GRID_PER_CM = np.exp(np.log(300.0) + 2e-5 * np.arange(150_000))


def milliseconds(work):
    """Best of three runs."""
    best = np.inf
    for _ in range(3):
        start = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - start)
    return 1e3 * best


@pytest.mark.benchmark
def test_smooth_timings():
    """Contours of the richest molecules, all pairs, all scatterers and the water continuum."""
    for formula in ("C2F6", "CHF3", "C5H8", "CCl3F"):
        parts = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())["part"]
        spent = milliseconds(lambda parts=parts: [contour_cross_section(p, GRID_PER_CM, 250.0) for p in parts])
        print(f"contours of {formula}: {spent:.1f} ms")
    for pair in collision_pairs():
        spent = milliseconds(lambda pair=pair: collision_coefficient(pair, GRID_PER_CM, 250.0))
        print(f"collisions {pair[0]}-{pair[1]}: {spent:.1f} ms")
    spent = milliseconds(lambda: [rayleigh_cross_section(gas, GRID_PER_CM) for gas in rayleigh_gases()])
    print(f"Rayleigh scattering of {len(rayleigh_gases())} gases: {spent:.1f} ms")
    print(f"water continuum: {milliseconds(lambda: water_continuum(GRID_PER_CM, 250.0)):.1f} ms")
