"""Cross-sections of one gas between measured tables: interpolated in temperature and pressure, held outside.

Tables over the same stretch (to within a fifth of it) form a set. Where sets overlap, the one with more temperatures
stands, then the one with the finer spacing. Inside a set a wavenumber uses the tables that reach it: linear in
pressure between those of one temperature, then linear in temperature. Beyond the measured temperatures and pressures
the nearest holds. At the ends of a set the values stop as they are, without blending.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.coverage import Interval, subtract, union
from planner.spectroscopy.files.rows import signs_of
from planner.spectroscopy.files.spread import SPREAD_RULE
from planner.spectroscopy.files.xsc import BAR_PER_TORR, CrossSectionTable
from planner.spectroscopy.store import digest

__all__ = ["MeasuredBands"]

_SAME_STRETCH = 0.8  # overlap of two tables over the length of both together
_SAME_TEMPERATURE_K = 1.5
_SAME_PRESSURE = 0.005
_LOW_PRESSURE_TORR = 0.05


@dataclass(frozen=True, kw_only=True, eq=False)
class _Piece:
    """A stretch whose every wavenumber is reached by the same tables, grouped by temperature, each by pressure."""

    interval: Interval
    groups: tuple[tuple[CrossSectionTable, ...], ...]


class MeasuredBands:
    """The measured absorption of one gas.

    Parameters
    ----------
    tables : sequence of CrossSectionTable
        All of one gas.
    taken : sequence of intervals
        Where something better stands and these are not used.

    Attributes
    ----------
    intervals : tuple of (from, to)
        Where it holds, ascending and disjoint.
    depends_on_pressure : bool
    sentences : tuple of str
        One per set of tables: what is used where, and how.
    digest : str
        Hash of the tables.

    Raises
    ------
    LineDataError
        If a stretch was measured twice in one state; both places are named.
    """

    def __init__(self, tables: Sequence[CrossSectionTable], taken: Sequence[Interval] = ()) -> None:
        self._pieces: list[_Piece] = []
        self.sentences: tuple[str, ...] = ()
        occupied = list(taken)
        for members in sorted(_sets(tables), key=_rank):
            reach = union([(t.from_per_cm, t.to_per_cm) for t in members])
            free = subtract(reach, occupied)
            if free:
                self._pieces += _pieces(members, free)
                self.sentences += (_sentence(members, free),)
            occupied += reach
        self.intervals = union([piece.interval for piece in self._pieces])
        self.depends_on_pressure = any(len(group) > 1 for piece in self._pieces for group in piece.groups)
        self.digest = _digest(tables)

    def cross_section_cm2(
        self, wavenumber_per_cm: NDArray[np.float64], temperature_k: float, pressures_bar: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Absorption in cm2 per molecule, zero outside the intervals.

        Parameters
        ----------
        wavenumber_per_cm : (wavenumber,) ndarray
            Ascending.
        temperature_k : float
        pressures_bar : (pressure,) ndarray

        Returns
        -------
        (pressure, wavenumber) ndarray
            One row alone if the pressure does not matter.
        """
        pressures = np.asarray(pressures_bar) / BAR_PER_TORR if self.depends_on_pressure else np.zeros(1)
        result = np.zeros((pressures.size, wavenumber_per_cm.size))
        for piece in self._pieces:
            low, high = piece.interval
            part = slice(*np.searchsorted(wavenumber_per_cm, [low, np.nextafter(high, np.inf)]))
            if part.stop > part.start:
                result[:, part] = self._at(piece, wavenumber_per_cm[part], temperature_k, pressures)
        return result

    def _at(
        self, piece: _Piece, wavenumber: NDArray[np.float64], temperature_k: float, pressures_torr: NDArray[np.float64]
    ) -> NDArray[np.float64]:
        """Values of one piece at a temperature, shape ``(pressure, wavenumber)``."""
        middles = [group[0].temperature_k for group in piece.groups]
        above = min(int(np.searchsorted(middles, temperature_k)), len(middles) - 1)
        below = max(above - 1, 0)
        cold_k, cold = self._at_pressures(piece.groups[below], wavenumber, pressures_torr)
        if above == below:
            return cold
        warm_k, warm = self._at_pressures(piece.groups[above], wavenumber, pressures_torr)
        share = np.clip((temperature_k - cold_k) / (warm_k - cold_k), 0.0, 1.0)[:, np.newaxis]
        return cold + share * (warm - cold)

    def _at_pressures(
        self, group: tuple[CrossSectionTable, ...], wavenumber: NDArray[np.float64], pressures_torr: NDArray[np.float64]
    ) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Temperatures, shape ``(pressure,)``, and values of the tables of one temperature between their pressures."""
        spectra = np.stack([np.interp(wavenumber, t.wavenumber_per_cm, t.absorption_cm2) for t in group])
        temperatures = np.array([t.temperature_k for t in group])
        position = np.interp(pressures_torr, [t.pressure_torr for t in group], np.arange(len(group)))
        below = np.minimum(position.astype(int), max(len(group) - 2, 0))
        above = np.minimum(below + 1, len(group) - 1)
        share = position - below
        kelvin = temperatures[below] + share * (temperatures[above] - temperatures[below])
        return kelvin, spectra[below] + share[:, np.newaxis] * (spectra[above] - spectra[below])


def _digest(tables: Sequence[CrossSectionTable]) -> str:
    def header(t: CrossSectionTable) -> str:
        return f"{t.formula} {t.from_per_cm} {t.to_per_cm} {t.temperature_k} {t.pressure_torr}"

    return digest(*(part for t in tables for part in (header(t), t.cross_section_cm2.tobytes())))


def _sets(tables: Sequence[CrossSectionTable]) -> list[list[CrossSectionTable]]:
    """Tables grouped by the stretch they cover."""
    sets: list[list[CrossSectionTable]] = []
    for table in sorted(tables, key=lambda t: (t.from_per_cm, t.to_per_cm, t.where)):
        for members in sets:
            first = members[0]
            common = min(first.to_per_cm, table.to_per_cm) - max(first.from_per_cm, table.from_per_cm)
            together = max(first.to_per_cm, table.to_per_cm) - min(first.from_per_cm, table.from_per_cm)
            if common >= _SAME_STRETCH * together:
                members.append(table)
                break
        else:
            sets.append([table])
    return sets


def _rank(members: list[CrossSectionTable]) -> tuple[int, float, str]:
    return -len(_groups(members)), min(t.step_per_cm for t in members), members[0].where


def _pieces(members: list[CrossSectionTable], free: Sequence[Interval]) -> list[_Piece]:
    """The free stretches of a set, cut where one of its tables begins or ends."""
    pieces = []
    ends = {end for t in members for end in (t.from_per_cm, t.to_per_cm)}
    for low, high in free:
        cuts = [low, *sorted(end for end in ends if low < end < high), high]
        for a, b in pairwise(cuts):
            groups = _groups([t for t in members if t.from_per_cm <= a and t.to_per_cm >= b])
            for group in groups:
                _refuse_one_state_twice(group)
            pieces.append(_Piece(interval=(a, b), groups=tuple(groups)))
    return pieces


def _groups(tables: Sequence[CrossSectionTable]) -> list[tuple[CrossSectionTable, ...]]:
    """Tables of one temperature together, ascending in pressure; temperatures ascending."""
    groups: list[list[CrossSectionTable]] = []
    for table in sorted(tables, key=lambda t: t.temperature_k):
        if groups and table.temperature_k - groups[-1][0].temperature_k <= _SAME_TEMPERATURE_K:
            groups[-1].append(table)
        else:
            groups.append([table])
    return [tuple(sorted(group, key=lambda t: t.pressure_torr)) for group in groups]


def _refuse_one_state_twice(group: tuple[CrossSectionTable, ...]) -> None:
    for one, other in pairwise(group):
        limit = max(_LOW_PRESSURE_TORR, _SAME_PRESSURE * other.pressure_torr)
        if other.pressure_torr - one.pressure_torr <= limit:
            raise LineDataError(
                f"{one.where} and {other.where}: {one.formula} was measured twice at {one.temperature_k:g} K and "
                f"{one.pressure_torr:g} Torr over the same stretch; keep one of the two"
            )


def _sentence(members: Sequence[CrossSectionTable], free: Sequence[Interval]) -> str:
    stretches = ", ".join(f"{low:.6g}-{high:.6g}" for low, high in free)
    files = sorted({Path(t.where.rpartition(":")[0]).name for t in members})
    names = ", ".join(files) if len(files) <= 3 else f"{len(files)} files, {files[0]} to {files[-1]}"
    signs = signs_of([t.cross_section_cm2 for t in members])
    rule = (SPREAD_RULE,) if any(np.any(t.cross_section_cm2 < 0) for t in members) else ()
    return "; ".join(
        (
            f"{members[0].formula}: measured cross-sections over {stretches} per cm from {names} "
            f"({_digest(members)[:8]}), in place of all embedded data there, joined without blending",
            _states(members),
            *signs,
            *rule,
        )
    )


def _states(members: Sequence[CrossSectionTable]) -> str:
    kelvin = [group[0].temperature_k for group in _groups(members)]
    torr = sorted({t.pressure_torr for t in members})
    temperatures = (
        f"{len(kelvin)} temperatures from {kelvin[0]:g} to {kelvin[-1]:g} K, linear between them and held outside"
        if len(kelvin) > 1
        else f"measured at {kelvin[0]:g} K and held at all temperatures"
    )
    if len(torr) > 1:
        return f"{temperatures}; {len(torr)} pressures from {torr[0]:g} to {torr[-1]:g} Torr, nearest held outside"
    return f"{temperatures}; {torr[0]:g} Torr, held at all pressures"
