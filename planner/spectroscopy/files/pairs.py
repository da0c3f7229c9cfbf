"""Collision-induced absorption of pairs from files, laid over the embedded coefficients.

A block of a file is one temperature over its own wavenumbers. At each wavenumber the blocks that reach it are
interpolated: ln k is linear in ln T where both values are positive, else k is. Up to a factor 1.2 beyond their
temperatures the nearest block holds. Beyond that the embedded coefficients stand again, or, where there are none, the
nearest block still holds. Outside the wavenumbers of all blocks nothing changes; at their ends nothing is blended.
"""

from __future__ import annotations

import math
import re
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.coverage import Interval, subtract, union
from planner.spectroscopy.files.cia import CollisionTable
from planner.spectroscopy.files.rows import signs_of
from planner.spectroscopy.files.spread import SPREAD_RULE
from planner.spectroscopy.store import digest

__all__ = ["MeasuredPair"]

_HELD_WITHIN = 1.2
_SAME_TEMPERATURE = 0.002


@dataclass(frozen=True, kw_only=True, eq=False)
class _Piece:
    """A stretch whose every wavenumber is reached by the same blocks, in ascending temperature."""

    interval: Interval
    blocks: tuple[CollisionTable, ...]


class MeasuredPair:
    """Coefficients of one pair from one or several files.

    Parameters
    ----------
    tables : sequence of CollisionTable
        All of one pair.

    Attributes
    ----------
    intervals : tuple of (from, to)
        The wavenumbers that the blocks reach, ascending and disjoint.
    sentences : tuple of str
        One per file: what is used where, and how.

    Raises
    ------
    LineDataError
        If two files of one edition give the same pair over the same stretch; both are named.
    """

    def __init__(self, tables: Sequence[CollisionTable]) -> None:
        self._pieces: list[_Piece] = []
        self.sentences: tuple[str, ...] = ()
        occupied: list[tuple[Interval, str]] = []
        for file in sorted({_file(t) for t in tables}, key=lambda name: (-_edition(name), name)):
            blocks = [t for t in tables if _file(t) == file]
            reach = union([_reach(t) for t in blocks])
            _refuse_one_edition_twice(file, reach, occupied)
            free = subtract(reach, [interval for interval, _ in occupied])
            if free:
                self._pieces += _pieces(blocks, free)
                self.sentences += (_sentence(blocks, free, file),)
            occupied += [(interval, file) for interval in reach]
        self.intervals = union([piece.interval for piece in self._pieces])

    def coefficient_cm5(
        self, wavenumber_per_cm: NDArray[np.float64], temperature_k: float, embedded_cm5: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """The embedded coefficients with those of the files laid over them, shape ``(wavenumber,)``.

        Parameters
        ----------
        wavenumber_per_cm : (wavenumber,) ndarray
            Ascending.
        temperature_k : float
        embedded_cm5 : (wavenumber,) ndarray
            Coefficients in cm5 per molecule squared; zero where nothing is embedded.
        """
        result = embedded_cm5.copy()
        for piece in self._pieces:
            low, high = piece.interval
            part = slice(*np.searchsorted(wavenumber_per_cm, [low, np.nextafter(high, np.inf)]))
            coldest, warmest = piece.blocks[0].temperature_k, piece.blocks[-1].temperature_k
            near = coldest / _HELD_WITHIN <= temperature_k <= warmest * _HELD_WITHIN
            if near or not np.any(embedded_cm5[part]):
                result[part] = self._at(piece, wavenumber_per_cm[part], temperature_k)
        return result

    def _at(self, piece: _Piece, wavenumber: NDArray[np.float64], temperature_k: float) -> NDArray[np.float64]:
        kelvin = [block.temperature_k for block in piece.blocks]
        above = min(int(np.searchsorted(kelvin, temperature_k)), len(kelvin) - 1)
        below = max(above - 1, 0)
        cold, warm = (
            np.interp(wavenumber, piece.blocks[i].wavenumber_per_cm, piece.blocks[i].absorption_cm5)
            for i in (below, above)
        )
        if above == below:
            return cold
        at = min(max(temperature_k, kelvin[below]), kelvin[above])
        result = cold + (at - kelvin[below]) / (kelvin[above] - kelvin[below]) * (warm - cold)
        both = (cold > 0) & (warm > 0)
        share = math.log(at / kelvin[below]) / math.log(kelvin[above] / kelvin[below])
        result[both] = cold[both] * (warm[both] / cold[both]) ** share
        return result


def _edition(file: str) -> int:
    """The year in a file's name, such as ``N2-N2_2018.cia``; 0 if there is none."""
    found = re.search(r"_(\d{4})[a-z]?\.cia", file, re.IGNORECASE)
    return int(found.group(1)) if found else 0


def _file(table: CollisionTable) -> str:
    return table.where.rpartition(":")[0]


def _reach(table: CollisionTable) -> Interval:
    return float(table.wavenumber_per_cm[0]), float(table.wavenumber_per_cm[-1])


def _refuse_one_edition_twice(file: str, reach: Sequence[Interval], occupied: Sequence[tuple[Interval, str]]) -> None:
    for (low, high), other in occupied:
        common = subtract(reach, subtract(reach, [(low, high)]))
        if common and _edition(other) == _edition(file):
            raise LineDataError(
                f"{other} and {file}: both give the same pair over {common[0][0]:g}-{common[0][1]:g} per cm; keep one, "
                "or put the year of its edition into its name so that the newer one is used"
            )


def _pieces(blocks: Sequence[CollisionTable], free: Sequence[Interval]) -> list[_Piece]:
    """The free stretches of a file, cut where one of its blocks begins or ends."""
    pieces = []
    ends = {end for block in blocks for end in _reach(block)}
    for low, high in free:
        cuts = [low, *sorted(end for end in ends if low < end < high), high]
        for a, b in pairwise(cuts):
            here = [block for block in blocks if _reach(block)[0] <= a and _reach(block)[1] >= b]
            pieces.append(_Piece(interval=(a, b), blocks=_one_per_temperature(here)))
    return pieces


def _one_per_temperature(blocks: Sequence[CollisionTable]) -> tuple[CollisionTable, ...]:
    """Ascending in temperature; of two blocks at one temperature the first of the file stands."""
    kept: list[CollisionTable] = []
    for block in sorted(blocks, key=lambda b: b.temperature_k):
        if not kept or block.temperature_k > kept[-1].temperature_k * (1 + _SAME_TEMPERATURE):
            kept.append(block)
    return tuple(kept)


def _sentence(blocks: Sequence[CollisionTable], free: Sequence[Interval], file: str) -> str:
    signs = signs_of([block.coefficient_cm5 for block in blocks])
    rule = (SPREAD_RULE,) if any(np.any(block.coefficient_cm5 < 0) for block in blocks) else ()
    return "; ".join(
        (
            f"{'-'.join(blocks[0].pair)} pairs: coefficients of {Path(file).name} ({_digest(blocks)[:8]}) over "
            + ", ".join(_stretch(blocks, interval) for interval in free)
            + f", in place of the embedded ones up to a factor {_HELD_WITHIN:g} beyond these temperatures, the nearest "
            "block held; joined without blending",
            *signs,
            *rule,
        )
    )


def _digest(blocks: Sequence[CollisionTable]) -> str:
    return digest(
        *(a.tobytes() for b in blocks for a in (b.wavenumber_per_cm, b.coefficient_cm5, np.array(b.temperature_k)))
    )


def _stretch(blocks: Sequence[CollisionTable], interval: Interval) -> str:
    """An interval and the temperatures of the blocks in it."""
    low, high = interval
    kelvin = sorted({b.temperature_k for b in blocks if _reach(b)[0] < high and _reach(b)[1] > low})
    told = f"{len(kelvin)} temperatures, {kelvin[0]:g}-{kelvin[-1]:g} K" if len(kelvin) > 1 else f"{kelvin[0]:g} K"
    return f"{low:.6g}-{high:.6g} per cm ({told})"
