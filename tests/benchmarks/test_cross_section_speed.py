"""Times of the cross-section kernel, against hapi's own Voigt routine and against a million lines.

Run ``pytest -m benchmark -s tests/benchmarks/test_cross_section_speed.py``. The accuracy asserted here is part of the
budget; the times are printed, not asserted. The lines are invented.
"""

from __future__ import annotations

import contextlib
import io
import json
import math
import os
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pytest

from planner.spectroscopy import crosssections
from planner.spectroscopy.crosssections import cross_sections, reference_cross_sections
from planner.spectroscopy.hitran import format_par, parse_par, write_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import quiet_hapi

pytestmark = pytest.mark.benchmark

ATM = 1.01325  # bar
TEMPERATURE_K = 250.0


def invented_lines(count: int, low: float, high: float) -> Lines:
    """Lines of methane with nine decades of intensity; unshifted, since hapi cuts wings from the unshifted centre."""
    rng = np.random.default_rng(0)
    return Lines.make(
        molecule=6,
        isotopologue=1,
        wavenumber_per_cm=rng.uniform(low, high, count),
        intensity_cm=10.0 ** rng.uniform(-28, -19, count),
        lower_energy_per_cm=rng.uniform(0.0, 2000.0, count),
        air_width_per_cm_atm=rng.uniform(0.03, 0.12, count),
        temperature_exponent=rng.uniform(0.5, 0.9, count),
    )


def best_of(times: int, function) -> tuple[float, float]:
    """Shortest wall and processor seconds of several runs, so that the load of others counts least."""
    seconds = []
    for _ in range(times):
        wall, cpu = time.perf_counter(), time.process_time()
        function()
        seconds.append((time.perf_counter() - wall, time.process_time() - cpu))
    walls, cpus = zip(*seconds, strict=True)
    return min(walls), min(cpus)


def hapi_seconds(lines: Lines, grid: np.ndarray, pressure_atm: float) -> tuple[float, float, np.ndarray]:
    """Wall and processor seconds of hapi's routine, called once as its manual does, and its cross-section."""
    hapi = quiet_hapi()
    with tempfile.TemporaryDirectory() as folder, contextlib.redirect_stdout(io.StringIO()):
        write_par(Path(folder) / "bench.data", lines)
        header = hapi.HITRAN_DEFAULT_HEADER | {"table_name": "bench"}
        (Path(folder) / "bench.header").write_text(json.dumps(header))
        hapi.db_begin(folder)
        wall, cpu = time.perf_counter(), time.process_time()
        _, values = hapi.absorptionCoefficient_Voigt(
            SourceTables="bench",
            Environment={"T": TEMPERATURE_K, "p": pressure_atm},
            WavenumberGrid=grid,
            WavenumberWing=25.0,
            WavenumberWingHW=0.0,
            IntensityThreshold=0.0,
            HITRAN_units=True,
            Diluent={"air": 1.0},
            partitionFunction=hapi.PYTIPS2021,
        )
        return time.perf_counter() - wall, time.process_time() - cpu, np.asarray(values)


@pytest.mark.parametrize("pressure_atm", [1.0, 0.01])
def test_against_hapi(monkeypatch, pressure_atm):
    """20,000 lines on 20,001 points, wing 25 per cm, no cut in intensity: ratio of times, largest errors.

    Both get the same lines as read from the same records, the same grid, temperature, pressure and wing. hapi's tables
    are in its memory, ours have been read; what either does with a line's intensity and width at that temperature
    is inside the time. hapi runs in one thread, as it is made; ours in one, and in as many as there are cores.
    """
    lines = parse_par(format_par(invented_lines(20_000, 2900.0, 3100.0)), "bench")
    grid = np.linspace(2900.0, 3100.0, 20_001)
    kwargs = {"temperature_k": TEMPERATURE_K, "pressures_bar": [pressure_atm * ATM]}
    ours = cross_sections(lines, grid, **kwargs)[0]
    slow = reference_cross_sections(lines, grid, **kwargs)[0]
    hapi_wall, hapi_cpu, theirs = hapi_seconds(lines, grid, pressure_atm)
    counts = slow > 1e-6 * slow.max()
    error, its_error = (np.max(np.abs(values / slow - 1.0)[counts]) for values in (ours, theirs))
    print(f"\n{pressure_atm:g} atm: hapi {hapi_wall:.1f} s of wall time, {hapi_cpu:.1f} s of processor")
    for threads in (1, crosssections._threads()):
        monkeypatch.setattr(crosssections, "_threads", lambda threads=threads: threads)
        wall, cpu = best_of(20, lambda: cross_sections(lines, grid, **kwargs))
        print(
            f"  {threads} thread(s): {1e3 * wall:.1f} ms of wall time, {1e3 * cpu:.1f} ms of processor: "
            f"{hapi_wall / wall:.0f} times faster by wall, {hapi_cpu / cpu:.0f} by processor"
        )
    print(
        f"  largest error against scipy's Voigt profile, above 1e-6 of the peak ({counts.mean():.0%} of points): "
        f"{error:.1e}; hapi's: {its_error:.1e}"
    )
    assert error < 1e-4


def test_a_million_lines():
    """A million lines, 22 pressures from 1e-6 to 10 bar, 110,000 points of the logarithmic grid."""
    lines = invented_lines(1_000_000, 1862.0, 16692.0)
    grid = np.exp(np.arange(math.log(1887.0), math.log(16667.0), 1.0 / 50_000))
    pressures = 10.0 ** np.linspace(-6, 1, 22)
    cross_sections(lines.where(slice(0, 10)), grid[:10], temperature_k=TEMPERATURE_K, pressures_bar=pressures)
    wall, cpu = time.perf_counter(), time.process_time()
    cross_sections(lines, grid, temperature_k=TEMPERATURE_K, pressures_bar=pressures)
    wall, cpu = time.perf_counter() - wall, time.process_time() - cpu
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1e6
    print(f"\na million lines: {wall:.1f} s of wall time, {cpu:.1f} s of CPU; peak memory {memory:.2f} GB")


def test_compile_time():
    """Import of the kernels with an empty cache, and again with what the first run kept."""
    code = (
        "import time; s, c = time.perf_counter(), time.process_time(); import numba\n"
        "m, d = time.perf_counter(), time.process_time(); import planner.spectroscopy._kernels\n"
        "print(f'numba {m - s:.2f} s, kernels {time.perf_counter() - m:.2f} s of wall time, '\n"
        "      f'{time.process_time() - d:.2f} s of CPU')"
    )
    with tempfile.TemporaryDirectory() as cache:
        for state in ("compiled", "loaded"):
            done = subprocess.run(
                [sys.executable, "-c", code],
                env=os.environ | {"NUMBA_CACHE_DIR": cache},
                capture_output=True,
                text=True,
                check=True,
            )
            print(f"\n{state}: {done.stdout.strip()}", end="")


def test_records():
    """Line records read and written in a second."""
    text = format_par(invented_lines(100_000, 2900.0, 3100.0))
    lines = parse_par(text, "bench")
    read, _ = best_of(3, lambda: parse_par(text, "bench"))
    wrote, _ = best_of(1, lambda: format_par(lines))
    print(f"\nline records: read {1e5 / read:,.0f} a second, wrote {1e5 / wrote:,.0f} a second")
