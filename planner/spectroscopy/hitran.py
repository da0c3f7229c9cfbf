"""Reader and writer of HITRAN line records: 160 characters a line, or 100 in the editions of 1986 to 2001.

A record is read whole or not at all: the first field that breaks the format raises `LineDataError` with file, line
and field. Plain files go through numpy columns; anything unusual goes through the slow parser, which reads one
record after the other and finds the fault or the rare but published spelling (``2.700-164``).
"""

from __future__ import annotations

import gzip
import math
import os
import re
import tempfile
import zlib
from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError, OutputError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import isotopologues

__all__ = ["format_par", "parse_par", "parse_par_slowly", "read_par", "write_par"]


class _Field(NamedTuple):
    """One numeric column of a record: where it stands, what it may hold."""

    name: str
    start: int
    stop: int
    blank: bool = False  # published records leave it blank where the value is unknown; read as 0
    least: float = -math.inf
    positive: bool = False


class _Edition(NamedTuple):
    """The layout of one edition of the format."""

    length: int
    numbers: tuple[_Field, ...]
    labels: tuple[tuple[str, int, int], ...]


_COMMON = (
    _Field("wavenumber_per_cm", 3, 15, positive=True),
    _Field("intensity_cm", 15, 25, least=0.0),
    _Field("air_width_per_cm_atm", 35, 40, least=0.0),
    _Field("self_width_per_cm_atm", 40, 45, blank=True, least=0.0),
    _Field("lower_energy_per_cm", 45, 55),
    _Field("temperature_exponent", 55, 59),
    _Field("air_shift_per_cm_atm", 59, 67, blank=True),
)
# Rothman et al. 2005, J. Quant. Spectrosc. Radiat. Transfer 96, 139, table 1.
_EDITION_2004 = _Edition(
    length=160,
    numbers=(
        *_COMMON,
        _Field("einstein_a_per_s", 25, 35, blank=True, least=0.0),
        _Field("upper_weight", 146, 153, blank=True, least=0.0),
        _Field("lower_weight", 153, 160, blank=True, least=0.0),
    ),
    labels=(
        ("upper_global", 67, 82),
        ("lower_global", 82, 97),
        ("upper_local", 97, 112),
        ("lower_local", 112, 127),
    ),
)
# Rothman et al. 1998, J. Quant. Spectrosc. Radiat. Transfer 60, 665, section 2. Columns 26 to 35 hold a squared
# transition moment there, not an Einstein coefficient: checked, not kept.
_EDITION_1986 = _Edition(
    length=100,
    numbers=(*_COMMON, _Field("squared_moment_debye2", 25, 35, blank=True, least=0.0)),
    labels=(
        ("upper_global", 67, 70),
        ("lower_global", 70, 73),
        ("upper_local", 73, 82),
        ("lower_local", 82, 91),
    ),
)
_EDITIONS = {edition.length: edition for edition in (_EDITION_2004, _EDITION_1986)}
_ISOTOPOLOGUE_CODES = "1234567890AB"  # isotopologues 1 to 12
_NUMBER = re.compile(r" *([+-]?(?:\d+\.?\d*|\.\d+))(?:[EeDd]?([+-]\d{1,3})|[EeDd](\d{1,3}))? *")
_PLAIN_NUMBER_BYTES = np.isin(np.arange(256), np.frombuffer(b" 0123456789+-.Ee", dtype=np.uint8))


def read_par(path: str | os.PathLike[str]) -> Lines:
    """Lines of a file of HITRAN records, plain or gzip (told by its first bytes).

    Raises
    ------
    LineDataError
        If the file cannot be read or a record breaks the format.
    """
    path = Path(path)
    try:
        data = path.read_bytes()
        if data.startswith(b"\x1f\x8b"):
            data = gzip.decompress(data)
    except (OSError, EOFError, zlib.error) as error:
        raise LineDataError(f"{path}: expected a readable file of line records, got: {error}") from error
    return parse_par(data, str(path))


def parse_par(text_or_bytes: str | bytes, where: str) -> Lines:
    """Lines of HITRAN records, sorted by wavenumber.

    Parameters
    ----------
    text_or_bytes : str or bytes
        Records of 160 characters (editions since 2004) or 100 (1986 to 2001), all of one kind, any molecules,
        separated by line feeds with or without carriage returns. The last may lack its line end.
    where : str
        Name of the source, used in messages.

    Returns
    -------
    Lines
        Isotopologue codes 0, A and B become 10, 11 and 12. A negative lower energy (unknown) is kept. A field left
        blank where the value is unknown is 0. The 100-character editions give no Einstein coefficient and no weights.

    Raises
    ------
    LineDataError
        On the first record that breaks the format, with file and line, field, what was expected and what came.
    """
    data = text_or_bytes.encode("utf-8") if isinstance(text_or_bytes, str) else bytes(text_or_bytes)
    lines = _parse_columns(data)
    return parse_par_slowly(data, where) if lines is None else lines


# ---------------------------------------------------------------- the fast way: columns of a table of bytes


def _parse_columns(data: bytes) -> Lines | None:
    """Lines of records that are all plain; None if any needs a closer look."""
    table = _table(data)
    if table is None or not np.all((table >= 32) & (table < 127)):
        return None
    edition = _EDITIONS[table.shape[1]]
    molecule, isotopologue = _species_columns(table)
    values: dict[str, NDArray[Any]] = {"molecule": molecule, "isotopologue": isotopologue}
    if not np.all(_known_species()[np.maximum(molecule, 0), np.maximum(isotopologue, 0)]):
        return None
    for field in edition.numbers:
        column = _number_column(table, field)
        if column is None or not np.all(np.isfinite(column)) or np.any(column < field.least):
            return None
        if field.positive and np.any(column <= 0):
            return None
        values[field.name] = column
    for name, start, stop in edition.labels:
        text = table[:, start:stop].astype(np.uint32).view(f"U{stop - start}")[:, 0]
        values[name] = np.char.rstrip(text)
    return _lines(values)


def _table(data: bytes) -> NDArray[np.uint8] | None:
    """The records as a table of bytes, shape (record, column), or None if they are not all of one known length."""
    first_end = data.find(b"\n")
    if first_end < 0:
        return None
    if not data.endswith(b"\n"):
        data += b"\r\n" if data[first_end - 1 : first_end] == b"\r" else b"\n"
    stride = first_end + 1
    if len(data) % stride:
        return None
    table = np.frombuffer(data, dtype=np.uint8).reshape(-1, stride)
    if not np.all(table[:, -1] == 10):
        return None
    ends = 2 if np.all(table[:, -2] == 13) else 1
    return table[:, :-ends] if stride - ends in _EDITIONS else None


def _species_columns(table: NDArray[np.uint8]) -> tuple[NDArray[np.int16], NDArray[np.int16]]:
    """Molecule and isotopologue numbers, shape (record,); -1 where they are not well written."""
    digit = np.full(256, -1, dtype=np.int16)
    digit[48:58] = np.arange(10)
    tens = np.where(table[:, 0] == 32, np.int16(0), digit[table[:, 0]])
    ones = digit[table[:, 1]]
    code = np.full(256, -1, dtype=np.int16)
    code[np.frombuffer(_ISOTOPOLOGUE_CODES.encode(), dtype=np.uint8)] = np.arange(1, 13)
    molecule = np.where((tens >= 0) & (ones >= 0), 10 * tens + ones, -1).astype(np.int16)
    return molecule, code[table[:, 2]]


@cache
def _known_species() -> NDArray[np.bool_]:
    """Whether HITRAN has a molecule and isotopologue, shape (100, 13)."""
    known = np.zeros((100, 13), dtype=bool)
    for molecule in range(100):
        known[molecule, list(isotopologues(molecule))] = True
    return known


def _number_column(table: NDArray[np.uint8], field: _Field) -> NDArray[np.float64] | None:
    """Numbers of one column, shape (record,), or None if any is not plainly written."""
    column = table[:, field.start : field.stop].copy()
    if not np.all(_PLAIN_NUMBER_BYTES[column]):
        return None
    if field.blank:
        column[np.all(column == 32, axis=1), -1] = 48
    try:
        return column.view(f"S{field.stop - field.start}")[:, 0].astype(np.float64)
    except ValueError:
        return None


# ---------------------------------------------------------------- the slow way: one record after the other


def parse_par_slowly(data: bytes, where: str) -> Lines:
    """The same as `parse_par`, one record and one field at a time; names the first fault."""
    rows = data.split(b"\n")
    if rows[-1] == b"":
        rows.pop()
    if not rows:
        raise LineDataError(f"{where}: expected line records of 160 characters, got an empty file")
    edition = _EDITIONS.get(len(rows[0].rstrip(b"\r")), _EDITION_2004)
    records = [_record(row, edition, f"{where}:{number}") for number, row in enumerate(rows, start=1)]
    return _lines({name: np.array([record[name] for record in records]) for name in records[0]})


def _record(row: bytes, edition: _Edition, place: str) -> dict[str, Any]:
    if row.endswith(b"\r"):
        row = row[:-1]
    if len(row) != edition.length:
        raise LineDataError(
            f"{place}: record: expected {edition.length} characters, got {len(row)}; the line is cut, wrapped or not a "
            "HITRAN record"
        )
    for column, byte in enumerate(row, start=1):
        if not 32 <= byte < 127:
            raise LineDataError(f"{place}: column {column}: expected a printable ASCII character, got byte {byte}")
    text = row.decode("ascii")
    record: dict[str, Any] = _species(text, place)
    for field in edition.numbers:
        record[field.name] = _number(text, field, place)
    for name, start, stop in edition.labels:
        record[name] = text[start:stop].rstrip()
    return record


def _species(text: str, place: str) -> dict[str, Any]:
    if not re.fullmatch(r"[ \d]\d", text[:2]):
        raise LineDataError(f"{place}: molecule (columns 1-2): expected a HITRAN molecule number, got {text[:2]!r}")
    molecule, code = int(text[:2]), text[2]
    known = isotopologues(molecule)
    if not known:
        raise LineDataError(f"{place}: molecule (columns 1-2): HITRAN has no molecule {molecule}")
    isotopologue = _ISOTOPOLOGUE_CODES.find(code) + 1
    if isotopologue not in known:
        codes = " ".join(_ISOTOPOLOGUE_CODES[i - 1] for i in known)
        raise LineDataError(
            f"{place}: isotopologue (column 3): expected one of {codes} for molecule {molecule}, got {code!r}"
        )
    return {"molecule": np.int16(molecule), "isotopologue": np.int16(isotopologue)}


def _number(text: str, field: _Field, place: str) -> float:
    written = text[field.start : field.stop]
    if field.blank and not written.strip():
        return 0.0
    match = _NUMBER.fullmatch(written)
    value = float(f"{match[1]}e{match[2] or match[3] or 0}") if match else math.nan
    bound = "greater than 0" if field.positive else f"of {field.least:g} or more" if field.least == 0 else ""
    if not math.isfinite(value) or value < field.least or (field.positive and value <= 0):
        raise LineDataError(
            f"{place}: {field.name} (columns {field.start + 1}-{field.stop}): expected a number"
            f"{' ' + bound if bound else ''}, got {written!r}"
        )
    return value


def _lines(values: dict[str, NDArray[Any]]) -> Lines:
    """A `Lines` record; what the old editions do not give is unknown."""
    values.pop("squared_moment_debye2", None)
    for name in ("einstein_a_per_s", "upper_weight", "lower_weight"):
        values.setdefault(name, np.zeros(values["molecule"].size))
    return Lines(**values)


# ---------------------------------------------------------------- writing


def format_par(lines: Lines) -> str:
    """The lines as HITRAN records of 160 characters (edition of 2004), rounded as the format rounds.

    Error and reference codes are written as 0, the flag for line mixing as blank, since `Lines` does not carry them.

    Raises
    ------
    LineDataError
        If a value does not fit its columns.
    """
    columns = [_written_species(lines)]
    columns += [
        _written(lines.wavenumber_per_cm, "wavenumber_per_cm", 12, _fixed(6)),
        _written(lines.intensity_cm, "intensity_cm", 10, _scientific),
        _written(lines.einstein_a_per_s, "einstein_a_per_s", 10, _scientific),
        _written(lines.air_width_per_cm_atm, "air_width_per_cm_atm", 5, _fixed(4)),
        _written(lines.self_width_per_cm_atm, "self_width_per_cm_atm", 5, _fixed(4)),
        _written(lines.lower_energy_per_cm, "lower_energy_per_cm", 10, _fixed(4)),
        _written(lines.temperature_exponent, "temperature_exponent", 4, _fixed(2)),
        _written(lines.air_shift_per_cm_atm, "air_shift_per_cm_atm", 8, _fixed(6)),
    ]
    columns += [_written_labels(getattr(lines, name), name) for name, _, _ in _EDITION_2004.labels]
    columns += [["000000 0 0 0 0 0 0 "] * len(lines)]
    columns += [
        _written(lines.upper_weight, "upper_weight", 7, _fixed(1)),
        _written(lines.lower_weight, "lower_weight", 7, _fixed(1)),
    ]
    return "".join("".join(row) + "\n" for row in zip(*columns, strict=True))


def write_par(path: str | os.PathLike[str], lines: Lines) -> None:
    """Write the lines as HITRAN records, gzip if the name ends in ``.gz``; the file appears whole or not at all.

    Raises
    ------
    LineDataError
        If a value does not fit its columns.
    OutputError
        If the file cannot be written.
    """
    path = Path(path)
    data = format_par(lines).encode("ascii")
    if path.suffix == ".gz":
        data = gzip.compress(data, mtime=0)
    try:
        with tempfile.NamedTemporaryFile(dir=path.parent, prefix=path.name, delete=False) as part:
            part.write(data)
        os.replace(part.name, path)
    except OSError as error:
        raise OutputError(f"{path}: cannot write line records: {error}; choose a folder that can be written") from error


def _written_species(lines: Lines) -> list[str]:
    pairs = list(zip(lines.molecule.tolist(), lines.isotopologue.tolist(), strict=True))
    for molecule, isotopologue in set(pairs):
        if isotopologue not in isotopologues(molecule):
            raise LineDataError(f"line records: HITRAN has no isotopologue {isotopologue} of molecule {molecule}")
    return [f"{molecule:2d}{_ISOTOPOLOGUE_CODES[isotopologue - 1]}" for molecule, isotopologue in pairs]


def _written(values: NDArray[np.float64], name: str, width: int, style: Callable[[float, int], str]) -> list[str]:
    texts = [style(value, width) for value in values.tolist()]
    for index, text in enumerate(texts):
        if len(text) > width:
            raise LineDataError(f"{name} of line {index + 1}: {float(values[index])!r} does not fit {width} columns")
    return [text.rjust(width) for text in texts]


def _fixed(decimals: int) -> Callable[[float, int], str]:
    """Fixed-point style: drops the zero before the point, then decimals, to fit the column as Fortran's F does."""

    def style(value: float, width: int) -> str:
        for places in range(decimals, -1, -1):
            text = f"{value:.{places}f}"
            if len(text) > width and text.startswith(("0.", "-0.")):
                text = text.replace("0.", ".", 1)
            if len(text) <= width:
                break
        return text

    return style


def _scientific(value: float, width: int) -> str:
    """Exponent style of four digits; three where the exponent needs three places."""
    text = f"{value:.3E}"
    return text if len(text) <= width else f"{value:.2E}"


def _written_labels(labels: NDArray[np.str_], name: str) -> list[str]:
    texts = labels.tolist()
    for text in set(texts):
        if len(text) > 15 or not text.isascii() or (text and not text.isprintable()):
            raise LineDataError(f"{name}: expected at most 15 printable ASCII characters, got {text!r}")
    return [text.ljust(15) for text in texts]
