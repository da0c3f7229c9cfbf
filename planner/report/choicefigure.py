"""Figures of a choice between gases: hours against information, and a chart of transits, gas by mode.

Made for print as the figure of a plan: modes differ by the form of their marks, shades stand for numbers that are
written out as well.
"""

from __future__ import annotations

from collections.abc import Collection, Sequence
from math import log10

import matplotlib
import numpy as np
from matplotlib.axes import Axes
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter
from matplotlib.transforms import Bbox

from planner.report.choices import bits_text
from planner.report.figure import STYLE, WIDTH_MM, add_heading, gas_label, made_by
from planner.report.words import count_text, ratio_text
from planner.studies.choices import Choice, ChoiceResult
from planner.studies.results import Verdict

__all__ = ["chart_figure", "worth_figure"]

_HEIGHT_MM = 105.0
_LEFT_MM, _RIGHT_MM, _TOP_MM, _BOTTOM_MM = 15.0, 60.0, 13.0, 18.0
_MARKS = (("o", "#1f4e8c"), ("s", "#c46a00"), ("^", "#2b8a6b"), ("D", "#8a3d7c"), ("v", "#555555"), ("P", "#a33333"))
_LISTED = 17
_LABELLED = 0.02
"""Share of the best: marks below it are named in the list, not in the plot."""
_OFFSETS_MM = [
    (sign * r * dx, r * dy)
    for r in (2.0, 3.2, 4.6, 6.5, 9.0)
    for sign in (1, -1)
    for dx, dy in ((1.0, 0.0), (0.85, 0.6), (0.85, -0.6), (0.3, 1.0), (0.3, -1.0))
]
_NOTHING = "No gas that tells anything is detected,\nhowever many transits: see the list"
_ROW_MM, _CELL_MM = 4.6, 27.0


def worth_figure(result: ChoiceResult) -> Figure:
    """Hours that each gas needs with each mode, against what the hours given are worth with it.

    A mark stands at the hours after which the gas is detected at its reference mixing ratio, and at the bits that the
    amplitude tells after the hours given; a line spans 16 to 84 % of the opinions. What never gets there is listed.
    """
    modes = list(dict.fromkeys(choice.mode for choice in sorted(result.choices, key=lambda c: c.mode)))
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, _HEIGHT_MM / 25.4))
        FigureCanvasAgg(figure)
        axes = figure.add_axes(
            (
                _LEFT_MM / WIDTH_MM,
                _BOTTOM_MM / _HEIGHT_MM,
                1 - (_LEFT_MM + _RIGHT_MM) / WIDTH_MM,
                1 - (_TOP_MM + _BOTTOM_MM) / _HEIGHT_MM,
            )
        )
        shown = [choice for choice in result.choices if _is_marked(choice, result)]
        _draw_marks(axes, shown, modes)
        _scale(axes, shown, result)
        if not shown:
            axes.set_yticks([])
            axes.text(0.5, 0.5, _NOTHING, transform=axes.transAxes, ha="center", va="center", linespacing=1.5)
        _label_marks(figure, axes, shown, result.hours)
        _list_beside(figure, result, modes)
        _legend(figure, modes, {choice.mode for choice in shown})
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def chart_figure(result: ChoiceResult) -> Figure:
    """Transits that each gas needs with each mode, gases in the order of their worth.

    Gases that are alike either way and out of reach are left out.
    """
    every = dict.fromkeys(choice.gas for choice in result.choices)
    gases = [gas for gas in every if _tells(gas, result) or _ever(gas, result)] or list(every)
    modes = list(dict.fromkeys(choice.mode for choice in sorted(result.choices, key=lambda c: c.mode)))
    by_place = {(choice.gas, choice.mode): choice for choice in result.choices}
    left, top, bottom = 40.0, 21.0, 13.0
    width = min(WIDTH_MM, left + _CELL_MM * len(modes) + 32.0)
    height = top + bottom + _ROW_MM * len(gases)
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(WIDTH_MM / 25.4, height / 25.4))
        axes = figure.add_axes(
            (left / WIDTH_MM, bottom / height, (width - left - 2.0) / WIDTH_MM, _ROW_MM * len(gases) / height)
        )
        for row, gas in enumerate(gases):
            for column, mode in enumerate(modes):
                _draw_cell(axes, column, row, by_place[gas, mode])
            _draw_row_ends(axes, row, len(modes), gas, result)
        _frame_chart(axes, modes, len(gases), len(modes) + 32.0 / _CELL_MM)
        figure.text(
            left / WIDTH_MM, 5.0 / height, _chart_note(result), ha="left", va="center", fontsize=7.0, color="0.25"
        )
        add_heading(figure, result.title, made_by(result.version, result.invented))
    return figure


def _bits(choice: Choice) -> float:
    return float(choice.worth.amplitude_bits)


def _hours(choice: Choice) -> float:
    hours = choice.plan.marginalised.hours_required
    assert hours is not None  # only what can be reached is drawn
    return hours


def _is_marked(choice: Choice, result: ChoiceResult) -> bool:
    """Whether it stands in the plot: reachable by some number of transits, and worth something."""
    best = max(map(_bits, result.choices))
    return choice.plan.marginalised.hours_required is not None and _bits(choice) > _LABELLED * best


def _draw_marks(axes: Axes, choices: Sequence[Choice], modes: Sequence[str]) -> None:
    for choice in choices:
        mark, colour = _MARKS[modes.index(choice.mode) % len(_MARKS)]
        hours = _hours(choice)
        axes.plot([hours, hours], choice.bits_spread, color="0.72", lw=0.8, zorder=1)
        axes.plot([hours], [_bits(choice)], mark, ms=4.5, mfc=colour, mec="black", mew=0.5, zorder=3)


def _scale(axes: Axes, choices: Sequence[Choice], result: ChoiceResult) -> None:
    hours = [_hours(choice) for choice in choices] or [result.hours]
    axes.set_xscale("log")
    axes.set_xlim(min([*hours, result.hours]) / 1.6, max([*hours, result.hours]) * 2.5)
    most = max([*(choice.bits_spread[1] for choice in choices), *map(_bits, choices)], default=1.0)
    axes.set_ylim(0, 1.1 * most)
    axes.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
    axes.xaxis.set_major_formatter(FuncFormatter(lambda x, _: f"{x:g}"))
    axes.xaxis.set_minor_locator(LogLocator(subs=tuple(range(1, 10))))
    axes.xaxis.set_minor_formatter(NullFormatter())
    axes.axvspan(axes.get_xlim()[0], result.hours, color="0.95", lw=0, zorder=0)
    axes.axvline(result.hours, color="0.35", lw=0.8, dashes=(4, 2), zorder=0)
    axes.annotate(
        f"{result.hours:.4g} h given", (result.hours, 1), (0, 2), xycoords=("data", "axes fraction"),
        textcoords="offset points", ha="center", va="bottom", fontsize=7.0, color="0.25",
    )  # fmt: skip
    axes.set_xlabel(
        f"Hours that a detection at {result.threshold_sigma:g}σ takes, at the reference mixing ratio", labelpad=1.5
    )
    axes.set_ylabel(f"Information about {result.hypothesis} in the hours given (bit)")
    axes.tick_params(which="both", top=True, right=True)


def _label_marks(figure: Figure, axes: Axes, choices: Sequence[Choice], hours_given: float) -> None:
    """A name beside each mark: the nearest place where it covers no mark, no line, no other name and no edge."""
    canvas = figure.canvas
    renderer = canvas.get_renderer()  # type: ignore[attr-defined]
    per_mm = figure.dpi / 25.4
    places = [axes.transData.transform((_hours(choice), _bits(choice))) for choice in choices]
    taken = [Bbox.from_bounds(x - 1.1 * per_mm, y - 1.1 * per_mm, 2.2 * per_mm, 2.2 * per_mm) for x, y in places]
    taken += _bars(axes, choices)
    frame = axes.get_window_extent(renderer)
    given = axes.transData.transform((hours_given, 0))[0]
    taken.append(Bbox.from_extents(given - 1, frame.y0, given + 1, frame.y1))
    for choice, (x, y) in zip(choices, places, strict=True):
        text = axes.text(0, 0, gas_label(choice.gas), fontsize=7.5, transform=None, va="center", zorder=4)
        best: tuple[float, float, float, str] | None = None
        for dx, dy in _OFFSETS_MM:
            text.set_position((x + dx * per_mm, y + dy * per_mm))
            text.set_horizontalalignment("left" if dx > 0 else "right")
            box = text.get_window_extent(renderer).expanded(1.02, 0.9)
            inside = frame.x0 < box.x0 and box.x1 < frame.x1 and frame.y0 < box.y0 and box.y1 < frame.y1
            clashes = sum(box.overlaps(other) for other in taken) + (0 if inside else 10)
            if best is None or clashes < best[0]:
                best = (clashes, dx, dy, "left" if dx > 0 else "right")
            if clashes == 0:
                break
        assert best is not None
        text.remove()
        _, dx, dy, side = best
        label = axes.annotate(
            gas_label(choice.gas), (_hours(choice), _bits(choice)),
            (dx * 72 / 25.4, dy * 72 / 25.4), textcoords="offset points", ha=side, va="center", fontsize=7.5, zorder=4,
            arrowprops={"arrowstyle": "-", "lw": 0.4, "color": "0.4", "shrinkA": 0, "shrinkB": 2}
            if np.hypot(dx, dy) > 3.5 else None,
        )  # fmt: skip
        taken.append(label.get_window_extent(renderer))


def _bars(axes: Axes, choices: Sequence[Choice]) -> list[Bbox]:
    """Where the lines of the opinions are, on the canvas."""
    boxes = []
    for choice in choices:
        ends = [axes.transData.transform((_hours(choice), bits)) for bits in choice.bits_spread]
        boxes.append(Bbox([ends[0] - [1, 0], ends[1] + [1, 0]]))
    return boxes


def _list_beside(figure: Figure, result: ChoiceResult, modes: Sequence[str]) -> None:
    """What has no mark: gases that no number of transits detects with any mode, and those worth nothing."""
    x, y = 1 - (_RIGHT_MM - 4.0) / WIDTH_MM, 1 - _TOP_MM / _HEIGHT_MM
    marked = {choice.gas for choice in result.choices if _is_marked(choice, result)}
    rest = list(dict.fromkeys(choice.gas for choice in result.choices if choice.gas not in marked))
    mute = [gas for gas in rest if not _tells(gas, result)]
    never = [g for g in rest if g not in mute and not _ever(g, result)]
    little = [gas for gas in rest if gas not in mute and gas not in never]
    line = 3.6 / _HEIGHT_MM
    for title, gases, with_bits in (
        ("Never detected; bits of the amplitude", never, True),
        ("Detectable, but little told (bits)", little, True),
        ("Alike either way: tells nothing alone", mute, False),
    ):
        if not gases:
            continue
        figure.text(x, y, title, ha="left", va="top", fontsize=7.0, fontweight="bold")
        y -= line
        for text in _entries(gases, result, with_bits):
            figure.text(x, y, text, ha="left", va="top", fontsize=7.0)
            y -= line
        y -= 0.5 * line


def _entries(gases: Sequence[str], result: ChoiceResult, with_bits: bool) -> list[str]:
    """Names with the bits of the best mode, a few to a line."""
    best = {gas: max(_bits(choice) for choice in result.choices if choice.gas == gas) for gas in gases}
    told = [f"{gas_label(gas)} {bits_text(best[gas])}" if with_bits else gas_label(gas) for gas in gases]
    per_line = 2 if with_bits else 4
    lines = ["   ".join(told[i : i + per_line]) for i in range(0, len(told), per_line)]
    return lines if len(lines) <= _LISTED else [*lines[: _LISTED - 1], f"and {len(told) - per_line * _LISTED} more"]


def _tells(gas: str, result: ChoiceResult) -> bool:
    return any(choice.tells for choice in result.choices if choice.gas == gas)


def _ever(gas: str, result: ChoiceResult) -> bool:
    return any(c.plan.marginalised.hours_required is not None for c in result.choices if c.gas == gas)


def _legend(figure: Figure, modes: Sequence[str], shown: Collection[str]) -> None:
    handles = [
        Line2D([], [], marker=mark, color=colour, mec="black", mew=0.5, ms=4.5, lw=0, label=mode)
        for mode, (mark, colour) in zip(modes, _MARKS, strict=False)
        if mode in shown
    ]
    handles.append(Line2D([], [], color="0.72", lw=0.8, label="16 to 84 % of opinions"))
    figure.legend(
        handles=handles, loc="lower left", ncols=4, frameon=False, handlelength=1.6, columnspacing=1.4,
        bbox_to_anchor=((_LEFT_MM - 2) / WIDTH_MM, 0.0), borderaxespad=0.3,
    )  # fmt: skip


def _draw_cell(axes: Axes, column: int, row: int, choice: Choice) -> None:
    counts, verdict = choice.plan.marginalised, choice.plan.verdict
    shade, dark = _shade(choice)
    axes.add_patch(Rectangle((column, row), 1, 1, facecolor=str(shade), edgecolor="white", lw=0.8))
    if verdict in (Verdict.NO_BAND, Verdict.SATURATED):
        text, weight = "no signal" if verdict is Verdict.NO_BAND else "saturated", "normal"
    elif counts.transits_required is None:
        text, weight = "never" + (" (floor)" if verdict is Verdict.FLOOR else " (confusion)"), "normal"
    else:
        enough = counts.transits_required <= choice.transits
        text, weight = count_text(counts.transits_required), "bold" if enough else "normal"
    colour = "white" if dark else "black" if counts.transits_required is not None else "0.45"
    axes.text(column + 0.5, row + 0.5, text, ha="center", va="center", color=colour, fontweight=weight, fontsize=7.0)


def _shade(choice: Choice) -> tuple[float, bool]:
    """Grey of a cell, and whether letters on it are white: the fewer transits the darker."""
    required = choice.plan.marginalised.transits_required
    if required is None:
        return 0.97, False
    share = min(log10(max(required, 1)) / 3.5, 1.0)
    shade = 0.32 + 0.6 * share
    return shade, shade < 0.55


def _draw_row_ends(axes: Axes, row: int, columns: int, gas: str, result: ChoiceResult) -> None:
    """Name and reference before a row, worth and range of opinions behind it."""
    best = next(choice for choice in result.choices if choice.gas == gas)
    axes.text(
        -0.06, row + 0.5, f"{gas_label(gas)}, {ratio_text(best.mixing_ratio)}", ha="right", va="center", fontsize=7.5
    )
    worth = f"{bits_text(_bits(best))}  ({'–'.join(bits_text(end) for end in best.bits_spread)})"
    axes.text(columns + 0.08, row + 0.5, worth if best.tells else "alike either way", va="center", fontsize=7.0)


def _frame_chart(axes: Axes, modes: Sequence[str], rows: int, width: float) -> None:
    axes.set_xlim(0, width)
    axes.set_ylim(rows, 0)
    axes.set_axis_off()
    for column, mode in enumerate(modes):
        axes.text(
            column + 0.5, -0.3, mode.replace("-", "-\n", 1) if len(mode) > 14 else mode, ha="center", va="bottom",
            fontsize=7.0,
        )  # fmt: skip
    axes.text(len(modes) + 0.08, -0.3, "bits, best mode\n(16–84 % of opinions)", va="bottom", fontsize=7.0)


def _chart_note(result: ChoiceResult) -> str:
    return (
        f"Transits for {result.threshold_sigma:g}σ with a chance of {100 * result.power:g} %, all unknowns "
        f"marginalised. Bold: within {result.hours:.4g} h.\nBits about {result.hypothesis} in that time; the "
        "presences and priors behind them are judgement."
    )
