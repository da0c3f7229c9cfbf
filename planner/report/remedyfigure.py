"""What would help as a figure: the significance that each remedy brings, beside what the search has without.

A block of bars for each search that has remedies and needs them; for all that have some where none needs them. Made for
print as the figure of a plan.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import isfinite
from typing import Any

import matplotlib
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from planner.report.figure import STYLE, WIDTH_MM, add_heading, gas_label, made_by
from planner.report.remedies import remedy_text
from planner.report.words import count_text, ratio_text, snr_text
from planner.studies.results import PlanResult, PlanRow, Verdict

__all__ = ["remedy_figure"]

_BAR_MM, _GAP_MM = 4.6, 9.5
_TOP_MM, _BOTTOM_MM, _LEFT_MM, _RIGHT_MM = 13.0, 21.0, 88.0, 34.0
_AS_IT_STANDS: dict[str, Any] = {"facecolor": "0.8", "edgecolor": "0.35", "lw": 0.5}
_ENOUGH: dict[str, Any] = {"facecolor": "#5f93cf", "edgecolor": "#1f4e8c", "lw": 0.5}
_SHORT: dict[str, Any] = {"facecolor": "white", "edgecolor": "0.35", "hatch": "//////", "lw": 0.5}
_THRESHOLD: dict[str, Any] = {"color": "black", "lw": 1.1, "dashes": (4.0, 1.5)}
_ROOM = 1.15
_TITLE_MM = _LEFT_MM - 15.0


def remedy_figure(result: PlanResult) -> Figure:
    """The figure of a plan whose searches have remedies.

    Parameters
    ----------
    result : PlanResult
        With remedies in at least one row.
    """
    helped = [row for row in result.rows if row.remedies]
    rows = [row for row in helped if row.verdict is not Verdict.WITHIN_REACH] or helped
    bars = [_BAR_MM * (1 + len(row.remedies)) for row in rows]
    height = _TOP_MM + _BOTTOM_MM + sum(bars) + _GAP_MM * (len(rows) - 1)
    most = _ROOM * max(result.threshold_sigma, *(snr for row in rows for _, snr, _, _ in _bars(row) if isfinite(snr)))
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        top = height - _TOP_MM
        for row, size in zip(rows, bars, strict=True):
            width = 1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM
            box = (_LEFT_MM / WIDTH_MM, (top - size) / height, width, size / height)
            _draw(figure.add_axes(box), row, result.threshold_sigma, most, last=row is rows[-1])
            top -= size + _GAP_MM
        _add_legend(figure, result.threshold_sigma)
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def _bars(row: PlanRow) -> list[tuple[str, float, dict[str, Any], str]]:
    """Label, significance, look and words for the end of each bar, as it stands first."""
    best = row.marginalised.snr_limit
    found = [
        ("as it stands, at best", best, _AS_IT_STANDS, f"{snr_text(best) if isfinite(best) else 'no bound'}, for ever")
    ]
    for remedy in row.remedies:
        label = remedy_text(remedy, row).split(": ")[0]
        words = f"{snr_text(remedy.snr)}, {count_text(remedy.transits)} transits"
        found.append((label, remedy.snr, _ENOUGH if remedy.enough else _SHORT, words))
    return found


def _draw(axes: Axes, row: PlanRow, threshold_sigma: float, most: float, *, last: bool) -> None:
    bars = _bars(row)
    for place, (_, snr, look, words) in enumerate(bars):
        axes.barh(place, min(snr, most), 0.7, **look)
        axes.text(1.02 * most, place, words, va="center", fontsize=7.0)
    axes.axvline(threshold_sigma, zorder=3, **_THRESHOLD)
    axes.set_yticks(range(len(bars)), [label for label, *_ in bars])
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(len(bars) - 0.5, -0.5)
    axes.set_xlim(0, most)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)
    if last:
        axes.set_xlabel("S/N with all else unknown", labelpad=1.5)
    else:
        axes.tick_params(axis="x", labelbottom=False)
    title = f"{gas_label(row.gas)}, {ratio_text(row.mixing_ratio)}, {row.mode}: {row.verdict.value}"
    axes.set_title(title, loc="left", x=-_TITLE_MM / (WIDTH_MM - _LEFT_MM - _RIGHT_MM), pad=2)


def _add_legend(figure: Figure, threshold_sigma: float) -> None:
    handles: Sequence[Line2D | Patch] = [
        Patch(**_AS_IT_STANDS, label="as it stands"),
        Patch(**_ENOUGH, label="would be enough"),
        Patch(**_SHORT, label="would not"),
        Line2D([], [], label=f"threshold, {threshold_sigma:g}$\\sigma$", **_THRESHOLD),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=4, frameon=False, handlelength=3.0, columnspacing=1.5,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.2,
    )  # fmt: skip
