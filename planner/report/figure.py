"""The figure of a plan: for each search the model spectrum, who makes it, and what the telescope would see.

Made for print: 180 mm wide, letters of 7 points and more, and readable without colour (lines differ by dashes and
lightness). The simulated points are drawn with a seed, so that a figure can be made again.
"""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Protocol

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import FixedLocator, FuncFormatter, NullFormatter
from numpy.typing import NDArray

from planner.errors import OutputError
from planner.report.files import write_bytes
from planner.report.points import Points, simulated_points
from planner.report.words import count_text, gas_text, hours_text, ratio_text
from planner.studies.results import BandShare, BinnedSpectrum, PlanResult, PlanRow, Verdict

__all__ = [
    "STYLE",
    "WIDTH_MM",
    "add_heading",
    "bin_edges",
    "bin_stairs",
    "check_figure_name",
    "choose_rows",
    "draw_points",
    "gas_label",
    "made_by",
    "plan_figure",
    "spectra_figure",
    "wavelength_axis",
    "write_figure",
]

Array = NDArray[np.float64]

WIDTH_MM = 180.0
PANEL_MM = 42.0
MARGINS_MM = {"left": 15.0, "right": 13.0, "top": 10.0, "bottom": 19.0, "gap": 14.0}
SUFFIXES = (".png", ".pdf", ".svg")
_GROUPS = 30
"""Points over the width of a panel, 5 mm apart: few enough for their error bars to tell something."""
_VISIBLE_SHARE = 0.25
"""Share in scale heights below which another gas gets no line."""
_TICKS_UM = (0.3, 0.4, 0.5, 0.6, 0.8, 1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 10.0, 12.0, 15.0, 20.0, 25.0)
_MINOR_TICKS_UM = [*(0.1 * i for i in range(2, 20)), *(0.5 * i for i in range(4, 12)), *map(float, range(6, 29))]
_LOWERED = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
"""Plain letters: whatever is typeset as mathematics takes time and fonts of its own."""
_SEARCHED = "#2f6db5"
_CONTAMINATION: dict[str, Any] = {"color": "0.55", "lw": 1.6}
_UNUSABLE: dict[str, Any] = {"facecolor": "0.93", "edgecolor": "0.6", "hatch": "//////", "lw": 0.0}
# dash pattern and colour of the other gases, dark and light in turn
_OTHERS = (
    ((5.0, 1.5), "#7a3b00"),
    ((1.2, 1.2), "#007a55"),
    ((4.0, 1.2, 1.0, 1.2), "#9a4d8f"),
    ((7.0, 1.5, 1.0, 1.5, 1.0, 1.5), "#555555"),
    ((2.5, 1.0), "#c77700"),
    ((8.0, 2.0), "#3d8fa6"),
)
STYLE: dict[Any, Any] = {
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],
    "font.size": 7.5,
    "axes.labelsize": 8.0,
    "axes.titlesize": 8.0,
    "axes.linewidth": 0.6,
    "xtick.labelsize": 7.5,
    "ytick.labelsize": 7.5,
    "xtick.direction": "in",
    "ytick.direction": "in",
    "hatch.linewidth": 0.5,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "legend.fontsize": 7.5,
    "pdf.fonttype": 42,  # letters stay letters
    "svg.hashsalt": "limbcast",  # the same figure is the same file
}


@dataclass(frozen=True, kw_only=True, eq=False)
class _Panel:
    spectrum: BinnedSpectrum
    title: str
    transits: int
    bands: tuple[BandShare, ...] = ()


def plan_figure(result: PlanResult, rows: Sequence[int] | None = None, *, seed: int = 1) -> Figure:
    """The figure of a plan, with points for the transits that each search requires.

    Where the search is out of reach, the points are for the transits available, or for a hundred when that is not said.

    Parameters
    ----------
    result : PlanResult
        With a spectrum for each row.
    rows : sequence of int, optional
        Which rows get a panel; the best mode of each gas (`choose_rows`) when left out.
    seed : int
        Of the simulated points.
    """
    chosen = choose_rows(result) if rows is None else list(rows)
    panels = []
    for index in chosen:
        row = result.rows[index]
        transits = _transits_shown(row, result.transits_available)
        title = _plan_title(row, transits)
        panels.append(_Panel(spectrum=result.spectra[index], title=title, bands=row.best_bands, transits=transits))
    return _figure(panels, result.title, made_by(result.version, result.invented), seed)


def spectra_figure(
    spectra: Sequence[BinnedSpectrum], *, title: str, version: str, invented: bool, transits: int = 1, seed: int = 1
) -> Figure:
    """A panel per gas and mode, at the largest of the gas's mixing ratios, with points for some transits."""
    largest: dict[tuple[str, str], BinnedSpectrum] = {}
    for spectrum in spectra:
        key = (spectrum.gas, spectrum.mode)
        if key not in largest or spectrum.mixing_ratio > largest[key].mixing_ratio:
            largest[key] = spectrum
    panels = [
        _Panel(spectrum=spectrum, title=f"{_search(spectrum)}; points for {_transits(transits)}", transits=transits)
        for spectrum in largest.values()
    ]
    return _figure(panels, title, made_by(version, invented), seed)


def write_figure(figure: Figure, path: str | Path) -> None:
    """Write a figure as PNG (300 dots per inch), PDF or SVG, by the ending of the name.

    Raises
    ------
    OutputError
        If the ending is another one, or the file cannot be written.
    """
    path = Path(path)
    check_figure_name(path)
    kind = path.suffix.lower()
    dates = {".pdf": {"CreationDate": None}, ".svg": {"Date": None}, ".png": None}  # no clock in the file
    data = io.BytesIO()
    with matplotlib.rc_context(STYLE):
        figure.savefig(data, format=kind[1:], dpi=300, metadata=dates[kind])
    write_bytes(path, data.getvalue())


def check_figure_name(path: Path) -> None:
    """Refuse a name whose ending is not that of a figure.

    Raises
    ------
    OutputError
        Naming the endings that are known.
    """
    if path.suffix.lower() not in SUFFIXES:
        ending = path.suffix or path.name
        raise OutputError(f'{path}: expected a name that ends in {", ".join(SUFFIXES)}, got "{ending}"')


def choose_rows(result: PlanResult) -> list[int]:
    """One row per gas, in the order of the plan: its largest mixing ratio, with the mode that needs fewest hours.

    Where no mode is enough, the one with the highest S/N of one transit.
    """
    best: dict[str, int] = {}
    for index, row in enumerate(result.rows):
        if row.gas not in best or _rank(row) < _rank(result.rows[best[row.gas]]):
            best[row.gas] = index
    return list(best.values())


def _rank(row: PlanRow) -> tuple[float, ...]:
    """Smaller is better to show: the largest ratio, then fewest hours, then the strongest signal."""
    hours = row.marginalised.hours_required
    return (
        -row.mixing_ratio,
        row.verdict in (Verdict.NO_BAND, Verdict.SATURATED),
        np.inf if hours is None else hours,
        -row.marginalised.snr_one_transit,
    )


def _figure(panels: Sequence[_Panel], title: str, made: str, seed: int) -> Figure:
    others = _other_gases(panels)
    with matplotlib.rc_context(STYLE):
        figure, axes = _frame(len(panels))
        for index, (one, panel) in enumerate(zip(axes, panels, strict=True)):
            _draw_panel(one, panel, others, np.random.default_rng([seed, index]))
        _add_legend(
            figure,
            others,
            unusable=not all(panel.spectrum.usable.all() for panel in panels),
            spotted=any(panel.spectrum.contamination_ppm is not None for panel in panels),
            bands=any(panel.bands for panel in panels),
        )
        add_heading(figure, title, made)
    return figure


def _other_gases(panels: Iterable[_Panel]) -> dict[str, tuple[tuple[float, ...], str]]:
    """Dashes and colour of every gas that needs a line in some panel beside the searched one."""
    gases: dict[str, None] = {}
    for panel in panels:
        spectrum = panel.spectrum
        for gas in spectrum.shares_ppm:
            if (
                gas not in _searched(spectrum)
                and np.max(spectrum.shares_ppm[gas]) > _VISIBLE_SHARE * spectrum.scale_height_ppm
            ):
                gases[gas] = None
    return {gas: _OTHERS[i % len(_OTHERS)] for i, gas in enumerate(gases)}


def _height_mm(panels: int) -> float:
    m = MARGINS_MM
    return m["top"] + m["bottom"] + panels * PANEL_MM + (panels - 1) * m["gap"]


def _frame(panels: int) -> tuple[Figure, list[Axes]]:
    """An empty figure with panels of one size below each other."""
    m, height = MARGINS_MM, _height_mm(panels)
    figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
    axes = []
    for index in range(panels):
        bottom = m["bottom"] + (panels - 1 - index) * (PANEL_MM + m["gap"])
        axes.append(
            figure.add_axes(
                (
                    m["left"] / WIDTH_MM,
                    bottom / height,
                    1 - (m["left"] + m["right"]) / WIDTH_MM,
                    PANEL_MM / height,
                )
            )
        )
    return figure, axes


def _draw_panel(
    axes: Axes, panel: _Panel, others: dict[str, tuple[tuple[float, ...], str]], rng: np.random.Generator
) -> None:
    spectrum = panel.spectrum
    edges, base = bin_edges(spectrum), float(spectrum.depth_ppm.min())
    for gas in spectrum.shares_ppm:
        if gas in others and gas not in _searched(spectrum):
            dashes, colour = others[gas]
            axes.plot(
                edges,
                bin_stairs(spectrum, base + spectrum.shares_ppm[gas]),
                color=colour,
                dashes=dashes,
                lw=0.9,
                zorder=3,
            )
    if spectrum.contamination_ppm is not None:
        bias = spectrum.contamination_ppm - spectrum.contamination_ppm.min()
        axes.plot(edges, bin_stairs(spectrum, base + bias), **_CONTAMINATION, zorder=3)
    with_gas = bin_stairs(spectrum, spectrum.depth_ppm)
    without = bin_stairs(spectrum, spectrum.depth_ppm - sum(spectrum.shares_ppm[gas] for gas in _searched(spectrum)))
    axes.fill_between(edges, without, with_gas, color=_SEARCHED, alpha=0.45, lw=0, zorder=1)
    axes.plot(edges, with_gas, color="black", lw=1.1, zorder=2)
    points = simulated_points(spectrum, panel.transits, _GROUPS, rng)
    draw_points(axes, points)
    _mark_unusable(axes, spectrum)
    _scale_axes(axes, spectrum, points)
    axes.set_title(panel.title, loc="left", pad=3)
    for band in panel.bands:
        axes.axvspan(band.from_um, band.to_um, ymin=0, ymax=0.03, color="black", lw=0, zorder=5)


def _searched(spectrum: BinnedSpectrum) -> list[str]:
    """The searched gas, or the gases of a set; what a set adds is drawn as the sum of their shares."""
    return spectrum.gas.split(" + ")


def draw_points(axes: Axes, points: Points) -> None:
    """Simulated observations with their errors."""
    middle = np.sqrt(points.from_um * points.to_um)
    spans = np.array([middle - points.from_um, points.to_um - middle])
    axes.errorbar(
        middle, points.depth_ppm, xerr=spans, yerr=points.error_ppm, fmt="o", ms=2.4, mfc="white", mec="black",
        mew=0.6, ecolor="0.25", elinewidth=0.6, capsize=0, zorder=4,
    )  # fmt: skip


def _transits_shown(row: PlanRow, available: int | None) -> int:
    required = row.marginalised.transits_required
    return required if required is not None and row.verdict is Verdict.WITHIN_REACH else available or 100


def _plan_title(row: PlanRow, transits: int) -> str:
    head = f"{_search(row)}: {row.verdict.value}"
    if row.verdict is Verdict.WITHIN_REACH:
        return f"{head}; points for {_transits(transits)}, {hours_text(row.marginalised.hours_required)} h"
    required = f" ({count_text(row.marginalised.transits_required)})" if row.verdict is Verdict.TOO_MANY else ""
    return f"{head}{required}; points for {_transits(transits)}"


def _search(row: PlanRow | BinnedSpectrum) -> str:
    return f"{gas_label(row.gas)}, {ratio_text(row.mixing_ratio)}, {row.mode}"


def _transits(transits: int) -> str:
    return f"{count_text(transits)} transit{'' if transits == 1 else 's'}"


def made_by(version: str, invented: bool) -> str:
    """What made a figure, and whether its target exists."""
    return f"limbcast {version}" + ("; the target is invented" if invented else "")


class OnBins(Protocol):
    """Anything given on bins."""

    @property
    def from_um(self) -> Array: ...
    @property
    def to_um(self) -> Array: ...


def bin_edges(spectrum: OnBins) -> Array:
    """Both ends of every bin, with a NaN where the next bin does not join, for stairs."""
    return _with_gaps(spectrum, np.column_stack([spectrum.from_um, spectrum.to_um]))


def bin_stairs(spectrum: OnBins, values: Array) -> Array:
    """A value per bin as the heights that go with `bin_edges`."""
    return _with_gaps(spectrum, np.column_stack([values, values]))


def _with_gaps(spectrum: OnBins, pairs: Array) -> Array:
    apart = ~np.isclose(spectrum.from_um[1:], spectrum.to_um[:-1], rtol=1e-6)
    return np.insert(pairs.ravel(), 2 * (np.flatnonzero(apart) + 1), np.nan)


def _mark_unusable(axes: Axes, spectrum: BinnedSpectrum) -> None:
    for low, high, usable in zip(spectrum.from_um, spectrum.to_um, spectrum.usable, strict=True):
        if not usable:
            axes.axvspan(low, high, **_UNUSABLE, zorder=0)


def _scale_axes(axes: Axes, spectrum: BinnedSpectrum, points: Points) -> None:
    """Wavelength in logarithm with plain ticks; depth on the left, scale heights above the lowest bin on the right.

    A few points that tell next to nothing must not flatten the rest: those with more than three times the usual error
    may lie outside.
    """
    wavelength_axis(axes, spectrum)
    base, height = float(spectrum.depth_ppm.min()), spectrum.scale_height_ppm
    telling = points.error_ppm <= 3 * np.median(points.error_ppm) if points.error_ppm.size else np.zeros(0, bool)
    bottom = float(np.min((points.depth_ppm - points.error_ppm)[telling], initial=base))
    top = float(np.max((points.depth_ppm + points.error_ppm)[telling], initial=spectrum.depth_ppm.max()))
    axes.set_ylim(bottom - 0.06 * (top - bottom), top + 0.06 * (top - bottom))
    axes.set_ylabel("Transit depth (ppm)")

    def heights(depth: Any) -> Any:
        return (depth - base) / height

    def depths(heights: Any) -> Any:
        return base + heights * height

    right = axes.secondary_yaxis("right", functions=(heights, depths))
    right.set_ylabel("Scale heights")


def wavelength_axis(axes: Axes, spectrum: OnBins) -> None:
    """Wavelength in logarithm with plain ticks, from the first bin to the last."""
    low_um, high_um = spectrum.from_um.min(), spectrum.to_um.max()
    axes.set_xscale("log")
    axes.set_xlim(low_um / 1.005, high_um * 1.005)
    axes.xaxis.set_major_locator(FixedLocator([t for t in _TICKS_UM if low_um <= t * 1.001 and t <= high_um * 1.001]))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda x, _: f"{x:g}"))
    axes.xaxis.set_minor_locator(FixedLocator(_MINOR_TICKS_UM))
    axes.xaxis.set_minor_formatter(NullFormatter())
    axes.set_xlabel("Wavelength (µm)", labelpad=1.5)
    axes.tick_params(which="both", top=True)


def add_heading(figure: Figure, title: str, made: str) -> None:
    """Title on the left; on the right what made the figure and whether the target exists."""
    m, height = MARGINS_MM, figure.get_figheight() * 25.4
    top = 1 - 1.5 / height
    figure.text(m["left"] / WIDTH_MM, top, title, ha="left", va="top", fontsize=8.5, fontweight="bold")
    figure.text(1 - m["right"] / WIDTH_MM, top, made, ha="right", va="top", fontsize=7.0, color="0.25")


def gas_label(gas: str) -> str:
    """The name of a gas, or of each gas of a set, with the numbers of a formula lowered."""
    names = [(formula, gas_text(formula)) for formula in gas.split(" + ")]
    return " + ".join(name.translate(_LOWERED) if name == formula else name for formula, name in names)


def _add_legend(
    figure: Figure, others: dict[str, tuple[tuple[float, ...], str]], *, unusable: bool, spotted: bool, bands: bool
) -> None:
    handles: list[Line2D | Patch] = [
        Line2D([], [], color="black", lw=1.1, label="all gases"),
        Patch(facecolor=_SEARCHED, alpha=0.45, label="share of the searched gas"),
        *(Line2D([], [], color=c, dashes=d, lw=0.9, label=f"share of {gas_label(g)}") for g, (d, c) in others.items()),
        *([Line2D([], [], **_CONTAMINATION, label="added by spots, faculae")] if spotted else []),
        Line2D([], [], color="black", marker="o", ms=2.4, mfc="white", mew=0.6, lw=0.6, label="simulated observation"),
        *([Patch(facecolor="black", label="best bands")] if bands else []),
        *([Patch(**_UNUSABLE, label="not usable")] if unusable else []),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=4, frameon=False, handlelength=3.0, columnspacing=1.5,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.2,
    )  # fmt: skip
