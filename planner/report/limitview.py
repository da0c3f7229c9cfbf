"""Limits for people: what some transits reach, in the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.table import sentences_block
from planner.report.words import count_text, gas_text, hours_text, ratio_text
from planner.studies.outcomes import LimitCurve, LimitPoint, LimitResult

__all__ = ["limit_view"]


_ABREAST = 2
"""Modes beside each other, for 80 columns."""


def limit_view(result: LimitResult) -> Group:
    """Limits as something a rich console prints: headline, one block per gas, what it rests on."""
    gases = list(dict.fromkeys(curve.gas for curve in result.curves))
    blocks = [_gas_block(gas, [curve for curve in result.curves if curve.gas == gas]) for gas in gases]
    priors = "; ".join(f"{name} {prior}" for name, prior in result.nuisances)
    return Group(
        _headline(result),
        *(item for block in blocks for item in block),
        *sentences_block("Held unknown, with the width of the prior", [priors] if priors else []),
        *sentences_block("Assumptions", result.assumptions),
        *sentences_block("Line data", result.line_data),
        *sentences_block("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


def _headline(result: LimitResult) -> Text:
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.invented:
        text.append("The target is invented.\n", style="italic")
    text.append(
        f"Detectable: the smallest mixing ratio that reaches {result.threshold_sigma:g} sigma, one-sided, with a "
        f"chance of {100 * result.power:g} %.\n"
        f"Excluded: larger ones are excluded with {100 * result.confidence:g} % confidence when nothing is seen.\n"
        "Numbers allow for all that is held unknown."
    )
    return text


def _gas_block(gas: str, curves: Sequence[LimitCurve]) -> list[RenderableType]:
    """What a gas is called and where it was looked for, tables of two modes each, and why there is no limit."""
    stated = ", ".join(ratio_text(ratio) for ratio in curves[0].stated_ratios)
    tried = ratio_text(float(curves[0].ratios[-1]))
    head = Text(f"{gas_text(gas)}", style="bold underline")
    head.append(f" (in the scenario {stated}; tried up to {tried})", style="not bold not underline")
    tables = [_table(curves[first : first + _ABREAST]) for first in range(0, len(curves), _ABREAST)]
    notes = [
        f"{curve.mode}: no limit, {curve.obstacle.value}: {curve.obstacle_words}" for curve in curves if curve.obstacle
    ]
    return [Text(), head, *tables, *map(Text, notes)]


def _table(curves: Sequence[LimitCurve]) -> Table:
    """Transits down, modes across."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("\ntransits", justify="right", style="bold")
    for curve in curves:
        table.add_column(f"{curve.mode}\nhours", justify="right")
        table.add_column("\ndetectable", justify="right", no_wrap=True, style="bold")
        table.add_column("\nexcluded", justify="right", no_wrap=True)
    for points in zip(*(curve.points for curve in curves), strict=True):
        table.add_row(count_text(points[0].transits), *(cell for point in points for cell in _cells(point)))
    table.add_row("no end", *(cell for curve in curves for cell in ("", _ratio(curve.detectable_at_all), "")))
    return table


def _cells(point: LimitPoint) -> tuple[str, str, str]:
    return hours_text(point.hours), _ratio(point.detectable_ratio), _ratio(point.upper_limit_ratio)


def _ratio(ratio: float | None) -> str:
    return "no limit" if ratio is None else ratio_text(ratio)
