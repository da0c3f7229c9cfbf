"""What a check of the embedded lists found, for the terminal."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from rich.console import Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.spectroscopy.accuracyfile import AccuracyTable, JudgedWindow, Judgement, UnseenWindow
from planner.studies.listrecords import CheckedList, CheckReport

__all__ = ["check_view"]

_STYLES = {Judgement.MEETS: "green", Judgement.MISSES: "red", Judgement.NARROW: "dim"}
_WIDE = 150
"""Columns from which a whole row fits."""
_KEPT_WHOLE = ("gas", "1/cm", "bins", "90 %", "median", "mean", "verdict", "sum, cm", "factor")
_KEY = (
    "Differences of effective heights in scale heights, in bins of R = 100; one figure per mixing ratio. "
    "In-sample: the list was fitted to data of this range."
)


def check_view(report: CheckReport, width: int) -> Group:
    """Faults of the lists, then the accuracy table, then what was never compared, for a console of this width."""
    parts: list[RenderableType] = []
    if report.lists:
        parts += [_lists(report.lists), Text()]
    parts += _accuracy(report.accuracy, width >= _WIDE)
    parts += [Text(notice) for notice in report.notices]
    return Group(*parts)


def _lists(lists: Sequence[CheckedList]) -> Table:
    table = _table("gas", "lines", "seconds", "faults")
    for row in lists:
        table.add_row(
            row.gas,
            str(row.lines or "-"),
            f"{row.seconds:.1f}",
            Text("; ".join(row.faults) or "none", style="red" if row.faults else ""),
        )
    total = sum(row.seconds for row in lists)
    table.add_row("all", str(sum(row.lines for row in lists)), f"{total:.1f}", "")
    return table


def _accuracy(accuracy: AccuracyTable, wide: bool) -> list[RenderableType]:
    if not accuracy.judged and not accuracy.unseen:
        return [Text("No accuracy is stored.")]
    meeting, judged = accuracy.meeting
    ratios = {row.mixing_ratios for row in accuracy.judged}
    said = " or ".join("/".join(f"{ratio:.0e}" for ratio in group) for group in sorted(ratios))
    return [
        Text(f"{meeting} of {judged} windows meet the marks.", style="bold"),
        Text(f"{_KEY} Mixing ratios {said}."),
        Text(),
        _judged(accuracy.judged, wide),
        Text(),
        Text(f"{len(accuracy.unseen)} band regions never compared with real spectra", style="bold"),
        _unseen(accuracy.unseen, wide),
    ]


def _judged(windows: Iterable[JudgedWindow], wide: bool) -> Table:
    """All columns, or on a narrow console those that a verdict rests on."""
    more = ("sum", "in-sample", "lines", "compared with") if wide else ()
    table = _table("gas", "1/cm", "bins", "90 %", "median", "mean", "verdict", *more)
    for row in windows:
        cells: list[RenderableType] = [
            row.gas,
            f"{row.from_per_cm:.0f}-{row.to_per_cm:.0f}",
            "/".join(map(str, row.bins)),
            *(_figures(values) for values in (row.percentile_90, row.median, row.mean)),
            Text(row.verdict.value, style=_STYLES[row.verdict]),
        ]
        if wide:
            sample = "yes" if row.in_sample else "no"
            cells += [f"{row.sum_ratio:.2f}", sample, f"{row.embedded_lines}/{row.real_lines}", row.compared_with]
        table.add_row(*cells)
    return table


def _unseen(windows: Iterable[UnseenWindow], wide: bool) -> Table:
    table = _table("gas", "1/cm", "sum, cm", "factor", "rests on", *(["against published sums"] if wide else []))
    for row in windows:
        stretch = f"{row.from_per_cm:.0f}-{row.to_per_cm:.0f}"
        cells = [row.gas, stretch, f"{row.sum_cm:.2g}", f"{row.strength_factor:.2f}", row.rests_on]
        table.add_row(*cells, *([row.published or "-"] if wide else []))
    return table


def _figures(values: Iterable[float | None]) -> str:
    return "/".join("-" if value is None else f"{value:.2f}" for value in values)


def _table(*heads: str) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="bold")
    for head in heads:
        table.add_column(head, overflow="fold", no_wrap=head in _KEPT_WHOLE)
    return table
