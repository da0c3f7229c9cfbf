"""What several gases seen at once are worth together: joint information, and what each member adds.

Amplitudes ``a_g`` of the members, in units of their own errors, are measured by one matched filter each. With ``e_g``
the members' templates scaled to unit significance and R their products in the metric of the noise (nuisances
marginalised),

    v = R a + n,   n normal with covariance R,   log p(v | a) = a'v - a'R a / 2 + (a term without a)

Given the hypothesis the members are taken as independent, each absent or at a level out of its range; levels are
summed over exactly, observations are drawn. Members whose templates correlate by less than a tenth are summed over
apart from each other, and groups that are larger than three are cut at their weakest links.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from planner.detection.worth import Channel, Occurrence

__all__ = ["Evidence", "Levels", "PatternBits", "bits_of_evidence", "lone_evidence", "pattern_bits"]

Array = NDArray[np.float64]

_LINKS = (0.1, 0.2, 0.35, 0.5, 0.7, 0.9, 1.1)
"""Correlations from which two templates are treated jointly: the first at which no group exceeds `_LARGEST`."""
_LARGEST = 3
_LEVELS = {1: 120, 2: 32, 3: 14}
"""Levels of each member in a group of this size."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Levels:
    """A member of a pattern: the significances it may have, the first of them 0, and how likely each is.

    Attributes
    ----------
    snr, if_true, if_false : (level,)
        The chances add up to 1.
    """

    snr: Array
    if_true: Array
    if_false: Array

    @classmethod
    def make(cls, channel: Channel, if_true: Occurrence, if_false: Occurrence, count: int) -> Levels:
        """At most ``count`` levels beside absence, from the cells of a channel."""
        starts = np.unique(np.linspace(0, channel.snr.size, count + 1).astype(int)[:-1])
        sizes = np.diff([*starts, channel.snr.size])
        snr = np.add.reduceat(channel.snr, starts) / sizes
        chances = []
        for occurrence in (if_true, if_false):
            there = np.add.reduceat(channel.shares(occurrence), starts) * occurrence.probability
            chances.append(np.concatenate([[1 - occurrence.probability], there]))
        return cls(snr=np.concatenate([[0.0], snr]), if_true=chances[0], if_false=chances[1])


@dataclass(frozen=True, kw_only=True, eq=False)
class Evidence:
    """Log likelihood ratios ``ln p(v | true) / p(v | false)`` of observations drawn of either kind, ``(draw,)``."""

    in_true: Array
    in_false: Array

    def __add__(self, other: Evidence) -> Evidence:
        """Of independent observations together."""
        return Evidence(in_true=self.in_true + other.in_true, in_false=self.in_false + other.in_false)


@dataclass(frozen=True, kw_only=True)
class PatternBits:
    """Information of a pattern about the hypothesis, with the standard error of the draws."""

    bits: float
    error: float
    without: tuple[float, ...]
    """For each member: what is left when its amplitude is not used, though it may be in the air."""


def pattern_bits(
    members: Sequence[tuple[Channel, Occurrence, Occurrence]],
    correlation: Array,
    prior: float,
    rng: np.random.Generator,
    draws: int = 2000,
) -> PatternBits:
    """Joint information of the members' amplitudes about a hypothesis.

    Parameters
    ----------
    members : sequence of (Channel, if true, if false)
    correlation : (member, member)
        Of the unit templates in the metric of noise and nuisances.
    prior : float
    rng : Generator
    draws : int
        Observations drawn of each kind of world.
    """
    groups = _groups(correlation)
    parts = []
    for group in groups:
        own, lost = _group_evidence([members[i] for i in group], correlation[np.ix_(group, group)], rng, draws)
        parts.append((group, own, lost))
    nothing = Evidence(in_true=np.zeros(draws), in_false=np.zeros(draws))
    bits, error = bits_of_evidence(sum((own for _, own, _ in parts), nothing), prior)
    without = np.zeros(len(members))
    for group, _, lost in parts:
        rest = sum((other for g, other, _ in parts if g != group), nothing)
        for member, left in zip(group, lost, strict=True):
            without[member] = bits_of_evidence(rest + left, prior)[0]
    return PatternBits(bits=bits, error=error, without=tuple(without.tolist()))


def bits_of_evidence(evidence: Evidence, prior: float) -> tuple[float, float]:
    """Mutual information in bits and its standard error, from drawn log likelihood ratios."""
    with np.errstate(over="ignore"):
        true = -np.log2(prior + (1 - prior) * np.exp(-evidence.in_true))
        false = -np.log2(prior * np.exp(evidence.in_false) + 1 - prior)
    bits = prior * true.mean() + (1 - prior) * false.mean()
    variance = prior**2 * true.var() / true.size + (1 - prior) ** 2 * false.var() / false.size
    return max(float(bits), 0.0), float(np.sqrt(variance))


def lone_evidence(levels: Levels, rng: np.random.Generator, draws: int) -> Evidence:
    """Evidence of drawn amplitudes of one gas by itself."""
    return _drawn([levels], np.eye(1), rng, draws)[0]


def _groups(correlation: Array) -> list[tuple[int, ...]]:
    """Members linked by their correlations, in groups of `_LARGEST` at most."""
    for link in _LINKS:
        groups = [{i} for i in range(len(correlation))]
        for i, j in combinations(range(len(correlation)), 2):
            if abs(correlation[i, j]) >= link:
                mine, theirs = (next(g for g in groups if k in g) for k in (i, j))
                if mine is not theirs:
                    groups.remove(theirs)
                    mine |= theirs
        if max(map(len, groups)) <= _LARGEST:
            break
    return [tuple(sorted(group)) for group in groups]


def _group_evidence(
    members: Sequence[tuple[Channel, Occurrence, Occurrence]],
    correlation: Array,
    rng: np.random.Generator,
    draws: int,
) -> tuple[Evidence, list[Evidence]]:
    """Evidence of drawn observations of one group, and the same with each member's amplitude left free."""
    levels = [Levels.make(*member, _LEVELS[len(members)]) for member in members]
    whole, seen = _drawn(levels, correlation, rng, draws)
    lost = []
    for index in range(len(levels)):
        rest = [i for i in range(len(levels)) if i != index]
        slope = correlation[rest, index]
        left = correlation[np.ix_(rest, rest)] - np.outer(slope, slope)  # what its free amplitude does not blur
        others = [levels[i] for i in rest]
        ratios = [_ratio(others, left, v[:, rest] - np.outer(v[:, index], slope)) for v in seen]
        lost.append(Evidence(in_true=ratios[0], in_false=ratios[1]))
    return whole, lost


def _drawn(
    levels: Sequence[Levels], correlation: Array, rng: np.random.Generator, draws: int
) -> tuple[Evidence, list[Array]]:
    """Evidence of drawn observations, and the observations of either kind of world, ``(draw, member)``."""
    seen = [_observed(levels, kind, correlation, rng, draws) for kind in ("if_true", "if_false")]
    ratios = [_ratio(levels, correlation, v) for v in seen]
    return Evidence(in_true=ratios[0], in_false=ratios[1]), seen


def _observed(levels: Sequence[Levels], kind: str, correlation: Array, rng: np.random.Generator, draws: int) -> Array:
    """Filtered observations ``v``, ``(draw, member)``, of worlds of one kind."""
    amplitudes = np.stack([rng.choice(level.snr, size=draws, p=getattr(level, kind)) for level in levels], axis=1)
    variances, vectors = np.linalg.eigh(correlation)
    root = vectors * np.sqrt(np.maximum(variances, 0.0))
    return np.asarray(amplitudes @ correlation + rng.standard_normal(amplitudes.shape) @ root.T)


def _ratio(levels: Sequence[Levels], correlation: Array, seen: Array) -> Array:
    """``ln p(v | true) / p(v | false)``, summed over all combinations of levels, ``(draw,)``."""
    if not levels:
        return np.zeros(len(seen))
    amplitudes = np.stack([g.ravel() for g in np.meshgrid(*(level.snr for level in levels), indexing="ij")], axis=1)
    chances = np.stack([_product([getattr(level, k) for level in levels]) for k in ("if_true", "if_false")], axis=1)
    halves = 0.5 * np.einsum("ci,ij,cj->c", amplitudes, correlation, amplitudes)
    result = np.empty(len(seen))
    for block in np.array_split(np.arange(len(seen)), max(1, len(seen) * len(halves) // 2_000_000)):
        exponent = seen[block] @ amplitudes.T - halves
        weight = np.exp(exponent - exponent.max(axis=1, keepdims=True)) @ chances
        weight = np.maximum(weight, 1e-300)
        result[block] = np.log(weight[:, 0] / weight[:, 1])
    return result


def _product(chances: Sequence[Array]) -> Array:
    result = np.ones(1)
    for chance in chances:
        result = np.outer(result, chance).ravel()
    return result
