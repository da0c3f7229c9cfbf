"""Line records from files laid over an embedded list: per isotopologue and interval, one source each."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from planner.errors import LineDataError
from planner.spectroscopy.broadening import ForeignWidths, joined_widths
from planner.spectroscopy.coverage import (
    COVERAGE_FILE,
    Declaration,
    Interval,
    inside,
    measured_coverage,
    subtract,
    union,
)
from planner.spectroscopy.files.folder import DataFiles, LineFile
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import Molecule

__all__ = ["Segment", "laid_over", "segments_of"]

_JOIN_PER_CM = 0.1
"""A measured stretch reaches this far beyond its last lines, so that the same lines are not left in the other list."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Segment:
    """Lines of one isotopologue from one file, complete over some intervals."""

    path: Path
    formula: str
    edition: str
    """As declared or found in the file's name; empty if neither says."""
    file_digest: str
    isotopologue: int
    lines: Lines
    widths: ForeignWidths | None
    intervals: tuple[Interval, ...]

    @property
    def year(self) -> int:
        """The edition's year, 0 if it is not named."""
        found = re.search(r"\d{4}", self.edition)
        return int(found[0]) if found else 0

    @property
    def sentence(self) -> str:
        """What it stands for."""
        stretches = ", ".join(f"{low:.6g}-{high:.6g}" for low, high in self.intervals)
        return (
            f"{self.formula}: isotopologue {self.isotopologue} over {stretches} per cm from {self.path.name} "
            f"({self.edition or 'edition not named'}, {self.file_digest[:8]})"
        )


def segments_of(molecule: Molecule, files: DataFiles, embedded: Lines | None) -> tuple[list[Segment], tuple[str, ...]]:
    """What of the files stands for a molecule, with disjoint intervals, and sentences on what is left out.

    Raises
    ------
    LineDataError
        If two files of one edition hold the same line where both would stand.
    """
    found: list[Segment] = []
    partial: list[str] = []
    for file in files.line_files:
        declared = [row for row in files.declared.get(file.path.name, ()) if row.formula == molecule.formula]
        present = file.lines.isotopologue[file.lines.molecule == molecule.hitran_number]
        named = {number for row in declared for number in row.isotopologues or ()}
        for isotopologue in sorted(named.union(np.unique(present).tolist())):
            mine = None if embedded is None else embedded.where(embedded.isotopologue == isotopologue)
            segment, reasons = _segment(file, molecule, isotopologue, declared, mine)
            partial += [f"{file.path.name}: {molecule.formula} isotopologue {isotopologue}: {text}" for text in reasons]
            if segment.intervals:
                found.append(segment)
    found.sort(key=lambda s: (s.isotopologue, -s.year, s.path.name))
    return _without_overlap(found), tuple(partial)


def laid_over(embedded: Lines | None, segments: Sequence[Segment]) -> tuple[Lines | None, ForeignWidths | None]:
    """The lines of the segments inside their intervals, the embedded ones elsewhere; widths in the same order."""
    if not segments:
        return embedded, None
    parts: list[tuple[Lines, ForeignWidths | None]] = []
    if embedded is not None:
        keep = np.ones(len(embedded), dtype=bool)
        for segment in segments:
            same = embedded.isotopologue == segment.isotopologue
            keep &= ~(same & inside(embedded.wavenumber_per_cm, segment.intervals))
        parts.append((embedded.where(keep), None))
    for segment in segments:
        here = inside(segment.lines.wavenumber_per_cm, segment.intervals)
        parts.append((segment.lines.where(here), segment.widths.where(here) if segment.widths else None))
    return Lines.join([lines for lines, _ in parts]), joined_widths(parts)


def _segment(
    file: LineFile, molecule: Molecule, isotopologue: int, declared: Sequence[Declaration], embedded: Lines | None
) -> tuple[Segment, list[str]]:
    """One isotopologue of one file where it is complete, and the reasons for what is not."""
    mine = (file.lines.molecule == molecule.hitran_number) & (file.lines.isotopologue == isotopologue)
    lines = file.lines.where(mine)
    rows = [row for row in declared if row.covers(molecule.formula, isotopologue)]
    intervals, reasons = union([row.interval_per_cm for row in rows]), list[str]()
    if not rows:
        measured, reasons = measured_coverage(lines, embedded)
        intervals = tuple((low - _JOIN_PER_CM, high + _JOIN_PER_CM) for low, high in measured)
    segment = Segment(
        path=file.path,
        formula=molecule.formula,
        edition=_edition(file.path, declared),
        file_digest=file.digest,
        isotopologue=isotopologue,
        lines=lines,
        widths=file.widths.where(mine) if file.widths else None,
        intervals=intervals,
    )
    return segment, reasons


def _edition(path: Path, declared: Sequence[Declaration]) -> str:
    """As declared, else by a name such as ``CO_hitran2020.par`` or HITRAN's own ``05_hit12.par``."""
    named = next((row.edition for row in declared if row.edition), None)
    if named:
        return named
    found = re.search(r"hit(?:ran)?[_-]?(\d{4}|\d\d)(?!\d)", path.name, re.IGNORECASE)
    if not found:
        return ""
    century = "" if len(found[1]) == 4 else "19" if int(found[1]) >= 86 else "20"
    return f"HITRAN{century}{found[1]}"


def _without_overlap(segments: Sequence[Segment]) -> list[Segment]:
    """Each interval of an isotopologue goes to the first segment in order; a line twice in one edition is an error."""
    kept: list[Segment] = []
    for segment in segments:
        taken = [s for s in kept if s.isotopologue == segment.isotopologue]
        for other in taken:
            if other.year == segment.year:
                _refuse_repeated_lines(segment, other)
        free = subtract(segment.intervals, [i for s in taken for i in s.intervals])
        if free:
            kept.append(replace(segment, intervals=free))
    return kept


def _refuse_repeated_lines(one: Segment, other: Segment) -> None:
    common = subtract(one.intervals, subtract(one.intervals, other.intervals))

    def labels(segment: Segment) -> set[tuple[float, str, str]]:
        lines = segment.lines.where(inside(segment.lines.wavenumber_per_cm, common))
        return set(zip(lines.wavenumber_per_cm.tolist(), lines.upper_local, lines.lower_local, strict=True))

    repeated = labels(one) & labels(other)
    if repeated:
        raise LineDataError(
            f"{one.path} and {other.path}: the line at {min(repeated)[0]:.6f} per cm stands in both; "
            f"keep one of the files, or name their editions in {COVERAGE_FILE} so that the newer one is used"
        )
