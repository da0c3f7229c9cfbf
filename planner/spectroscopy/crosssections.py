"""Absorption cross-sections of spectral lines: one temperature, many pressures at once.

A line is summed point by point around its centre and where its wing is cut. Everywhere else, at least one cell away
from the centre, its wing is smooth: it is summed on a few nodes per cell of the grid and interpolated once all lines
are in. The cells are as wide as makes the work least, and the points of the grid may lie anywhere.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import RangeError
from planner.spectroscopy.molecules import isotopologue_mass_g, partition_sum

if TYPE_CHECKING:
    from planner.spectroscopy.lines import Lines

__all__ = ["cross_sections", "line_intensities", "reference_cross_sections"]

Floats = NDArray[np.float64]

REFERENCE_TEMPERATURE_K = 296.0  # of HITRAN line lists: Rothman et al. 2005, JQSRT 96, 139
BAR_PER_ATM = 1.01325
# CODATA 2018, exact in the SI of 2019
SECOND_RADIATION_CM_K = 1.438776877
GAS_CONSTANT_J_PER_MOL_K = 8.314462618
LIGHT_SPEED_M_PER_S = 299792458.0

_STRETCH = 4096  # points that one task owns; fixed, so that the result does not depend on the number of threads
_NODES = 8  # per cell: interpolates 1/x**2 one cell away from its pole to 2e-5


def cross_sections(
    lines: Lines,
    wavenumber_per_cm: ArrayLike,
    *,
    temperature_k: float,
    pressures_bar: ArrayLike,
    self_fraction: float = 0.0,
    width_factor: float = 1.0,
    wing_per_cm: float = 25.0,
    subtract_at_wing: bool = False,
) -> Floats:
    """Cross-sections in cm2 per molecule, shape ``(pressure, wavenumber)``.

    Parameters
    ----------
    lines : Lines
        Any number of lines of any molecules; intensities include the natural abundance.
    wavenumber_per_cm : array_like, shape (wavenumber,)
        Strictly ascending, evenly spaced or not.
    temperature_k : float
        Within the partition sums of every isotopologue.
    pressures_bar : array_like, shape (pressure,)
        0 or more, in any order; 0 gives the Doppler profile.
    self_fraction : float
        Mole fraction of the absorber itself, 0 to 1: the share of the self width.
    width_factor : float
        Factor on the air width where the background gas is not air.
    wing_per_cm : float
        Distance from the shifted centre at which a line ends.
    subtract_at_wing : bool
        Take off each line's own value at that distance, as continua of water vapour assume.

    Raises
    ------
    RangeError
        If an argument is out of its range, or the temperature out of that of the partition sums.
    LineDataError
        If the partition sum or mass of an isotopologue is not known.

    Notes
    -----
    Voigt profile with the Doppler 1/e half width ``nu sqrt(2RT/M)/c`` and the Lorentz half width
    ``P (296/T)**n (width_factor * gamma_air * (1 - x) + gamma_self * x)``, x the self fraction, centred at
    ``nu + delta P`` (Rothman et al. 2005, JQSRT 96, 139; P in atm). A list has one temperature
    exponent, that of air, which serves both widths, and one shift, which serves every mixture and temperature.
    `line_intensities` gives the strengths.

    A line's relative error is below 1e-4 wherever it exceeds 1e-11 of its Doppler peak: 9e-5 from the approximation
    of the Voigt function near a centre, 5e-5 farther out, 2e-5 from the interpolation. What is subtracted has an
    error of its own as large. `reference_cross_sections` does the same slowly.
    """
    grid, pressure_atm = _checked(
        wavenumber_per_cm, pressures_bar, temperature_k, self_fraction, width_factor, wing_per_cm
    )
    result = np.zeros((pressure_atm.size, grid.size))
    if not len(lines) or not pressure_atm.size:
        return result
    shapes = _line_shapes(lines, temperature_k, self_fraction, width_factor)
    starts = range(0, grid.size, _STRETCH)

    def work(start: int) -> None:
        stop = start + _STRETCH
        result[:, start:stop] = _stretch(grid[start:stop], shapes, pressure_atm, wing_per_cm, subtract_at_wing)

    # compiled code lets go of the interpreter, so threads share the cores; each owns its part of the result
    with ThreadPoolExecutor(_threads()) as pool:
        list(pool.map(work, starts))
    return result


def line_intensities(lines: Lines, temperature_k: float) -> Floats:
    """Line intensities in cm per molecule at a temperature, shape ``(line,)``.

    ``S(T) = S(296 K) Q(296)/Q(T) exp(-c2 E/T)/exp(-c2 E/296) (1 - exp(-c2 nu/T))/(1 - exp(-c2 nu/296))``:
    Rothman et al. 1998, JQSRT 60, 665, appendix A. Where the lower energy E is negative, the mark of the unknown,
    it is taken as 0: such a line follows the partition sum alone.

    Raises
    ------
    LineDataError
        If the partition sum of an isotopologue is not known.
    RangeError
        If the temperature is outside that of a partition sum.
    """
    per_k = SECOND_RADIATION_CM_K * (1.0 / temperature_k - 1.0 / REFERENCE_TEMPERATURE_K)
    boltzmann = np.exp(-per_k * np.maximum(lines.lower_energy_per_cm, 0.0))
    stimulated = np.expm1(-SECOND_RADIATION_CM_K / temperature_k * lines.wavenumber_per_cm)
    stimulated /= np.expm1(-SECOND_RADIATION_CM_K / REFERENCE_TEMPERATURE_K * lines.wavenumber_per_cm)
    ratio = _per_species(
        lines, lambda m, i: partition_sum(m, i, REFERENCE_TEMPERATURE_K) / partition_sum(m, i, temperature_k)
    )
    return lines.intensity_cm * ratio * boltzmann * stimulated


def reference_cross_sections(
    lines: Lines,
    wavenumber_per_cm: ArrayLike,
    *,
    temperature_k: float,
    pressures_bar: ArrayLike,
    self_fraction: float = 0.0,
    width_factor: float = 1.0,
    wing_per_cm: float = 25.0,
    subtract_at_wing: bool = False,
) -> Floats:
    """The same as `cross_sections`, line by line on every point with scipy's Voigt profile: slow and plain."""
    from scipy.special import voigt_profile

    grid, pressure_atm = _checked(
        wavenumber_per_cm, pressures_bar, temperature_k, self_fraction, width_factor, wing_per_cm
    )
    result = np.zeros((pressure_atm.size, grid.size))
    if not len(lines):
        return result
    shapes = _line_shapes(lines, temperature_k, self_fraction, width_factor)
    for row, pressure in zip(result, pressure_atm, strict=True):
        for centre, strength, doppler, lorentz, shift in shapes.T:
            shifted = centre + shift * pressure
            first, last = np.searchsorted(grid, [shifted - wing_per_cm, shifted + wing_per_cm])
            sigma, gamma = doppler / math.sqrt(2.0), lorentz * pressure
            row[first:last] += strength * voigt_profile(grid[first:last] - shifted, sigma, gamma)
            if subtract_at_wing:
                row[first:last] -= strength * voigt_profile(wing_per_cm, sigma, gamma)
    return result


# ---------------------------------------------------------------- arguments and line shapes


def _checked(
    wavenumber_per_cm: ArrayLike,
    pressures_bar: ArrayLike,
    temperature_k: float,
    self_fraction: float,
    width_factor: float,
    wing_per_cm: float,
) -> tuple[Floats, Floats]:
    """The grid and the pressures in atm, once every argument has been found in its range."""
    grid = np.asarray(wavenumber_per_cm, dtype=np.float64)
    pressures = np.asarray(pressures_bar, dtype=np.float64)
    if grid.ndim != 1 or not np.all(np.isfinite(grid)) or np.any(np.diff(grid) <= 0) or np.any(grid <= 0):
        raise RangeError("wavenumber_per_cm: expected positive wavenumbers in strictly ascending order")
    if pressures.ndim != 1 or not np.all(np.isfinite(pressures)) or np.any(pressures < 0):
        raise RangeError(f"pressures_bar: expected a list of pressures of 0 or more, got {pressures_bar!r}")
    for name, value, right, expected in (
        ("temperature_k", temperature_k, temperature_k > 0, "a temperature above 0 K"),
        ("self_fraction", self_fraction, 0 <= self_fraction <= 1, "a fraction from 0 to 1"),
        ("width_factor", width_factor, width_factor > 0, "a factor above 0"),
        ("wing_per_cm", wing_per_cm, wing_per_cm > 0, "a distance above 0"),
    ):
        if not (right and math.isfinite(value)):
            raise RangeError(f"{name}: expected {expected}, got {value!r}")
    return np.ascontiguousarray(grid), np.ascontiguousarray(pressures / BAR_PER_ATM)


def _line_shapes(lines: Lines, temperature_k: float, self_fraction: float, width_factor: float) -> Floats:
    """Per line the centre, strength, Doppler 1/e half width, Lorentz half width and shift per atm, shape (5, line)."""
    mass_kg = _per_species(lines, isotopologue_mass_g) * 1e-3
    thermal = np.sqrt(2.0 * GAS_CONSTANT_J_PER_MOL_K * temperature_k / mass_kg) / LIGHT_SPEED_M_PER_S
    width = (1.0 - self_fraction) * width_factor * lines.air_width_per_cm_atm
    width = width + self_fraction * lines.self_width_per_cm_atm
    return np.stack(
        [
            lines.wavenumber_per_cm,
            line_intensities(lines, temperature_k),
            lines.wavenumber_per_cm * thermal,
            width * (REFERENCE_TEMPERATURE_K / temperature_k) ** lines.temperature_exponent,
            lines.air_shift_per_cm_atm,
        ]
    )


def _per_species(lines: Lines, value_of: Callable[[int, int], float]) -> Floats:
    """A number of each line's isotopologue, shape (line,)."""
    code = lines.molecule * np.int64(100) + lines.isotopologue
    species = np.flatnonzero(np.bincount(code))
    value = np.zeros(species[-1] + 1)
    value[species] = [value_of(int(c) // 100, int(c) % 100) for c in species]
    return value[code]


# ---------------------------------------------------------------- one stretch of the grid


@dataclass(frozen=True, kw_only=True)
class _Cells:
    """Equal cells over a stretch of the grid; ``nodes`` is empty where interpolation does not pay."""

    first_edge: float
    width: float
    start: NDArray[np.int64]
    nodes: Floats


def _stretch(points: Floats, shapes: Floats, pressure_atm: Floats, wing: float, subtract: bool) -> Floats:
    """Sums of all lines on the points of one stretch, shape (pressure, point)."""
    from planner.spectroscopy._kernels import add_lines  # compiles on first import

    slack = float(np.max(np.abs(shapes[4]))) * float(pressure_atm.max())
    first, last = np.searchsorted(shapes[0], [points[0] - wing - slack, points[-1] + wing + slack])
    if first == last:
        return np.zeros((pressure_atm.size, points.size))
    near = np.ascontiguousarray(shapes[:, first:last])
    cells = _cells(points, wing, slack, float(near[2].max()))
    places = np.concatenate([points, cells.nodes])
    sums = np.zeros((pressure_atm.size, places.size))
    per_cell = _NODES if cells.nodes.size else 0
    cell_numbers = (points.size, per_cell, cells.first_edge, cells.width, cells.start)
    add_lines(places, sums, *cell_numbers, *near, pressure_atm, wing, subtract)
    on_points, on_nodes = sums[:, : points.size], sums[:, points.size :]
    if cells.nodes.size:
        on_points += _interpolated(points, cells, on_nodes)
    # the interpolation may leave -1e-5 of what a line was worth where its wing is cut
    return np.maximum(on_points, 0.0)


def _cells(points: Floats, wing: float, slack: float, doppler: float) -> _Cells:
    """The cells of a stretch, as wide as makes the work least.

    With m nodes per cell a line costs about four cells of points (its own, two neighbours, a half at either end of
    its wing) and the nodes in between: ``4 width / spacing + 2 m wing / width``, least at
    ``width = sqrt(m wing spacing / 2)``. A cell must be wider than the core of a line and well wider than its shift,
    ``slack``, and the ends of the wing must lie beyond the neighbours; where no width does all this and saves
    anything, every line is summed on the points alone and the cells only help to find them.
    """
    from planner.spectroscopy._kernels import ASYMPTOTE_FROM

    spacing = (points[-1] - points[0]) / max(points.size - 1, 1)
    width = max(math.sqrt(_NODES * wing * spacing / 2.0), ASYMPTOTE_FROM * doppler + 4.0 * slack)
    gains = 4.0 * width + 2.0 * _NODES * wing * spacing / width < 2.0 * wing and 4.0 * width < wing - slack
    if not gains:
        width = max(16.0 * spacing, 1e-6 * points[0])
    count = int((points[-1] - points[0]) / width) + 1
    edges = points[0] + width * np.arange(count + 1)
    start = np.searchsorted(points, edges)
    start[-1] = points.size
    nodes = (edges[:-1, np.newaxis] + 0.5 * width * (1.0 + _CHEBYSHEV)).ravel() if gains else np.zeros(0)
    return _Cells(first_edge=float(points[0]), width=width, start=start, nodes=nodes)


_CHEBYSHEV = np.cos((np.arange(_NODES) + 0.5) * np.pi / _NODES)  # roots of the Chebyshev polynomial
_TO_POWERS = np.linalg.inv(np.vander(_CHEBYSHEV, increasing=True))  # values there to coefficients of powers


def _interpolated(points: Floats, cells: _Cells, on_nodes: Floats) -> Floats:
    """Values on the points from those on the nodes, shape (pressure, point): one polynomial per cell."""
    cell = np.repeat(np.arange(cells.start.size - 1), np.diff(cells.start))
    place = 2.0 * (points - cells.first_edge - cell * cells.width) / cells.width - 1.0
    coefficient = _TO_POWERS @ on_nodes.reshape(on_nodes.shape[0], -1, _NODES, 1)
    value = np.zeros((on_nodes.shape[0], points.size))
    for power in reversed(range(_NODES)):
        value *= place
        value += coefficient[:, cell, power, 0]
    return value


def _threads() -> int:
    """As many threads as numba would use: the cores, or NUMBA_NUM_THREADS."""
    import numba

    return int(numba.config.NUMBA_NUM_THREADS)
