"""Nested sampling: evidence and posterior of any likelihood over the unit cube, in legs that can be kept and taken up.

A run is a list of dead points and a set of live ones (Skilling 2006, Bayesian Analysis 1, 833). Each leg hands the live
points to the sampler of the library dynesty (Speagle 2020, MNRAS 493, 3132), which draws uniformly inside ellipsoids
around them (Feroz, Hobson & Bridges 2009, MNRAS 398, 1601; citations from memory), and takes back what died on the way.
Legs begin with a random generator of their own, so that a run that was taken up again goes on as if it had never
stopped, and its state is nothing but arrays.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from itertools import islice

import numpy as np
from numpy.typing import NDArray
from scipy.special import logsumexp

__all__ = ["NestedRun", "NestedState", "advance", "begin", "draws", "outcome", "remaining"]

Array = NDArray[np.float64]
LnLikelihood = Callable[[Array], float]
"""Of a point ``(parameter,)`` in the unit cube, over which the prior is uniform."""

_CUBE_WHILE = 0.1
"""As long as so much of the prior is left, drawing from all of it is cheaper than from ellipsoids."""
_ENLARGED = 1.25
"""Volume of the ellipsoids over that which holds the live points."""


@dataclass(frozen=True, kw_only=True, eq=False)
class NestedState:
    """A run so far. Points are in the unit cube, ``(point, parameter)``.

    Attributes
    ----------
    dead, live : array
    dead_ln_likelihood, live_ln_likelihood : (point,)
        Of the dead in ascending order.
    legs, evaluations : int
        Done so far.
    """

    dead: Array
    dead_ln_likelihood: Array
    live: Array
    live_ln_likelihood: Array
    legs: int
    evaluations: int


@dataclass(frozen=True, kw_only=True, eq=False)
class NestedRun:
    """What a run amounts to.

    Attributes
    ----------
    ln_evidence, error : float
        ln of the likelihood averaged over the prior, and one standard error: the root of information over live points
        (Skilling 2006, section 5.2; number from memory).
    information : float
        From prior to posterior, in nats.
    points : (point, parameter)
        In the unit cube.
    ln_likelihood, weights : (point,)
        Weights add up to 1.
    evaluations : int
    """

    ln_evidence: float
    error: float
    information: float
    points: Array
    ln_likelihood: Array
    weights: Array
    evaluations: int

    @property
    def effective_size(self) -> float:
        """Independent draws that the weighted points are worth (Kish 1965, from memory)."""
        return float(1 / np.sum(self.weights**2))


def begin(ln_likelihood: LnLikelihood, parameters: int, *, live: int, seed: int) -> NestedState:
    """The first live points, drawn from the prior.

    Parameters
    ----------
    ln_likelihood : callable
        Finite everywhere.
    parameters : int
    live : int
        Points that live at any time: the error of ln(evidence) falls with their root, the work grows with them.
    seed : int
    """
    points = np.random.default_rng([seed, 0]).random((live, parameters))
    values = np.array([ln_likelihood(point) for point in points])
    return NestedState(
        dead=np.empty((0, parameters)),
        dead_ln_likelihood=np.empty(0),
        live=points,
        live_ln_likelihood=values,
        legs=0,
        evaluations=live,
    )


def advance(state: NestedState, ln_likelihood: LnLikelihood, *, seed: int) -> NestedState:
    """One leg further: as many points die as live, and e times less of the prior is left."""
    from dynesty import NestedSampler  # takes a while to load

    live, parameters = state.live.shape
    sampler = NestedSampler(
        ln_likelihood,
        lambda u: u,
        parameters,
        nlive=live,
        bound="multi",
        sample="unif",
        live_points=[state.live.copy(), state.live.copy(), state.live_ln_likelihood.copy()],
        bootstrap=0,  # ellipsoids wide enough for their own bootstrap leave few draws inside the likelihood
        enlarge=_ENLARGED,
        first_update={"min_ncall": np.inf, "min_eff": 0.0},
        rstate=np.random.default_rng([seed, 1 + state.legs]),
    )
    if np.exp(_ln_left(state)) < _CUBE_WHILE:
        sampler.update_bound_if_needed(-np.inf, force=True)
    for _ in islice(sampler.sample(dlogz=None, add_live=False, save_bounds=False), live):
        pass
    died = sampler.results
    return NestedState(
        dead=np.concatenate([state.dead, died.samples_u]),
        dead_ln_likelihood=np.concatenate([state.dead_ln_likelihood, died.logl]),
        live=sampler.live_u,
        live_ln_likelihood=sampler.live_logl,
        legs=state.legs + 1,
        evaluations=state.evaluations + int(np.sum(died.ncall)),
    )


def remaining(state: NestedState) -> float:
    """By how much the live points can still raise ln(evidence), at most about; nothing where they are all alike."""
    if np.ptp(state.live_ln_likelihood) == 0:
        return 0.0
    best = float(state.live_ln_likelihood.max()) + _ln_left(state)
    dead = logsumexp(_ln_shares(state)[: len(state.dead)] + state.dead_ln_likelihood) if len(state.dead) else -np.inf
    return float(np.logaddexp(dead, best) - dead)


def outcome(state: NestedState) -> NestedRun:
    """Evidence and weighted posterior of a run, the live points included."""
    ln_likelihood = np.concatenate([state.dead_ln_likelihood, state.live_ln_likelihood])
    ln_weights = _ln_shares(state) + ln_likelihood
    ln_evidence = float(logsumexp(ln_weights))
    weights = np.exp(ln_weights - ln_evidence)
    information = max(0.0, float(weights @ ln_likelihood) - ln_evidence)
    return NestedRun(
        ln_evidence=ln_evidence,
        error=float(np.sqrt(information / len(state.live))),
        information=information,
        points=np.concatenate([state.dead, state.live]),
        ln_likelihood=ln_likelihood,
        weights=weights,
        evaluations=state.evaluations,
    )


def draws(run: NestedRun, count: int, rng: np.random.Generator) -> NDArray[np.intp]:
    """Positions of points drawn with their weights, evenly spaced along them (systematic resampling)."""
    places = (np.arange(count) + rng.random()) / count
    ends = np.cumsum(run.weights)
    found: NDArray[np.intp] = np.searchsorted(ends / ends[-1], places)
    return found


def _ln_left(state: NestedState) -> float:
    """ln of the share of the prior that is left: each death takes one part of as many as live."""
    return -len(state.dead) / len(state.live)


def _ln_shares(state: NestedState) -> Array:
    """ln of the share of the prior that each point stands for, ``(point,)``, the dead first."""
    dead, live = len(state.dead), len(state.live)
    ln_volume = -np.arange(dead + 1) / live
    between = ln_volume[:-1] + np.log(-np.expm1(-1 / live))
    return np.concatenate([between, np.full(live, ln_volume[-1] - np.log(live))])
