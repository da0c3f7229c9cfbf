"""The spread of a plan as a figure: a row of three panels for each gas, with the mode that suits it best.

On the left the transits over the draws, in the middle the chance of success against transits, on the right what drives
the answer. Made for print as the figure of a plan: nothing is told by colour alone.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import FixedLocator, FuncFormatter, NullFormatter
from numpy.typing import NDArray

from planner.report.figure import STYLE, WIDTH_MM, add_heading, choose_rows, gas_label, made_by
from planner.report.words import count_text, ratio_text
from planner.studies.outcomes import TransitSpread
from planner.studies.results import PlanResult, PlanRow

__all__ = ["spread_figure"]

Array = NDArray[np.float64]

_PANEL_MM, _GAP_MM = 36.0, 16.0
_TOP_MM, _BOTTOM_MM = 14.0, 21.0
_PANELS_MM = ((13.0, 56.0), (85.0, 38.0), (152.0, 22.0))
"""Left end and width of the panels."""
_BINS_PER_DECADE = 8
_DRIVERS = 6
_SHORT = 40
_NEVER_ROOM = 0.17
_NEVER_PLACES = (0.88, 0.92, 0.96, 1.0)
"""Share of the axis for the draws that never arrive; left end, middle and right end of their bar, end of the axis."""
_MOST_DECADES = 4.0
"""Draws beyond so many decades above the fewest transits count with the last bin."""
_WITHIN: dict[str, Any] = {"facecolor": "#5f93cf", "edgecolor": "white", "lw": 0.4}
_BEYOND: dict[str, Any] = {"facecolor": "#cfdff0", "edgecolor": "0.55", "lw": 0.4}
_NEVER: dict[str, Any] = {"facecolor": "0.93", "edgecolor": "0.45", "hatch": "//////", "lw": 0.5}
_ASKED: dict[str, Any] = {"color": "black", "lw": 1.0, "dashes": (4.0, 1.5)}
_OFFER: dict[str, Any] = {"color": "0.45", "lw": 1.0}
_RANGE: dict[str, Any] = {"color": "#c46a00", "lw": 2.2, "solid_capstyle": "butt"}
_MEDIAN: dict[str, Any] = {"marker": "D", "ms": 4.2, "mfc": "white", "mec": "#7a3b00", "mew": 1.0}


def spread_figure(result: PlanResult) -> Figure:
    """The figure of a plan with a spread in its rows.

    Parameters
    ----------
    result : PlanResult
        Every row with its spread.
    """
    rows = [result.rows[index] for index in choose_rows(result)]
    height = _TOP_MM + _BOTTOM_MM + len(rows) * _PANEL_MM + (len(rows) - 1) * _GAP_MM
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        for number, row in enumerate(rows):
            bottom = (_BOTTOM_MM + (len(rows) - 1 - number) * (_PANEL_MM + _GAP_MM)) / height
            boxes = [(left / WIDTH_MM, bottom, wide / WIDTH_MM, _PANEL_MM / height) for left, wide in _PANELS_MM]
            axes = [figure.add_axes(box) for box in boxes]
            _draw(axes, row, result.threshold_sigma)
        _add_legend(figure, rows)
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def _draw(axes: Sequence[Axes], row: PlanRow, threshold_sigma: float) -> None:
    spread, (transits, chances, drivers) = row.spread, axes
    assert spread is not None
    _draw_transits(transits, spread)
    _draw_chances(chances, spread, threshold_sigma)
    _draw_drivers(drivers, spread)
    transits.set_title(f"{gas_label(row.gas)}, {ratio_text(row.mixing_ratio)}, {row.mode}", loc="left", pad=3)


def _draw_transits(axes: Axes, spread: TransitSpread) -> None:
    """Share of the draws for each number of transits, in the logarithm; what is never enough stands apart."""
    reached = np.array([n for n in spread.transits_drawn if n is not None], dtype=float)
    edges = _edges(reached, spread)
    counts, _ = np.histogram(np.minimum(reached, edges[-1]), edges)
    percent = 100 * counts / spread.draws
    axes.set_xscale("log")
    within = edges[:-1] < spread.transits_on_offer
    for mine, look in ((within, _WITHIN), (~within, _BEYOND)):
        axes.bar(edges[:-1][mine], percent[mine], np.diff(edges)[mine], align="edge", **look)
    never, end = 100 * spread.unreachable_share, edges[-1]
    if never:
        places = np.array(_NEVER_PLACES) / (1 - _NEVER_ROOM)
        left, middle, right, end = edges[0] * (end / edges[0]) ** places
        axes.bar(left, never, right - left, align="edge", **_NEVER)
        axes.text(middle, never, f"never\n{never:.0f} %", ha="center", va="bottom", fontsize=7.0, linespacing=0.95)
    top = max(1.28 * percent.max(initial=0.0), 1.4 * never)
    _mark_range(axes, spread, 0.93 * top, edges[-1])
    _mark_numbers(axes, spread)
    axes.set_xlim(edges[0], end)
    axes.set_ylim(0, top)
    axes.set_yticks([tick for tick in axes.get_yticks() if tick <= min(top, 100)])
    _count_axis(axes, edges[-1])
    axes.set_ylabel("Draws (%)", labelpad=2)


def _edges(reached: Array, spread: TransitSpread) -> Array:
    """Edges of the bins, even in the logarithm, one of them at all the transits on offer."""
    low = min(reached.min(initial=np.inf), spread.transits_asked, spread.transits_on_offer)
    high = max(reached.max(initial=0.0), spread.transits_on_offer)
    below = np.ceil(_BINS_PER_DECADE * np.log10(spread.transits_on_offer / low) + 1)
    above = np.ceil(_BINS_PER_DECADE * np.log10(high / spread.transits_on_offer) + 1e-9)
    steps = np.arange(-below, min(above, _BINS_PER_DECADE * _MOST_DECADES - below) + 1)
    return np.asarray(spread.transits_on_offer * 10 ** (steps / _BINS_PER_DECADE))


def _mark_range(axes: Axes, spread: TransitSpread, height: float, end: float) -> None:
    """A bar from 16 to 84 % of the draws with a mark at the middle; an arrow where an end is out of reach."""
    low, middle, high = spread.transits_16, spread.transits_50, spread.transits_84
    if low is None:
        return
    axes.plot([low, min(high or end, end)], [height, height], zorder=4, **_RANGE)
    if high is None or high > end:
        axes.plot(end, height, marker=">", ms=4.5, color=_RANGE["color"], zorder=4)
    if middle is not None and middle <= end:
        axes.plot(middle, height, zorder=5, **_MEDIAN)


def _mark_numbers(axes: Axes, spread: TransitSpread) -> None:
    """The transits that the plan asks for, and those on offer."""
    axes.axvline(spread.transits_on_offer, zorder=3, **_OFFER)
    axes.axvline(spread.transits_asked, zorder=3, **_ASKED)


def _draw_chances(axes: Axes, spread: TransitSpread, threshold_sigma: float) -> None:
    numbers, chances = zip(*spread.chances, strict=True)
    axes.set_xscale("log")
    axes.plot(numbers, 100 * np.array(chances), color="#2f6db5", lw=1.5, zorder=4)
    _mark_numbers(axes, spread)
    for number, chance in (
        (spread.transits_asked, spread.chance_asked),
        (spread.transits_on_offer, spread.chance_on_offer),
    ):
        axes.plot(number, 100 * chance, "o", ms=4, mfc="white", mec="black", mew=0.9, zorder=5, clip_on=False)
    axes.set_xlim(1, numbers[-1])
    axes.set_ylim(0, 100)
    _count_axis(axes, numbers[-1])
    axes.set_ylabel(f"Chance of {threshold_sigma:g}$\\sigma$ (%)", labelpad=2)
    axes.set_title(_chance_title(spread), loc="left", pad=3, fontsize=7.0)


def _chance_title(spread: TransitSpread) -> str:
    after = f"{100 * spread.chance_asked:.0f} % with {count_text(spread.transits_asked)}"
    if spread.transits_asked == spread.transits_on_offer:
        return f"{after}, all there are"
    return f"{after}, {100 * spread.chance_on_offer:.0f} % with {count_text(spread.transits_on_offer)}"


def _draw_drivers(axes: Axes, spread: TransitSpread) -> None:
    """Shares of the variance, largest on top, and what they leave."""
    shown = spread.drivers[:_DRIVERS]
    rest = 1 - sum(driver.share for driver in shown)
    names = [*(_driver_label(driver.name) for driver in shown), "all else, interplay"]
    shares = np.array([*(driver.share for driver in shown), rest])
    places = range(len(names))
    looks = [_WITHIN] * len(shown) + [_BEYOND]
    for place, share, look in zip(places, shares.tolist(), looks, strict=True):
        axes.barh(place, 100 * share, 0.72, **look)
        axes.text(100 * share + 2, place, f"{100 * share:.0f}", va="center", fontsize=7.0)
    axes.set_yticks(places, names)
    axes.tick_params(axis="y", length=0)
    axes.set_ylim(max(len(names), 4) - 0.45, -0.55)
    axes.set_xlim(0, 100 * shares.max() * 1.3)
    axes.set_xticks([tick for tick in axes.get_xticks() if tick <= axes.get_xlim()[1]])
    axes.set_xlabel("Variance (%)", labelpad=1.5)
    for side in ("top", "right"):
        axes.spines[side].set_visible(False)


def _driver_label(name: str) -> str:
    """A gas as people write it; other names are words in small letters."""
    return gas_label(name) if name[:1].isupper() else name


def _count_axis(axes: Axes, last: float) -> None:
    """Whole numbers of transits up to a last one; 2 and 5 beside the powers of ten on a short axis."""
    first = axes.get_xlim()[0]
    steps = np.array([digit * 10.0**power for power in range(-1, 7) for digit in range(1, 10)])
    steps = steps[(steps >= first * (1 - 1e-9)) & (steps <= last * (1 + 1e-9))]
    digits = np.rint(steps / 10 ** np.floor(np.log10(steps) + 1e-9))
    labelled = np.isin(digits, (1, 2, 5) if last / first < _SHORT else (1,)) & (steps > 0.99)
    axes.xaxis.set_major_locator(FixedLocator(steps[labelled].tolist()))
    axes.xaxis.set_minor_locator(FixedLocator(steps[~labelled].tolist()))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:,.0f}".replace(",", " ")))
    axes.xaxis.set_minor_formatter(NullFormatter())
    axes.tick_params(which="both", top=True, right=True)
    axes.set_xlabel("Transits", labelpad=1.5)


def _add_legend(figure: Figure, rows: list[PlanRow]) -> None:
    spreads = [row.spread for row in rows if row.spread is not None]
    draws = spreads[0].draws
    handles: list[Line2D | Patch] = [
        Patch(**_WITHIN, label=f"{draws} draws, within the transits on offer"),
        Patch(**_BEYOND, label="more than there are"),
        *([Patch(**_NEVER, label="no number is enough")] if any(s.unreachable_share for s in spreads) else []),
        Line2D([], [], label="16, 50 and 84 % of the draws", **_RANGE, **_MEDIAN),
        Line2D([], [], label="asked for by the plan", **_ASKED),
        Line2D([], [], label="on offer", **_OFFER),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=3, frameon=False, handlelength=3.0, columnspacing=1.5,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.2,
    )  # fmt: skip
