"""Limits for people: what some transits reach, in the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.table import sentences_block
from planner.report.words import count_text, gas_text, hours_text, ratio_text
from planner.studies.outcomes import LimitCurve, LimitResult

__all__ = ["limit_view"]


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
    """What a gas is called and where it was looked for, its limits mode by mode, and why there is none."""
    stated = ", ".join(ratio_text(ratio) for ratio in curves[0].stated_ratios)
    tried = ratio_text(float(curves[0].ratios[-1]))
    head = Text(f"{gas_text(gas)}", style="bold underline")
    head.append(f" (in the scenario {stated}; tried up to {tried})", style="not bold not underline")
    notes = [
        f"{curve.mode}: no limit, {curve.obstacle.value}: {curve.obstacle_words}" for curve in curves if curve.obstacle
    ]
    return [Text(), head, _table(curves), *map(Text, notes)]


def _table(curves: Sequence[LimitCurve]) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("mode", overflow="fold")
    table.add_column("transits", justify="right", style="bold", no_wrap=True)
    table.add_column("hours", justify="right", no_wrap=True)
    table.add_column("detectable", justify="right", style="bold", no_wrap=True)
    table.add_column("excluded", justify="right", no_wrap=True)
    for curve in curves:
        for number, point in enumerate(curve.points):
            table.add_row(
                "" if number else curve.mode,
                count_text(point.transits),
                hours_text(point.hours),
                _ratio(point.detectable_ratio),
                _ratio(point.upper_limit_ratio),
            )
        table.add_row("", "no end", "", _ratio(curve.detectable_at_all), "")
    return table


def _ratio(ratio: float | None) -> str:
    return "no limit" if ratio is None else ratio_text(ratio)
