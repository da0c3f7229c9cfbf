"""The stored accuracy table, ``linelists/accuracy.toml``: what was compared with real data, how well, what was not."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, fields
from enum import StrEnum
from functools import lru_cache
from pathlib import Path
from typing import Any

from planner.errors import LineDataError
from planner.resources import data_folder

__all__ = [
    "AccuracyTable",
    "JudgedWindow",
    "Judgement",
    "UnseenWindow",
    "format_accuracy",
    "parse_accuracy",
    "stored_accuracy",
]

ACCURACY_FILE = "accuracy.toml"


class Judgement(StrEnum):
    """What a comparison comes down to."""

    MEETS = "meets"
    MISSES = "misses"
    NARROW = "too narrow to judge"


@dataclass(frozen=True, kw_only=True)
class JudgedWindow:
    """An embedded list against real data in one window.

    Sequences have an entry per mixing ratio; where no bin shows at a mixing ratio its scores are None. Differences
    are embedded less real effective heights in scale heights.
    """

    gas: str
    from_per_cm: float
    to_per_cm: float
    verdict: Judgement
    missed: str
    """Which marks are missed, and by how much; empty if none."""
    compared_with: str
    in_sample: bool
    """Most of the intensity was fitted to real data: the score tells how well constants describe, not predict."""
    temperatures_k: tuple[float, ...]
    mixing_ratios: tuple[float, ...]
    bins: tuple[int, ...]
    percentile_90: tuple[float | None, ...]
    median: tuple[float | None, ...]
    mean: tuple[float | None, ...]
    percentile_90_at_1000: tuple[float | None, ...]
    """The same with bins of R = 1000."""
    real_sum_cm: float
    sum_ratio: float
    """Embedded over real."""
    strength_factor: float
    """Factor by which the strength may be wrong."""
    embedded_lines: int
    real_lines: int


@dataclass(frozen=True, kw_only=True)
class UnseenWindow:
    """A stretch of an embedded list that was never compared with real spectra."""

    gas: str
    from_per_cm: float
    to_per_cm: float
    sum_cm: float
    strength_factor: float
    rests_on: str
    """The source of most of the intensity."""
    published: str
    """How its sum compares with a published band intensity; empty if there is none."""


@dataclass(frozen=True, kw_only=True)
class AccuracyTable:
    """All windows, by gas and wavenumber."""

    judged: tuple[JudgedWindow, ...] = ()
    unseen: tuple[UnseenWindow, ...] = ()

    @property
    def meeting(self) -> tuple[int, int]:
        """How many of the windows that can be judged meet the marks, and how many can be judged."""
        verdicts = [window.verdict for window in self.judged if window.verdict is not Judgement.NARROW]
        return verdicts.count(Judgement.MEETS), len(verdicts)


@lru_cache(maxsize=1)
def stored_accuracy() -> AccuracyTable:
    """The table that ships with the lists; empty if there is none.

    Raises
    ------
    LineDataError
        If the file breaks its layout.
    """
    path = data_folder("linelists") / ACCURACY_FILE
    return parse_accuracy(path.read_text(encoding="utf-8"), path) if path.is_file() else AccuracyTable()


def parse_accuracy(text: str, where: Path) -> AccuracyTable:
    """The table from a text of its own layout; ``where`` is named in errors.

    Raises
    ------
    LineDataError
        If the text breaks the layout.
    """
    try:
        table = tomllib.loads(text)
        return AccuracyTable(
            judged=tuple(_judged(row) for row in table.get("judged", ())),
            unseen=tuple(UnseenWindow(**row) for row in table.get("unseen", ())),
        )
    except (tomllib.TOMLDecodeError, KeyError, TypeError, ValueError) as error:
        raise LineDataError(
            f"{where}: not an accuracy table of this program: {error}; make it anew with `limbcast lines check --write`"
        ) from error


def format_accuracy(table: AccuracyTable) -> str:
    """The inverse of `parse_accuracy`, numbers rounded as they deserve."""
    lines = [
        "# Accuracy of the embedded line lists. Written by `limbcast lines check --against DIR --write`;",
        "# not to be edited by hand. Differences in scale heights, an entry per mixing ratio, nan where nothing shows.",
    ]
    for name, rows in (("judged", table.judged), ("unseen", table.unseen)):
        for row in rows:
            lines += ["", f"[[{name}]]", *(f"{f.name} = {_written(getattr(row, f.name))}" for f in fields(row))]
    return "\n".join(lines) + "\n"


def _judged(row: Mapping[str, Any]) -> JudgedWindow:
    values: dict[str, Any] = {key: _absent(value) if isinstance(value, list) else value for key, value in row.items()}
    values["verdict"] = Judgement(row["verdict"])
    return JudgedWindow(**values)


def _absent(values: Iterable[Any]) -> tuple[Any, ...]:
    """A list as it was written, with None for nan."""
    return tuple(None if value != value else value for value in values)


def _written(value: Any) -> str:
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return '"' + value.replace("\\", "\\\\").replace('"', '\\"') + '"'
    if isinstance(value, Sequence):
        return f"[{', '.join(_written(item) for item in value)}]"
    if value is None:
        return "nan"
    return repr(value)
