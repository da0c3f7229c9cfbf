"""A map of transits: the figure for a proposal, and the numbers behind it.

Made for print as the figure of a plan. Shades grow darker with the transits and every contour carries its number, so
that nothing rests on colour; what no number of transits reaches is hatched.
"""

from __future__ import annotations

from itertools import pairwise
from typing import Any

import matplotlib
import numpy as np
from astropy.table import Column, Table
from matplotlib import patheffects
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.colors import LinearSegmentedColormap
from matplotlib.contour import QuadContourSet
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Patch, Rectangle
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from numpy.typing import NDArray
from scipy import ndimage
from scipy.interpolate import RectBivariateSpline
from scipy.spatial import cKDTree

from planner.report.figure import STYLE, WIDTH_MM, add_heading, gas_label, made_by
from planner.report.words import count_text, ratio_text
from planner.studies.outcomes import MapAxis, MapResult

__all__ = ["map_figure", "map_table"]

Array = NDArray[np.float64]

_HEIGHT_MM = 95.0
_LEFT_MM, _RIGHT_MM, _TOP_MM, _BOTTOM_MM = 17.0, 44.0, 11.5, 12.0
_SHADES = LinearSegmentedColormap.from_list("transits", ["#f4f7fb", "#b7cbe2", "#6f94bf", "#355f92", "#16345c"])
_HATCH: dict[str, Any] = {"facecolor": "0.96", "edgecolor": "0.45", "hatch": "/////", "lw": 0.0}
_FINE = 300
_BOLD, _FINE_LINE = 1.6, 0.7
_LEAST_ROOM_MM = 2.0
"""To the next contour, for a number on one."""
_MOST_LN = 4.0
"""Significances further from the wanted one are all alike to a contour."""
_LEAST_ROOM = 24
"""Half the room that the label of the hatched region needs, in points of the fine grid."""
_PRESSURE = "bar"
_UNITS = {
    "M_earth": ("Earth masses", "earthMass"),
    "R_earth": ("Earth radii", "earthRad"),
    "R_sun": ("solar radii", "solRad"),
}
"""In words, and as astropy writes them in tables."""


def map_table(result: MapResult) -> Table:
    """The cells of a map, x running fastest; transits that no number suffices for are infinite."""
    columns, rows = np.meshgrid(result.x.values, result.y.values)
    table = Table(
        meta={
            "title": result.title,
            "invented": result.invented,
            "gas": result.gas,
            "mode": result.mode,
            "threshold_sigma": result.threshold_sigma,
            "power": result.power,
            "significance": "one-sided",
            "transits_on_offer": result.transits_on_offer,
            "charged_hours_per_transit": result.charged_hours_per_transit,
            "nuisances": dict(result.nuisances),
            "assumptions": list(result.assumptions),
            "line_data": list(result.line_data),
            "cautions": list(result.cautions),
            "limbcast": result.version,
        }
    )
    for axis, values in ((result.x, columns), (result.y, rows)):
        table[axis.name] = Column(values.ravel(), unit=_astropy_unit(axis.unit))
    table["transits_unrounded"] = result.transits_unrounded.ravel()
    table["transits_required"] = np.maximum(1.0, np.ceil(result.transits_unrounded - 1e-9)).ravel()
    table["snr_one_transit"] = result.snr_one_transit.ravel()
    table["snr_limit"] = result.snr_limit.ravel()
    return table


def map_figure(result: MapResult) -> Figure:
    """Transits as shades with contours; the unreachable hatched; where the scenario stands marked by a star."""
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, _HEIGHT_MM / 25.4))
        FigureCanvasAgg(figure)
        box = (
            _LEFT_MM / WIDTH_MM,
            _BOTTOM_MM / _HEIGHT_MM,
            1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM,
            1 - (_TOP_MM + _BOTTOM_MM) / _HEIGHT_MM,
        )
        axes = figure.add_axes(box)
        _draw(axes, result)
        _add_key(figure, result)
        add_heading(figure, result.title, made_by(result.version, result.invented))
        what = f"{gas_label(result.gas)} with {result.mode}: transits for {result.threshold_sigma:g}σ"
        axes.set_title(f"{what}, {100 * result.power:g} % chance", loc="left", pad=3)
    return figure


def _draw(axes: Axes, result: MapResult) -> None:
    """Shades from the most transits to the fewest, one painted over the other, then contours."""
    x, y = _fine(result.x), _fine(result.y)
    axes.add_patch(Rectangle((0, 0), 1, 1, transform=axes.transAxes, **_HATCH, zorder=0))
    reachable = _field(result, result.snr_limit)
    for number, field in enumerate([reachable, *(_field(result, snr) for snr in result.snr_after[::-1])]):
        axes.contourf(x, y, field, levels=[0, np.inf], colors=[_shade(len(result.levels) - number, result)], zorder=1)
    axes.contour(x, y, reachable, levels=[0], colors="0.25", linewidths=0.7, zorder=2)
    contours = {
        level: axes.contour(
            x,
            y,
            _field(result, snr),
            levels=[0],
            colors="black",
            linewidths=_BOLD if level == result.transits_on_offer else _FINE_LINE,
            zorder=3,
        )
        for level, snr in zip(result.levels, result.snr_after, strict=True)
    }
    star = _star(result)
    if star is not None:
        axes.plot(*star, "*", ms=9, mfc="white", mec="black", mew=0.8, clip_on=False, zorder=6)
    _scale(axes, result)
    _label_contours(axes, contours, result)
    _label_unreachable(axes, x, y, reachable < 0)


def _field(result: MapResult, snr: Array) -> Array:
    """Logarithm of a significance over the wanted one on the fine grid: zero where it is just enough."""
    with np.errstate(divide="ignore"):
        logarithm = np.clip(np.log(snr / result.snr_wanted), -_MOST_LN, _MOST_LN)
    places = [np.linspace(0, 1, axis.values.size) for axis in (result.y, result.x)]
    order = [min(3, place.size - 1) for place in places]
    fine = np.linspace(0, 1, _FINE)
    values: Array = RectBivariateSpline(*places, logarithm, kx=order[0], ky=order[1])(fine, fine)
    return values


def _fine(axis: MapAxis) -> Array:
    spaced = np.geomspace if axis.logarithmic else np.linspace
    return spaced(axis.values[0], axis.values[-1], _FINE)


def _shade(number: int, result: MapResult) -> Any:
    """Shade of what the level of this position is enough for; that after the last is for more than any level."""
    return _SHADES(number / len(result.levels))


def _label_contours(axes: Axes, contours: dict[int, QuadContourSet], result: MapResult) -> None:
    """Numbers on the contours, each where it has most room; a contour without room goes without."""
    to_mm = 25.4 / axes.figure.dpi
    lines = {level: _points(axes, contour) for level, contour in contours.items()}
    box = axes.bbox
    star = _star(result)
    taken = [] if star is None else [axes.transData.transform(star)]
    for level, contour in contours.items():
        mine = lines[level]
        others = [points for other, points in lines.items() if other != level and len(points)]
        if not len(mine):
            continue
        room = np.min([mine - (box.x0, box.y0), (box.x1, box.y1) - mine], axis=(0, 2)) / 2
        for place in taken:
            room = np.minimum(room, np.hypot(*(mine - place).T) / 3)
        for points in others:
            room = np.minimum(room, cKDTree(points).query(mine)[0])
        best = int(np.argmax(room))
        if room[best] * to_mm < _LEAST_ROOM_MM:
            continue
        taken.append(mine[best])
        (label,) = axes.clabel(
            contour, fmt=count_text(level), inline_spacing=3, manual=[axes.transData.inverted().transform(mine[best])]
        )
        label.set_fontweight("bold" if level == result.transits_on_offer else "normal")
        label.set_path_effects([patheffects.withStroke(linewidth=2.2, foreground="white")])


def _points(axes: Axes, contour: QuadContourSet) -> Array:
    """Points of a contour on the page, in pixels, ``(point, 2)``."""
    vertices = np.concatenate([np.zeros((0, 2)), *(np.asarray(path.vertices) for path in contour.get_paths())])
    return np.asarray(axes.transData.transform(vertices))


def _star(result: MapResult) -> tuple[float, float] | None:
    """The scenario's own values, if both lie on the map."""
    if result.x.stated is None or result.y.stated is None:
        return None
    return result.x.stated, result.y.stated


def _label_unreachable(axes: Axes, x: Array, y: Array, unreachable: NDArray[np.bool_]) -> None:
    """Say what the hatching means where there is most room for it."""
    room = ndimage.distance_transform_edt(np.pad(unreachable, 1))[1:-1, 1:-1]
    row, column = np.unravel_index(np.argmax(room), room.shape)
    if room[row, column] < _LEAST_ROOM:
        return
    axes.text(
        x[column], y[row], "out of reach", ha="center", va="center", fontsize=8.0, zorder=5,
        bbox={"facecolor": "white", "edgecolor": "0.45", "lw": 0.5, "pad": 2.5},
    )  # fmt: skip


def _scale(axes: Axes, result: MapResult) -> None:
    for axis, matplotlib_axis, name in ((result.x, axes.xaxis, "x"), (result.y, axes.yaxis, "y")):
        if axis.logarithmic:
            axes.set(**{f"{name}scale": "log"})
            matplotlib_axis.set_major_locator(LogLocator(numticks=20))
            matplotlib_axis.set_minor_locator(LogLocator(subs=range(2, 10), numticks=20))
            matplotlib_axis.set_minor_formatter(NullFormatter())
            text = ratio_text if axis.label.startswith("mixing ratio") else "{:g}".format
            matplotlib_axis.set_major_formatter(FuncFormatter(lambda value, _, text=text: text(value)))
        ends = axis.values[0], axis.values[-1]
        # pressure falls upwards, as in the air
        axes.set(**{f"{name}lim": ends[::-1] if axis.unit == _PRESSURE else ends})
        matplotlib_axis.set_label_text(_axis_label(axis))
    axes.tick_params(which="both", top=True, right=True)


def _axis_label(axis: MapAxis) -> str:
    head, of, gas = axis.label.partition(" of ")
    label = f"{head}{of}{gas_label(gas)}" if gas and head == "mixing ratio" else axis.label
    unit = (
        axis.unit.replace("M_earth", "Earth masses").replace("R_earth", "Earth radii").replace("R_sun", "solar radii")
    )
    return label[0].upper() + label[1:] + (f" ({unit})" if unit else "")


def _add_key(figure: Figure, result: MapResult) -> None:
    """Shades with the transits they stand for, beside the map, and what a transit is charged."""
    texts = [f"up to {count_text(result.levels[0])}"]
    texts += [f"{count_text(a)} to {count_text(b)}" for a, b in pairwise(result.levels)]
    texts.append(f"more than {count_text(result.levels[-1])}")
    handles: list[Patch | Line2D] = [
        Patch(facecolor=_shade(number, result), edgecolor="0.25", lw=0.5, label=text)
        for number, text in enumerate(texts)
    ]
    handles.append(Patch(**_HATCH, label="no number is enough"))
    handles.append(
        Line2D([], [], color="black", lw=_BOLD, label=f"all {count_text(result.transits_on_offer)} on offer")
    )
    if _star(result) is not None:
        handles.append(Line2D([], [], color="none", marker="*", ms=9, mfc="white", mec="black", label="the scenario"))
    figure.legend(
        handles=handles, title="Transits", loc="upper left", alignment="left", frameon=False, handlelength=1.8,
        bbox_to_anchor=(1 - (_RIGHT_MM - 2.0) / WIDTH_MM, 1 - (_TOP_MM - 2.0) / _HEIGHT_MM), labelspacing=0.55,
    )  # fmt: skip

    note = (
        f"A transit is charged {result.charged_hours_per_transit:.2g} h.\n"
        f"Hatched: the expected S/N\nstays below {result.snr_wanted:.2g} for ever\n(floor, or confusion)."
    )
    figure.text(
        1 - (_RIGHT_MM - 4.4) / WIDTH_MM, _BOTTOM_MM / _HEIGHT_MM, note, fontsize=7.0, va="bottom", color="0.25"
    )


def _astropy_unit(unit: str) -> str | None:
    return _UNITS.get(unit, (unit, unit))[1] or None
