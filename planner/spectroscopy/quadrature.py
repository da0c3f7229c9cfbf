"""Few samples with weights that stand for the mean over many: a quadrature fitted to the functions it must serve.

Absorption at two wavenumbers that see the same mixture of strong and weak lines depends on the atmosphere in the same
way, so the mean over hundreds of samples is a weighted mean of a few of them. The weights are found from the values
of a training set by non-negative least squares; the idea is that of optimal spectral sampling (Moncet et al. 2008,
J. Atmos. Sci. 65, 3917), the search for the samples is ours: functions are first reduced to the combinations that
vary at all over the samples. With r of them left, r + 1 samples are enough (Tchakaloff's theorem), and an active-set
solver finds such a set, because its solutions have no more non-zero weights than there are equations.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize

__all__ = ["Quadrature", "fit_quadrature", "fit_until"]

Array = NDArray[np.float64]

_SUM_OF_WEIGHTS = 1e3
"""How hard the weights are held to a sum of one, in units of the values."""
_FIRST_TOLERANCE = 2.0
"""In units of the error allowed: norms of combinations over the whole training set, so more than one is no waste."""
_HALVINGS = 8

Quadrature = tuple[NDArray[np.intp], Array]
"""Positions among the samples, ascending, and their weights, positive and adding up to one; each ``(chosen,)``."""


def fit_quadrature(values: Array, share: Array, means: Array, tolerance: float) -> Quadrature:
    """Weights on few samples that reproduce the mean of every function.

    Parameters
    ----------
    values : (function, sample)
        In a unit in which an error of one is an error of one for every function.
    share : (sample,)
        How much each sample counts when the functions are reduced to combinations; >= 0, adding up to 1. Samples
        that count for nothing are not chosen.
    means : (function,)
        What the weighted samples shall give.
    tolerance : float
        Combinations of functions whose norm over the samples is below this are let go.
    """
    return _Combinations(values, share, means).fit(tolerance)


def fit_until(
    values: Array, share: Array, means: Array, held_out: Array, held_out_means: Array, allowed: float
) -> Quadrature:
    """The same with the tolerance lowered until no function of a second set errs by more than is allowed.

    The best of all tried is returned when none is good enough.

    Parameters
    ----------
    values, share, means
        As in `fit_quadrature`.
    held_out : (other function, sample)
        Functions that the weights are not fitted to.
    held_out_means : (other function,)
    allowed : float
        Largest error.
    """
    combinations = _Combinations(values, share, means)
    best, least = None, np.inf
    for step in range(_HALVINGS):
        found = combinations.fit(_FIRST_TOLERANCE * allowed / 2**step)
        index, weight = found
        error = np.abs(held_out[:, index] @ weight - held_out_means).max(initial=0.0)
        if best is None or error < least:
            best, least = found, error
        if least <= allowed:
            break
    assert best is not None
    return best


class _Combinations:
    """The functions as orthogonal combinations of samples that count, largest first."""

    def __init__(self, values: Array, share: Array, means: Array) -> None:
        self._counting = np.flatnonzero(share)
        root = np.sqrt(share[self._counting])
        weighted = (values[:, self._counting] - means[:, np.newaxis]) * root
        # eigenvectors of the samples' products: as good as singular vectors down to 1e-8 of the largest, and cheaper
        squares, vectors = linalg.eigh(weighted.T @ weighted)
        self._norms = np.sqrt(np.maximum(squares[::-1], 0.0))
        self._rows = self._norms[:, np.newaxis] * vectors.T[::-1] / root

    def fit(self, tolerance: float) -> Quadrature:
        kept = self._rows[: int(np.searchsorted(-self._norms, -tolerance))]
        equations = np.vstack([kept, np.full((1, self._counting.size), _SUM_OF_WEIGHTS)])
        wanted = np.zeros(len(equations))
        wanted[-1] = _SUM_OF_WEIGHTS
        weights, _ = optimize.nnls(equations, wanted, maxiter=20 * self._counting.size)
        chosen = np.flatnonzero(weights)
        return self._counting[chosen], weights[chosen] / weights[chosen].sum()
