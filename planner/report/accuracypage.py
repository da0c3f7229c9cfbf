"""The accuracy table of the embedded lists for people: a page in Markdown, and its place in the lists' README."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

from planner.errors import LineDataError, OutputError
from planner.report.files import write_text
from planner.resources import data_folder
from planner.spectroscopy.accuracyfile import (
    ACCURACY_FILE,
    AccuracyTable,
    JudgedWindow,
    Judgement,
    UnseenWindow,
    format_accuracy,
    stored_accuracy,
)
from planner.studies.listrecords import GasListing

__all__ = ["Remark", "accuracy_page", "parse_remarks", "replace_page", "write_accuracy"]

BEGIN, END = "<!-- accuracy table: begin -->", "<!-- accuracy table: end -->"
REMARKS_FILE = "remarks.toml"
_LONGEST_SOURCE = 90


@dataclass(frozen=True, kw_only=True)
class Remark:
    """Why a window misses its marks, in a person's words."""

    gas: str
    from_per_cm: float
    to_per_cm: float
    text: str

    def about(self, row: JudgedWindow) -> bool:
        """Whether it speaks of a window: of the gas, and of its middle."""
        return row.gas == self.gas and self.from_per_cm <= 0.5 * (row.from_per_cm + row.to_per_cm) <= self.to_per_cm


def write_accuracy(table: AccuracyTable, listings: Sequence[GasListing]) -> tuple[Path, Path]:
    """Write a table into the lists' own ``accuracy.toml`` and README; returns the two paths.

    Raises
    ------
    OutputError
        If the lists are those of an installed package, or their README has no place for the table.
    """
    folder = data_folder("linelists")
    if not (folder.parent / "pyproject.toml").is_file():
        raise OutputError(
            f"{folder}: the accuracy table belongs to the lists of a checkout and is not written into an installed "
            "package; leave out --write, or run it in a checkout"
        )
    remarks = folder / REMARKS_FILE
    page = accuracy_page(table, listings, parse_remarks(remarks.read_text(encoding="utf-8"), remarks))
    readme = folder / "README.md"
    text = replace_page(readme.read_text(encoding="utf-8"), page, readme)
    write_text(folder / ACCURACY_FILE, format_accuracy(table))
    write_text(readme, text)
    stored_accuracy.cache_clear()
    return folder / ACCURACY_FILE, readme


def parse_remarks(text: str, where: Path) -> tuple[Remark, ...]:
    """Remarks from a text: tables ``[[remark]]`` with gas, range_per_cm and text.

    Raises
    ------
    LineDataError
        If the text breaks the layout.
    """
    try:
        return tuple(
            Remark(
                gas=str(row["gas"]),
                from_per_cm=float(row["range_per_cm"][0]),
                to_per_cm=float(row["range_per_cm"][1]),
                text=str(row["text"]),
            )
            for row in tomllib.loads(text).get("remark", ())
        )
    except (tomllib.TOMLDecodeError, KeyError, IndexError, TypeError, ValueError) as error:
        raise LineDataError(f"{where}: not a table of remarks: {error!r}") from error


def replace_page(text: str, page: str, where: Path) -> str:
    """A text with what stands between the markers replaced.

    Raises
    ------
    OutputError
        If the markers are not there.
    """
    head, begin, rest = text.partition(BEGIN)
    _, end, tail = rest.partition(END)
    if not begin or not end:
        raise OutputError(f"{where}: expected the lines {BEGIN} and {END}, found no place for the table")
    return f"{head}{BEGIN}\n\n{page}\n{END}{tail}"


def accuracy_page(table: AccuracyTable, listings: Sequence[GasListing], remarks: Sequence[Remark] = ()) -> str:
    """The whole page: how many windows meet the marks, every window, the reasons of misses, what was never compared."""
    meeting, judged = table.meeting
    share = f"{100.0 * meeting / judged:.0f} %" if judged else "none"
    sections = [
        f"**{meeting} of {judged} windows meet the marks ({share}).** {len(table.judged) - judged} more are narrower "
        f"than half a bin of R = 100 and are shown without a verdict. {len(table.unseen)} band regions were never "
        "compared with real spectra.",
        "### Each gas\n\n" + _gases(table, listings),
        "### Windows compared with real data\n\n" + _judged(table.judged),
        "### Windows that miss, and why\n\n" + _misses(table.judged, remarks),
        "### Band regions never compared with real spectra\n\n" + _unseen(table.unseen),
    ]
    return "\n\n".join(sections) + "\n"


def _gases(table: AccuracyTable, listings: Sequence[GasListing]) -> str:
    rows = []
    for listing in listings:
        mine = [row for row in table.judged if row.gas == listing.gas and row.verdict is not Judgement.NARROW]
        meeting = sum(row.verdict is Judgement.MEETS for row in mine)
        unseen = sum(row.gas == listing.gas for row in table.unseen)
        rows.append(
            (
                listing.gas,
                listing.covers_per_cm,
                listing.covers_um,
                f"{meeting} of {len(mine)}" if mine else "-",
                unseen,
            )
        )
    return _markdown(("gas", "list covers, 1/cm", "um", "windows that meet", "never compared"), rows)


def _judged(windows: Iterable[JudgedWindow]) -> str:
    heads = (
        "gas", "window, 1/cm", "bins", "90 %", "median", "mean", "90 %, R = 1000", "sum", "verdict", "compared with",
        "in-sample", "lines ours / real",
    )  # fmt: skip
    rows = [
        (
            row.gas,
            f"{row.from_per_cm:g}-{row.to_per_cm:g}",
            "/".join(str(count) for count in row.bins),
            _figures(row.percentile_90),
            _figures(row.median),
            _figures(row.mean),
            _figures(row.percentile_90_at_1000),
            f"{row.sum_ratio:.2f}",
            f"**{row.verdict.value}**" if row.verdict is Judgement.MISSES else row.verdict.value,
            row.compared_with + (f", {len(row.temperatures_k)} temperatures" if len(row.temperatures_k) > 1 else ""),
            "yes" if row.in_sample else "no",
            f"{row.embedded_lines or '-'} / {row.real_lines or '-'}",
        )
        for row in windows
    ]
    return _markdown(heads, rows)


def _misses(windows: Iterable[JudgedWindow], remarks: Sequence[Remark]) -> str:
    lines = []
    for row in windows:
        if row.verdict is Judgement.MISSES:
            reasons = [remark.text for remark in remarks if remark.about(row)] or ["Reason not known."]
            lines.append(f"- {row.gas} {row.from_per_cm:g}-{row.to_per_cm:g}: {row.missed}. {' '.join(reasons)}")
    return "\n".join(lines) or "None."


def _unseen(windows: Iterable[UnseenWindow]) -> str:
    rows = [
        (
            row.gas,
            f"{row.from_per_cm:g}-{row.to_per_cm:g}",
            f"{row.sum_cm:.2g}",
            f"{row.strength_factor:.2f}",
            _short(row.rests_on),
            row.published or "-",
        )
        for row in windows
    ]
    return _markdown(("gas", "region, 1/cm", "sum, cm", "factor", "rests on", "against published sums"), rows)


def _figures(values: Iterable[float | None]) -> str:
    return "/".join("-" if value is None else f"{value:.2f}" for value in values)


def _short(text: str) -> str:
    return text if len(text) <= _LONGEST_SOURCE else text[: _LONGEST_SOURCE - 3].rsplit(" ", 1)[0] + " ..."


def _markdown(heads: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    body = [f"| {' | '.join(str(cell).replace('|', '/') for cell in row)} |" for row in rows]
    return "\n".join([f"| {' | '.join(heads)} |", f"|{'---|' * len(heads)}", *body])
