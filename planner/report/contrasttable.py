"""A contrast between two atmospheres for people, and its bins as a table."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from astropy.table import Column, Table
from rich.console import Group
from rich.table import Table as TextTable
from rich.text import Text

from planner.report.table import sentences_block
from planner.report.words import band_text, bands_text, count_text, gas_text, hours_text, ratio_text, snr_text
from planner.studies.contrasts import ContrastResult, ContrastRow
from planner.studies.results import Counts, Verdict

__all__ = ["bins_table", "contrast_view", "headline"]

_COSTS_SHOWN = 2


def contrast_view(result: ContrastResult) -> Group:
    """A contrast as something a rich console prints: who is compared, numbers, where they come from."""
    same = result.nuisances_a == result.nuisances_b
    priors = [_priors(result.nuisances_a)] if same else [f"A: {_priors(result.nuisances_a)}"]
    priors += [] if same else [f"B: {_priors(result.nuisances_b)}"]
    return Group(
        _heading(result),
        Text(),
        _numbers(result.rows),
        Text(),
        _reasons(result.rows),
        *sentences_block("Left out", _left_out(result.rows)),
        *sentences_block("Held unknown, with the width of the prior", priors),
        *sentences_block("Assumptions", result.assumptions),
        *sentences_block("Line data", result.line_data),
        *sentences_block("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


def headline(row: ContrastRow) -> str:
    """The outcome with one mode in a phrase."""
    if row.transits_required is None:
        best = min(row.a_excluded.snr_limit, row.b_excluded.snr_limit)
        return f"{row.verdict.value}: at most {snr_text(best)} sigma however many transits"
    needed = f"{count_text(row.transits_required)} transits, {hours_text(row.hours_required)} h"
    return f"{row.verdict.value}: {needed}"


def bins_table(result: ContrastResult) -> Table:
    """The bins of all modes one below the other.

    ``left_ppm`` is what of the difference A less B no change of the unknowns can imitate, in the harder of the two
    cases, after ``transits``; ``share`` is the part of the bin in its squared significance (negative where the bin
    counts against), zero where ``usable`` is false.
    """
    spectra = result.spectra
    counts = [spectrum.from_um.size for spectrum in spectra]
    table = Table(meta=_meta(result))
    table["mode"] = np.repeat([spectrum.mode for spectrum in spectra], counts)
    units = {"from_um": "um", "to_um": "um"} | dict.fromkeys(
        ("depth_a_ppm", "depth_b_ppm", "left_ppm", "noise_one_transit_ppm", "floor_ppm"), "1e-6"
    )
    for name in ("detector", "from_um", "to_um", "depth_a_ppm", "depth_b_ppm", "left_ppm", "share"):
        table[name] = Column(np.concatenate([getattr(s, name) for s in spectra]), unit=units.get(name))
    for name in ("noise_one_transit_ppm", "floor_ppm", "usable"):
        table[name] = Column(np.concatenate([getattr(s, name) for s in spectra]), unit=units.get(name))
    table["transits"] = np.repeat([spectrum.transits for spectrum in spectra], counts)
    return table


def _meta(result: ContrastResult) -> dict[str, object]:
    return {
        "title_a": result.title_a,
        "title_b": result.title_b,
        "invented": result.invented,
        "significance": "one-sided",
        "line_data": list(result.line_data),
        "cautions": list(result.cautions),
        "limbcast": result.version,
    }


def _heading(result: ContrastResult) -> Text:
    text = Text()
    for letter, title, gases, held in (
        ("A", result.title_a, result.gases_a, result.held_a),
        ("B", result.title_b, result.gases_b, result.held_b),
    ):
        text.append(f"{letter}  {title}\n", style="bold")
        air = ", ".join(f"{gas_text(gas)} {ratio_text(ratio)}" for gas, ratio in gases)
        text.append(f"   {air}; held as stated: {', '.join(map(gas_text, held))}\n")
    if result.invented:
        text.append("The target is invented.\n", style="italic")
    available = f"; {result.transits_available} transits available" if result.transits_available else ""
    text.append(
        f"Goal: rule out the wrong one at {result.threshold_sigma:g} sigma, one-sided, with a chance of "
        f"{100 * result.power:g} %, whichever it is{available}."
    )
    return text


def _numbers(rows: Sequence[ContrastRow]) -> TextTable:
    table = TextTable(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="dim")
    table.add_column("\nmode", overflow="fold", min_width=12)
    table.add_column("\nverdict", min_width=12)
    for heading in ("\ntransits", "\nhours", "A true:\nB out", "best\nS/N", "B true:\nA out", "best\nS/N"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("known:\ntransits", justify="right", no_wrap=True, style="dim")
    for row in rows:
        table.add_row(
            row.mode,
            Text(row.verdict.value, style=_style(row.verdict)),
            Text(count_text(row.transits_required), style="bold"),
            Text(hours_text(row.hours_required), style="bold"),
            *_side(row.b_excluded),
            *_side(row.a_excluded),
            count_text(row.all_known.transits_required),
        )
    return table


def _side(counts: Counts) -> tuple[str, str]:
    return count_text(counts.transits_required), snr_text(counts.snr_limit)


def _style(verdict: Verdict) -> str:
    return {Verdict.WITHIN_REACH: "green", Verdict.TOO_MANY: "yellow", Verdict.NO_BAND: "dim"}.get(verdict, "red")


def _reasons(rows: Sequence[ContrastRow]) -> TextTable:
    table = TextTable(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("\nmode", overflow="fold", min_width=12)
    table.add_column("where it is decided, um\n(share of the information)", ratio=1)
    table.add_column("all known, all unknown; what costs most\n(S/N left by it alone)", ratio=1)
    for row in rows:
        costs = ", ".join(
            f"{name.replace(f'{row.mode}: ', '')} ({snr_text(snr)})" for name, snr in row.confusion[:_COSTS_SHOWN]
        )
        change = f"{snr_text(row.confused_from)} becomes {snr_text(row.confused_to)}"
        table.add_row(row.mode, bands_text(row.best_bands) or "-", f"{change}: {costs}" if costs else change)
    return table


def _left_out(rows: Sequence[ContrastRow]) -> list[str]:
    notes = [
        f"{row.mode}: no data of {gas_text(gas)} at {band_text(low, high)} um, taken as transparent there"
        for row in rows
        for gas, low, high in row.uncovered_um
    ]
    return notes + [f"{row.mode}: saturated at {band_text(a, b)} um" for row in rows for a, b in row.saturated_um]


def _priors(nuisances: Sequence[tuple[str, str]]) -> str:
    return "; ".join(f"{name} {prior}" for name, prior in nuisances)
