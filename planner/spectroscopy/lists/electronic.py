"""Electronic absorption: smooth tables of visible and ultraviolet bands, and the forbidden lines of oxygen.

The oxygen lines go from the ground triplet X3Sigma-g to the singlets b1Sigma+g (A, B, gamma bands) and a1Deltag
(1.27 and 1.06 um) by magnetic dipole. Each lower level (N, J) borrows its strength from its Omega = 1 share, and the
lines follow the Hoenl-London factors of case-a states (Watson 1968, Can. J. Phys. 46, 1637; Herzberg 1950).
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import C2_CM_K, REFERENCE_TEMPERATURE_K, einstein_a_per_s

__all__ = ["oxygen_lines", "smooth_table_cross_section"]

# Extrapolating ln(sigma) further than this from the laboratory would be a guess; it is held instead.
_COLDEST_K, _WARMEST_K = 200.0, 330.0


def smooth_table_cross_section(
    part: Mapping[str, Any], wavenumber_per_cm: ArrayLike, temperature_k: float
) -> NDArray[np.float64]:
    """Absorption cross-section of one part of kind ``smooth-table``.

    ln(sigma) is linear in wavelength between knots. With a second column it is linear in temperature too, and held
    at its values for 200 and 330 K outside.

    Parameters
    ----------
    part : mapping
        ``wavelength_um``: ascending vacuum wavelengths of the knots; ``cross_section_cm2``; optionally
        ``cold_cross_section_cm2`` with ``temperature_k``, the temperatures of the two columns in this order.
    wavenumber_per_cm : (wavenumber,) array_like
        In any order.
    temperature_k : float
        Gas temperature.

    Returns
    -------
    (wavenumber,) ndarray
        cm2 per molecule; 0 outside the knots. The first knot is inside and the last outside, so that tables which
        meet do not count twice.

    Raises
    ------
    LineDataError
        If columns are missing, of unequal length, not positive, or wavelengths do not ascend.
    """
    wavelength, log_sigma = _table(part, temperature_k)
    wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))
    asked = 1e4 / wavenumber
    total = np.zeros_like(wavenumber)
    inside = (asked >= wavelength[0]) & (asked < wavelength[-1])
    total[inside] = np.exp(np.interp(asked[inside], wavelength, log_sigma))
    return total


def _table(part: Mapping[str, Any], temperature_k: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Knot wavelengths and ln(sigma) at one temperature."""
    wavelength = _column(part, "wavelength_um")
    log_sigma = np.log(_column(part, "cross_section_cm2"))
    if wavelength.size != log_sigma.size or wavelength.size < 2 or np.any(np.diff(wavelength) <= 0.0):
        raise LineDataError(
            f"{_title(part)}: expected ascending wavelength_um and as many cross_section_cm2, "
            f"got {wavelength.size} and {log_sigma.size}"
        )
    if "cold_cross_section_cm2" in part:
        log_cold = np.log(_column(part, "cold_cross_section_cm2"))
        own, cold = _column(part, "temperature_k", size=2)
        if log_cold.size != log_sigma.size or own == cold:
            raise LineDataError(
                f"{_title(part)}: expected {log_sigma.size} cold_cross_section_cm2 at another temperature, "
                f"got {log_cold.size} at {cold} K beside {own} K"
            )
        held = min(max(temperature_k, _COLDEST_K), _WARMEST_K)
        log_sigma = log_sigma + (log_cold - log_sigma) * (held - own) / (cold - own)
    return wavelength, log_sigma


def _column(part: Mapping[str, Any], key: str, size: int | None = None) -> NDArray[np.float64]:
    values = np.atleast_1d(np.asarray(part.get(key, []), dtype=np.float64))
    if not values.size or values.size != (size or values.size) or not np.all(values > 0.0):
        wanted = "positive numbers" if size is None else f"{size} positive numbers"
        raise LineDataError(f"{_title(part)}: {key}: expected {wanted}, got {part.get(key)!r:.60}")
    return values


def _title(part: Mapping[str, Any]) -> str:
    return f"part {part.get('name', part.get('kind', '?'))!r}"


@dataclass(frozen=True, kw_only=True)
class _TripletLevel:
    """A level of the ground state: N, J, energy above N = 1, J = 0 and share of |Omega| = 1."""

    n: int
    j: int
    energy_per_cm: float
    perpendicular_share: float


def oxygen_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Forbidden lines of 16O2 from one part of kind ``oxygen``.

    Parameters
    ----------
    part : mapping
        ``isotopologue``, ``largest_n``; ``ground``: constants of the triplet in 1/cm; ``band``: tables with ``upper``
        ("a" or "b"), ``vibration``, ``origin_per_cm``, ``rotation_per_cm``, ``distortion_per_cm``, ``band_sum_cm``
        and ``widths``, the key of the rows in ``widths``: N, air width, self width, exponent, shift.
    hitran_number : int
        HITRAN molecule number.

    Returns
    -------
    Lines
        The lines of each band; their intensities add up to its ``band_sum_cm``.

    Raises
    ------
    LineDataError
        If a key is missing or the upper state is not "a" or "b".
    """
    try:
        levels = _ground_levels(part["ground"], int(part["largest_n"]))
        bands = [_band_lines(part, band, levels, hitran_number) for band in part["band"]]
    except KeyError as error:
        raise LineDataError(f"{_title(part)}: the key {error} is missing") from error
    return Lines.join(bands)


def _ground_levels(ground: Mapping[str, float], largest_n: int) -> list[_TripletLevel]:
    """Levels of X3Sigma-g with odd N (the nuclei have no spin)."""
    levels = [level for j in range(largest_n + 2) for level in _levels_of_j(ground, j) if level.n <= largest_n]
    zero = next(level.energy_per_cm for level in levels if (level.n, level.j) == (1, 0))
    return [replace(level, energy_per_cm=level.energy_per_cm - zero) for level in levels]


def _levels_of_j(ground: Mapping[str, float], j: int) -> Iterator[_TripletLevel]:
    """The levels of one J on an absolute scale.

    N = J stands alone; N = J - 1 and N = J + 1 mix through the spin-spin term (Tinkham & Strandberg 1955,
    Phys. Rev. 97, 937). The state of Omega = 0 is the lowest eigenvector of the spin-spin term alone.
    """
    if j % 2:
        yield _TripletLevel(n=j, j=j, energy_per_cm=_diagonal(ground, j, j), perpendicular_share=1.0)
        return
    if j == 0:
        yield _TripletLevel(n=1, j=0, energy_per_cm=_diagonal(ground, 1, 0), perpendicular_share=0.0)
        return
    mixing = 2.0 * math.sqrt(j * (j + 1.0)) / (2.0 * j + 1.0)
    mean_x = 0.5 * (j * (j - 1.0) + (j + 1.0) * (j + 2.0))
    coupling = ground["spin_spin_per_cm"] + ground["spin_spin_distortion_per_cm"] * mean_x
    below, above = _diagonal(ground, j - 1, j), _diagonal(ground, j + 1, j)
    energies, vectors = np.linalg.eigh([[below, mixing * coupling], [mixing * coupling, above]])
    spin_only = np.diag([2.0 / 3.0 * _spin_spin_factor(n, j) for n in (j - 1, j + 1)])
    spin_only[0, 1] = spin_only[1, 0] = mixing
    parallel = np.linalg.eigh(spin_only)[1][:, 0]
    for k, n in enumerate((j - 1, j + 1)):
        share = 1.0 - float(vectors[:, k] @ parallel) ** 2
        yield _TripletLevel(n=n, j=j, energy_per_cm=float(energies[k]), perpendicular_share=share)


def _diagonal(ground: Mapping[str, float], n: int, j: int) -> float:
    """Energy of a pure (N, J) level: rotation, spin-rotation and the diagonal of spin-spin."""
    x = n * (n + 1.0)
    rotation = x * (ground["rotation_per_cm"] - x * (ground["distortion_per_cm"] - x * ground["sextic_per_cm"]))
    spin_rotation = ground["spin_rotation_per_cm"] + ground["spin_rotation_distortion_per_cm"] * x
    spin_spin = ground["spin_spin_per_cm"] + ground["spin_spin_distortion_per_cm"] * x
    return rotation + spin_rotation * 0.5 * (j * (j + 1.0) - x - 2.0) + spin_spin * 2.0 / 3.0 * _spin_spin_factor(n, j)


def _spin_spin_factor(n: int, j: int) -> float:
    """Diagonal factor of the spin-spin term, for N = J, J - 1 and J + 1."""
    return {j: 1.0, j - 1: -(j - 1.0) / (2.0 * j + 1.0), j + 1: -(j + 2.0) / (2.0 * j + 1.0)}[n]


def _line_strength(upper: str, j: int, step: int) -> float:
    """Hoenl-London factor by lower J for P, Q, R (step -1, 0, 1); zero where there is no upper level.

    b1Sigma+g has even J only, a1Deltag any J from 2.
    """
    if upper == "b":
        return 0.0 if (j + step) % 2 else {-1: j + 1.0, 0: 2.0 * j + 1.0, 1: float(j)}[step]
    if upper != "a":
        raise LineDataError(f"upper state of an oxygen band: expected 'a' or 'b', got {upper!r}")
    if j + step < 2:
        return 0.0
    if step == -1:
        return (j - 1.0) * (j - 2.0) / j
    if step == 0:
        return (j - 1.0) * (j + 2.0) * (2.0 * j + 1.0) / (j * (j + 1.0))
    return (j + 2.0) * (j + 3.0) / (j + 1.0)


def _band_lines(
    part: Mapping[str, Any], band: Mapping[str, Any], levels: list[_TripletLevel], hitran_number: int
) -> Lines:
    """Lines of one band, scaled to its sum."""
    n, j, j_upper, lower, strength = _transitions(band["upper"], levels)
    x = j_upper * (j_upper + 1.0)
    upper = band["origin_per_cm"] + x * (band["rotation_per_cm"] - x * band["distortion_per_cm"])
    position = upper - _diagonal(part["ground"], 1, 0) - lower
    scale = C2_CM_K / REFERENCE_TEMPERATURE_K
    weight = strength * position * np.exp(-scale * lower) * -np.expm1(-scale * position)
    intensity = band["band_sum_cm"] * weight / weight.sum()
    isotopologue, upper_weight = int(part["isotopologue"]), 2.0 * j_upper + 1.0
    return Lines.make(
        molecule=hitran_number,
        isotopologue=isotopologue,
        wavenumber_per_cm=position,
        intensity_cm=intensity,
        einstein_a_per_s=einstein_a_per_s(hitran_number, isotopologue, position, intensity, lower, upper_weight),
        lower_energy_per_cm=lower,
        **_broadening(part["widths"][band["widths"]], n),
        upper_global=f"       {band['upper']}      {band['vibration']}",
        lower_global="       X      0",
        lower_local=[
            f" {_branch(low_n, up)}{low_n:3d}{_branch(low_j, up)}{low_j:3d}     d"
            for low_n, low_j, up in zip(n, j, j_upper, strict=True)
        ],
        upper_weight=upper_weight,
        lower_weight=2.0 * j + 1.0,
    )


def _transitions(upper: str, levels: list[_TripletLevel]) -> tuple[NDArray[Any], ...]:
    """N", J", J', lower energy and strength of every allowed line, each of shape ``(line,)``."""
    rows = [
        (level.n, level.j, level.j + step, level.energy_per_cm, level.perpendicular_share * strength)
        for level in levels
        for step in (-1, 0, 1)
        if (strength := _line_strength(upper, level.j, step)) > 0.0 and level.perpendicular_share > 0.0
    ]
    return tuple(np.array(column) for column in zip(*rows, strict=True))


def _broadening(rows: list[list[float]], n: NDArray[np.int64]) -> dict[str, NDArray[np.float64]]:
    """Widths, exponent and shift, linear in N between the rows."""
    table = np.array(rows, dtype=np.float64).T
    names = ("air_width_per_cm_atm", "self_width_per_cm_atm", "temperature_exponent", "air_shift_per_cm_atm")
    return {name: np.interp(n, table[0], column) for name, column in zip(names, table[1:], strict=True)}


def _branch(lower: int, upper: int) -> str:
    """Letter of a change in quantum number; N of a singlet level is its J."""
    return "OPQRS"[upper - lower + 2]
