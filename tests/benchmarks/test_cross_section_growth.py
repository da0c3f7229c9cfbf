"""How the cost of cross-sections grows, drawn; how near the machine's peak it comes, and what holds it back.

Run ``LIMBCAST_FIGURES=folder pytest -m benchmark -s tests/benchmarks/test_cross_section_growth.py``: the figure
``cross_section_growth.png`` is written to the folder. Times are those of the processor in one thread, least of several
runs. The lines are invented. What is asserted is the error against the slow reference, never a time.
"""

from __future__ import annotations

import os
import time
from pathlib import Path

import numpy as np
import pytest
from matplotlib.figure import Figure
from matplotlib.ticker import NullFormatter
from threadpoolctl import threadpool_limits

from planner.spectroscopy import _kernels, crosssections
from planner.spectroscopy.crosssections import cross_sections, reference_cross_sections
from planner.spectroscopy.lines import Lines

pytestmark = pytest.mark.benchmark

LOW, HIGH = 2000.0, 4000.0  # per cm
BASE = {"lines": 30_000, "points": 34_657, "pressures": 6, "wing": 25.0}  # points of the grid of the forward model
STEPS = {
    "lines": [300, 1000, 3000, 10_000, 30_000, 100_000, 300_000],
    "points": [1000, 3000, 10_000, 34_657, 100_000, 300_000],
    "pressures": [1, 2, 4, 8, 16, 32],
    "wing": [2.5, 5.0, 10.0, 25.0, 50.0, 100.0, 200.0],
}
TITLES = {
    "lines": "lines",
    "points": "points of the grid",
    "pressures": "pressures",
    "wing": "length of the wings (cm$^{-1}$)",
}
OPERATIONS_PER_POINT = 19
"""Of a line on a point: 9 sums, 9 products and a quotient."""


def invented_lines(count: int, low: float = LOW, high: float = HIGH) -> Lines:
    """Lines of methane with nine decades of intensity, shifted by pressure as real ones are."""
    rng = np.random.default_rng(0)
    return Lines.make(
        molecule=6,
        isotopologue=1,
        wavenumber_per_cm=rng.uniform(low, high, count),
        intensity_cm=10.0 ** rng.uniform(-28, -19, count),
        lower_energy_per_cm=rng.uniform(0.0, 2000.0, count),
        air_width_per_cm_atm=rng.uniform(0.03, 0.12, count),
        temperature_exponent=rng.uniform(0.5, 0.9, count),
        air_shift_per_cm_atm=rng.uniform(-0.01, 0.01, count),
    )


def arguments(lines: int, points: int, pressures: int, wing: float) -> tuple[tuple, dict]:
    """What `cross_sections` is called with."""
    grid = np.exp(np.linspace(np.log(LOW), np.log(HIGH), points))
    bars = np.logspace(-5, 0, pressures) if pressures > 1 else np.array([0.01])
    return (invented_lines(lines), grid), {"temperature_k": 250.0, "pressures_bar": bars, "wing_per_cm": wing}


def processor_seconds(function, least: float = 0.3) -> float:
    """Shortest of at least three runs that take this long together."""
    runs: list[float] = []
    while len(runs) < 3 or sum(runs) < least:
        start = time.process_time()
        function()
        runs.append(time.process_time() - start)
    return min(runs)


def exponent(sizes, seconds) -> float:
    """Slope of the upper half of a curve in the logarithms: where what is measured counts, not the calls."""
    upper = len(sizes) // 2 - 1
    return float(np.polyfit(np.log(sizes[upper:]), np.log(seconds[upper:]), 1)[0])


def test_growth(monkeypatch, tmp_path):
    """Seconds against each size, the others held; and the same with every wing summed point by point."""
    monkeypatch.setattr(crosssections, "_threads", lambda: 1)
    shared = crosssections._cells_in_a_wing
    curves: dict[str, dict[str, list[float]]] = {}
    for name, sizes in STEPS.items():
        curves[name] = {"series": [], "points": []}
        for size in sizes:
            args, kwargs = arguments(**BASE | {name: size})
            for way, cells in (("series", shared), ("points", lambda points, lines, wing: 0)):
                monkeypatch.setattr(crosssections, "_cells_in_a_wing", cells)
                curves[name][way].append(processor_seconds(lambda: cross_sections(*args, **kwargs)))  # noqa: B023
        slopes = {way: exponent(sizes, seconds) for way, seconds in curves[name].items()}
        print(
            f"\n{TITLES[name]}, {sizes[0]:g} to {sizes[-1]:g}: {curves[name]['series'][0]:.3f} to "
            f"{curves[name]['series'][-1]:.3f} s, exponent {slopes['series']:.2f}; point by point "
            f"{curves[name]['points'][-1]:.3f} s, exponent {slopes['points']:.2f}",
            end="",
        )
    figure = growth_figure(curves)
    folder = Path(os.environ.get("LIMBCAST_FIGURES", tmp_path))
    folder.mkdir(parents=True, exist_ok=True)
    figure.savefig(folder / "cross_section_growth.png", dpi=200)
    print(f"\n{folder / 'cross_section_growth.png'}")


def growth_figure(curves: dict[str, dict[str, list[float]]]) -> Figure:
    """Four panels, readable without colour."""
    figure = Figure(figsize=(180 / 25.4, 120 / 25.4), layout="constrained")
    for axes, (name, seconds) in zip(figure.subplots(2, 2).flat, curves.items(), strict=True):
        sizes = STEPS[name]
        styles = {"series": ("o-", "black", "far wings as series"), "points": ("s--", "0.55", "point by point")}
        for way, (style, shade, label) in styles.items():
            slope = exponent(sizes, seconds[way])
            axes.loglog(sizes, seconds[way], style, color=shade, ms=3.5, lw=1, label=f"{label}: exponent {slope:.2f}")
        axes.axvline(BASE[name], color="0.8", lw=0.8, zorder=0)
        axes.set_xlabel(TITLES[name], fontsize=8)
        axes.set_ylabel("processor time (s)", fontsize=8)
        low, high = min(seconds["series"]), max(*seconds["series"], *seconds["points"])
        axes.set_ylim(low / 2, high * 6)
        axes.tick_params(labelsize=7)
        axes.xaxis.set_minor_formatter(NullFormatter())
        axes.legend(fontsize=7, framealpha=1.0, edgecolor="none", loc="upper left")
    figure.suptitle(
        f"Cross-sections from {LOW:g} to {HIGH:g} cm$^{{-1}}$ in one thread. Where not varied (grey lines): "
        f"{BASE['lines']:,} lines,\n{BASE['points']:,} points, {BASE['pressures']} pressures, wings of "
        f"{BASE['wing']:g} cm$^{{-1}}$. Exponents of the upper half of each curve.",
        fontsize=8,
    )
    return figure


def test_error():
    """Largest error against the slow reference on the grid of the figure, at each of its pressures."""
    args, kwargs = arguments(**BASE | {"lines": 2000, "points": 5000})
    fast, slow = cross_sections(*args, **kwargs), reference_cross_sections(*args, **kwargs)
    print()
    for bar, one, other in zip(kwargs["pressures_bar"], fast, slow, strict=True):
        counts = other > 1e-6 * other.max()
        error = np.max(np.abs(one / other - 1.0)[counts])
        print(f"{bar:g} bar: largest error {error:.1e} above 1e-6 of the peak ({counts.mean():.0%} of the points)")
        assert error < 1e-4


def test_threads(monkeypatch):
    """Wall time in one thread and in two; on a machine that is busy with other things it tells little."""
    args, kwargs = arguments(**BASE | {"lines": 300_000})
    print(f"\nload of the machine before: {os.getloadavg()[0]:.1f} on {os.cpu_count()} cores")
    for threads in (1, 2):
        monkeypatch.setattr(crosssections, "_threads", lambda threads=threads: threads)
        walls = []
        for _ in range(5):
            start = time.perf_counter()
            cross_sections(*args, **kwargs)
            walls.append(time.perf_counter() - start)
        print(f"{threads} thread(s): {min(walls):.2f} s of wall time")


def test_share_of_the_peak(monkeypatch):
    """Operations a second of the innermost loop and of the whole, against matrix products and against division."""
    monkeypatch.setattr(crosssections, "_threads", lambda: 1)
    square = np.random.default_rng(0).normal(size=(768, 768))
    with threadpool_limits(1):
        peak = 2 * 768**3 / processor_seconds(lambda: square @ square)
    numbers, quotients = np.linspace(1.0, 2.0, 2000), np.empty(2000)
    repeat = 2000

    def divide() -> None:
        for _ in range(repeat):
            np.divide(1.0, numbers, out=quotients)

    division = repeat * numbers.size / processor_seconds(divide)
    # lines so broad that all points are outside their cores, on a grid that stays in the nearest cache
    points, sums = np.linspace(3000.0, 3001.0, 2000), np.zeros(2000)
    lines = np.tile(np.array([[3000.5], [1e-20], [0.005], [0.1], [0.0]]), 5000)
    cells = np.array([0, 2000])
    none = np.zeros((0, _kernels.TERMS + 1)), np.zeros((2, 0, _kernels.CUT_TERMS + 1))
    rate = (
        lines.shape[1]
        * 2000
        / processor_seconds(lambda: _kernels.add_lines(points, sums, cells, 3000.0, 1.001, lines, 25.0, *none))
    )
    print(
        f"\npeak: {peak / 1e9:.1f} GFlop/s (matrix product), {division / 1e9:.2f} quotients a ns (division of an array)"
        f"\na line on its points: {rate / 1e9:.2f} points a ns, {OPERATIONS_PER_POINT * rate / 1e9:.1f} GFlop/s: "
        f"{OPERATIONS_PER_POINT * rate / peak:.0%} of the peak, {rate / division:.0%} of the rate of division"
    )
    spent = dict.fromkeys(("add_lines", "add_wings"), 0.0)
    for name in spent:
        monkeypatch.setattr(_kernels, name, timed(getattr(_kernels, name), spent, name))
    grid, lines = np.linspace(2900.0, 3100.0, 20_001), invented_lines(20_000, 2900.0, 3100.0)
    for bar in (1.0, 0.01):
        spent |= dict.fromkeys(spent, 0.0)
        start = time.process_time()
        for _ in range(20):
            cross_sections(lines, grid, temperature_k=250.0, pressures_bar=[bar])
        whole = time.process_time() - start
        print(
            f"{bar:g} bar, {len(lines):,} lines on {grid.size:,} points, {1e3 * whole / 20:.1f} ms of processor: "
            f"line by line {spent['add_lines'] / whole:.0%}, far cells {spent['add_wings'] / whole:.0%}, "
            f"strengths and the rest {1 - sum(spent.values()) / whole:.0%}"
        )


def timed(function, spent: dict[str, float], name: str):
    """The function, with the processor time spent in it added up."""

    def run(*args):
        start = time.process_time()
        function(*args)
        spent[name] += time.process_time() - start

    return run
