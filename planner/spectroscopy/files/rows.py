"""Checks that all readers of fixed-column files share."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError

__all__ = ["fixed_count", "fixed_number", "header_at_odds", "numbers_of", "printable_rows", "shapes_of", "signs_of"]

_ALL_DIGITS_ALIKE = bytes.maketrans(b"123456789e", b"000000000E")
_NUMBER = re.compile(r" *[+-]?(?:\d+\.?\d*|\.\d+)(?:[EeDd][+-]?\d{1,3})? *")
_REPAIRS = (
    (re.compile(rb"(\d)([+-]\d{3})"), rb"\1E\2"),  # an exponent of three digits loses its letter
    (re.compile(rb"(\d)(-\d\.)"), rb"\1 \2"),  # a negative number fills its column and touches its neighbour
)
_LARGEST_OFF = 0.002  # headers round their largest value to three or four digits


def printable_rows(text_or_bytes: str | bytes, where: str) -> list[bytes]:
    """The rows of a text file, without line ends; blank rows at its end are dropped.

    Raises
    ------
    LineDataError
        If the file is empty or a row holds anything but printable ASCII.
    """
    data = text_or_bytes.encode() if isinstance(text_or_bytes, str) else text_or_bytes
    rows = [row.removesuffix(b"\r") for row in data.split(b"\n")]
    while rows and not rows[-1].strip():
        rows.pop()
    if not rows:
        raise LineDataError(f"{where}: expected a table, got an empty file")
    if not data.isascii() or re.search(rb"[^\x20-\x7e\r\n]", data):
        for number, row in enumerate(rows, start=1):
            found = re.search(rb"[^\x20-\x7e]", row)
            if found:
                raise LineDataError(
                    f"{where}:{number}: column {found.start() + 1}: expected a printable ASCII character, "
                    f"got byte {found[0][0]}"
                )
    return rows


def shapes_of(rows: Sequence[bytes], fits: Callable[[bytes], bool]) -> tuple[set[bytes], int | None]:
    """The shapes of rows, and the index of the first row whose shape is wrong (None if all are right).

    A row's shape is the row with every digit replaced by 0. Tables have few shapes, so each is judged only once.
    """
    shapes = [row.translate(_ALL_DIGITS_ALIKE) for row in rows]
    found = set(shapes)
    wrong = {shape for shape in found if not fits(shape)}
    return found, next(i for i, shape in enumerate(shapes) if shape in wrong) if wrong else None


def numbers_of(rows: Sequence[bytes], shapes: set[bytes]) -> NDArray[np.float64]:
    """All numbers of rows whose shapes have been checked, in order."""
    text = b" ".join(rows)
    for peculiarity, spelled_out in _REPAIRS:
        if any(peculiarity.search(shape) for shape in shapes):
            text = peculiarity.sub(spelled_out, text)
    return np.fromstring(text, dtype=np.float64, sep=" ")


def fixed_number(row: bytes, name: str, start: int, stop: int, place: str, *, least: float, positive: bool) -> float:
    """The number in columns ``start`` to ``stop`` (from 0, end excluded).

    Raises
    ------
    LineDataError
        If there is none, or it is below ``least``, or not positive where it must be.
    """
    written = row[start:stop].decode("ascii")
    value = float(written.replace("D", "E").replace("d", "e")) if _NUMBER.fullmatch(written) else np.nan
    if not np.isfinite(value) or value < least or (positive and value <= 0):
        bound = " greater than 0" if positive else f" of {least:g} or more" if np.isfinite(least) else ""
        raise LineDataError(f"{place}: {name} (columns {start + 1}-{stop}): expected a number{bound}, got {written!r}")
    return value


def fixed_count(row: bytes, start: int, stop: int, place: str) -> int:
    """The number of points in columns ``start`` to ``stop``, at least 2.

    Raises
    ------
    LineDataError
        If there is none.
    """
    written = row[start:stop].decode("ascii")
    if not re.fullmatch(r" *\d+ *", written) or int(written) < 2:
        raise LineDataError(
            f"{place}: number of points (columns {start + 1}-{stop}): expected a whole number of 2 or more, "
            f"got {written!r}"
        )
    return int(written)


def signs_of(arrays: Sequence[NDArray[np.float64]]) -> tuple[str, ...]:
    """How many measured values are below zero or zero, in a sentence; none if all are above."""
    values = np.concatenate(arrays)
    negative, zero, count = np.sum(values < 0), np.sum(values == 0), values.size
    return (f"{negative} negative and {zero} zero values of {count}",) if negative or zero else ()


def header_at_odds(values: NDArray[np.float64], largest_stated: float, unit: str) -> tuple[str, ...]:
    """Says so if the largest value is not what the header states; that occurs in published files."""
    largest = float(values.max())
    if abs(largest - largest_stated) <= _LARGEST_OFF * abs(largest):
        return ()
    return (f"the header gives {largest_stated:.3e} {unit} as the largest value, it is {largest:.3e}",)
