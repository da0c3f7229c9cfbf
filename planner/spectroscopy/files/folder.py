"""All files of a folder of spectroscopic data, each read, checked and kept in the store."""

from __future__ import annotations

import io
import json
import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.broadening import ForeignWidths
from planner.spectroscopy.coverage import COVERAGE_FILE, Declaration, read_declarations
from planner.spectroscopy.files.cia import CollisionTable, parse_cia
from planner.spectroscopy.files.disk import read_whole
from planner.spectroscopy.files.widths import read_widths, widths_path
from planner.spectroscopy.files.xsc import CrossSectionTable, parse_xsc
from planner.spectroscopy.hitran import parse_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import lines_from_table, table_from_lines
from planner.spectroscopy.store import Store, digest

__all__ = ["DataFiles", "LineFile", "kind_of", "read_files", "read_folder"]


@dataclass(frozen=True, kw_only=True, eq=False)
class LineFile:
    """One file of line records.

    Attributes
    ----------
    path : Path
    lines : Lines
        All its records, any molecules.
    widths : ForeignWidths or None
        Widths in other gases than air, from the file beside it.
    digest : str
        Hash of its bytes and of the widths.
    """

    path: Path
    lines: Lines
    widths: ForeignWidths | None
    digest: str


@dataclass(frozen=True, kw_only=True, eq=False)
class DataFiles:
    """What a folder holds: line records, cross-sections, collision blocks, and what the user declares of them."""

    line_files: tuple[LineFile, ...] = ()
    tables: tuple[CrossSectionTable, ...] = ()
    blocks: tuple[CollisionTable, ...] = ()
    declared: Mapping[str, Sequence[Declaration]] = field(default_factory=dict)


def kind_of(path: Path) -> str | None:
    """``"par"``, ``"xsc"`` or ``"cia"`` by the name of a file, plain or gzip; None for any other."""
    found = re.search(r"\.(par|xsc|cia)(\.gz)?$", path.name, re.IGNORECASE)
    return found.group(1).lower() if found else None


def read_folder(folder: Path, store: Store) -> DataFiles:
    """All files of a folder.

    Raises
    ------
    LineDataError
        If the folder does not exist, holds no such file, or one breaks its format.
    """
    if not folder.is_dir():
        raise LineDataError(f"{folder}: expected a folder of HITRAN-format files, found none")
    paths = sorted(path for path in folder.iterdir() if kind_of(path) and path.is_file())
    if not paths:
        raise LineDataError(f"{folder}: holds no .par, .xsc or .cia file, plain or gzip")
    return read_files(paths, read_declarations(folder / COVERAGE_FILE), store)


def read_files(paths: Sequence[Path], declared: Mapping[str, Sequence[Declaration]], store: Store) -> DataFiles:
    """The files of these paths, with declarations by file name.

    Raises
    ------
    LineDataError
        If one breaks its format.
    """
    line_files, tables, blocks = [], [], []
    for path in paths:
        match kind_of(path):
            case "par":
                line_files.append(_line_file(path, store))
            case "xsc":
                tables += _stored(path, store, parse_xsc, CrossSectionTable)
            case "cia":
                blocks += _stored(path, store, parse_cia, CollisionTable)
    return DataFiles(line_files=tuple(line_files), tables=tuple(tables), blocks=tuple(blocks), declared=declared)


def _line_file(path: Path, store: Store) -> LineFile:
    data = read_whole(path)
    name = digest(data)
    lines = lines_from_table(store.fetch("files", {"par": name}, lambda: table_from_lines(parse_par(data, str(path)))))
    beside = widths_path(path)
    widths = read_widths(beside, len(lines), name) if beside.is_file() else None
    return LineFile(path=path, lines=lines, widths=widths, digest=digest(name, widths.digest if widths else ""))


def _stored(path: Path, store: Store, parse: Callable[[bytes, str], Sequence[Any]], kind: type[Any]) -> list[Any]:
    """The tables of a file, parsed once and then read from the store."""
    data = read_whole(path)
    key = {"file": digest(data), "path": str(path)}
    return _unpacked(store.fetch("files", key, lambda: _packed(parse(data, str(path)))), kind)


def _packed(tables: Sequence[Any]) -> NDArray[np.uint8]:
    """Records of arrays and plain values as one array of bytes."""
    arrays: dict[str, Any] = {}
    plain = []
    for number, table in enumerate(tables):
        values = {f.name: getattr(table, f.name) for f in fields(table)}
        arrays |= {f"{number}.{name}": value for name, value in values.items() if isinstance(value, np.ndarray)}
        plain.append({name: value for name, value in values.items() if not isinstance(value, np.ndarray)})
    buffer = io.BytesIO()
    np.savez(buffer, plain=np.array(json.dumps(plain)), **arrays)
    return np.frombuffer(buffer.getvalue(), dtype=np.uint8)


def _unpacked(packed: NDArray[np.uint8], kind: type[Any]) -> list[Any]:
    with np.load(io.BytesIO(packed.tobytes()), allow_pickle=False) as arrays:
        records = json.loads(str(arrays["plain"]))
        for name in arrays.files:
            number, _, attribute = name.partition(".")
            if attribute:
                records[int(number)][attribute] = arrays[name]
    return [kind(**{k: tuple(v) if isinstance(v, list) else v for k, v in record.items()}) for record in records]
