"""Limits as a figure: mixing ratio against transits, and the curve of growth, a row of two panels for each gas.

Made for print as the figure of a plan. Modes differ by dashes and by lightness.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

from planner.report.figure import STYLE, WIDTH_MM, add_heading, gas_label, made_by
from planner.report.words import ratio_text
from planner.studies.outcomes import LimitCurve, LimitPoint, LimitResult

__all__ = ["limit_figure"]

_PANEL_MM, _GAP_MM = 48.0, 15.0
_TOP_MM, _BOTTOM_MM, _LEFT_MM, _RIGHT_MM = 12.0, 22.0, 21.0, 6.0
_BETWEEN_MM = 19.0
_MODES = ("#1f4e8c", "#c46a00", "#2b8a6b", "#8a3d7c", "#555555", "#a33333")
_DASHES: tuple[tuple[float, ...], ...] = ((), (6.0, 1.5), (1.5, 1.2), (5.0, 1.2, 1.2, 1.2), (9.0, 2.0), (3.0, 1.0))
_LEAST_PPM = 0.03
"""Shares below this are of no use to anyone."""


def limit_figure(result: LimitResult) -> Figure:
    """For each gas the limits against transits, and its largest share in a bin against its mixing ratio."""
    gases = list(dict.fromkeys(curve.gas for curve in result.curves))
    modes = list(dict.fromkeys(curve.mode for curve in result.curves))
    height = _TOP_MM + _BOTTOM_MM + len(gases) * _PANEL_MM + (len(gases) - 1) * _GAP_MM
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        FigureCanvasAgg(figure)
        width = (WIDTH_MM - _LEFT_MM - _RIGHT_MM - _BETWEEN_MM) / 2
        for row, gas in enumerate(gases):
            bottom = (_BOTTOM_MM + (len(gases) - 1 - row) * (_PANEL_MM + _GAP_MM)) / height
            curves = [curve for curve in result.curves if curve.gas == gas]
            for column, draw in enumerate((_draw_limits, _draw_growth)):
                left = (_LEFT_MM + column * (width + _BETWEEN_MM)) / WIDTH_MM
                draw(figure.add_axes((left, bottom, width / WIDTH_MM, _PANEL_MM / height)), curves, modes)
        _add_legend(figure, modes, result)
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def _draw_limits(axes: Axes, curves: Sequence[LimitCurve], modes: Sequence[str]) -> None:
    """Detectable mixing ratios, and thinner what a null result leaves."""
    axes.set(xscale="log", yscale="log")
    for curve in curves:
        look = _look(modes.index(curve.mode))
        points = sorted({p.transits: p for p in (*curve.points, curve.at_best)}.values(), key=lambda p: p.transits)
        _line(axes, [(p, p.detectable_ratio) for p in points], lw=1.5, marker="o", ms=3.2, **look)
        _line(axes, [(p, p.upper_limit_ratio) for p in points], lw=0.7, marker="v", ms=3.2, mfc="white", **look)
    for ratio in curves[0].stated_ratios:
        axes.axhline(ratio, color="0.45", lw=0.6, zorder=1)
    axes.set_title(f"{gas_label(curves[0].gas)}: limits", loc="left", pad=3)
    if not axes.lines[len(curves[0].stated_ratios) :]:
        axes.text(0.5, 0.5, "no limit", transform=axes.transAxes, ha="center", va="center")
    axes.set_xlabel("Transits", labelpad=1.5)
    axes.set_ylabel("Mixing ratio")
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    _decades(axes, "y")


def _draw_growth(axes: Axes, curves: Sequence[LimitCurve], modes: Sequence[str]) -> None:
    """Curve of growth, with a mark where the gas becomes detectable with all transits on offer."""
    axes.set(xscale="log", yscale="log")
    for curve in curves:
        look = _look(modes.index(curve.mode))
        seen = curve.feature_ppm > _LEAST_PPM
        axes.plot(curve.ratios[seen], curve.feature_ppm[seen], lw=1.2, **look)
        found = curve.at_best.detectable_ratio
        if found is not None:
            feature = np.exp(np.interp(np.log(found), np.log(curve.ratios), np.log(curve.feature_ppm)))
            axes.plot(found, feature, "o", ms=5, color=look["color"], mec="black", mew=0.6)
    for ratio in curves[0].stated_ratios:
        axes.axvline(ratio, color="0.45", lw=0.6, zorder=1)
    axes.set_title(f"{gas_label(curves[0].gas)}: curve of growth", loc="left", pad=3)
    axes.set_xlabel(f"Mixing ratio of {gas_label(curves[0].gas.split(' + ')[0])}", labelpad=1.5)
    axes.set_ylabel("Largest share in a bin (ppm)")
    axes.yaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
    _decades(axes, "x")


def _line(axes: Axes, points: Sequence[tuple[LimitPoint, float | None]], **look: Any) -> None:
    reached = [(point.transits, ratio) for point, ratio in points if ratio is not None]
    if reached:
        axes.plot(*zip(*reached, strict=True), **look)


def _look(mode: int) -> dict[str, Any]:
    look: dict[str, Any] = {"color": _MODES[mode % len(_MODES)]}
    dashes = _DASHES[mode % len(_DASHES)]
    return look | ({"dashes": dashes} if dashes else {})


def _decades(axes: Axes, name: str) -> None:
    """Mixing ratios in ppm, ppb and so on along an axis, at most at every decade."""
    axis = axes.yaxis if name == "y" else axes.xaxis
    axis.set_major_locator(LogLocator(numticks=7))
    axis.set_minor_locator(LogLocator(numticks=30))
    axis.set_minor_formatter(NullFormatter())
    axis.set_major_formatter(FuncFormatter(lambda value, _: ratio_text(value)))
    axes.tick_params(which="both", top=True, right=True)


def _add_legend(figure: Figure, modes: Sequence[str], result: LimitResult) -> None:
    lines = [Line2D([], [], lw=1.5, label=mode, **_look(number)) for number, mode in enumerate(modes)]
    chance = f"{result.threshold_sigma:g}σ with {100 * result.power:g} % chance"
    signs = [
        Line2D([], [], color="black", lw=1.5, marker="o", ms=3.2, label=f"detectable: {chance}"),
        Line2D(
            [], [], color="black", lw=0.7, marker="v", ms=3.2, mfc="white",
            label=f"upper limit of a null result, {100 * result.confidence:g} %",
        ),
        Line2D([], [], color="none", marker="o", ms=5, mfc="0.7", mec="black", label="detectable with all on offer"),
        Line2D([], [], color="0.45", lw=0.6, label="the scenario"),
    ]  # fmt: skip
    figure.legend(
        handles=[*lines, *signs], loc="lower center", ncols=3, frameon=False, handlelength=3.0, columnspacing=1.5,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.2,
    )  # fmt: skip
