"""The figure of a contrast: both spectra, what would be observed, and which bins tell them apart.

For each mode two panels: the spectra of A and B with simulated observations of A, and below what of their difference
no change of the unknowns can imitate, beside the noise, with the share of each bin as bars.
"""

from __future__ import annotations

from typing import Any

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch
from numpy.typing import NDArray

from planner.report.contrasttable import headline
from planner.report.figure import (
    STYLE,
    WIDTH_MM,
    add_heading,
    bin_edges,
    bin_stairs,
    draw_points,
    made_by,
    wavelength_axis,
)
from planner.report.points import simulated_points
from planner.studies.contrasts import ContrastResult, ContrastSpectrum
from planner.studies.results import BinnedSpectrum

__all__ = ["contrast_figure"]

Array = NDArray[np.float64]

_LEFT_MM, _RIGHT_MM, _TOP_MM, _BOTTOM_MM = 18.0, 13.0, 13.5, 26.0
_SPECTRA_MM, _DIFFERENCE_MM, _BETWEEN_MM, _GAP_MM = 42.0, 26.0, 3.0, 16.0
_LABEL_MM = 10.5
"""From the axis to the middle of its label."""
_GROUPS = 30
_A: dict[str, Any] = {"color": "black", "lw": 1.1}
_B: dict[str, Any] = {"color": "#2f6db5", "lw": 1.2, "dashes": (4.0, 1.3)}
_LEFT: dict[str, Any] = {"color": "black", "lw": 1.1}
_NOISE: dict[str, Any] = {"color": "0.82", "lw": 0.0}
_SHARE: dict[str, Any] = {"facecolor": "#c46a00", "edgecolor": "#7a3b00", "lw": 0.4}
_BARS = 0.25
"""Height of the largest bar over that of its panel."""


def contrast_figure(result: ContrastResult, *, seed: int = 1) -> Figure:
    """The figure of a contrast, with points for the transits that each mode needs, or for all on offer.

    Parameters
    ----------
    result : ContrastResult
    seed : int
        Of the simulated points.
    """
    block = _SPECTRA_MM + _BETWEEN_MM + _DIFFERENCE_MM
    height = _TOP_MM + _BOTTOM_MM + len(result.spectra) * block + (len(result.spectra) - 1) * _GAP_MM
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        for index, (row, spectrum) in enumerate(zip(result.rows, result.spectra, strict=True)):
            top = height - _TOP_MM - index * (block + _GAP_MM)
            upper = _axes(figure, top, _SPECTRA_MM, height)
            lower = _axes(figure, top - _SPECTRA_MM - _BETWEEN_MM, _DIFFERENCE_MM, height)
            _draw_spectra(upper, spectrum, np.random.default_rng([seed, index]))
            _draw_difference(lower, spectrum)
            upper.set_title(f"{row.mode}: {headline(row)}", loc="left", pad=3)
        _add_legend(figure)
        add_heading(figure, "Two atmospheres told apart", made_by(result.version, result.invented))
        _add_titles(figure, result, height)
    return figure


def _axes(figure: Figure, top_mm: float, size_mm: float, height_mm: float) -> Axes:
    width = 1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM
    return figure.add_axes((_LEFT_MM / WIDTH_MM, (top_mm - size_mm) / height_mm, width, size_mm / height_mm))


def _draw_spectra(axes: Axes, spectrum: ContrastSpectrum, rng: np.random.Generator) -> None:
    edges = bin_edges(spectrum)
    axes.plot(edges, bin_stairs(spectrum, spectrum.depth_a_ppm), **_A, zorder=3)
    axes.plot(edges, bin_stairs(spectrum, spectrum.depth_b_ppm), **_B, zorder=2)
    points = simulated_points(_as_observed(spectrum), spectrum.transits, _GROUPS, rng)
    draw_points(axes, points)
    wavelength_axis(axes, spectrum)
    axes.set_xlabel("")
    axes.tick_params(labelbottom=False)
    _label(axes, "Transit depth (ppm)")
    telling = points.error_ppm <= 3 * np.median(points.error_ppm) if points.error_ppm.size else np.zeros(0, bool)
    both = np.concatenate([spectrum.depth_a_ppm, spectrum.depth_b_ppm])
    low = float(np.min((points.depth_ppm - points.error_ppm)[telling], initial=both.min()))
    high = float(np.max((points.depth_ppm + points.error_ppm)[telling], initial=both.max()))
    axes.set_ylim(low - 0.06 * (high - low), high + 0.06 * (high - low))


def _draw_difference(axes: Axes, spectrum: ContrastSpectrum) -> None:
    """What cannot be imitated, over the noise of each bin, and the share of each bin below."""
    edges, usable = bin_edges(spectrum), spectrum.usable
    noise = np.sqrt(spectrum.noise_one_transit_ppm**2 / spectrum.transits + spectrum.floor_ppm**2)
    noise = np.where(usable, noise, np.nan)
    axes.fill_between(edges, bin_stairs(spectrum, -noise), bin_stairs(spectrum, noise), **_NOISE, zorder=0)
    axes.axhline(0.0, color="0.4", lw=0.6, zorder=1)
    axes.plot(edges, bin_stairs(spectrum, np.where(usable, spectrum.left_ppm, np.nan)), **_LEFT, zorder=3)
    wavelength_axis(axes, spectrum)
    _label(axes, "What is left of\nA less B (ppm)")
    largest = float(np.abs(spectrum.left_ppm).max(initial=0.0))
    reach = 1.15 * max(largest, 1.5 * float(np.nanmin(noise, initial=np.inf)) if usable.any() else 0.0) or 1.0
    axes.set_ylim(-reach * (1 + 2 * _BARS), reach)
    _draw_shares(axes, spectrum, reach)


def _label(axes: Axes, text: str) -> None:
    """The labels of all panels in one line."""
    axes.set_ylabel(text)
    axes.yaxis.set_label_coords(-_LABEL_MM / (WIDTH_MM - _LEFT_MM - _RIGHT_MM), 0.5)


def _draw_shares(axes: Axes, spectrum: ContrastSpectrum, reach: float) -> None:
    positive = np.maximum(spectrum.share, 0.0)
    if positive.max(initial=0.0) <= 0:
        return
    bottom = -reach * (1 + 2 * _BARS)
    heights = positive / positive.max() * _BARS * 2 * reach * (1 + _BARS)
    axes.bar(spectrum.from_um, heights, spectrum.to_um - spectrum.from_um, bottom=bottom, align="edge", **_SHARE)


def _as_observed(spectrum: ContrastSpectrum) -> BinnedSpectrum:
    """The spectrum of A in the form from which observations are simulated."""
    return BinnedSpectrum(
        gas="A",
        mixing_ratio=1.0,
        mode=spectrum.mode,
        detector=spectrum.detector,
        from_um=spectrum.from_um,
        to_um=spectrum.to_um,
        depth_ppm=spectrum.depth_a_ppm,
        shares_ppm={},
        noise_one_transit_ppm=spectrum.noise_one_transit_ppm,
        floor_ppm=spectrum.floor_ppm,
        usable=spectrum.usable,
        scale_height_ppm=1.0,
    )


def _add_titles(figure: Figure, result: ContrastResult, height_mm: float) -> None:
    """Who is A and who is B, under the legend."""
    for number, (letter, title) in enumerate((("A", result.title_a), ("B", result.title_b))):
        figure.text(
            _LEFT_MM / WIDTH_MM,
            (5.6 - 3.6 * number) / height_mm,
            f"{letter}: {title}",
            ha="left",
            va="center",
            fontsize=7.5,
        )


def _add_legend(figure: Figure) -> None:
    height_mm = figure.get_figheight() * 25.4
    handles: list[Line2D | Patch] = [
        Line2D([], [], **_A, label="A"),
        Line2D([], [], **_B, label="B"),
        Line2D(
            [], [], color="black", marker="o", ms=2.4, mfc="white", mew=0.6, lw=0.6, label="simulated observation of A"
        ),
        Patch(**_NOISE, label="noise of a bin"),
        Patch(**_SHARE, label="share of the bin in what tells them apart"),
    ]
    figure.legend(
        handles=handles, loc="lower center", ncols=5, frameon=False, handlelength=2.6, columnspacing=1.3,
        bbox_to_anchor=(0.5, 7.5 / height_mm), borderaxespad=0.0,
    )  # fmt: skip
