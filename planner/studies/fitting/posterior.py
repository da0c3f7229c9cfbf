"""What weighted draws amount to: quantiles, limits, goodness of fit, and which bins carry the result."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special, stats

from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.records import Found, GoodnessOfFit, Residual
from planner.studies.fitting.unknowns import Unknown

__all__ = ["LeftOut", "cut_by_its_prior", "effective_size", "found_of", "goodness_of", "leave_out_each", "offset_of"]

Array = NDArray[np.float64]

_QUANTILES = (0.025, 0.16, 0.5, 0.84, 0.975)
_LOW_END = 0.2
"""Part of a gas's prior that stands for next to none of it."""
_TOLD_FROM_NONE = np.exp(-2.5)
"""With less than this of its share left at the low end, a gas counts as told from none: moderate evidence on Jeffreys'
scale (see `planner.detection.evidence`), for there the likelihood is that of none."""
_TOP_END = 0.05
"""Part of a gas's prior at its upper end, which a posterior that is not cut there hardly reaches."""
_TOO_BAD, _TOO_GOOD = 0.01, 0.999
_LARGEST = 3
_LEAST_SIZE = 0.1
"""Of the draws, below which a bin left out is not to be judged from them."""


def found_of(unknown: Unknown, draws: Array) -> Found:
    """The posterior of a parameter from equally likely draws, as `Unknown.shown` gives them."""
    ends = unknown.shown(np.array([0.0, 1.0]))
    low, high = float(ends.min()), float(ends.max())
    share = float(np.mean(draws < low + _LOW_END * (high - low))) / _LOW_END
    is_limit = unknown.gas and share > _TOLD_FROM_NONE
    marks = [float(10**q if unknown.logarithmic else q) for q in np.quantile(draws, (*_QUANTILES, 0.95))]
    return Found(
        name=unknown.name,
        unit=unknown.unit,
        prior=unknown.words,
        gas=unknown.gas,
        logarithmic=unknown.logarithmic,
        low_95=marks[0],
        low_68=marks[1],
        median=marks[2],
        high_68=marks[3],
        high_95=marks[4],
        upper_95=marks[5] if is_limit else None,
        low_end_share=share,
        draws=draws,
        prior_ends=(low, high),
    )


def offset_of(detector: str, draws: Array, width_ppm: float) -> Found:
    """The posterior of a detector's level, in ppm."""
    marks = [float(q) for q in np.quantile(draws, _QUANTILES)]
    return Found(
        name=f"offset of {detector}",
        unit="ppm",
        prior=f"{width_ppm:g} ppm",
        gas=False,
        logarithmic=False,
        low_95=marks[0],
        low_68=marks[1],
        median=marks[2],
        high_68=marks[3],
        high_95=marks[4],
        upper_95=None,
        low_end_share=0.0,
        draws=draws,
        prior_ends=(-3 * width_ppm, 3 * width_ppm),
    )


def cut_by_its_prior(found: Found) -> bool:
    """Whether the posterior of a gas runs into the upper end of its prior: denser there than the prior itself."""
    low, high = found.prior_ends
    return found.gas and float(np.mean(found.draws > high - _TOP_END * (high - low))) > _TOP_END


def goodness_of(data: LevelledData, best_ppm: Array, edges_um: tuple[Array, Array], parameters: int) -> GoodnessOfFit:
    """Whether a best model, levels included, describes the data.

    The chance is that of chi-squared with as many degrees of freedom as bins less parameters; parameters that the
    data hardly touch make it look a little smaller than it is. Neighbouring residuals of independent bins have a
    correlation of zero, give or take the root of one over their number.
    """
    left = (data.depth_ppm - best_ppm) / data.error_ppm
    chi2, free = float(left @ left), max(1, left.size - parameters)
    p_value = float(stats.chi2.sf(chi2, free))
    pairs = (data.detector[1:] == data.detector[:-1]) & np.isclose(edges_um[0][1:], edges_um[1][:-1], rtol=1e-6)
    count = int(pairs.sum())
    neighbours = float(np.sum((left[1:] * left[:-1])[pairs]) / count / np.mean(left**2)) if count else 0.0
    order = np.argsort(-np.abs(left))[:_LARGEST]
    return GoodnessOfFit(
        chi2=chi2,
        bins=left.size,
        parameters=parameters,
        p_value=p_value,
        neighbours=neighbours,
        neighbours_sigma=neighbours * float(np.sqrt(count)),
        largest=tuple(
            Residual(from_um=float(edges_um[0][i]), to_um=float(edges_um[1][i]), sigma=float(left[i])) for i in order
        ),
        verdict=_verdict(p_value, neighbours * float(np.sqrt(count))),
    )


def _verdict(p_value: float, neighbours_sigma: float) -> str:
    if p_value < _TOO_BAD:
        return "the model does not describe the data: numbers drawn from it mean little"
    if p_value > _TOO_GOOD:
        return "the scatter about the model is less than the errors say: they are too large, or correlated"
    if neighbours_sigma > 3:
        return "neighbouring residuals go together: errors are correlated, or a band is missing from the model"
    return "the model describes the data"


@dataclass(frozen=True, kw_only=True, eq=False)
class LeftOut:
    """What is left of a posterior when one bin at a time is left out.

    Attributes
    ----------
    ln_density : (bin,)
        Of the bin's depth, as the rest expects it.
    means : (parameter, bin)
        Of each parameter without the bin, less the mean with it, in widths of the posterior.
    size : (bin,)
        Effective number of draws.
    trusted : (bin,) bool
    """

    ln_density: Array
    means: Array
    size: Array
    trusted: NDArray[np.bool_]


def leave_out_each(ln_densities: Array, parameters: Array) -> LeftOut:
    """Leave out each bin by importance weights.

    A draw counts for the posterior without a bin by one over the density that it gives to that bin's depth (Gelfand,
    Dey & Chang 1992; Vehtari, Gelman & Gabry 2017, Stat. Comput. 27, 1413, equation 7; number from memory).

    Parameters
    ----------
    ln_densities : (draw, bin)
        Of each depth given each draw, levels included.
    parameters : (draw, parameter)
    """
    ln_weights = -ln_densities
    total = special.logsumexp(ln_weights, axis=0)
    weights = np.exp(ln_weights - total)
    widths = np.maximum(parameters.std(axis=0), np.finfo(float).tiny)
    means = (parameters - parameters.mean(axis=0)).T @ weights / widths[:, None]
    size = 1 / np.sum(weights**2, axis=0)
    return LeftOut(
        ln_density=np.log(len(ln_densities)) - total,
        means=means,
        size=size,
        trusted=size >= _LEAST_SIZE * len(ln_densities),
    )


def effective_size(ln_weights: Sequence[float] | Array) -> float:
    """Independent draws that weighted ones are worth (Kish 1965, from memory)."""
    weights = np.exp(np.asarray(ln_weights) - special.logsumexp(ln_weights))
    return float(1 / np.sum(weights**2))
