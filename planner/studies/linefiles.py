"""Real spectroscopic data into a folder: fetched from HITRANonline, or taken in from files."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from pathlib import Path

from planner.spectroscopy.files.byhand import collision_file, cross_section_files, pair_of
from planner.spectroscopy.files.fetch import CITATIONS, FetchOrder, fetch_lines, order_lines
from planner.spectroscopy.files.importing import ColumnMeaning, ImportReport, Promise, import_files
from planner.spectroscopy.files.service import LineService
from planner.spectroscopy.molecules import find_molecule, isotopologues
from planner.spectroscopy.store import Store

__all__ = ["fetch", "take_in"]


def fetch(
    names: Sequence[str],
    from_per_cm: float,
    to_per_cm: float,
    folder: Path,
    *,
    least_abundance: float,
    today: str,
    service: LineService | None = None,
    progress: Callable[[str, float], None] | None = None,
) -> Iterator[str]:
    """Fetch the lines of gases into a folder; yields one sentence per gas as it is done, then what to quote.

    All names are checked before the first request. For gases and pairs that hapi does not offer, the sentence says
    what to download by hand.

    Parameters
    ----------
    names : sequence of str
        Gases, by formula or common name, and pairs such as ``"N2-H2"``.
    from_per_cm, to_per_cm : float
    folder : Path
    least_abundance : float
        Isotopologues that are rarer are left out.
    today : str
        The day, for the record.
    service : LineService, optional
        By default the true one.
    progress : callable, optional
        Called with a text and the share done of one gas.

    Raises
    ------
    LineDataError
        If a name is not known or the service fails; what has come is kept.
    OutputError
        If the folder cannot be written.
    """
    orders = [_order(name, from_per_cm, to_per_cm, folder, least_abundance) for name in names]
    asked = service or LineService()
    for order in orders:
        if isinstance(order, str):
            yield order
            continue
        yield fetch_lines(order, folder, asked, today=today, progress=progress or _say_nothing).sentence
    if any(isinstance(order, FetchOrder) for order in orders):
        yield from ("Please quote:", *(f"  {citation}" for citation in CITATIONS))


def take_in(
    paths: Sequence[Path], folder: Path, *, promise: Promise | None = None, columns: ColumnMeaning | None = None
) -> ImportReport:
    """Check files and take them into a folder; see `import_files`."""
    return import_files(paths, folder, Store(), promise=promise, columns=columns)


def _order(name: str, low: float, high: float, folder: Path, least_abundance: float) -> FetchOrder | str:
    """What to fetch, or what to do by hand."""
    pair = pair_of(name)
    if pair is not None:
        return collision_file(pair, folder)
    molecule = find_molecule(name)
    if molecule.hitran_number is None or not isotopologues(molecule.hitran_number):
        return cross_section_files(molecule, low, high, folder)
    return order_lines(molecule, low, high, least_abundance)


def _say_nothing(text: str, share: float) -> None:
    """No progress is shown."""
