"""Widths of lines in other gases than air: a file of numbers beside a file of line records.

``NAME.widths.csv`` or ``NAME.widths.csv.gz`` beside ``NAME.par`` (or ``.par.gz``) has one row per record, in the order
of the records. Its first row names the hash of the record file it belongs to, its second the columns: for each gas
the half width at 296 K in 1/cm per atm and the exponent of its temperature law; ``nan`` where HITRAN has none.
"""

from __future__ import annotations

import io
import re
from collections.abc import Mapping
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.broadening import ForeignWidths
from planner.spectroscopy.files.disk import read_whole
from planner.spectroscopy.molecules import find_molecule
from planner.spectroscopy.store import digest

__all__ = ["format_widths", "parse_widths", "read_widths", "widths_path"]


def widths_path(records: Path) -> Path:
    """Where the widths of a file of line records lie."""
    stem, packed = re.fullmatch(r"(.*)\.par(\.gz)?", records.name, re.IGNORECASE).groups()  # type: ignore[union-attr]
    return records.with_name(f"{stem}.widths.csv{packed or ''}")


def format_widths(by_gas: Mapping[str, NDArray[np.float64]], records_digest: str) -> str:
    """Text of a widths file from ``(2, record)`` arrays of width and exponent by formula."""
    columns = ",".join(f"gamma_{gas},n_{gas}" for gas in by_gas)
    table = np.concatenate([np.atleast_2d(values) for values in by_gas.values()]).T
    text = io.StringIO()
    np.savetxt(
        text, table, fmt="%.6g", delimiter=",", header=f"of the records {records_digest}\n{columns}", comments=""
    )
    return text.getvalue()


def read_widths(path: Path, records: int, records_digest: str) -> ForeignWidths:
    """The widths of a file; see `parse_widths`."""
    return parse_widths(read_whole(path), str(path), records, records_digest)


def parse_widths(text: bytes, where: str, records: int, records_digest: str) -> ForeignWidths:
    """Widths from the bytes of a file.

    Parameters
    ----------
    text : bytes
    where : str
        Name of the source, used in messages.
    records : int
        How many line records they belong to.
    records_digest : str
        Hash of those records.

    Raises
    ------
    LineDataError
        If they belong to other records or a row breaks the layout.
    """
    first, _, rest = text.partition(b"\n")
    if first.decode(errors="replace").strip() != f"of the records {records_digest}":
        raise LineDataError(f"{where}:1: these widths belong to other line records; remove the file or fetch again")
    header, _, body = rest.partition(b"\n")
    gases = _gases(header.decode(errors="replace").strip(), f"{where}:2")
    rows = body.splitlines()
    if len(rows) != records:
        raise LineDataError(f"{where}: expected {records} rows, one per line record, got {len(rows)}")
    try:
        table = np.loadtxt(rows, delimiter=",", ndmin=2) if rows else np.empty((0, 2 * len(gases)))
    except ValueError as error:
        raise LineDataError(
            f"{where}:{_first_bad_row(rows, len(gases)) + 3}: expected numbers or nan: {error}"
        ) from error
    bad = np.flatnonzero(np.any(np.isinf(table), axis=1) | np.any(table[:, ::2] < 0, axis=1))
    if table.shape[1] != 2 * len(gases) or bad.size:
        line = 3 + (int(bad[0]) if bad.size else 0)
        raise LineDataError(f"{where}:{line}: expected {2 * len(gases)} finite numbers or nan, widths of 0 or more")
    return ForeignWidths(
        by_gas={gas: np.ascontiguousarray(table[:, 2 * k : 2 * k + 2].T) for k, gas in enumerate(gases)},
        digest=digest(text),
    )


def _gases(header: str, place: str) -> list[str]:
    names = re.findall(r"gamma_(\w+),n_\1(?:,|$)", header)
    if not names or ",".join(f"gamma_{name},n_{name}" for name in names) != header:
        raise LineDataError(f"{place}: expected columns such as gamma_H2,n_H2,gamma_He,n_He, got {header!r}")
    return [find_molecule(name).formula for name in names]


def _first_bad_row(rows: list[bytes], gases: int) -> int:
    def good(row: bytes) -> bool:
        try:
            return len([float(word) for word in row.split(b",")]) == 2 * gases
        except ValueError:
            return False

    return next((i for i, row in enumerate(rows) if not good(row)), 0)
