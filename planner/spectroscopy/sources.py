"""Which data stand for a gas: the embedded list, or real files laid over it where they are complete.

Each isotopologue and interval has one source: the newest line file that is complete there
(`planner.spectroscopy.coverage`), else measured cross-sections, which stand for all isotopologues at once, else the
embedded list. Collision pairs from files are laid over the embedded ones in the same spirit.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.broadening import ForeignWidths
from planner.spectroscopy.collisions import collision_coefficient, collision_pairs
from planner.spectroscopy.coverage import Interval, inside, subtract, union
from planner.spectroscopy.files.cia import Pair
from planner.spectroscopy.files.folder import DataFiles, read_folder
from planner.spectroscopy.files.measured import MeasuredBands
from planner.spectroscopy.files.pairs import MeasuredPair
from planner.spectroscopy.files.segments import Segment, laid_over, segments_of
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import (
    Constants,
    build_lines,
    embedded_formulas,
    read_constants,
    smooth_cross_section,
)
from planner.spectroscopy.molecules import Molecule, find_molecule
from planner.spectroscopy.store import Store, digest

__all__ = ["GasSource", "LineLibrary", "NoDataError"]


class NoDataError(LineDataError):
    """A gas for which there are no data at all, neither embedded nor in the folder."""


@dataclass(frozen=True, kw_only=True, eq=False)
class GasSource:
    """The data that stand for one gas.

    Attributes
    ----------
    molecule : Molecule
    lines : Lines or None
        All lines, one source per isotopologue and interval. Inside the measured intervals they do not count.
    widths : ForeignWidths or None
        Widths of these lines in other gases than air, in the same order.
    constants : Constants or None
        The embedded constants with their smooth parts; None for a gas known from files alone.
    measured : MeasuredBands or None
        Measured cross-sections; inside their intervals nothing else of the gas counts.
    covers_per_cm : tuple of (from, to)
        Where the data can be trusted to hold what matters, ascending and disjoint.
    imported_per_cm : tuple of (from, to)
        Where files stand for the gas, at least for its main isotopologue, ascending and disjoint.
    provenance : tuple of str
        One sentence per source used.
    partial : tuple of str
        One sentence per stretch of a file that was found and not used, with the reason.
    digest : str
        Hash of everything the data come from, for the store.
    """

    molecule: Molecule
    lines: Lines | None
    widths: ForeignWidths | None
    constants: Constants | None
    measured: MeasuredBands | None
    covers_per_cm: tuple[Interval, ...]
    imported_per_cm: tuple[Interval, ...]
    provenance: tuple[str, ...]
    partial: tuple[str, ...]
    digest: str

    def measured_at(self, wavenumber_per_cm: NDArray[np.float64]) -> NDArray[np.bool_]:
        """Where measured cross-sections stand for the gas and its lines do not count, shape ``(wavenumber,)``."""
        return inside(wavenumber_per_cm, self.measured.intervals if self.measured else ())

    def smooth_cross_section(
        self, wavenumber_per_cm: NDArray[np.float64], temperature_k: float, pressures_bar: NDArray[np.float64]
    ) -> NDArray[np.float64] | None:
        """What the gas absorbs apart from its lines: measured cross-sections where they stand, else smooth bands.

        Parameters
        ----------
        wavenumber_per_cm : (wavenumber,) ndarray
            Ascending.
        temperature_k : float
        pressures_bar : (pressure,) ndarray

        Returns
        -------
        (pressure, wavenumber) ndarray or None
            cm2 per molecule; one row alone where the pressure does not matter, None where there is nothing.
        """
        smooth = None
        if self.constants is not None:
            smooth = smooth_cross_section(self.constants, wavenumber_per_cm, temperature_k)
        if self.measured is None:
            return None if smooth is None else smooth[np.newaxis]
        total = self.measured.cross_section_cm2(wavenumber_per_cm, temperature_k, pressures_bar)
        if smooth is not None:
            total += np.where(self.measured_at(wavenumber_per_cm), 0.0, smooth)
        return total


class LineLibrary:
    """Finds the data of each gas and pair.

    Parameters
    ----------
    store : Store
        Keeps built lists and parsed files.
    folder : Path, optional
        A folder of HITRAN-format ``.par``, ``.xsc`` and ``.cia`` files, plain or gzip, that replace embedded data
        where they are complete.
    files : DataFiles, optional
        Files read already, in place of a folder.

    Raises
    ------
    LineDataError
        If the folder does not exist, holds no such file, a file breaks its format, or two files of a pair conflict.
    """

    def __init__(self, store: Store, folder: Path | None = None, *, files: DataFiles | None = None) -> None:
        self._store = store
        self._files = files or (DataFiles() if folder is None else read_folder(folder, store))
        pairs = {block.pair for block in self._files.blocks if block.usable}
        self._pairs = {pair: MeasuredPair([b for b in self._files.blocks if b.pair == pair]) for pair in sorted(pairs)}
        self.gas = lru_cache(maxsize=None)(self._gas)

    def collision_pairs(self) -> list[Pair]:
        """All pairs with coefficients, embedded or from files, each in alphabetical order, sorted."""
        return sorted({*collision_pairs(), *self._pairs})

    def collision_coefficient(
        self, pair: Pair, wavenumber_per_cm: NDArray[np.float64], temperature_k: float
    ) -> NDArray[np.float64]:
        """Coefficient of a pair in cm5 per molecule squared, shape ``(wavenumber,)``; wavenumbers ascending.

        Raises
        ------
        LineDataError
            If the pair is not known.
        """
        first, second = sorted(pair)
        files = self._pairs.get((first, second))
        if files is not None and (first, second) not in collision_pairs():
            return files.coefficient_cm5(wavenumber_per_cm, temperature_k, np.zeros(wavenumber_per_cm.size))
        embedded = collision_coefficient(pair, wavenumber_per_cm, temperature_k)
        return embedded if files is None else files.coefficient_cm5(wavenumber_per_cm, temperature_k, embedded)

    def pair_provenance(self, formulas: Iterable[str]) -> tuple[str, ...]:
        """One sentence per collision file that is used among these gases; a hash of its content is part of it."""
        present = set(formulas)
        return tuple(s for pair, files in self._pairs.items() if present.issuperset(pair) for s in files.sentences)

    def _gas(self, name: str) -> GasSource:
        """The data of one gas, by formula or common name.

        Raises
        ------
        NoDataError
            If there are none.
        LineDataError
            If the name is not known or files conflict.
        """
        molecule = find_molecule(name)
        constants = read_constants(molecule.formula) if molecule.formula in embedded_formulas() else None
        embedded = build_lines(constants, self._store) if constants else None
        segments, partial = segments_of(molecule, self._files, embedded)
        measured, unused = self._measured(molecule, segments)
        partial += unused
        if constants is None and not segments and measured is None:
            reasons = f" ({'; '.join(partial)})" if partial else ""
            raise NoDataError(
                f"{name}: no embedded data and none in the line folder{reasons}; embedded gases are "
                + ", ".join(embedded_formulas())
            )
        lines, widths = laid_over(embedded, segments)
        return GasSource(
            molecule=molecule,
            lines=lines,
            widths=widths,
            constants=constants,
            measured=measured,
            covers_per_cm=union(
                [
                    *(constants.covers_per_cm if constants else ()),
                    *(interval for segment in segments for interval in segment.intervals),
                    *(measured.intervals if measured else ()),
                ]
            ),
            imported_per_cm=union(
                [
                    *(interval for segment in segments if segment.isotopologue == 1 for interval in segment.intervals),
                    *(measured.intervals if measured else ()),
                ]
            ),
            provenance=_provenance(molecule, constants, segments, measured),
            partial=partial,
            digest=digest(
                constants.digest if constants else "",
                *(f"{s.file_digest} {s.isotopologue} {s.intervals}" for s in segments),
                measured.digest if measured else "",
            ),
        )

    def _measured(
        self, molecule: Molecule, segments: Sequence[Segment]
    ) -> tuple[MeasuredBands | None, tuple[str, ...]]:
        """Measured cross-sections where no line file stands, and sentences on what is left out."""
        tables = [table for table in self._files.tables if table.formula == molecule.formula]
        if not tables:
            return None, ()
        bands = MeasuredBands(tables, taken=[interval for s in segments for interval in s.intervals])
        reach = union([(table.from_per_cm, table.to_per_cm) for table in tables])
        left_out = subtract(reach, bands.intervals)
        unused = (
            f"{molecule.formula}: measured cross-sections over {_ranges(left_out)} per cm not used: line records stand "
            "there, which follow temperature and pressure",
        )
        return bands if bands.intervals else None, unused if left_out else ()


def _provenance(
    molecule: Molecule, constants: Constants | None, segments: Sequence[Segment], measured: MeasuredBands | None
) -> tuple[str, ...]:
    from_files = (*(segment.sentence for segment in segments), *(measured.sentences if measured else ()))
    if constants is None:
        return from_files
    return (
        f"{molecule.formula}: embedded, constants file {constants.digest[:8]}, "
        f"covers {_ranges(constants.covers_per_cm)} per cm" + (" where no file is named" if from_files else ""),
        *from_files,
    )


def _ranges(intervals: Sequence[Interval]) -> str:
    return ", ".join(f"{low:.6g}-{high:.6g}" for low, high in intervals)
