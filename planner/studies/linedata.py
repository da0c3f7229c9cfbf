"""Which line data there are, building them ahead of use, and checking how good they are."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path
from time import perf_counter

from planner.spectroscopy.accuracyfile import AccuracyTable, stored_accuracy
from planner.spectroscopy.faults import list_faults
from planner.spectroscopy.files.folder import read_folder
from planner.spectroscopy.lists.build import Constants, build_lines, embedded_formulas, read_constants
from planner.spectroscopy.quality import quality_summary
from planner.spectroscopy.store import Store
from planner.studies.comparison import jobs_of, judge_all
from planner.studies.listrecords import CheckedList, CheckReport, GasListing
from planner.studies.unseen import published_bands, unseen_windows

__all__ = ["build", "check", "list_gases"]

Progress = Callable[[str, float], None]


def list_gases() -> list[GasListing]:
    """All embedded gases, sorted by formula."""
    return [_listing(read_constants(formula)) for formula in embedded_formulas()]


def build(gases: Sequence[str] = (), progress: Progress | None = None) -> list[str]:
    """Build and store the lists of some gases, or of all; one sentence each.

    Raises
    ------
    LineDataError
        If a gas has no embedded data.
    """
    store = Store()
    names = list(gases) or embedded_formulas()
    sentences = []
    for done, name in enumerate(names):
        constants = read_constants(name)
        if progress:
            progress(constants.molecule.formula, done / len(names))
        started = perf_counter()
        lines = build_lines(constants, store)
        kind = "smooth bands only" if lines is None else f"{len(lines)} lines, {perf_counter() - started:.2f} s"
        sentences.append(f"{constants.molecule.formula}: {kind}")
    return [*sentences, *store.notices]


def check(against: Path | None = None, progress: Progress | None = None) -> CheckReport:
    """Check the embedded lists for faults, or score them against a folder of real data.

    Parameters
    ----------
    against : Path, optional
        Folder of HITRAN-format ``.par`` and ``.xsc`` files, plain or gzip.
    progress : callable, optional

    Raises
    ------
    LineDataError
        If a constants file or a real file breaks its layout, or the folder holds none.
    """
    formulas = embedded_formulas()
    if against is None:
        lists = tuple(_checked(formula, progress, done / len(formulas)) for done, formula in enumerate(formulas))
        return CheckReport(lists=lists, accuracy=stored_accuracy(), against=None, notices=())
    store = Store()
    judged = judge_all(jobs_of(read_folder(against, store), store, progress), progress)
    unseen = unseen_windows(formulas, judged, published_bands(), store)
    table = AccuracyTable(judged=judged, unseen=unseen)
    return CheckReport(lists=(), accuracy=table, against=against, notices=tuple(store.notices))


def _checked(formula: str, progress: Progress | None, fraction: float) -> CheckedList:
    if progress:
        progress(formula, fraction)
    started = perf_counter()
    lines, faults = list_faults(read_constants(formula))
    count = 0 if lines is None else len(lines)
    return CheckedList(gas=formula, lines=count, seconds=perf_counter() - started, faults=tuple(faults))


def _listing(constants: Constants) -> GasListing:
    kinds = dict.fromkeys(str(part["kind"]) for part in (*constants.line_parts, *constants.smooth_parts))
    return GasListing(
        gas=constants.molecule.formula,
        also_called=", ".join(constants.molecule.names),
        made_of=", ".join(kinds),
        covers_per_cm=", ".join(f"{low:g}-{high:g}" for low, high in constants.covers_per_cm),
        covers_um=", ".join(f"{1e4 / high:.3g}-{1e4 / low:.3g}" for low, high in reversed(constants.covers_per_cm)),
        quality=quality_summary(constants.molecule.formula),
    )
