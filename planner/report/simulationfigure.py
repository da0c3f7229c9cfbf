"""Simulated observations as a figure: significances found with the gas and without, beside those that are stated.

A panel for each gas, with the mode that suits it best. Made for print as the figure of a plan.
"""

from __future__ import annotations

from math import pi, sqrt
from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch

from planner.report.figure import STYLE, WIDTH_MM, add_heading, choose_rows, gas_label, made_by
from planner.report.words import count_text, ratio_text
from planner.studies.results import PlanResult, PlanRow

__all__ = ["simulation_figure"]

_PANEL_MM, _GAP_MM = 30.0, 15.0
_TOP_MM, _BOTTOM_MM, _LEFT_MM, _RIGHT_MM = 13.0, 21.0, 15.0, 50.0
_THERE: dict[str, Any] = {"facecolor": "#8fb6e0", "edgecolor": "white", "lw": 0.4}
_ABSENT: dict[str, Any] = {"facecolor": "none", "edgecolor": "0.35", "hatch": "//////", "lw": 0.5}
_STATED: dict[str, Any] = {"color": "black", "lw": 1.1}
_THRESHOLD: dict[str, Any] = {"color": "#a04000", "lw": 1.6, "dashes": (4.0, 1.5)}


def simulation_figure(result: PlanResult) -> Figure:
    """The figure of a plan whose searches were tried on simulated observations; those with no band have no panel."""
    rows = [result.rows[index] for index in choose_rows(result) if result.rows[index].simulation is not None]
    height = _TOP_MM + _BOTTOM_MM + len(rows) * _PANEL_MM + max(0, len(rows) - 1) * _GAP_MM
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        for number, row in enumerate(rows):
            bottom = (_BOTTOM_MM + (len(rows) - 1 - number) * (_PANEL_MM + _GAP_MM)) / height
            width = 1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM
            _draw(
                figure.add_axes((_LEFT_MM / WIDTH_MM, bottom, width, _PANEL_MM / height)), row, result.threshold_sigma
            )
        _add_legend(figure, rows, result.threshold_sigma)
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def _draw(axes: Axes, row: PlanRow, threshold_sigma: float) -> None:
    tried = row.simulation
    assert tried is not None
    edges = np.array(tried.sigma_edges)
    fine = np.linspace(edges[0], edges[-1], 400)
    per_bin = tried.draws * (edges[1] - edges[0]) / sqrt(2 * pi)
    for counts, mean, look in ((tried.counts_absent, 0.0, _ABSENT), (tried.counts_there, tried.snr_stated, _THERE)):
        axes.bar(edges[:-1], counts, np.diff(edges), align="edge", zorder=2 if look is _ABSENT else 1, **look)
        axes.plot(fine, per_bin * np.exp(-0.5 * (fine - mean) ** 2), zorder=3, **_STATED)
    axes.axvline(threshold_sigma, zorder=4, **_THRESHOLD)
    axes.set_xlim(edges[0], max(edges[-1], threshold_sigma + 1))
    axes.set_ylim(0, 1.18 * per_bin)
    axes.tick_params(which="both", top=True, right=True)
    axes.set_xlabel("Significance found (sigma)", labelpad=1.5)
    axes.set_ylabel("Observations", labelpad=2)
    axes.set_title(
        f"{gas_label(row.gas)}, {ratio_text(row.mixing_ratio)}, {row.mode}; {count_text(tried.transits)} transits",
        loc="left", pad=3,
    )  # fmt: skip
    figures = (
        f"detected: stated {100 * tried.power_stated:.1f} %,\n"
        f"found {100 * tried.power_found:.1f} ± {100 * tried.power_error:.1f} %\n\n"
        f"alarms at {tried.false_alarm_sigma:g}$\\sigma$: stated {100 * tried.false_alarms_stated:.2f} %,\n"
        f"found {100 * tried.false_alarms_found:.2f} ± {100 * tried.false_alarms_error:.2f} %\n\n"
        f"place not chosen in advance:\n{tried.sigma_anywhere:.1f}$\\sigma$ needed"
    )
    axes.text(1.04, 0.98, figures, transform=axes.transAxes, va="top", fontsize=7.5, linespacing=1.2)


def _add_legend(figure: Figure, rows: list[PlanRow], threshold_sigma: float) -> None:
    draws = count_text(rows[0].simulation.draws) if rows and rows[0].simulation else ""
    handles: list[Line2D | Patch] = [
        Patch(**_THERE, label=f"{draws} observations with the gas"),
        Patch(**_ABSENT, label="as many without"),
        Line2D([], [], label="as stated", **_STATED),
        Line2D([], [], label=f"threshold, {threshold_sigma:g}$\\sigma$", **_THRESHOLD),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=4, frameon=False, handlelength=3.0, columnspacing=1.5,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.2,
    )  # fmt: skip
