"""Taking files of spectroscopic data into a folder: checked first, with what is there already, then written."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from planner.disk import make_folder, write_whole
from planner.errors import LineDataError
from planner.spectroscopy.coverage import COVERAGE_FILE, Declaration, format_declarations, read_declarations
from planner.spectroscopy.files.columns import evenly_spaced, parse_columns
from planner.spectroscopy.files.describe import descriptions, formulas_in
from planner.spectroscopy.files.disk import read_whole
from planner.spectroscopy.files.folder import DataFiles, LineFile, kind_of, read_files
from planner.spectroscopy.files.widths import widths_path
from planner.spectroscopy.files.xsc import BAR_PER_TORR, CrossSectionTable, format_xsc, parse_xsc
from planner.spectroscopy.sources import LineLibrary, NoDataError
from planner.spectroscopy.store import Store

__all__ = ["ColumnMeaning", "ImportReport", "Promise", "import_files"]


@dataclass(frozen=True, kw_only=True)
class ColumnMeaning:
    """What the two columns of a text file are."""

    formula: str
    x_unit: str
    y_unit: str
    temperature_k: float
    pressure_bar: float


@dataclass(frozen=True, kw_only=True)
class Promise:
    """What the user says of the line files: where they are complete, and of which edition they are."""

    interval_per_cm: tuple[float, float]
    isotopologues: tuple[int, ...] | None = None
    edition: str | None = None


@dataclass(frozen=True, kw_only=True)
class ImportReport:
    """What was taken in.

    Attributes
    ----------
    files : tuple of str
        One sentence per file: what it holds, and what a reader should know.
    used : tuple of str
        One sentence per source that stands for something now, the embedded data included.
    unused : tuple of str
        One sentence per stretch that is not used, with the reason.
    written : tuple of Path
    """

    files: tuple[str, ...]
    used: tuple[str, ...]
    unused: tuple[str, ...]
    written: tuple[Path, ...]


def import_files(
    paths: Sequence[Path],
    folder: Path,
    store: Store,
    *,
    promise: Promise | None = None,
    columns: ColumnMeaning | None = None,
) -> ImportReport:
    """Check files, say what they cover, and write them into a folder with the user's promise, if any.

    Everything is checked, together with what the folder holds already, before anything is written.

    Parameters
    ----------
    paths : sequence of Path
        Files, or folders whose ``.par``, ``.xsc`` and ``.cia`` files are meant, plain or gzip.
    folder : Path
        Where they go; made if need be.
    store : Store
        Keeps what was parsed.
    promise : Promise, optional
        Goes into ``coverage.toml`` for every line file among the paths and every gas in it.
    columns : ColumnMeaning, optional
        Says that files of any other name are text of two columns; they are written as ``.xsc``.

    Raises
    ------
    LineDataError
        If a file breaks its format, is of no known kind, or conflicts with another.
    OutputError
        If the folder cannot be written.
    """
    sources = _sources(paths, columns)
    converted = {path: _converted(path, columns) for path in sources if columns is not None and kind_of(path) is None}
    targets = {path: folder / (_xsc_name(path) if path in converted else path.name) for path in sources}
    contents = {p: format_xsc(converted[p][0]).encode() if p in converted else read_whole(p) for p in sources}
    _refuse_clashes(targets, contents)
    held = {path for path in folder.iterdir() if kind_of(path)} if folder.is_dir() else set[Path]()
    kept = sorted(held - set(targets.values()))
    files = read_files([*kept, *(path for path in sources if path not in converted)], {}, store)
    files = replace(files, tables=(*files.tables, *(table for table, _ in converted.values())))
    declared = read_declarations(folder / COVERAGE_FILE)
    if promise is not None:
        declared |= _declarations(promise, [file for file in files.line_files if file.path in targets])
    library = LineLibrary(store, files=replace(files, declared=declared))
    new = _only(files, sources, converted)
    sentences = (*descriptions(new), *(note for _, note in converted.values()))
    used, unused = _standing(library, new)
    make_folder(folder)
    for path, target in targets.items():
        _write(path, target, contents[path])
    if promise is not None:
        write_whole(folder / COVERAGE_FILE, format_declarations(declared).encode())
    return ImportReport(files=sentences, used=used, unused=unused, written=tuple(targets.values()))


def _sources(paths: Sequence[Path], columns: ColumnMeaning | None) -> list[Path]:
    """The files meant, folders opened."""
    found: list[Path] = []
    for path in paths:
        inside = sorted(p for p in path.iterdir() if kind_of(p) and p.is_file()) if path.is_dir() else [path]
        if not inside:
            raise LineDataError(f"{path}: holds no .par, .xsc or .cia file, plain or gzip")
        found += inside
    for path in found:
        if kind_of(path) is None and columns is None:
            raise LineDataError(
                f"{path}: expected a .par, .xsc or .cia file, plain or gzip; for a table of two columns state the gas, "
                "the units, the temperature and the pressure"
            )
    return found


def _xsc_name(path: Path) -> str:
    """The name that a two-column file gets."""
    return Path(re.sub(r"\.gz$", "", path.name, flags=re.IGNORECASE)).stem + ".xsc"


def _converted(path: Path, columns: ColumnMeaning) -> tuple[CrossSectionTable, str]:
    """A two-column file as a table in the precision of a ``.xsc`` file, and a sentence on how."""
    where = str(path)
    wavenumber, values = parse_columns(read_whole(path), where, x_unit=columns.x_unit, y_unit=columns.y_unit)
    table, note = evenly_spaced(
        wavenumber,
        values,
        formula=columns.formula,
        temperature_k=columns.temperature_k,
        pressure_torr=columns.pressure_bar / BAR_PER_TORR,
        where=f"{where}:1",
    )
    (written,) = parse_xsc(format_xsc(table), where)
    return written, f"{path.name}: two columns in {columns.x_unit} and {columns.y_unit}, {note}, kept to four digits"


def _refuse_clashes(targets: Mapping[Path, Path], contents: Mapping[Path, bytes]) -> None:
    """Refuse two files that would get one name, and one that would take the place of another."""
    taken: dict[Path, Path] = {}
    for path, target in targets.items():
        if target in taken:
            raise LineDataError(f"{taken[target]} and {path}: two files of one name; rename one")
        taken[target] = path
        if target.is_file() and read_whole(target) != contents[path]:
            raise LineDataError(
                f"{target}: is there already and differs from {path}; rename one, or remove the old one"
            )


def _declarations(promise: Promise, files: Sequence[LineFile]) -> dict[str, list[Declaration]]:
    def row(formula: str) -> Declaration:
        return Declaration(
            formula=formula,
            isotopologues=promise.isotopologues,
            interval_per_cm=promise.interval_per_cm,
            edition=promise.edition,
        )

    return {file.path.name: [row(formula) for formula in formulas_in(file.lines)] for file in files}


def _only(files: DataFiles, sources: Sequence[Path], converted: Mapping[Path, object]) -> DataFiles:
    """The part of the files that comes from the sources."""
    names = {str(path) for path in sources}
    return replace(
        files,
        line_files=tuple(file for file in files.line_files if str(file.path) in names),
        tables=tuple(table for table in files.tables if table.where.rpartition(":")[0] in names),
        blocks=tuple(block for block in files.blocks if block.where.rpartition(":")[0] in names),
    )


def _standing(library: LineLibrary, new: DataFiles) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """What stands for the gases of the new files, and what of them does not."""
    formulas = dict.fromkeys(formula for file in new.line_files for formula in formulas_in(file.lines))
    formulas |= dict.fromkeys(table.formula for table in new.tables)
    used: list[str] = []
    unused: list[str] = []
    for formula in formulas:
        try:
            source = library.gas(formula)
            used += source.provenance
            unused += source.partial
        except NoDataError as error:
            unused.append(str(error))
    used += library.pair_provenance(partner for block in new.blocks for partner in block.pair)
    return tuple(used), tuple(unused)


def _write(path: Path, target: Path, content: bytes) -> None:
    if target.is_file():
        return  # the same content, as was checked
    write_whole(target, content)
    if kind_of(path) == "par" and widths_path(path).is_file():
        write_whole(widths_path(target), read_whole(widths_path(path)))
