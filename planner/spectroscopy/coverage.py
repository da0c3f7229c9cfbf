"""Where a file of line data is complete: declared by the user, or measured against the embedded list.

Coverage is never a file's first and last line. It is declared (``coverage.toml`` beside the files), or it is measured:
within each stretch of an isotopologue's lines that has no gap over 5 per cm, the file must hold at least 0.9 of the
intensity that the embedded list puts there. A gap of up to 50 per cm in which the embedded list has less than 0.001 of
the intensity around is one of the spectrum, not of the file, and ends no stretch. At any other gap of that size, what
the embedded list has within 5 per cm of the ends of a stretch counts as missing: a file that skips lines is not
complete between them. What falls short is reported as partial and not used, so that a fragment never stands for a band.
"""

from __future__ import annotations

import difflib
import json
import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import find_molecule

__all__ = [
    "COVERAGE_FILE",
    "Declaration",
    "Interval",
    "format_declarations",
    "inside",
    "measured_coverage",
    "read_declarations",
    "subtract",
    "union",
]

Interval = tuple[float, float]

COVERAGE_FILE = "coverage.toml"
_KEYS = ("name", "gas", "range_per_cm", "isotopologues", "edition", "fetched")
_GAP_PER_CM = 5.0
_COMPLETE_SHARE = 0.9
_NEARBY_PER_CM = 50.0
_NEXT_TO_NOTHING = 1e-3
_EDGE_PER_CM = 0.1  # how far the same line may stand apart in the two lists


@dataclass(frozen=True, kw_only=True)
class Declaration:
    """What a file is said to hold completely, by the user or by the record of a fetch.

    Attributes
    ----------
    formula : str
    isotopologues : tuple of int, or None
        None for all that the file holds.
    interval_per_cm : (from, to)
    edition : str or None
        Such as ``"HITRAN2020"``; its year decides which of two files is newer.
    fetched : str or None
        How the file was fetched: service, day, least abundance. Told to the user, and otherwise not used.
    """

    formula: str
    isotopologues: tuple[int, ...] | None = None
    interval_per_cm: Interval
    edition: str | None = None
    fetched: str | None = None

    @classmethod
    def parse(cls, row: dict[str, Any]) -> Declaration:
        """From one ``[[file]]`` table."""
        unknown = sorted(set(row) - set(_KEYS))
        if unknown:
            near = difflib.get_close_matches(unknown[0], _KEYS, n=1)
            raise ValueError(f"unknown key {unknown[0]!r}" + (f", did you mean {near[0]!r}?" if near else ""))
        low, high = (float(end) for end in row["range_per_cm"])
        if not 0 <= low < high:
            raise ValueError(f"range_per_cm {low:g} to {high:g} is empty")
        isotopologues = row.get("isotopologues")
        return cls(
            formula=find_molecule(str(row["gas"])).formula,
            isotopologues=None if isotopologues is None else tuple(int(number) for number in isotopologues),
            interval_per_cm=(low, high),
            edition=row.get("edition"),
            fetched=row.get("fetched"),
        )

    def covers(self, formula: str, isotopologue: int) -> bool:
        """Whether it speaks of this gas and isotopologue."""
        return self.formula == formula and (self.isotopologues is None or isotopologue in self.isotopologues)


def read_declarations(path: Path) -> dict[str, list[Declaration]]:
    """Declarations by file name; none if there is no such file.

    Raises
    ------
    LineDataError
        If the file does not follow the layout.
    """
    if not path.is_file():
        return {}
    result: dict[str, list[Declaration]] = {}
    try:
        for row in tomllib.loads(path.read_text(encoding="utf-8"))["file"]:
            result.setdefault(str(row["name"]), []).append(Declaration.parse(row))
    except (tomllib.TOMLDecodeError, UnicodeDecodeError, KeyError, TypeError, ValueError, LineDataError) as error:
        raise LineDataError(
            f'{path}: expected tables [[file]] with name = "x.par", gas = "CO2", range_per_cm = [2100, 2300] and, if '
            f'wanted, isotopologues = [1, 2] and edition = "HITRAN2020"; got {error!r}'
        ) from error
    return result


def format_declarations(declared: Mapping[str, Sequence[Declaration]]) -> str:
    """Declarations by file name as `read_declarations` reads them."""
    text = "# Where the files of this folder are complete.\n"
    for name, rows in declared.items():
        for row in rows:
            low, high = row.interval_per_cm
            text += f"\n[[file]]\nname = {json.dumps(name)}\ngas = {json.dumps(row.formula)}\n"
            text += f"range_per_cm = [{low!r}, {high!r}]\n"
            text += "" if row.isotopologues is None else f"isotopologues = {list(row.isotopologues)}\n"
            text += "" if row.edition is None else f"edition = {json.dumps(row.edition)}\n"
            text += "" if row.fetched is None else f"fetched = {json.dumps(row.fetched)}\n"
    return text


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
        Stretches without a gap that hold at least 0.9 of the embedded intensity.
    reasons : list of str
        One per stretch that is not used.
    """
    good: list[Interval] = []
    reasons: list[str] = []
    short = 0
    for low, high, count, judged in _stretches(lines.wavenumber_per_cm, embedded):
        yardstick = _sum_within(embedded, *judged)
        here = _sum_within(lines, low, high)
        if high - low < _GAP_PER_CM:
            short += count
        elif embedded is None or not len(embedded):
            reasons.append(
                f"{low:.2f}-{high:.2f} per cm: no embedded list to judge it by; declare it in {COVERAGE_FILE} to use it"
            )
        elif here >= _COMPLETE_SHARE * yardstick:
            good.append((low, high))
        else:
            reasons.append(
                f"{low:.2f}-{high:.2f} per cm: partial, not used "
                f"(holds {here / yardstick:.2g} of the embedded intensity)"
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


def inside(wavenumber_per_cm: NDArray[np.float64], intervals: Sequence[Interval]) -> NDArray[np.bool_]:
    """Which wavenumbers lie in any of the intervals, ends included."""
    mask = np.zeros(wavenumber_per_cm.size, dtype=bool)
    for low, high in intervals:
        mask |= (wavenumber_per_cm >= low) & (wavenumber_per_cm <= high)
    return mask


def subtract(intervals: Sequence[Interval], taken: Sequence[Interval]) -> tuple[Interval, ...]:
    """What is left of intervals when others are taken away."""
    free: list[Interval] = list(intervals)
    for low, high in taken:
        pieces: list[Interval] = []
        for a, b in free:
            pieces += [(x, y) for x, y in ((a, min(b, low)), (max(a, high), b)) if y > x]
        free = pieces
    return tuple(free)


def _stretches(
    wavenumber_per_cm: NDArray[np.float64], embedded: Lines | None
) -> list[tuple[float, float, int, Interval]]:
    """Stretches of a file's lines between its gaps: from, to, number of lines, and the interval to judge it in."""
    if not wavenumber_per_cm.size:
        return []
    widths = np.diff(wavenumber_per_cm)
    wide = np.flatnonzero(widths > _GAP_PER_CM).tolist()
    gaps: list[int] = [k for k in wide if not _bridged(wavenumber_per_cm[k : k + 2], embedded)]
    beyond = [0.0, *(_GAP_PER_CM if widths[k] <= _NEARBY_PER_CM else 0.0 for k in gaps), 0.0]
    result = []
    for number, (before, last) in enumerate(pairwise([-1, *gaps, wavenumber_per_cm.size - 1])):
        low, high = float(wavenumber_per_cm[before + 1]), float(wavenumber_per_cm[last])
        result.append((low, high, last - before, (low - beyond[number], high + beyond[number + 1])))
    return result


def _bridged(ends_per_cm: NDArray[np.float64], embedded: Lines | None) -> bool:
    """Whether a gap is one of the spectrum and not of the file: the embedded list has next to nothing in it."""
    low, high = ends_per_cm
    if embedded is None or not len(embedded) or high - low > _NEARBY_PER_CM:
        return False
    around = _sum_within(embedded, low - _NEARBY_PER_CM, high + _NEARBY_PER_CM)
    return around > 0.0 and _sum_within(embedded, low + _EDGE_PER_CM, high - _EDGE_PER_CM) < _NEXT_TO_NOTHING * around


def _sum_within(lines: Lines | None, low: float, high: float) -> float:
    if lines is None:
        return 0.0
    first, last = np.searchsorted(lines.wavenumber_per_cm, [low - 1e-6, high + 1e-6])
    return float(lines.intensity_cm[first:last].sum())
