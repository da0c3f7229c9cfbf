"""The figure of a fit: spectrum and model, what is left, which bins carry the result, and the mixing ratios."""

from __future__ import annotations

from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from matplotlib.ticker import MaxNLocator
from numpy.typing import NDArray

from planner.report.figure import (
    STYLE,
    WIDTH_MM,
    add_heading,
    bin_edges,
    bin_stairs,
    gas_label,
    made_by,
    wavelength_axis,
)
from planner.report.fittable import range_text, value_text
from planner.report.words import gas_text
from planner.studies.fitting.records import BinReport, FitResult, Found

__all__ = ["fit_figure"]

Array = NDArray[np.float64]

_LEFT_MM, _RIGHT_MM, _TOP_MM, _LEGEND_MM = 20.0, 13.0, 8.0, 9.0
_SPECTRUM_MM, _LEFT_OVER_MM, _CARRIES_MM, _GAP_MM = 50.0, 20.0, 18.0, 2.5
_AXIS_MM, _HISTOGRAM_MM, _TITLES_MM, _BETWEEN_MM = 9.0, 22.0, 9.0, 4.0
_PER_ROW = 4
_LABEL_MM = 10.0
_STEPS = 30
_MODEL: dict[str, Any] = {"color": "#123f7a", "lw": 0.9}
_INNER: dict[str, Any] = {"facecolor": "#7ba3d6", "lw": 0.0}
_OUTER: dict[str, Any] = {"facecolor": "#c9d9ee", "lw": 0.0}
_POINTS: dict[str, Any] = {
    "fmt": "o", "ms": 1.8, "mfc": "white", "mec": "black", "mew": 0.5, "ecolor": "0.3", "elinewidth": 0.5, "capsize": 0,
}  # fmt: skip
_BARS: dict[str, Any] = {"facecolor": "#c46a00", "edgecolor": "#7a3b00", "lw": 0.3}
_UNTRUSTED: dict[str, Any] = {"facecolor": "white", "edgecolor": "#7a3b00", "lw": 0.4, "hatch": "////////"}
_PRIOR: dict[str, Any] = {"color": "0.35", "lw": 0.8, "dashes": (3.0, 1.5)}


def fit_figure(result: FitResult) -> Figure:
    """The figure of a fit."""
    gases = [found for found in result.found if found.gas]
    rows = -(-len(gases) // _PER_ROW)
    upper = _TOP_MM + _SPECTRUM_MM + _GAP_MM + _LEFT_OVER_MM + _GAP_MM + _CARRIES_MM + _AXIS_MM
    height = upper + rows * (_TITLES_MM + _HISTOGRAM_MM + _AXIS_MM) + _LEGEND_MM
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        top = height - _TOP_MM
        _draw_spectrum(_wide(figure, top, _SPECTRUM_MM, height), result.bins)
        top -= _SPECTRUM_MM + _GAP_MM
        _draw_left_over(_wide(figure, top, _LEFT_OVER_MM, height), result.bins)
        top -= _LEFT_OVER_MM + _GAP_MM
        _draw_carriers(_wide(figure, top, _CARRIES_MM, height), result)
        for number, found in enumerate(gases):
            _draw_gas(_small(figure, number, height - upper, height), found, first=number % _PER_ROW == 0)
        _add_legend(figure, untrusted=not result.bins.trusted.all())
        add_heading(figure, f"{result.title}: {result.spectrum}", made_by(result.version, result.invented))
    return figure


def _wide(figure: Figure, top_mm: float, size_mm: float, height_mm: float) -> Axes:
    width = 1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM
    return figure.add_axes((_LEFT_MM / WIDTH_MM, (top_mm - size_mm) / height_mm, width, size_mm / height_mm))


def _small(figure: Figure, number: int, top_mm: float, height_mm: float) -> Axes:
    """The panel of one gas: so many to a row."""
    row, column = divmod(number, _PER_ROW)
    width = (WIDTH_MM - _LEFT_MM - _RIGHT_MM - (_PER_ROW - 1) * _BETWEEN_MM) / _PER_ROW
    left = _LEFT_MM + column * (width + _BETWEEN_MM)
    bottom = top_mm - row * (_TITLES_MM + _HISTOGRAM_MM + _AXIS_MM) - _TITLES_MM - _HISTOGRAM_MM
    return figure.add_axes((left / WIDTH_MM, bottom / height_mm, width / WIDTH_MM, _HISTOGRAM_MM / height_mm))


def _draw_spectrum(axes: Axes, bins: BinReport) -> None:
    edges = bin_edges(bins)
    low_95, low_68, median, high_68, high_95 = (bin_stairs(bins, band) for band in bins.bands_ppm)
    axes.fill_between(edges, low_95, high_95, **_OUTER, zorder=1)
    axes.fill_between(edges, low_68, high_68, **_INNER, zorder=2)
    axes.plot(edges, median, **_MODEL, zorder=3)
    axes.errorbar(_middle(bins), bins.depth_ppm, yerr=bins.error_ppm, **_POINTS, zorder=4)
    telling = bins.error_ppm <= 3 * np.median(bins.error_ppm)
    low = float(min((bins.depth_ppm - bins.error_ppm)[telling].min(), bins.bands_ppm.min()))
    high = float(max((bins.depth_ppm + bins.error_ppm)[telling].max(), bins.bands_ppm.max()))
    axes.set_ylim(low - 0.06 * (high - low), high + 0.06 * (high - low))
    _finish(axes, bins, "Transit depth (ppm)", last=False)


def _draw_left_over(axes: Axes, bins: BinReport) -> None:
    left = (bins.depth_ppm - bins.best_ppm) / bins.error_ppm
    axes.axhline(0.0, color=_MODEL["color"], lw=0.7, zorder=1)
    axes.errorbar(_middle(bins), left, yerr=np.ones(left.size), **_POINTS, zorder=2)
    reach = 1.12 * max(3.0, float(np.abs(left).max()) + 1)
    axes.set_ylim(-reach, reach)
    _finish(axes, bins, "Data less best\nmodel (errors)", last=False)


def _draw_carriers(axes: Axes, result: FitResult) -> None:
    """What the gas in question gains from each bin; else how the first gas moves without it."""
    bins = result.bins
    if bins.left_out_gain is not None:
        values, label = bins.left_out_gain, f"Speaks for\n{gas_label(str(result.evidences[-1].without))} (nats)"
    else:
        values, label = bins.left_out_shift[0], f"{gas_label(bins.gases[0])} without\nthe bin (widths)"
    width = bins.to_um - bins.from_um
    for kept, style in ((bins.trusted, _BARS), (~bins.trusted, _UNTRUSTED)):
        axes.bar(bins.from_um[kept], values[kept], width[kept], align="edge", **style, zorder=2)
    axes.axhline(0.0, color="0.3", lw=0.6, zorder=1)
    axes.yaxis.set_major_locator(MaxNLocator(4))
    _finish(axes, bins, label, last=True)


def _finish(axes: Axes, bins: BinReport, label: str, *, last: bool) -> None:
    wavelength_axis(axes, bins)
    if not last:
        axes.set_xlabel("")
        axes.tick_params(labelbottom=False)
    axes.set_ylabel(label)
    axes.yaxis.set_label_coords(-_LABEL_MM / (WIDTH_MM - _LEFT_MM - _RIGHT_MM), 0.5)


def _draw_gas(axes: Axes, found: Found, *, first: bool) -> None:
    """Density of the mixing ratio in decades, the flat prior, and the limit or the middle 68 %."""
    low, high = found.prior_ends
    heights, edges = np.histogram(found.draws, bins=_STEPS, range=(low, high), density=True)
    axes.stairs(heights, edges, fill=True, **_INNER, zorder=1)
    axes.stairs(heights, edges, color=_MODEL["color"], lw=0.8, zorder=2)
    axes.axhline(1 / (high - low), **_PRIOR, zorder=3)
    name = gas_label(found.name) if gas_text(found.name) == found.name else gas_text(found.name)
    if found.upper_95 is not None:
        axes.axvline(np.log10(found.upper_95), color="black", lw=1.0, dashes=(1.0, 1.0), zorder=4)
        axes.set_title(f"{name}, 95 %:\nbelow {value_text(found, found.upper_95)}", pad=3, fontsize=7.5)
    else:
        axes.axvline(np.log10(found.median), color="black", lw=1.0, zorder=4)
        text = range_text(found, found.low_68, found.high_68)
        axes.set_title(f"{name}, 68 %:\n{text}", pad=3, fontsize=7.5)
    axes.set_xlim(low, high)
    axes.set_ylim(0, 1.12 * max(float(heights.max()), 1.5 / (high - low)))
    axes.xaxis.set_major_locator(MaxNLocator(5, integer=True))
    axes.set_xlabel("log$_{10}$ mixing ratio", labelpad=1.5)
    axes.tick_params(labelleft=False, left=False)
    if first:
        axes.set_ylabel("Density")
        axes.yaxis.set_label_coords(-3.0 / (axes.get_position().width * WIDTH_MM), 0.5)


def _middle(bins: BinReport) -> Array:
    middle: Array = np.sqrt(bins.from_um * bins.to_um)
    return middle


def _add_legend(figure: Figure, *, untrusted: bool) -> None:
    handles: list[Line2D | Patch] = [
        Line2D([], [], color="black", marker="o", ms=2.2, mfc="white", mew=0.5, lw=0.5, label="data"),
        Line2D([], [], **_MODEL, label="median"),
        Patch(**_INNER, label="68 %"),
        Patch(**_OUTER, label="95 %"),
        Patch(**_BARS, label="bin left out"),
        *([Patch(**_UNTRUSTED, label="too few draws to judge")] if untrusted else []),
        Line2D([], [], **_PRIOR, label="prior"),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=len(handles), frameon=False, handlelength=2.4, columnspacing=1.3,
        bbox_to_anchor=(0.5, 0.0), borderaxespad=0.3,
    )  # fmt: skip
