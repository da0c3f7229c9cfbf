"""How long a forward model takes; figures only."""

from __future__ import annotations

import time

import numpy as np
import pytest

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.transmission import transit_depth


@pytest.mark.slow
@pytest.mark.benchmark
@pytest.mark.parametrize(("size", "share_count"), [(110_000, 0), (110_000, 6), (3_000, 6)])
def test_forward_model(make_air, capsys, size, share_count):
    """Eight gases with tables of 22 pressures, two pairs: seconds of the clock and of the processor."""
    names = ["CO2", "H2O", "CH4", "O3", "N2O", "CO", "SO2", "NH3"]
    rows = 10.0 ** np.linspace(-6, 1, 22)
    rng = np.random.default_rng(0)
    gases = [
        GasOpacity(
            formula=name,
            pressures_bar=rows,
            log10_cross_section=rng.uniform(-26, -18, size) + np.log10(rows[:, None]) * rng.uniform(0, 1, size),
            flat_cross_section_cm2=np.full(size, 1e-27),
        )
        for name in names
    ]
    pairs = [
        PairOpacity(first=first, second=second, coefficient_cm5=np.full(size, 1e-45))
        for first, second in (("N2", "N2"), ("H2O", "*"))
    ]
    air = make_air(mixing_ratios=dict.fromkeys(names, 1e-4) | {"N2": 1 - 8e-4})
    arguments = {"wavenumber_per_cm": np.geomspace(1000, 9000, size), "star_radius_km": 8.3e4}
    clock, processor = [], []
    for _ in range(5):
        start = time.perf_counter(), time.process_time()
        found = transit_depth(air, gases, pairs, shares_of=names[:share_count], **arguments)
        clock.append(time.perf_counter() - start[0])
        processor.append(time.process_time() - start[1])
    assert np.all(np.isfinite(found.depth))
    with capsys.disabled():
        print(f"\n{size} wavenumbers, {share_count} shares: {min(clock):.4f} s clock, {min(processor):.4f} s processor")
