"""What would help a search, and which rivals were tried, in words and as a block of a plan's table."""

from __future__ import annotations

import math
from collections.abc import Sequence

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.words import band_text, count_text, gas_text, hours_text, ratio_text, snr_text
from planner.studies.results import PlanRow, Remedy, RemedyKind, Rival, Verdict

__all__ = ["confusion_text", "remedies_block", "remedy_text", "rivals_text"]

_NAMED = 2
_RIVALS_TOLD = 3
_TELLING = 1.0
"""Rivals of a search that does not even reach this significance are passed over in silence."""
_HARMLESS = 0.98
"""A rival that leaves more than this share of a significance is not worth a word."""


def remedies_block(rows: Sequence[PlanRow]) -> list[RenderableType]:
    """For each row what its unknowns cost and what would help; nothing where there is nothing to tell."""
    told = [(row, _sentences(row)) for row in rows]
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), show_header=False)
    table.add_column(min_width=7, no_wrap=True, style="bold")
    table.add_column(justify="right", no_wrap=True)
    table.add_column(ratio=1)
    for row, sentences in told:
        for number, sentence in enumerate(sentences):
            first = number == 0
            table.add_row(
                gas_text(row.gas) if first else "",
                ratio_text(row.mixing_ratio) if first else "",
                Text(f"{row.mode}: {sentence}" if first else f"- {sentence}"),
            )
    return [Text(), Text("What would help", style="bold"), table] if table.row_count else []


def _sentences(row: PlanRow) -> list[str]:
    told = [remedy_text(remedy, row) for remedy in row.remedies]
    if row.rivals and row.rivals[0].snr >= _TELLING:
        told.append(rivals_text(row.rivals))
    return [_standing(row), *told] if told else []


def _standing(row: PlanRow) -> str:
    """How the search stands: what it reaches at most, and what the unknowns cost."""
    limit, costs = row.marginalised.snr_limit, confusion_text(row)
    if row.verdict in (Verdict.NO_BAND, Verdict.SATURATED):
        return row.verdict.value
    if row.marginalised.transits_required is None:
        return f"at most {snr_text(limit)} sigma however many transits" + (f"; {costs}" if costs else "")
    return costs or row.verdict.value


def confusion_text(row: PlanRow) -> str:
    """``confused with cloud and H2O: 5.00 becomes 2.81``: all known, and all unknown at as many transits."""
    names = [name.replace(f"{row.mode}: ", "") for name, _ in row.confusion[:_NAMED]]
    if not names:
        return ""
    return f"confused with {' and '.join(names)}: {snr_text(row.confused_from)} becomes {snr_text(row.confused_to)}"


def remedy_text(remedy: Remedy, row: PlanRow) -> str:
    """One remedy as a sentence without a full stop."""
    after = f"after {_transits(remedy.transits)}"
    outcome = f"within reach {after}" if remedy.enough else f"still only {snr_text(remedy.snr)} sigma {after}"
    if remedy.kind is RemedyKind.MODE:
        return _mode_text(remedy)
    if remedy.kind is RemedyKind.FLOOR:
        if remedy.floor_factor == 0:
            return f"without any floor: {outcome}"
        size = "floors at" if remedy.floor_ppm is None else f"a floor of {remedy.floor_ppm:.2g} ppm,"
        return f"{size} {remedy.floor_factor:.2g} of the present one: {outcome}"
    if remedy.kind is RemedyKind.AMOUNT:
        ratio = remedy.mixing_ratio or row.mixing_ratio
        return f"{ratio_text(ratio)} of {_first(row.gas)} ({_times(ratio / row.mixing_ratio)} times as much): {outcome}"
    top_bar = remedy.cloud_top_bar or math.inf
    sky = "a sky without clouds" if math.isinf(top_bar) else f"a cloud top at {top_bar:.2g} bar"
    return f"{sky}: {outcome}"


def _mode_text(remedy: Remedy) -> str:
    band = f", most through {band_text(*remedy.band_um)} um" if remedy.band_um else ""
    text = f"{remedy.mode} as well: {snr_text(remedy.snr)} sigma after {_transits(remedy.transits)} with each{band}"
    if remedy.transits_required is None:
        return f"{text}; no number of transits is enough"
    needed = f"{count_text(remedy.transits_required)} with each, {hours_text(remedy.hours_required)} h in all"
    return f"{text}; needed: {needed}" + ("" if remedy.enough else ", more than there are")


def rivals_text(rivals: Sequence[Rival]) -> str:
    """What the dearest of the rivals would leave, or that none matters."""
    dear = [r for r in rivals if r.snr_left < _HARMLESS * r.snr][:_RIVALS_TOLD]
    tried = ", ".join(gas_text(rival.gas) for rival in rivals)
    if not dear:
        return f"gases that the air is not said to hold were tried, and none would matter: {tried}"
    first = dear[0]
    costs = ", ".join(f"{gas_text(r.gas)} at {ratio_text(r.mixing_ratio)} {snr_text(r.snr_left)}" for r in dear)
    return (
        f"were it not known that there is none, {snr_text(first.snr)} sigma after {_transits(first.transits)} would "
        f"become: {costs} (tried: {tried})"
    )


def _times(factor: float) -> str:
    """Two digits, without an exponent."""
    return f"{float(f'{factor:.2g}'):,g}".replace(",", " ") if factor < 1e5 else f"{factor:.0e}"


def _first(gas: str) -> str:
    return gas_text(gas.split(" + ")[0])


def _transits(transits: int) -> str:
    return f"{count_text(transits)} transit{'' if transits == 1 else 's'}"
