"""Embedded lists against a folder of real data: where the data are complete, which windows to judge, all verdicts.

Line files are trusted over the intervals that ``coverage.toml`` beside them declares, else over the range in their
name (``CO2_2100-2300_hitran2012.par``), else over their own runs of lines. Measured cross-sections are trusted where
they exceed their noise.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from planner.spectroscopy.accuracyfile import JudgedWindow
from planner.spectroscopy.coverage import Interval, inside, union
from planner.spectroscopy.files.folder import DataFiles, LineFile
from planner.spectroscopy.files.xsc import CrossSectionTable
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import Constants, build_lines, embedded_formulas, read_constants
from planner.spectroscopy.store import Store
from planner.spectroscopy.windows import band_windows, runs
from planner.studies.judging import averaged, judge_lines, judge_tables, noise_cm2, smooth_sum_cm, sum_cm

__all__ = ["Job", "jobs_of", "judge_all"]

Progress = Callable[[str, float], None]

_RANGE = re.compile(r"(?<![\d.])(\d{2,5}(?:\.\d+)?)-(\d{2,5}(?:\.\d+)?)(?![\d.]*\d)")
"""In the name of a file: wavenumbers between which it is complete."""
_FRAGMENT_SHARE = 0.5
"""A run that no one vouches for and that holds less than this of the embedded intensity is taken for a fragment."""
_ABOVE_NOISE = 5.0
_SAME_STRETCH = 0.8
_MIDDLE_K = 250.0
_WORKERS = 2


@dataclass(frozen=True, kw_only=True, eq=False)
class Job:
    """One gas in one window against one source of real data: lines, or tables of one stretch."""

    constants: Constants
    embedded: Lines | None
    window_per_cm: Interval
    source: str
    lines: Lines | None = None
    tables: tuple[CrossSectionTable, ...] = ()

    @property
    def gas(self) -> str:
        """Formula of the gas."""
        return self.constants.molecule.formula

    def judge(self) -> JudgedWindow | None:
        """Score and verdict; None where the real data show nothing."""
        if self.lines is not None:
            return judge_lines(self.constants, self.embedded, self.lines, self.window_per_cm, self.source)
        return judge_tables(self.constants, self.embedded, self.tables, self.window_per_cm, self.source)


def jobs_of(files: DataFiles, store: Store, progress: Progress | None = None) -> list[Job]:
    """Every window in which an embedded list can be compared with the data of a folder, by gas."""
    found: list[Job] = []
    formulas = embedded_formulas()
    for done, formula in enumerate(formulas):
        constants = read_constants(formula)
        number = constants.molecule.hitran_number
        line_files = [file for file in files.line_files if number is not None and np.any(file.lines.molecule == number)]
        tables = [table for table in files.tables if table.formula == formula]
        if line_files or tables:
            if progress:
                progress(f"building {formula}", done / len(formulas))
            embedded = build_lines(constants, store)
            found += _line_jobs(constants, embedded, line_files, files)
            found += _table_jobs(constants, embedded, tables)
    return found


def judge_all(jobs: Sequence[Job], progress: Progress | None = None) -> tuple[JudgedWindow, ...]:
    """All verdicts, by gas and wavenumber; two windows at a time."""
    done = 0

    def run(job: Job) -> JudgedWindow | None:
        nonlocal done
        result = job.judge()
        done += 1
        if progress:
            progress(f"{job.gas} {job.window_per_cm[0]:.0f}-{job.window_per_cm[1]:.0f}", done / len(jobs))
        return result

    # numpy and the compiled kernels let go of the interpreter, so threads share the cores
    with ThreadPoolExecutor(_WORKERS) as pool:
        judged = [row for row in pool.map(run, jobs) if row is not None]
    return tuple(sorted(judged, key=lambda row: (row.gas, row.from_per_cm, row.to_per_cm)))


# ---------------------------------------------------------------- line files


def _line_jobs(
    constants: Constants, embedded: Lines | None, line_files: Sequence[LineFile], files: DataFiles
) -> Iterator[Job]:
    for file in line_files:
        lines = file.lines.where(file.lines.molecule == constants.molecule.hitran_number)
        for interval in _complete(file, files, constants, lines, embedded):
            here = lines.where(inside(lines.wavenumber_per_cm, [interval]))
            for window in band_windows(here.wavenumber_per_cm, here.intensity_cm, interval):
                yield Job(
                    constants=constants,
                    embedded=embedded,
                    window_per_cm=window,
                    source=f"{_edition(file, files) or 'edition not named'}, {file.path.name}",
                    lines=here,
                )


def _complete(
    file: LineFile, files: DataFiles, constants: Constants, lines: Lines, embedded: Lines | None
) -> tuple[Interval, ...]:
    """Intervals over which a file is complete for a gas: declared, named, or its own runs of lines."""
    rows = [row for row in files.declared.get(file.path.name, ()) if row.formula == constants.molecule.formula]
    if rows:
        return union([row.interval_per_cm for row in rows])
    named = _RANGE.search(file.path.name)
    if named and float(named[1]) < float(named[2]):
        return ((float(named[1]), float(named[2])),)
    return tuple(run for run in runs(lines.wavenumber_per_cm) if not _fragment(run, lines, embedded, constants))


def _fragment(run: Interval, lines: Lines, embedded: Lines | None, constants: Constants) -> bool:
    ours = None if embedded is None else embedded.where(np.isin(embedded.isotopologue, np.unique(lines.isotopologue)))
    return sum_cm(lines, run) < _FRAGMENT_SHARE * (sum_cm(ours, run) + smooth_sum_cm(constants, run))


def _edition(file: LineFile, files: DataFiles) -> str:
    named = next((row.edition for row in files.declared.get(file.path.name, ()) if row.edition), None)
    found = re.search(r"hitran[_-]?(\d{4})", file.path.name, re.IGNORECASE)
    return named or (f"HITRAN{found[1]}" if found else "")


# ---------------------------------------------------------------- measured cross-sections


def _table_jobs(constants: Constants, embedded: Lines | None, tables: Sequence[CrossSectionTable]) -> Iterator[Job]:
    """Windows inside what the embedded list covers, from the table nearest 250 K of each stretch."""
    for group in _by_stretch(tables):
        table = min(group, key=lambda t: abs(t.temperature_k - _MIDDLE_K))
        nu, values = table.wavenumber_per_cm, averaged(table.cross_section_cm2, table.step_per_cm)
        shows = values > _ABOVE_NOISE * noise_cm2(table)
        low, high = max(t.from_per_cm for t in group), min(t.to_per_cm for t in group)
        for covered in constants.covers_per_cm:
            reach = max(low, covered[0]), min(high, covered[1])
            for window in band_windows(nu[shows], values[shows], reach):
                yield Job(
                    constants=constants,
                    embedded=embedded,
                    window_per_cm=window,
                    source=f"measured cross-sections, {_names(group)}",
                    tables=tuple(group),
                )


def _by_stretch(tables: Sequence[CrossSectionTable]) -> list[list[CrossSectionTable]]:
    """Tables of one gas grouped by the stretch they cover, to within a fifth of it."""
    groups: list[list[CrossSectionTable]] = []
    for table in sorted(tables, key=lambda t: (t.from_per_cm, t.to_per_cm, t.temperature_k)):
        for group in groups:
            common = min(group[0].to_per_cm, table.to_per_cm) - max(group[0].from_per_cm, table.from_per_cm)
            together = max(group[0].to_per_cm, table.to_per_cm) - min(group[0].from_per_cm, table.from_per_cm)
            if common >= _SAME_STRETCH * together:
                group.append(table)
                break
        else:
            groups.append([table])
    return groups


def _names(group: Sequence[CrossSectionTable]) -> str:
    names = sorted({re.sub(r":\d+$", "", table.where).rpartition("/")[2] for table in group})
    return names[0] if len(names) == 1 else f"{len(names)} files such as {names[0]}"
