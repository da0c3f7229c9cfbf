"""Lines that stand for many: drawn at random so that bins keep their band sum and their curve of growth.

Where a spectrum is too crowded for a handful of constants, three things per stretch of wavenumber decide what a
broad bin shows: the summed intensity, how many lines share it, and from which lower states they come. Intensities
follow the law ``p(x) ~ exp(-x)/x`` with ``x`` the intensity in units of its scale, the distribution behind the band
model of W. Malkmus (1967, J. Opt. Soc. Am. 57, 323). For lines of that law the sum S of the intensities and the
sum q of their square roots give the number that fixes the curve of growth, ``q**2/(pi S)``, called ``density``
here: the number of lines of intensity S/density that would grow alike.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.special import digamma, exp1, gammaincinv

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines

__all__ = ["lower_energies", "relative_strengths", "statistical_lines", "with_satellites"]

_COLUMNS = 9
_EULER = -float(digamma(1.0))
_LOG_X_STEP = float(digamma(0.5) - digamma(1.0))  # from the S-weighted to the sqrt(S)-weighted mean of ln x
_LOG_X_VARIANCE = np.pi**2 / 6.0  # of ln x weighted with S, which makes x exponential
_GOLDEN = 0.5 * (np.sqrt(5.0) - 1.0)
_FIRST_PLACE = 0.25
_SHARPEST = 1e-4


def statistical_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Random lines, the same for the same part, whose bins have the stated sums.

    Parameters
    ----------
    part : mapping
        ``isotopologue``; ``seed``, an integer; ``weakest``, the smallest x that is drawn (1e-3 loses 0.1 % of
        the number that fixes the curve of growth, 1e-2 one per cent, for 6.3 and 4.0 lines per unit of
        ``density``); ``self_width_ratio``, self over air width; and ``bins``, rows of

        ``from, to (1/cm), S (cm/molecule at 296 K), density (lines in the bin), lower energy weighted with
        the intensity and with its square root, standard deviation of the lower energy weighted with the
        intensity (1/cm), air width (1/cm/atm), temperature exponent``.
    hitran_number : int
        Molecule number that the lines carry.

    Returns
    -------
    Lines
        In each bin ``density * exp1(weakest)`` lines (at least one): strengths at the midpoints of equally
        probable steps of the law, one line at random in each of as many equal cells of wavenumber; lower
        energies as in `lower_energies`.

    Raises
    ------
    LineDataError
        If a row is not nine finite numbers with ``from < to``, S >= 0, density > 0 and energies >= 0.
    """
    bins = _checked_bins(part["bins"], hitran_number)
    weakest = float(part["weakest"])
    rng = np.random.default_rng(int(part["seed"]))
    columns: list[NDArray[np.float64]] = []
    for start, stop, total, density, energy, energy_sqrt, spread, width, exponent in bins:
        count = max(1, round(density * float(exp1(weakest))))
        x = relative_strengths(count, weakest)
        lower = lower_energies(x, energy, energy_sqrt, spread)
        order = rng.permutation(count)
        position = start + (stop - start) * (np.arange(count) + rng.random(count)) / count
        same = np.ones(count)
        columns.append(np.stack([position, total * x[order] / x.sum(), lower[order], width * same, exponent * same]))
    position, intensity, lower, width, exponent = np.concatenate(columns, axis=1)
    return Lines.make(
        molecule=hitran_number,
        isotopologue=int(part["isotopologue"]),
        wavenumber_per_cm=position,
        intensity_cm=intensity,
        lower_energy_per_cm=lower,
        air_width_per_cm_atm=width,
        self_width_per_cm_atm=float(part["self_width_ratio"]) * width,
        temperature_exponent=exponent,
    )


def relative_strengths(count: int, weakest: float) -> NDArray[np.float64]:
    """Strengths x at the midpoints of ``count`` equally probable steps of ``exp(-x)/x``, x >= weakest, ascending.

    The share of lines beyond x is ``exp1(x)/exp1(weakest)``, inverted on a logarithmic table. Shape ``(count,)``.
    """
    table = np.geomspace(weakest, 60.0, 4001)
    wanted = exp1(weakest) * (1.0 - (np.arange(count) + 0.5) / count)
    # interpolated in ln(exp1), where the table is nearly straight at both ends
    return np.exp(np.interp(-np.log(wanted), -np.log(exp1(table)), np.log(table)))


def lower_energies(x: NDArray[np.float64], mean: float, mean_sqrt: float, spread: float) -> NDArray[np.float64]:
    """Lower energies of lines of strengths x, shape ``(line,)``, in the unit of the three moments.

    Their mean over lines of one strength is linear in ln x such that both weighted means come out, and not negative;
    about it they follow a gamma law, as the energies of a classical gas do, wide enough to make up the spread. Without
    the spread the sum of a bin would rise too little both towards the cold and towards the warm.

    Parameters
    ----------
    x : (line,) array
        Ascending; the intensities are proportional to it.
    mean, mean_sqrt, spread : float
        Mean weighted with the intensity and with its square root, standard deviation weighted with the intensity.
    """
    slope = (mean_sqrt - mean) / _LOG_X_STEP
    typical = np.maximum(0.0, mean + slope * (np.log(x) + _EULER))
    explained = slope**2 * _LOG_X_VARIANCE
    relative_variance = (spread**2 - explained) / (mean**2 + explained) if mean > 0 else 0.0
    if relative_variance > _SHARPEST:
        shape = 1.0 / relative_variance
        # Steps of the golden ratio, from the strongest line on, spread any run of neighbours evenly over the law, so
        # that few lines will do. Where they start decides how well: of ten starts this errs least from 7 lines up.
        place = (_FIRST_PLACE + _GOLDEN * np.arange(x.size)[::-1]) % 1.0
        typical = typical * gammaincinv(shape, place) / shape
    total = float(x @ typical)
    return typical * (mean * float(x.sum()) / total) if total > 0 else typical


def with_satellites(
    lines: Lines,
    *,
    fraction: float,
    count: int,
    spread_per_cm: float,
    seed: int,
    decades: float = 3.0,
    raised_per_cm: float = 300.0,
) -> Lines:
    """The lines, each of which hands a share of its intensity to companions nearby.

    A stand-in for what the constants do not give: forbidden, resonance-borrowed and unlisted hot lines, or a
    splitting by internal rotation. Local quantum labels are dropped.

    Parameters
    ----------
    lines : Lines
        What is to be thickened, of one molecule.
    fraction : float
        Share of each line's intensity that its companions carry together; the sum stays.
    count : int
        Companions per line.
    spread_per_cm : float
        Standard deviation of their (normal) displacement.
    seed : int
        The same seed gives the same lines.
    decades : float
        Their intensities are even in the logarithm over so many decades.
    raised_per_cm : float
        Their lower energies are raised at random by an exponential law with this mean: weak companions tend to come
        from higher states.
    """
    if fraction <= 0 or count < 1 or not len(lines):
        return lines
    rng = np.random.default_rng(seed)
    shape = (count, len(lines))
    share = 10.0 ** (-decades * rng.random(shape))
    share *= fraction / share.sum(axis=0)
    position = lines.wavenumber_per_cm + rng.normal(0.0, spread_per_cm, shape)
    raised = lines.lower_energy_per_cm + raised_per_cm * rng.exponential(1.0, shape)
    # a displacement may not carry a line past zero; mirrored there it keeps its intensity
    position = np.abs(position)

    def repeated(value: NDArray[Any]) -> NDArray[Any]:
        return np.concatenate([value, np.tile(value, count)])

    return Lines.make(
        molecule=int(lines.molecule[0]),
        isotopologue=repeated(lines.isotopologue),
        wavenumber_per_cm=np.concatenate([lines.wavenumber_per_cm, position.ravel()]),
        intensity_cm=np.concatenate([(1.0 - fraction) * lines.intensity_cm, (share * lines.intensity_cm).ravel()]),
        lower_energy_per_cm=np.concatenate([lines.lower_energy_per_cm, raised.ravel()]),
        air_width_per_cm_atm=repeated(lines.air_width_per_cm_atm),
        self_width_per_cm_atm=repeated(lines.self_width_per_cm_atm),
        temperature_exponent=repeated(lines.temperature_exponent),
        upper_global=repeated(lines.upper_global),
        lower_global=repeated(lines.lower_global),
    )


def _checked_bins(rows: Any, hitran_number: int) -> NDArray[np.float64]:
    """The rows as a float array, or a message that names the first bad one."""
    for index, row in enumerate(rows):
        bad = len(row) != _COLUMNS or not np.all(np.isfinite(row))
        if bad or not row[0] < row[1] or row[2] < 0 or row[3] <= 0 or min(row[4:7]) < 0:
            raise LineDataError(
                f"statistical lines of molecule {hitran_number}, bin {index + 1}: expected {_COLUMNS} finite numbers "
                f"with from < to, S >= 0, density > 0 and energies >= 0, got {list(row)}; correct the constants file"
            )
    return np.asarray(rows, dtype=np.float64).reshape(-1, _COLUMNS)
