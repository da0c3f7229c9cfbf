"""A plan for people: tables and sentences in the terminal, fit for 80 columns and more."""

from __future__ import annotations

import io
from collections.abc import Iterable, Sequence
from dataclasses import fields, is_dataclass
from typing import Any

from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.remedies import remedies_block
from planner.report.simulations import simulations_block
from planner.report.spreads import spreads_block
from planner.report.words import band_text, bands_text, count_text, gas_text, hours_text, ratio_text, snr_text
from planner.studies.results import PlanResult, PlanRow, Verdict

__all__ = ["plan_text", "plan_view", "records_view", "sentences_block"]

_STYLES = {
    Verdict.WITHIN_REACH: "green",
    Verdict.TOO_MANY: "yellow",
    Verdict.FLOOR: "red",
    Verdict.CONFUSION: "red",
    Verdict.NO_BAND: "dim",
    Verdict.SATURATED: "red",
}
_LEAST_SHARE = 0.005
_NUISANCES_SHOWN = 2
_WIDE = 112
"""Columns from which a verdict fits on one line."""


def plan_text(result: PlanResult, width: int = 100) -> str:
    """What `plan_view` shows on a plain terminal of this width."""
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(plan_view(result, width))
    return "\n".join(line.rstrip() for line in file.getvalue().splitlines()) + "\n"


def plan_view(result: PlanResult, width: int) -> Group:
    """A plan as something a rich console of this width prints: headline, one block per mode, what it rests on."""
    modes = list(dict.fromkeys(row.mode for row in result.rows))
    blocks = [_mode_block(mode, [row for row in result.rows if row.mode == mode], width) for mode in modes]
    priors = "; ".join(f"{name} {prior}" for name, prior in result.nuisances)
    return Group(
        _headline(result),
        *(item for block in blocks for item in block),
        *remedies_block(result.rows),
        *simulations_block(result.rows),
        *spreads_block(result),
        *sentences_block("Held unknown, with the width of the prior", [priors] if priors else []),
        *sentences_block("Assumptions", result.assumptions),
        *sentences_block("Line data", result.line_data),
        *sentences_block("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


def records_view(records: Sequence[Any]) -> Table:
    """Any dataclass records of one kind as a table, a column per field."""
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="bold")
    if records and is_dataclass(records[0]):
        for field in fields(records[0]):
            numeric = isinstance(getattr(records[0], field.name), int | float)
            table.add_column(field.name.replace("_", " "), justify="right" if numeric else "left", overflow="fold")
        for record in records:
            table.add_row(*(_cell(getattr(record, field.name)) for field in fields(record)))
    return table


def _cell(value: Any) -> Text:
    if value is None:
        return Text("-")
    if isinstance(value, tuple | list):
        if value and all(isinstance(item, tuple | list) and len(item) == 2 for item in value):
            return Text(", ".join(f"{low:g}-{high:g}" for low, high in value))
        return Text(", ".join(str(item) for item in value))
    return Text(f"{value:.4g}" if isinstance(value, float) else str(value))


def _headline(result: PlanResult) -> Text:
    available = f"; {result.transits_available} transits available" if result.transits_available else ""
    at_most = " at most" if len({row.mode for row in result.rows}) > 1 else ""
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.invented:
        text.append("The target is invented.\n", style="italic")
    text.append(
        f"Goal: {result.threshold_sigma:g} sigma, one-sided, with a chance of {100 * result.power:g} %{available}.\n"
        f"A transit of {result.transit_duration_h:.2f} h is charged{at_most} {result.charged_hours_per_transit:.2f} h. "
        f"Scale height {result.scale_height_km:.3g} km, {result.scale_height_ppm:.3g} ppm.\n"
        "Numbers allow for all that is held unknown; the last two columns take everything but the gas as known."
    )
    return text


def _mode_block(mode: str, rows: Sequence[PlanRow], width: int) -> list[RenderableType]:
    """Numbers, then where they come from, then what is left out of single rows."""
    block: list[RenderableType] = [Text(), Text(mode, style="bold underline"), _numbers(rows, width)]
    if any(row.best_bands or row.confusion for row in rows):
        block += [Text(), _reasons(rows)]
    notes = [note for row in rows for note in _notes(row)]
    return [*block, *(_bullet(note) for note in dict.fromkeys(notes))]


def _numbers(rows: Sequence[PlanRow], width: int) -> Table:
    wide = width >= _WIDE
    table = Table(box=None, pad_edge=False, padding=(0, 2 if wide else 1, 0, 0), header_style="dim")
    table.add_column("\ngas", min_width=7)
    table.add_column("mixing\nratio", justify="right", no_wrap=True, min_width=7)
    table.add_column("\nverdict", width=max(map(len, Verdict)) if wide else 18)
    for heading, least in (("\ntransits", 8), ("\nhours", 6), ("S/N per\ntransit", 7), ("best\nS/N", 5)):
        table.add_column(heading, justify="right", no_wrap=True, min_width=least)
    for heading, least in (("known:\ntransits", 8), ("known:\nhours", 6)):
        table.add_column(heading, justify="right", no_wrap=True, style="dim", min_width=least)
    for row in rows:
        ours, known = row.marginalised, row.all_known
        table.add_row(
            Text(gas_text(row.gas), style="bold"),
            ratio_text(row.mixing_ratio),
            Text(row.verdict.value, style=_STYLES[row.verdict]),
            Text(count_text(ours.transits_required), style="bold"),
            Text(hours_text(ours.hours_required), style="bold"),
            snr_text(ours.snr_one_transit),
            snr_text(ours.snr_limit),
            count_text(known.transits_required),
            hours_text(known.hours_required),
        )
    return table


def _reasons(rows: Sequence[PlanRow]) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("gas", min_width=7)
    table.add_column("mixing\nratio", justify="right", no_wrap=True, min_width=7)
    table.add_column("best bands, um\n(share of the information)", ratio=1)
    table.add_column("what costs most\n(S/N left by it alone)", ratio=1)
    for row in rows:
        bands = bands_text(band for band in row.best_bands if band.share >= _LEAST_SHARE)
        costs = ", ".join(f"{name} ({snr_text(snr)})" for name, snr in row.confusion[:_NUISANCES_SHOWN])
        table.add_row(gas_text(row.gas), ratio_text(row.mixing_ratio), bands or "-", costs or "-")
    return table


def _notes(row: PlanRow) -> list[str]:
    """What is left out, and what to mind with this row."""
    missing: dict[str, list[str]] = {}
    for gas, low, high in sorted(row.uncovered_um, key=lambda stretch: stretch[1]):
        missing.setdefault(gas, []).append(band_text(low, high))
    notes = [f"no data of {gas_text(gas)} at {', '.join(bands)} um: left out" for gas, bands in missing.items()]
    notes += [f"saturated at {band_text(low, high)} um: left out" for low, high in row.saturated_um]
    head = f"{gas_text(row.gas)} {ratio_text(row.mixing_ratio)}"
    return notes + [f"{head}: {caution}" for caution in row.cautions]


def sentences_block(title: str, items: Iterable[str]) -> list[RenderableType]:
    """A title and a list of sentences under it; nothing where there are none."""
    lines = [_bullet(item) for item in items]
    return [Text(), Text(title, style="bold"), *lines] if lines else []


def _bullet(text: str) -> RenderableType:
    table = Table.grid(padding=(0, 1, 0, 0))
    table.add_row(Text("-"), Text(text))
    return table
