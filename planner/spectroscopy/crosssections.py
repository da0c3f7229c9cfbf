"""Absorption cross-sections of spectral lines: one temperature, many pressures at once.

A line is summed point by point around its centre alone. Farther out its wing is smooth, and the wings of all lines
that share a cell of the grid are one series in powers of the inverse distance from the middle of that cell, in which
a line costs a few multiplications however long its wing is. The series of all cells that reach a cell are translated
to one polynomial over it (the fast multipole method: Greengard and Rokhlin 1987, J. Comput. Phys. 73, 325). Where a
wing is cut, series are summed from line to line, point by point. The cells are as wide as makes the work least, and
the points of the grid may lie anywhere.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from functools import lru_cache
from itertools import pairwise
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

_STRETCH = 12288  # points that one task owns at most; fixed, so that the result does not depend on the threads
_POWERS = 6  # of the polynomial over a cell: good to 1e-5 for 1/x**2 two cells away from its pole
_WORTH = 1e-6  # of a series: powers that count for less are left out

# Least width of a cell, in greatest Lorentz and Doppler widths: so far out series converge, and Gaussians are over.
_LORENTZ_WIDTHS, _DOPPLER_WIDTHS = 2.2, 6.0
_LEAST_CELLS = 8  # in a wing

# Costs in nanoseconds of a line on a point, of a line in a series, of a cell seen from both sides
_PER_POINT, _PER_LINE, _PER_CELL = 1.0, 70.0, 8.0


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
    of the Voigt function inside six Doppler widths, 3e-5 outside, 3e-5 at most from series and polynomials.
    `reference_cross_sections` does the same slowly.
    """
    grid, pressure_atm = _checked(
        wavenumber_per_cm, pressures_bar, temperature_k, self_fraction, width_factor, wing_per_cm
    )
    result = np.zeros((pressure_atm.size, grid.size))
    if not len(lines) or not result.size:
        return result
    shapes = _line_shapes(lines, temperature_k, self_fraction, width_factor)
    count = -(-grid.size // _STRETCH)
    edges = [grid.size * number // count for number in range(count + 1)]

    def work(row: int, start: int, stop: int) -> None:
        _add(result[row, start:stop], grid[start:stop], shapes, pressure_atm[row], wing_per_cm, subtract_at_wing)

    # compiled code lets go of the interpreter, so threads share the cores; each owns its part of the result
    with ThreadPoolExecutor(_threads()) as pool:
        tasks = [pool.submit(work, row, *ends) for row in range(len(result)) for ends in pairwise(edges)]
        for task in tasks:
            task.result()
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
    return np.array(
        grid
    ), pressures / BAR_PER_ATM  # a copy of the grid, since compiled code takes none that is read-only


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


def _add(sums: Floats, points: Floats, shapes: Floats, pressure_atm: float, wing: float, subtract: bool) -> None:
    """Add all lines at one pressure to the sums on the points of one stretch."""
    from planner.spectroscopy import _kernels as kernels  # compiles on first import

    lines = _lines_near(points, shapes, pressure_atm, wing, subtract)
    if not lines.size:
        return
    cut = _cells_in_a_wing(points, lines, wing)
    span = points[-1] - points[0]
    width = wing / cut if cut else max(16.0 * span / points.size, 1e-6 * points[0])
    cell_start = np.searchsorted(points, points[0] + width * np.arange(int(span / width) + 2))
    cell_start[-1] = points.size
    stretch = (points, sums, cell_start, float(points[0]), width)
    moments = np.zeros((cell_start.size - 1 + 2 * cut if cut else 0, kernels.TERMS + 1))
    ends = np.zeros((2, points.size if cut else 0, kernels.CUT_TERMS + 1))
    kernels.add_lines(*stretch, lines, wing, moments, ends, np.zeros(kernels.TERMS + 1))
    if cut:
        fields = np.zeros((_POWERS, cell_start.size - 1))
        kernels.add_wings(*stretch, np.ascontiguousarray(moments.T), ends, *_translations(cut), fields)
    # the polynomials may leave -1e-5 of what a line was worth where its wing is cut
    np.maximum(sums, 0.0, out=sums)


def _lines_near(points: Floats, shapes: Floats, pressure_atm: float, wing: float, subtract: bool) -> Floats:
    """What `add_lines` wants to know of the lines that may reach a stretch, shape (5, line)."""
    slack = float(np.max(np.abs(shapes[4]))) * pressure_atm
    first, last = np.searchsorted(shapes[0], [points[0] - wing - slack, points[-1] + wing + slack])
    centre, strength, doppler, lorentz, shift = shapes[:, first:last]
    lorentz = lorentz * pressure_atm
    taken_off = np.zeros_like(centre)
    if subtract:
        from scipy.special import voigt_profile

        taken_off = strength * voigt_profile(wing, doppler / math.sqrt(2.0), lorentz)
    return np.stack([centre + shift * pressure_atm, strength, doppler, lorentz, taken_off])


def _cells_in_a_wing(points: Floats, lines: Floats, wing: float) -> int:
    """How many cells make the work least; 0 if it is least to sum each line on all points that it reaches.

    With n lines near each centre, of five cells, the work is ``n 5 width / spacing`` points and
    ``span wing / width**2`` pairs of cells.
    """
    count, span = lines.shape[1], points[-1] - points[0]
    if points.size == 1:
        return 0
    per_length = _PER_POINT * count * points.size / span
    pairs = _PER_CELL * span * wing
    least = max(_LORENTZ_WIDTHS * lines[3].max(), _DOPPLER_WIDTHS * lines[2].max())
    width = max((2.0 * pairs / (5.0 * per_length)) ** (1 / 3), least)
    gains = per_length * 5.0 * width + _PER_LINE * count + pairs / width**2 < per_length * 2.0 * wing
    return int(wing / width) if gains and wing > _LEAST_CELLS * width else 0


@lru_cache(maxsize=64)
def _translations(cut: int) -> tuple[NDArray[np.int64], Floats]:
    """For each distance of cells below ``cut``: the powers that count, and their polynomials over the cell.

    Shapes ``(cut,)`` and ``(cut, power of the inverse distance, power of the place from -1 to 1)``.
    """
    from planner.spectroscopy._kernels import NEAR, TERMS

    apart = np.maximum(np.arange(cut), NEAR + 1)[:, np.newaxis]
    convergence = math.hypot(0.5, 1.0 / _LORENTZ_WIDTHS) / (apart[:, 0] - 0.5)
    terms = np.minimum(np.ceil(math.log(_WORTH) / np.log(convergence)), TERMS).astype(np.int64)
    place = np.cos((np.arange(_POWERS) + 0.5) * np.pi / _POWERS)  # roots of the Chebyshev polynomial
    values = (1.0 / (apart + 0.5 * place))[:, np.newaxis] ** np.arange(2.0, 2.0 + TERMS)[:, np.newaxis]
    return terms, np.ascontiguousarray(values @ np.linalg.inv(np.vander(place, increasing=True)).T)


def _threads() -> int:
    """As many threads as numba would use: the cores, or NUMBA_NUM_THREADS."""
    import numba

    return int(numba.config.NUMBA_NUM_THREADS)
