"""Which line data stand for a gas: the embedded list, or real files laid over it where they are complete.

Coverage is never a file's first and last line. It is declared (``coverage.toml`` beside the files), or it is measured:
within each stretch of an isotopologue's lines that has no gap over 5 per cm, the file must hold at least 0.9 of the
intensity that the embedded list puts there. What falls short is reported as partial and not used, so that a fragment
never stands for a band.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
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

__all__ = ["GasSource", "Interval", "LineLibrary", "measured_coverage"]

Interval = tuple[float, float]

_GAP_PER_CM = 5.0
_COMPLETE_SHARE = 0.9
COVERAGE_FILE = "coverage.toml"


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
    declared: dict[str, list[dict[str, object]]] = field(default_factory=dict)


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
                if declared is not None:
                    good, why = declared, []
                else:
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
        rows = self._folder.declared.get(path.name)
        if rows is None:
            return None
        ranges = []
        for row in rows:
            isotopologues = row.get("isotopologues")
            if find_molecule(str(row["gas"])).formula == molecule.formula and (
                isotopologues is None or isotopologue in isotopologues  # type: ignore[operator]
            ):
                low, high = row["range_per_cm"]  # type: ignore[misc]
                ranges.append((float(low), float(high)))
        return union(ranges) or None


def measured_coverage(lines: Lines, embedded: Lines | None) -> tuple[tuple[Interval, ...], list[str]]:
    """Where a file's lines of one isotopologue are complete, and reasons for what is not.

    Parameters
    ----------
    lines : Lines
        Lines of one isotopologue of one molecule from one file.
    embedded : Lines or None
        The embedded lines of the same isotopologue, the yardstick.

    Returns
    -------
    intervals : tuple of (from, to)
        Stretches without a gap over 5 per cm that hold at least 0.9 of the embedded intensity.
    reasons : list of str
        One per stretch that is not used.
    """
    good: list[Interval] = []
    reasons: list[str] = []
    nu = lines.wavenumber_per_cm
    breaks = np.flatnonzero(np.diff(nu) > _GAP_PER_CM) + 1
    short = 0
    for piece in np.split(np.arange(nu.size), breaks):
        low, high = float(nu[piece[0]]), float(nu[piece[-1]])
        if high - low < _GAP_PER_CM:
            short += piece.size
            continue
        here = float(lines.intensity_cm[piece].sum())
        yardstick = _sum_within(embedded, low, high)
        if embedded is None or not len(embedded):
            reasons.append(
                f"{low:.2f}-{high:.2f} per cm: no embedded list to judge it by; declare it in {COVERAGE_FILE} to use it"
            )
        elif here >= _COMPLETE_SHARE * yardstick:
            good.append((low, high))
        else:
            reasons.append(
                f"{low:.2f}-{high:.2f} per cm: partial, not used (holds {here / yardstick:.2g} of the embedded intensity)"
            )
    if short:
        reasons.append(f"{short} lines in stretches shorter than {_GAP_PER_CM:g} per cm: partial, not used")
    return tuple(good), reasons


def union(intervals: Sequence[Interval]) -> tuple[Interval, ...]:
    """Ascending disjoint intervals that cover the same points."""
    merged: list[Interval] = []
    for low, high in sorted(intervals):
        if merged and low <= merged[-1][1]:
            merged[-1] = (merged[-1][0], max(high, merged[-1][1]))
        else:
            merged.append((low, high))
    return tuple(merged)


def _sum_within(lines: Lines | None, low: float, high: float) -> float:
    if lines is None:
        return 0.0
    first, last = np.searchsorted(lines.wavenumber_per_cm, [low - 1e-6, high + 1e-6])
    return float(lines.intensity_cm[first:last].sum())


def _inside(wavenumber_per_cm: NDArray[np.float64], intervals: Sequence[Interval]) -> NDArray[np.bool_]:
    mask = np.zeros(wavenumber_per_cm.size, dtype=bool)
    for low, high in intervals:
        mask |= (wavenumber_per_cm >= low) & (wavenumber_per_cm <= high)
    return mask


def _without_overlap(segments: list[_Segment]) -> list[_Segment]:
    """Each interval of an isotopologue goes to the first segment in order; a line twice in one edition is an error."""
    kept: list[_Segment] = []
    for segment in segments:
        taken = [s for s in kept if s.isotopologue == segment.isotopologue]
        for other in taken:
            if other.edition == segment.edition:
                _refuse_repeated_lines(segment, other)
        free = _subtract(segment.intervals, [i for s in taken for i in s.intervals])
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


def _subtract(intervals: Sequence[Interval], taken: Sequence[Interval]) -> tuple[Interval, ...]:
    free: list[Interval] = list(intervals)
    for low, high in taken:
        pieces: list[Interval] = []
        for a, b in free:
            pieces += [(x, y) for x, y in ((a, min(b, low)), (max(a, high), b)) if y > x]
        free = pieces
    return tuple(free)


def _laid_over(embedded: Lines | None, segments: Sequence[_Segment]) -> tuple[Lines | None, tuple[str, ...]]:
    if not segments:
        return embedded, ()
    parts: list[Lines] = []
    sentences: list[str] = []
    if embedded is not None:
        keep = np.ones(len(embedded), dtype=bool)
        for segment in segments:
            same = embedded.isotopologue == segment.isotopologue
            keep &= ~(same & _inside(embedded.wavenumber_per_cm, segment.intervals))
        parts.append(embedded.where(keep))
    for segment in segments:
        parts.append(segment.lines.where(_inside(segment.lines.wavenumber_per_cm, segment.intervals)))
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


def _edition(path: Path, declared: Sequence[dict[str, object]]) -> int:
    named = [str(row["edition"]) for row in declared if "edition" in row] or [path.name]
    found = re.search(r"(?:hitran)[_-]?(\d{4})", named[0], re.IGNORECASE)
    return int(found.group(1)) if found else 0


def _read_folder(folder: Path, store: Store) -> _Folder:
    if not folder.is_dir():
        raise LineDataError(f"{folder}: expected a folder of HITRAN-format line files, found none")
    paths = sorted(p for p in folder.iterdir() if re.search(r"\.par(\.gz)?$", p.name, re.IGNORECASE))
    if not paths:
        raise LineDataError(f"{folder}: holds no .par or .par.gz file")
    result = _Folder(declared=_read_declared(folder / COVERAGE_FILE))
    for path in paths:
        file_digest = digest(path.read_bytes())
        table = store.fetch("files", {"par": file_digest}, _reader(path))
        result.files[path] = (lines_from_table(table), file_digest)
    return result


def _reader(path: Path) -> Callable[[], NDArray[np.void]]:
    return lambda: table_from_lines(read_par(path))


def _read_declared(path: Path) -> dict[str, list[dict[str, object]]]:
    if not path.is_file():
        return {}
    try:
        rows = tomllib.loads(path.read_text())["file"]
        result: dict[str, list[dict[str, object]]] = {}
        for row in rows:
            low, high = row["range_per_cm"]
            if not float(low) < float(high):
                raise ValueError(f"range_per_cm {low} to {high} is empty")
            find_molecule(str(row["gas"]))
            result.setdefault(row["name"], []).append(row)
    except (tomllib.TOMLDecodeError, KeyError, TypeError, ValueError) as error:
        raise LineDataError(
            f'{path}: expected tables [[file]] with name = "x.par", gas = "CO2", range_per_cm = [2100, 2300] and, if '
            f'wanted, isotopologues = [1, 2] and edition = "HITRAN2020"; got {error!r}'
        ) from error
    return result
