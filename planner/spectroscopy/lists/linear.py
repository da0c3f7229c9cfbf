"""Lines of linear molecules from level constants and band intensities.

A line of a band is proportional to ::

    w L exp(-c2 E"/T) nu (1 - exp(-c2 nu/T)) F**2

with the nuclear spin weight w of the lower level, the Hoenl-London factor L and the Herman-Wallis factor F; the sum
over a band is set to the stated intensity at 296 K.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import (
    einstein_a_per_s,
    relative_intensity,
    whole_band_cut_cm,
    worth_keeping,
)
from planner.spectroscopy.lists.linear_levels import E, F, Levels, honl_london

__all__ = ["linear_lines"]

Floats = NDArray[np.float64]

_BAND_COLUMNS = 7
_WIDTH_COLUMNS = 4


def linear_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Lines of a linear molecule.

    Parameters
    ----------
    part : mapping
        ``weakest_cm``, the smallest intensity that is kept (at 296 or at 600 K); ``largest_j``; ``widths``, rows
        ``|m|, air half width, self half width (1/cm/atm), temperature exponent``, linear between rows and
        constant beyond, with m = -J, J, J+1 in P, Q, R; and ``species``, tables with ``isotopologue`` (HITRAN),
        ``nuclear_weights`` (of symmetric and antisymmetric levels), ``levels`` (rows as in
        :meth:`Levels.from_rows`) and ``bands``, rows ``upper, lower, lines, S (cm/molecule at 296 K with natural
        abundance), a1, a2, source``. A row speaks for all lines of its band (``lines = ""``) or, where
        resonances part them, for the named branches and parities of the lower level, such as ``"Q"`` or
        ``"ePR"``. The Herman-Wallis factor F is ``1 + a1 m + a2 m**2`` in P and R and ``1 + a2 J(J+1)`` in Q.
    hitran_number : int
        Molecule number that the lines carry.

    Raises
    ------
    LineDataError
        If a row breaks its layout, or a band names a level that is not there.
    """
    widths = np.array(part["widths"], dtype=np.float64)
    if widths.ndim != 2 or widths.shape[1] != _WIDTH_COLUMNS or np.any(np.diff(widths[:, 0]) <= 0):
        raise LineDataError("widths: expected rows |m|, air, self, exponent with ascending |m|")
    return Lines.join(
        [
            _species_lines(species, hitran_number, widths, int(part["largest_j"]), float(part["weakest_cm"]))
            for species in part["species"]
        ]
    )


@dataclass(frozen=True, kw_only=True, eq=False)
class _Transitions:
    """Every allowed transition of a set of bands; arrays have shape ``(line,)``. Parity is that of the lower level."""

    band: NDArray[np.int64]
    branch: NDArray[np.int64]
    j: NDArray[np.int64]
    parity: NDArray[np.int64]
    wavenumber_per_cm: Floats
    lower_energy_per_cm: Floats
    honl_london: Floats

    def where(self, mask: NDArray[np.bool_]) -> _Transitions:
        return _Transitions(**{field.name: getattr(self, field.name)[mask] for field in fields(self)})


def _species_lines(
    species: Mapping[str, Any], hitran_number: int, widths: Floats, largest_j: int, weakest_cm: float
) -> Lines:
    levels = Levels.from_rows(species["levels"])
    upper, lower, columns, allowed = _bands(species["bands"], levels)
    found = _transitions(levels, upper, lower, allowed, largest_j)
    symmetric = levels.symmetric(lower[found.band], found.j, found.parity)
    weight = np.where(symmetric, *species["nuclear_weights"])
    intensity = _intensities(found, weight, *columns)
    numbers = (hitran_number, int(species["isotopologue"]))
    keep = worth_keeping(*numbers, found.wavenumber_per_cm, intensity, found.lower_energy_per_cm, weakest_cm)
    pair, lines_of = np.unique(upper[found.band] * len(levels.names) + lower[found.band], return_inverse=True)
    for number in range(pair.size):
        mine = np.flatnonzero(lines_of == number)
        keep[mine] |= intensity[mine] >= whole_band_cut_cm(intensity[mine], keep[mine])
    found, weight, intensity = found.where(keep), weight[keep], intensity[keep]
    names = np.array([name.rjust(15).rstrip() for name in levels.names])
    order = np.maximum(found.j, found.j + found.branch)
    upper_weight = weight * (2 * (found.j + found.branch) + 1)
    return Lines.make(
        molecule=hitran_number,
        isotopologue=numbers[1],
        wavenumber_per_cm=found.wavenumber_per_cm,
        intensity_cm=intensity,
        einstein_a_per_s=einstein_a_per_s(
            *numbers, found.wavenumber_per_cm, intensity, found.lower_energy_per_cm, upper_weight
        ),
        lower_energy_per_cm=found.lower_energy_per_cm,
        air_width_per_cm_atm=np.interp(order, widths[:, 0], widths[:, 1]),
        self_width_per_cm_atm=np.interp(order, widths[:, 0], widths[:, 2]),
        temperature_exponent=np.interp(order, widths[:, 0], widths[:, 3]),
        upper_global=names[upper[found.band]],
        lower_global=names[lower[found.band]],
        lower_local=_local_labels(found, with_parity=bool(np.any(levels.angular_momentum))),
        upper_weight=upper_weight,
        lower_weight=weight * (2 * found.j + 1),
    )


def _bands(
    rows: Sequence[Sequence[Any]], levels: Levels
) -> tuple[NDArray[np.int64], NDArray[np.int64], Floats, NDArray[np.bool_]]:
    """Indices of upper and lower levels; S, a1, a2, shape ``(3, band)``; what is allowed, ``(band, PQR, ef)``."""
    index = {name: number for number, name in enumerate(levels.names)}
    for row in rows:
        if len(row) != _BAND_COLUMNS or not np.all(np.isfinite(row[3:6])) or row[3] <= 0 or set(row[2]) - set("PQRef"):
            raise LineDataError(
                f'band {row[:2]}: expected upper, lower, lines such as "" or "ePR", S > 0, a1, a2, source; '
                f"got {list(row)}"
            )
        if missing := [name for name in row[:2] if name not in index]:
            raise LineDataError(f"band {row[:2]}: no level {missing[0]!r}; add it to the levels")
    upper, lower = (np.array([index[row[end]] for row in rows], dtype=np.int64) for end in (0, 1))
    allowed = np.array([[[_speaks_for(row[2], b, p) for p in "ef"] for b in "PQR"] for row in rows])
    return upper, lower, np.array([row[3:6] for row in rows], dtype=np.float64).T, allowed


def _speaks_for(lines: str, branch: str, parity: str) -> bool:
    """Whether a row's ``lines`` name a branch and a parity; naming none of a kind means all of it."""
    return (branch in lines or not set(lines) & set("PQR")) and (parity in lines or not set(lines) & set("ef"))


def _transitions(
    levels: Levels,
    upper: NDArray[np.int64],
    lower: NDArray[np.int64],
    allowed: NDArray[np.bool_],
    largest_j: int,
) -> _Transitions:
    """All transitions up to the largest J of the lower level: P and R keep the parity, Q changes it."""
    j = np.broadcast_to(np.arange(largest_j + 1), (upper.size, largest_j + 1))
    up, low = upper[:, np.newaxis], lower[:, np.newaxis]
    momenta = levels.angular_momentum[low], levels.angular_momentum[up]
    pieces: list[tuple[NDArray[Any], ...]] = []
    for branch in (-1, 0, 1):
        for parity in (E, F):
            above = parity if branch else -parity
            mask = levels.exists(low, j, parity) & levels.exists(up, j + branch, above)
            energy = levels.energy_per_cm(low, j, parity)
            position = levels.energy_per_cm(up, j + branch, above) - energy
            factor = honl_london(branch, j, *momenta)
            mask &= (position > 0.0) & (factor > 0.0)
            mask &= allowed[:, branch + 1, 0 if parity == E else 1, np.newaxis]
            band = np.nonzero(mask)[0]
            constant = (np.full(band.size, branch), np.full(band.size, parity))
            pieces.append((band, constant[0], j[mask], constant[1], position[mask], energy[mask], factor[mask]))
    columns = (np.concatenate(column) for column in zip(*pieces, strict=True))
    return _Transitions(**dict(zip((field.name for field in fields(_Transitions)), columns, strict=True)))


def _intensities(
    found: _Transitions, weight: NDArray[Any], intensity_cm: Floats, slope: Floats, curvature: Floats
) -> Floats:
    """Intensities at 296 K, scaled band by band to the stated sums."""
    m = np.where(found.branch == 0, 0, np.where(found.branch < 0, -found.j, found.j + 1))
    square = np.where(found.branch == 0, found.j * (found.j + 1), m**2)
    herman_wallis = 1.0 + slope[found.band] * m + curvature[found.band] * square
    thermal = relative_intensity(found.wavenumber_per_cm, found.lower_energy_per_cm)
    strength = weight * found.honl_london * thermal * herman_wallis**2
    total = np.bincount(found.band, weights=strength, minlength=intensity_cm.size)
    if not np.all(total > 0.0):
        raise LineDataError(f"band row {int(np.argmin(total)) + 1}: it allows no line")
    return np.asarray(strength * (intensity_cm / total)[found.band], dtype=np.float64)


def _local_labels(found: _Transitions, *, with_parity: bool) -> NDArray[np.str_]:
    """HITRAN local labels of the lower level: branch, J, and e or f where the molecule bends."""
    branch = np.array(["P", "Q", "R"])[found.branch + 1]
    parity = np.where(found.parity == E, "e", "f") if with_parity else np.full(branch.size, "")
    texts = [f"     {b}{j:3d}{p}" for b, j, p in zip(branch, found.j, parity, strict=True)]
    return np.array(texts, dtype="<U15")
