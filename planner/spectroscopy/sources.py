"""Which line data stand for a gas: the embedded list, or real files laid over it where they are complete.

Each isotopologue and interval has one source: the newest real file that is complete there
(`planner.spectroscopy.coverage`), else the embedded list.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.coverage import (
    COVERAGE_FILE,
    Declaration,
    Interval,
    inside,
    measured_coverage,
    read_declarations,
    subtract,
    union,
)
from planner.spectroscopy.hitran import read_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import (
    Constants,
    build_lines,
    embedded_formulas,
    lines_from_table,
    read_constants,
    table_from_lines,
)
from planner.spectroscopy.molecules import Molecule, find_molecule
from planner.spectroscopy.store import Store, digest

__all__ = ["GasSource", "LineLibrary"]


@dataclass(frozen=True, kw_only=True, eq=False)
class GasSource:
    """The data that stand for one gas.

    Attributes
    ----------
    molecule : Molecule
    lines : Lines or None
        All lines, one source per isotopologue and interval.
    constants : Constants or None
        The embedded constants with their smooth parts; None for a gas known from files alone.
    covers_per_cm : tuple of (from, to)
        Where the data can be trusted to hold what matters, ascending and disjoint.
    provenance : tuple of str
        One sentence per source used.
    partial : tuple of str
        One sentence per stretch of a file that was found and not used, with the reason.
    digest : str
        Hash of the lines' origin, for the store.
    """

    molecule: Molecule
    lines: Lines | None
    constants: Constants | None
    covers_per_cm: tuple[Interval, ...]
    provenance: tuple[str, ...]
    partial: tuple[str, ...]
    digest: str


@dataclass(frozen=True, kw_only=True, eq=False)
class _Segment:
    """Lines of one isotopologue from one file, complete over some intervals."""

    path: Path
    edition: int
    file_digest: str
    isotopologue: int
    lines: Lines
    intervals: tuple[Interval, ...]


@dataclass(kw_only=True, eq=False)
class _Folder:
    """All line files of a folder, read once."""

    files: dict[Path, tuple[Lines, str]] = field(default_factory=dict)
    declared: dict[str, list[Declaration]] = field(default_factory=dict)


class LineLibrary:
    """Finds the data of each gas.

    Parameters
    ----------
    store : Store
        Keeps built lists and parsed files.
    folder : Path, optional
        A folder of HITRAN-format ``.par`` files, plain or gzip, that replace embedded data where they are complete.

    Raises
    ------
    LineDataError
        If the folder does not exist, holds no line files, or a file breaks its format.
    """

    def __init__(self, store: Store, folder: Path | None = None) -> None:
        self._store = store
        self._folder = _Folder() if folder is None else _read_folder(folder, store)
        self.gas = lru_cache(maxsize=None)(self._gas)

    def _gas(self, name: str) -> GasSource:
        """The data of one gas, by formula or common name."""
        molecule = find_molecule(name)
        constants = read_constants(molecule.formula) if molecule.formula in embedded_formulas() else None
        embedded = build_lines(constants, self._store) if constants else None
        segments, partial = self._segments(molecule, embedded)
        if constants is None and not segments:
            reasons = f" ({'; '.join(partial)})" if partial else ""
            raise LineDataError(
                f"{name}: no embedded data and none in the line folder{reasons}; embedded gases are "
                + ", ".join(embedded_formulas())
            )
        lines, provenance = _laid_over(embedded, segments)
        if constants is not None:
            provenance = (
                f"{molecule.formula}: embedded, constants file {constants.digest[:8]}, "
                f"covers {_ranges(constants.covers_per_cm)} per cm" + (" where no file is named" if segments else ""),
                *provenance,
            )
        covers = union([*(constants.covers_per_cm if constants else ()), *(i for s in segments for i in s.intervals)])
        return GasSource(
            molecule=molecule,
            lines=lines,
            constants=constants,
            covers_per_cm=covers,
            provenance=provenance,
            partial=partial,
            digest=digest(
                constants.digest if constants else "",
                *(f"{s.file_digest} {s.isotopologue} {s.intervals}" for s in segments),
            ),
        )

    def _segments(self, molecule: Molecule, embedded: Lines | None) -> tuple[list[_Segment], tuple[str, ...]]:
        """Segments in order of precedence with disjoint intervals, and what was left out."""
        found: list[_Segment] = []
        partial: list[str] = []
        for path, (lines, file_digest) in self._folder.files.items():
            for isotopologue in np.unique(lines.isotopologue[lines.molecule == molecule.hitran_number]):
                mask = (lines.molecule == molecule.hitran_number) & (lines.isotopologue == isotopologue)
                chosen = lines.where(mask)
                declared = self._declared(path, molecule, int(isotopologue))
                good = declared or ()
                if declared is None:
                    mine = None if embedded is None else embedded.where(embedded.isotopologue == isotopologue)
                    good, why = measured_coverage(chosen, mine)
                    partial += [f"{path.name}: {molecule.formula} isotopologue {isotopologue}: {text}" for text in why]
                if good:
                    found.append(
                        _Segment(
                            path=path,
                            edition=_edition(path, self._folder.declared.get(path.name, [])),
                            file_digest=file_digest,
                            isotopologue=int(isotopologue),
                            lines=chosen,
                            intervals=good,
                        )
                    )
        found.sort(key=lambda s: (s.isotopologue, -s.edition, s.path.name))
        return _without_overlap(found), tuple(partial)

    def _declared(self, path: Path, molecule: Molecule, isotopologue: int) -> tuple[Interval, ...] | None:
        """Declared coverage of one file, or None if it says nothing about this gas."""
        rows = [row for row in self._folder.declared.get(path.name, []) if row.covers(molecule.formula, isotopologue)]
        return union([row.interval_per_cm for row in rows]) or None


def _without_overlap(segments: list[_Segment]) -> list[_Segment]:
    """Each interval of an isotopologue goes to the first segment in order; a line twice in one edition is an error."""
    kept: list[_Segment] = []
    for segment in segments:
        taken = [s for s in kept if s.isotopologue == segment.isotopologue]
        for other in taken:
            if other.edition == segment.edition:
                _refuse_repeated_lines(segment, other)
        free = subtract(segment.intervals, [i for s in taken for i in s.intervals])
        if free:
            kept.append(
                _Segment(
                    path=segment.path, edition=segment.edition, file_digest=segment.file_digest,
                    isotopologue=segment.isotopologue, lines=segment.lines, intervals=free,
                )
            )  # fmt: skip
    return kept


def _refuse_repeated_lines(one: _Segment, other: _Segment) -> None:
    def labels(segment: _Segment) -> set[tuple[float, str, str]]:
        lines = segment.lines
        return set(zip(lines.wavenumber_per_cm.tolist(), lines.upper_local, lines.lower_local, strict=True))

    repeated = labels(one) & labels(other)
    if repeated:
        raise LineDataError(
            f"{one.path} and {other.path}: the line at {min(repeated)[0]:.6f} per cm stands in both; "
            "keep one of the files, or name their editions in coverage.toml so that the newer one is used"
        )


def _laid_over(embedded: Lines | None, segments: Sequence[_Segment]) -> tuple[Lines | None, tuple[str, ...]]:
    if not segments:
        return embedded, ()
    parts: list[Lines] = []
    sentences: list[str] = []
    if embedded is not None:
        keep = np.ones(len(embedded), dtype=bool)
        for segment in segments:
            same = embedded.isotopologue == segment.isotopologue
            keep &= ~(same & inside(embedded.wavenumber_per_cm, segment.intervals))
        parts.append(embedded.where(keep))
    for segment in segments:
        parts.append(segment.lines.where(inside(segment.lines.wavenumber_per_cm, segment.intervals)))
        edition = f"HITRAN{segment.edition}" if segment.edition else "edition not named"
        sentences.append(
            f"{find_molecule(str(_formula(segment))).formula}: isotopologue {segment.isotopologue} over "
            f"{_ranges(segment.intervals)} per cm from {segment.path.name} ({edition}, {segment.file_digest[:8]})"
        )
    return Lines.join(parts), tuple(sentences)


def _formula(segment: _Segment) -> str:
    from planner.spectroscopy.molecules import MOLECULES

    number = int(segment.lines.molecule[0])
    return next(m.formula for m in MOLECULES if m.hitran_number == number)


def _ranges(intervals: Sequence[Interval]) -> str:
    return ", ".join(f"{low:.6g}-{high:.6g}" for low, high in intervals)


def _edition(path: Path, declared: Sequence[Declaration]) -> int:
    named = next((row.edition for row in declared if row.edition is not None), path.name)
    found = re.search(r"hitran[_-]?(\d{4})", named, re.IGNORECASE)
    return int(found.group(1)) if found else 0


def _read_folder(folder: Path, store: Store) -> _Folder:
    if not folder.is_dir():
        raise LineDataError(f"{folder}: expected a folder of HITRAN-format line files, found none")
    paths = sorted(p for p in folder.iterdir() if re.search(r"\.par(\.gz)?$", p.name, re.IGNORECASE))
    if not paths:
        raise LineDataError(f"{folder}: holds no .par or .par.gz file")
    result = _Folder(declared=read_declarations(folder / COVERAGE_FILE))
    for path in paths:
        file_digest = digest(path.read_bytes())
        table = store.fetch("files", {"par": file_digest}, _reader(path))
        result.files[path] = (lines_from_table(table), file_digest)
    return result


def _reader(path: Path) -> Callable[[], NDArray[np.void]]:
    return lambda: table_from_lines(read_par(path))
