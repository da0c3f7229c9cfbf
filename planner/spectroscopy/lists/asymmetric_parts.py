"""What an asymmetric part of a constants file says: rotors, bands and coupled sets, read and checked."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from planner.errors import LineDataError
from planner.spectroscopy.lists.asymmetric_rotor import Coupling, RotorConstants, block_change

__all__ = ["BandSet", "Moment", "parse_asymmetric_part"]

_MOMENT_TERMS = 6
_DISTORTION_COLUMNS = 13
_NEEDED = {
    "kind", "isotopologue", "cut_cm", "spin_weights", "width_j_scale", "air_width", "air_exponent", "self_width",
    "distortion", "states",
}  # fmt: skip
_OPTIONAL = {
    "source",
    "k_max",
    "merge_per_cm",
    "spin_rotation_per_cm",
    "antisymmetric_states",
    "spin_weights_antisymmetric",
    "bands",
    "coupled",
}
_ROW_LENGTHS = {
    "spin_weights": (4,),
    "spin_weights_antisymmetric": (4,),
    "air_width": (4, 6),
    "self_width": (4, 6),
    "air_exponent": (4,),
    "spin_rotation_per_cm": (3,),
}
_COUPLED_KEYS = {"states", "lower", "sum_cm", "j_max", "couplings", "moments", "keep", "source"}


@dataclass(frozen=True, kw_only=True)
class Moment:
    """Share of one upper state in a set's dipole moment: which state, which axis, six factors."""

    state: int
    axis: str
    factors: tuple[float, ...]


@dataclass(frozen=True, kw_only=True)
class BandSet:
    """One or several coupled upper states, reached from one lower state; the unit of line generation."""

    states: tuple[str, ...]
    lower: str
    sum_cm: float
    j_max: int
    moments: tuple[Moment, ...]
    couplings: tuple[Coupling, ...] = ()
    ka_most: tuple[float, ...]
    cuts_cm: tuple[float, ...]

    @property
    def name(self) -> str:
        return f"{'+'.join(self.states)} <- {self.lower}"


def parse_asymmetric_part(part: Mapping[str, Any], where: str) -> tuple[dict[str, RotorConstants], list[BandSet]]:
    """Rotors by name, and the bands and coupled sets, of a part laid out as `asymmetric_lines` describes.

    Raises
    ------
    LineDataError
        If a key is missing or unknown, a row has the wrong shape, or a state is not defined.
    """
    _check_keys(part, _NEEDED, _OPTIONAL, where)
    _check_rows(part, where)
    rotors = _rotors(part, where)
    sets = [*_single_bands(part, where), *_coupled_sets(part, where)]
    for band in sets:
        unknown = [name for name in (*band.states, band.lower) if name not in rotors]
        if unknown:
            raise LineDataError(f"{where}: {band.name}: state {unknown[0]!r} is not among the states")
    return rotors, sets


def _check_keys(table: Mapping[str, Any], needed: set[str], optional: set[str], where: str) -> None:
    missing, unknown = sorted(needed - set(table)), sorted(set(table) - needed - optional)
    if missing or unknown:
        allowed = ", ".join(sorted(needed | optional))
        raise LineDataError(f"{where}: missing keys {missing}, unknown keys {unknown}; allowed: {allowed}")


def _check_rows(part: Mapping[str, Any], where: str) -> None:
    """Rows of fixed length hold that many finite numbers."""
    if part.get("antisymmetric_states") and "spin_weights_antisymmetric" not in part:
        raise LineDataError(f"{where}: antisymmetric_states needs spin_weights_antisymmetric beside it")
    for name, lengths in _ROW_LENGTHS.items():
        row = part.get(name)
        if row is not None and (len(row) not in lengths or not np.all(np.isfinite(np.array(row, dtype=float)))):
            allowed = " or ".join(str(length) for length in lengths)
            raise LineDataError(f"{where}: {name}: expected {allowed} finite numbers, got {row!r}")


def _rotors(part: Mapping[str, Any], where: str) -> dict[str, RotorConstants]:
    rotors = {}
    for name, row in part["states"].items():
        try:
            origin, a, b, c, distortion, _ = row
            numbers = [float(x) for x in part["distortion"][distortion]]
            numbers = numbers + [0.0] * (_DISTORTION_COLUMNS - len(numbers))
            if len(numbers) != _DISTORTION_COLUMNS:
                raise ValueError(f"distortion {distortion!r} has more than {_DISTORTION_COLUMNS} numbers")
            rotors[name] = RotorConstants(
                origin_per_cm=float(origin),
                a_per_cm=float(a),
                b_per_cm=float(b),
                c_per_cm=float(c),
                softening=numbers[0],
                quartic_per_cm=tuple(numbers[1:6]),
                sextic_per_cm=tuple(numbers[6:]),
            )
        except (TypeError, ValueError, KeyError) as error:
            expected = "[origin, A, B, C, name of a distortion row, source]"
            raise LineDataError(f"{where}: state {name!r}: expected {expected}, got {row!r} ({error!r})") from error
    return rotors


def _six(numbers: Sequence[float]) -> tuple[float, ...]:
    if len(numbers) > _MOMENT_TERMS:
        raise ValueError(f"more than {_MOMENT_TERMS} factors")
    return (*(float(x) for x in numbers), *[0.0] * (_MOMENT_TERMS - len(numbers)))


def _single_bands(part: Mapping[str, Any], where: str) -> Iterator[BandSet]:
    for row in part.get("bands", ()):
        try:
            upper, lower, axis, total, j_max, factors, _ = row
            block_change(axis, 0)
            yield BandSet(
                states=(upper,),
                lower=lower,
                sum_cm=float(total),
                j_max=int(j_max),
                moments=(Moment(state=0, axis=axis, factors=_six([1.0, *factors])),),
                ka_most=(np.inf,),
                cuts_cm=(float(part["cut_cm"]),),
            )
        except (TypeError, ValueError, KeyError) as error:
            expected = "[upper, lower, axis a, b or c, sum, largest J, [m1, m2, ...], source]"
            raise LineDataError(f"{where}: band: expected {expected}, got {row!r} ({error!r})") from error


def _coupled_sets(part: Mapping[str, Any], where: str) -> Iterator[BandSet]:
    for table in part.get("coupled", ()):
        _check_keys(table, _COUPLED_KEYS - {"keep", "source"}, {"keep", "source"}, f"{where}: coupled set")
        try:
            place = {name: number for number, name in enumerate(table["states"])}
            keep = {place[name]: limits for name, limits in table.get("keep", {}).items()}
            limits = [keep.get(number, (np.inf, part["cut_cm"])) for number in place.values()]
            yield BandSet(
                states=tuple(place),
                lower=table["lower"],
                sum_cm=float(table["sum_cm"]),
                j_max=int(table["j_max"]),
                couplings=tuple(
                    Coupling(first=place[one], second=place[other], kind=kind, strength_per_cm=float(strength))
                    for one, other, kind, strength in table["couplings"]
                ),
                moments=tuple(
                    Moment(state=place[name], axis=axis, factors=_six(factors))
                    for name, (axis, *factors) in table["moments"].items()
                ),
                ka_most=tuple(float(most) for most, _ in limits),
                cuts_cm=tuple(float(cut) for _, cut in limits),
            )
        except (TypeError, ValueError, KeyError) as error:
            raise LineDataError(f"{where}: coupled set {table.get('states')!r}: {error!r}") from error
