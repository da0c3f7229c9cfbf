"""Line records of a gas from HITRANonline into a folder: stretch by stretch, resumable, with a record of what it is.

A stretch that has come lies in ``.fetch/`` inside the folder, written at once or not at all, until all are there; a
second run takes up where the first ended. Then they become one ``.par.gz`` file, one file of widths in other gases,
and rows in ``coverage.toml``.
"""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from filelock import FileLock, Timeout
from numpy.typing import NDArray

from planner.disk import make_folder, write_whole
from planner.errors import LineDataError, OutputError
from planner.spectroscopy.coverage import COVERAGE_FILE, Declaration, format_declarations, read_declarations
from planner.spectroscopy.files.service import LineService
from planner.spectroscopy.files.widths import format_widths, widths_path
from planner.spectroscopy.hitran import parse_par
from planner.spectroscopy.molecules import Molecule, isotopologue_abundance, isotopologues
from planner.spectroscopy.store import digest

__all__ = ["CITATIONS", "FetchOrder", "Fetched", "fetch_lines", "order_lines"]

Progress = Callable[[str, float], None]

CITATIONS = (
    "Gordon et al. 2022, J. Quant. Spectrosc. Radiat. Transfer 277, 107949 (HITRAN2020)",
    "Kochanov et al. 2016, J. Quant. Spectrosc. Radiat. Transfer 177, 15 (hapi)",
    "Gamache et al. 2021, J. Quant. Spectrosc. Radiat. Transfer 271, 107713 (partition sums)",
    "Tan et al. 2022, Astrophys. J. Suppl. 262, 40 (widths in H2, He and CO2)",
    "Tan et al. 2019, J. Geophys. Res. Atmospheres 124, 11580 (widths in H2O)",
    "the measurements behind the lines: columns 134-145 of the records, explained at hitran.org",
)
"""What to quote beside fetched lines; newer editions say at hitran.org how they want to be cited."""

WIDTH_GASES = ("H2", "He", "CO2", "H2O")
"""Gases whose widths HITRAN gives beside those in air."""

_STRETCH_PER_CM = 250.0
_RECORD = 160
_UNKNOWN = "#"


@dataclass(frozen=True, kw_only=True)
class FetchOrder:
    """What is to be fetched."""

    molecule: Molecule
    isotopologues: tuple[int, ...]
    from_per_cm: float
    to_per_cm: float
    least_abundance: float

    @property
    def file_name(self) -> str:
        """Name of the file of records."""
        return f"{self.molecule.formula}_{self.from_per_cm:g}-{self.to_per_cm:g}_hitranonline.par.gz"

    @property
    def work_name(self) -> str:
        """Name of the folder of stretches."""
        return f"{self.molecule.formula}-{digest(repr(self))[:8]}"


@dataclass(frozen=True, kw_only=True)
class Fetched:
    """What came.

    Attributes
    ----------
    path : Path
        The file of records.
    records : int or None
        How many; None if the file was there already.
    sentence : str
        What it is and where it lies.
    """

    path: Path
    records: int | None
    sentence: str


def order_lines(molecule: Molecule, from_per_cm: float, to_per_cm: float, least_abundance: float) -> FetchOrder:
    """All isotopologues of a molecule with a natural abundance of at least this, over a range.

    Raises
    ------
    LineDataError
        If HITRAN has no lines of the molecule, or no isotopologue is abundant enough.
    """
    number = molecule.hitran_number
    known = isotopologues(number) if number is not None else ()
    if number is None or not known:
        raise LineDataError(f"{molecule.formula}: HITRAN has no line records of it")
    chosen = tuple(i for i in known if isotopologue_abundance(number, i) >= least_abundance)
    if not chosen:
        raise LineDataError(f"{molecule.formula}: no isotopologue has an abundance of {least_abundance:g} or more")
    if not 0 <= from_per_cm < to_per_cm:
        raise LineDataError(f"range: expected 0 <= from < to in 1/cm, got {from_per_cm:g} to {to_per_cm:g}")
    return FetchOrder(
        molecule=molecule,
        isotopologues=chosen,
        from_per_cm=round(from_per_cm, 6),
        to_per_cm=round(to_per_cm, 6),
        least_abundance=least_abundance,
    )


def fetch_lines(order: FetchOrder, folder: Path, service: LineService, *, today: str, progress: Progress) -> Fetched:
    """Fetch what was ordered, or what is missing of it, into a folder.

    Parameters
    ----------
    order : FetchOrder
    folder : Path
        Made if need be.
    service : LineService
    today : str
        The day, for the record, such as ``"2026-03-01"``.
    progress : callable
        Called with a text and the share done.

    Raises
    ------
    LineDataError
        If the service fails; what has come is kept.
    OutputError
        If the folder cannot be written.
    """
    path = make_folder(folder) / order.file_name
    there = [row for row in read_declarations(folder / COVERAGE_FILE).get(path.name, ()) if row.fetched]
    if path.is_file() and there and there[0].isotopologues == order.isotopologues:
        return Fetched(path=path, records=None, sentence=f"{path.name}: there already, {there[0].fetched}")
    work = make_folder(folder / ".fetch" / order.work_name)
    with _alone(work):
        begun = _begun(work, today)
        _fetch_stretches(order, work, service, progress)
        records = _join(order, work, path)
        told = f"from {service.description} on {begun}" + ("" if begun == today else f" to {today}")
        told += f", isotopologues with an abundance of {order.least_abundance:g} or more"
        _declare(order, folder, edition=f"HITRANonline {today}", told=told)
        shutil.rmtree(work)
    return Fetched(path=path, records=records, sentence=f"{path.name}: {records} line records {told}")


@contextmanager
def _alone(work: Path) -> Iterator[None]:
    """Keeps a second run off the same stretches; the folder of stretches goes when the last is done."""
    lock = FileLock(work.with_suffix(".lock"), timeout=0)
    try:
        with lock:
            yield
    except Timeout:
        raise OutputError(f"{work}: another run is fetching the same; wait for it to end") from None
    if not work.exists():
        with suppress(OSError):
            Path(lock.lock_file).unlink(missing_ok=True)
            work.parent.rmdir()


def _begun(work: Path, today: str) -> str:
    """The day on which the first stretch was asked for."""
    note = work / "begun.txt"
    if not note.is_file():
        write_whole(note, today.encode())
    return note.read_text(encoding="utf-8")


# ---------------------------------------------------------------- stretches


def _fetch_stretches(order: FetchOrder, work: Path, service: LineService, progress: Progress) -> None:
    """Ask for every stretch that is not there yet.

    The service answers 404 where it has no lines, and also when something is wrong with it. So a stretch without
    lines is only believed as part of an answer with lines: it is asked for again together with what follows, twice as
    much each time, and at the end of the range together with the last line known.
    """
    edges = _edges(order)
    start = max((end for _, end in _done(order, work)), default=order.from_per_cm)
    step = 1
    while start < order.to_per_cm:
        progress(f"{order.molecule.formula}, {start:g} 1/cm", _share(order, start))
        stop = edges[min(edges.index(start) + step, len(edges) - 1)]
        body = _ask(order, service, start, stop)
        if body is None and stop == order.to_per_cm:
            body = _tail(order, work, service, start)
        if body is None:
            step *= 2
            continue
        write_whole(work / f"{start!r}-{stop!r}.txt", body)
        start, step = stop, 1
    progress(order.molecule.formula, 1.0)


def _edges(order: FetchOrder) -> list[float]:
    """Where stretches meet: whole multiples of their length inside the range, and its ends."""
    first = np.floor(order.from_per_cm / _STRETCH_PER_CM) + 1
    inner = np.arange(first, np.ceil(order.to_per_cm / _STRETCH_PER_CM)) * _STRETCH_PER_CM
    return [order.from_per_cm, *inner.tolist(), order.to_per_cm]


def _done(order: FetchOrder, work: Path) -> Iterator[tuple[Path, float]]:
    """Files of the stretches that have come, from the start of the range without a gap, and where each ends."""
    ends = {}
    for path in work.glob("*-*.txt"):
        low, _, high = path.stem.partition("-")
        ends[float(low)] = (path, float(high))
    at = order.from_per_cm
    while at in ends:
        path, at = ends[at]
        yield path, at


def _share(order: FetchOrder, at: float) -> float:
    return (at - order.from_per_cm) / (order.to_per_cm - order.from_per_cm)


def _ask(order: FetchOrder, service: LineService, start: float, stop: float) -> bytes | None:
    """Rows of a stretch, its end excluded unless it is the end of the range; None if the service has none."""
    number = order.molecule.hitran_number
    assert number is not None
    last = np.inf if stop == order.to_per_cm else stop

    def check(body: bytes) -> None:
        _check_rows(order, body.splitlines(), start, stop)

    body = service.records(
        [(number, i) for i in order.isotopologues],
        start,
        stop,
        parameters=[f"{letter}_{gas}" for gas in WIDTH_GASES for letter in ("gamma", "n")],
        check=check,
    )
    if not body:
        return None
    return b"".join(row + b"\n" for row in body.splitlines() if start <= _wavenumber(row) < last)


def _tail(order: FetchOrder, work: Path, service: LineService, start: float) -> bytes:
    """Rows from a start to the end of the range, where the service says that there are none: asked for again together
    with the last line before."""
    rows = [row for path, _ in _done(order, work) for row in path.read_bytes().splitlines()]
    if not rows:
        raise LineDataError(
            f"{service.address}: no lines of {order.molecule.formula} in {order.from_per_cm:g}-{order.to_per_cm:g} per "
            "cm: every answer was 404 (not found) or empty; check the gas, the range and the address"
        )
    anchor = max(_wavenumber(row) for row in rows)
    body = _ask(order, service, anchor, order.to_per_cm)
    if body is None:
        raise LineDataError(
            f"{service.address}: answered 404 (not found) for {anchor:g}-{order.to_per_cm:g} per cm, where it had "
            "lines before; run the same command again later; what has come is kept"
        )
    return b"".join(row + b"\n" for row in body.splitlines() if _wavenumber(row) >= start)


def _wavenumber(row: bytes) -> float:
    return float(row[3:15])


def _check_rows(order: FetchOrder, rows: Sequence[bytes], start: float, stop: float) -> None:
    """Refuse an answer that is not records of these isotopologues in this stretch, each with its widths."""
    if not rows:
        return
    lines = parse_par(b"".join(row[:_RECORD] + b"\n" for row in rows), "line")
    _widths(rows)
    if set(lines.molecule.tolist()) != {order.molecule.hitran_number}:
        raise LineDataError(f"lines of other molecules than {order.molecule.formula}")
    if not set(lines.isotopologue.tolist()) <= set(order.isotopologues):
        raise LineDataError("lines of other isotopologues than asked for")
    nu = lines.wavenumber_per_cm
    if nu[0] < start - 1e-6 or nu[-1] > stop + 1e-6:
        raise LineDataError(f"lines from {nu[0]:g} to {nu[-1]:g} per cm, outside {start:g}-{stop:g} per cm")


def _widths(rows: Sequence[bytes]) -> NDArray[np.float64]:
    """What stands behind the records, shape ``(record, 2 * gas)``; not a number where HITRAN has none."""
    table = np.full((len(rows), 2 * len(WIDTH_GASES)), np.nan)
    for number, row in enumerate(rows):
        words = row[_RECORD:].decode("ascii", errors="replace").split(",")
        if len(words) != table.shape[1] + 1 or words[0].strip():
            raise LineDataError(
                f"line:{number + 1}: expected a record and {table.shape[1]} parameters, got {row!r:.200}"
            )
        for column, word in enumerate(words[1:]):
            if word.strip() not in ("", _UNKNOWN):
                table[number, column] = _parameter(word, number)
    return table


def _parameter(word: str, number: int) -> float:
    try:
        value = float(word)
    except ValueError:
        value = np.inf
    if not abs(value) < 100:
        raise LineDataError(f"line:{number + 1}: expected a width or exponent, or #, got {word!r}")
    return value


# ---------------------------------------------------------------- the whole


def _join(order: FetchOrder, work: Path, path: Path) -> int:
    """One file of records and one of widths from all stretches; returns the number of records."""
    rows = [row for stretch, _ in _done(order, work) for row in stretch.read_bytes().splitlines()]
    rows.sort(key=_wavenumber)
    _check_rows(order, rows, order.from_per_cm, order.to_per_cm)
    records = b"".join(row[:_RECORD] + b"\n" for row in rows)
    table = _widths(rows)
    by_gas = {gas: table[:, 2 * k : 2 * k + 2].T for k, gas in enumerate(WIDTH_GASES)}
    known = {gas: values for gas, values in by_gas.items() if np.any(np.isfinite(values[0]))}
    if known:
        write_whole(widths_path(path), format_widths(known, digest(records)).encode())
    write_whole(path, records)
    return len(rows)


def _declare(order: FetchOrder, folder: Path, *, edition: str, told: str) -> None:
    declared = read_declarations(folder / COVERAGE_FILE)
    declared[order.file_name] = [
        Declaration(
            formula=order.molecule.formula,
            isotopologues=order.isotopologues,
            interval_per_cm=(order.from_per_cm, order.to_per_cm),
            edition=edition,
            fetched=told,
        )
    ]
    write_whole(folder / COVERAGE_FILE, format_declarations(declared).encode())
