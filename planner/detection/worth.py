"""What an observation is worth: how much it tells about a hypothesis, in bits, and the odds after it.

Let L be a hypothesis (life, or industry). If L is true the gas is present with probability ``q_L`` at a mixing ratio
evenly spread in its logarithm over a range; if L is false, with ``q_not`` over another range. An observation returns
one number z, the amplitude in units of its error: normal with unit width around the expected significance s(x), around
zero where the gas is absent. Then

    p(z | h) = q_h <phi(z - s(x))> + (1 - q_h) phi(z)
    P(detect | h) = q_h <Phi(s(x) - T)> + (1 - q_h) alpha,   alpha = Phi(-T)

with the means over the range for h. The worth is the mutual information between L and z, and between L and the bare
"detected or not" (Lindley 1956, Ann. Math. Stat. 27, 986, from memory). The second is never more than the first.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import log, pi, sqrt

import numpy as np
from numpy.typing import NDArray
from scipy import interpolate, special

__all__ = [
    "Channel",
    "Occurrence",
    "Response",
    "Worth",
    "entropy_bits",
    "mutual_information_bits",
    "posterior",
    "worth",
]

Array = NDArray[np.float64]

_STEP_SIGMA = 0.25
"""Of the grid in z. A sum over unit normals 0.25 apart is exact to rounding; its logarithm to 1e-6 bits."""
_TAIL_SIGMA = 7.0
_CELLS = 64
"""Cells over a range of mixing ratios at least; two more for every sigma that the significance moves within it."""
_TINY = 1e-300


@dataclass(frozen=True, kw_only=True, eq=False)
class Response:
    """Expected significance against mixing ratio, from a few computed points.

    Between the points ``ln s`` is interpolated in ``ln x`` by a curve that adds no bumps. Below the lowest ``s`` falls
    in proportion to ``x``, as a thin gas does; above the highest it stays.

    Attributes
    ----------
    ln_mixing_ratio : (point,)
        Ascending, at least two.
    snr : (point,)
        Zero or more.
    """

    ln_mixing_ratio: Array
    snr: Array

    def __call__(self, ln_mixing_ratio: Array) -> Array:
        """Expected significance at logarithms of mixing ratios, in the shape given."""
        if not np.all(self.snr > 0):
            return np.interp(ln_mixing_ratio, self.ln_mixing_ratio, self.snr)
        first, last = self.ln_mixing_ratio[[0, -1]]
        below = np.minimum(ln_mixing_ratio - first, 0.0)
        return np.asarray(np.exp(self._curve(np.clip(ln_mixing_ratio, first, last)) + below))

    @cached_property
    def _curve(self) -> interpolate.PchipInterpolator:
        return interpolate.PchipInterpolator(self.ln_mixing_ratio, np.log(self.snr))

    def mixing_ratio_for(self, snr: float) -> float | None:
        """The lowest mixing ratio whose expected significance reaches ``snr``; None if none does up to the last."""
        fine = np.linspace(self.ln_mixing_ratio[0], self.ln_mixing_ratio[-1], 2001)
        reached = np.flatnonzero(self(fine) >= snr)
        if not reached.size:
            return None
        if reached[0] == 0:  # below the points the gas is thin
            return float(np.exp(fine[0]) * snr / self.snr[0])
        low, high = self(fine[reached[0] - 1 : reached[0] + 1])
        share = (snr - low) / (high - low)
        return float(np.exp(fine[reached[0] - 1] + share * (fine[1] - fine[0])))


@dataclass(frozen=True, kw_only=True, eq=False)
class Occurrence:
    """How likely the gas is there, and how much of it: evenly in the logarithm from ``lowest`` to ``highest``.

    Plain numbers, or arrays ``(draw,)`` that stand for many opinions at once.
    """

    probability: float | Array
    lowest: float | Array
    highest: float | Array


@dataclass(frozen=True, kw_only=True, eq=False)
class Channel:
    """From mixing ratio to the measured amplitude, on cells of ``ln x`` and a grid of ``z``; made by `make`.

    Attributes
    ----------
    ln_edges : (cell + 1,)
        Cells narrow enough for the significance to move by half a sigma within one at most.
    snr : (cell,)
        Expected significance in the middle of each.
    z : (z,)
    present : (cell, z)
        Density of z for a mixing ratio in each cell.
    absent : (z,)
    """

    ln_edges: Array
    snr: Array
    z: Array
    present: Array
    absent: Array

    @classmethod
    def make(cls, response: Response, lowest: float, highest: float) -> Channel:
        """For mixing ratios from ``lowest`` to ``highest``."""
        fine = np.linspace(log(lowest), log(highest), 2001)
        moved = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(response(fine))))])
        progress = 2 * moved + _CELLS * (fine - fine[0]) / (fine[-1] - fine[0])
        count = int(np.ceil(progress[-1]))
        edges = np.interp(np.linspace(0, progress[-1], count + 1), progress, fine)
        snr = response((edges[1:] + edges[:-1]) / 2)
        z = np.arange(-_TAIL_SIGMA, snr.max() + _TAIL_SIGMA, _STEP_SIGMA)
        return cls(
            ln_edges=edges, snr=snr, z=z, present=_unit_normal(z[None, :] - snr[:, None]), absent=_unit_normal(z)
        )

    def shares(self, occurrence: Occurrence) -> Array:
        """Share of each cell in the range of an occurrence, ``(..., cell)``; sums to 1.

        Raises
        ------
        ValueError
            If the range reaches beyond the cells.
        """
        low, high = np.log(occurrence.lowest)[..., None], np.log(occurrence.highest)[..., None]
        if np.any(low < self.ln_edges[0] - 1e-9) or np.any(high > self.ln_edges[-1] + 1e-9):
            raise ValueError("Channel.shares: the range of mixing ratios reaches beyond the channel")
        inside = np.minimum(high, self.ln_edges[1:]) - np.maximum(low, self.ln_edges[:-1])
        return np.asarray(np.maximum(inside, 0.0) / (high - low))

    def density(self, occurrence: Occurrence) -> Array:
        """Density of the measured amplitude, ``(..., z)``."""
        chance = np.asarray(occurrence.probability)[..., None]
        return np.asarray(chance * (self.shares(occurrence) @ self.present) + (1 - chance) * self.absent)

    def chance_of_detection(self, occurrence: Occurrence, threshold_sigma: float) -> Array:
        """Probability that the amplitude reaches the threshold, gas or false alarm, ``(...)``."""
        chance = np.asarray(occurrence.probability)
        power = self.shares(occurrence) @ special.ndtr(self.snr - threshold_sigma)
        return np.asarray(chance * power + (1 - chance) * special.ndtr(-threshold_sigma))


@dataclass(frozen=True, kw_only=True, eq=False)
class Worth:
    """What an observation tells about a hypothesis of probability ``prior``. Numbers, or arrays ``(draw,)``.

    Bits are at most ``entropy_bits(prior)``.
    """

    prior: float | Array
    amplitude_bits: float | Array
    """Mutual information between the hypothesis and the measured amplitude."""
    detection_bits: float | Array
    """The same for the bare statement "detected" or "not detected"."""
    detected_if_true: float | Array
    detected_if_false: float | Array

    @property
    def after_detection(self) -> float | Array:
        """Probability of the hypothesis once the gas is detected."""
        return posterior(self.prior, self.detected_if_true, self.detected_if_false)

    @property
    def after_null(self) -> float | Array:
        """Probability of the hypothesis once the gas is looked for and not detected."""
        return posterior(self.prior, 1 - self.detected_if_true, 1 - self.detected_if_false)


def worth(
    channel: Channel, if_true: Occurrence, if_false: Occurrence, prior: float | Array, threshold_sigma: float
) -> Worth:
    """What one observation is worth; with arrays in the arguments, for every draw at once.

    Parameters
    ----------
    channel : Channel
        Of the gas, with the mode and the hours in mind.
    if_true, if_false : Occurrence
        The gas where the hypothesis is true, and where it is false.
    prior : float
        Probability of the hypothesis before looking.
    threshold_sigma : float
        From which a significance counts as a detection, one-sided.
    """
    found = [channel.chance_of_detection(occurrence, threshold_sigma) for occurrence in (if_true, if_false)]
    amplitudes = _two_kinds(channel.density(if_true), channel.density(if_false), prior, _STEP_SIGMA)
    bare = _two_kinds(_yes_or_no(found[0]), _yes_or_no(found[1]), prior, 1.0)
    return Worth(
        prior=prior,
        amplitude_bits=amplitudes,
        detection_bits=bare,
        detected_if_true=found[0],
        detected_if_false=found[1],
    )


def mutual_information_bits(densities: Array, weights: Array, step: float) -> float | Array:
    """Mutual information between which density a value was drawn from, and the value.

    ``sum_k w_k integral p_k log2(p_k / p)`` with ``p = sum_k w_k p_k``, by a sum over an even grid.

    Parameters
    ----------
    densities : (..., component, value)
    weights : (..., component)
        Adding up to 1.
    step : float
        Of the grid of values; 1 for probabilities of separate outcomes.
    """
    mean = np.sum(weights[..., None] * densities, axis=-2, keepdims=True)
    logarithm = np.log2(np.maximum(densities, _TINY)) - np.log2(np.maximum(mean, _TINY))
    divergence = np.sum(densities * logarithm, axis=-1) * step
    return np.maximum(np.sum(weights * divergence, axis=-1), 0.0)


def entropy_bits(probability: float | Array) -> float | Array:
    """What there is to learn about a hypothesis of this probability: the most that any observation can be worth."""
    return (special.entr(probability) + special.entr(1 - np.asarray(probability))) / log(2)


def posterior(prior: float | Array, if_true: float | Array, if_false: float | Array) -> float | Array:
    """Probability of a hypothesis after something that happens with one chance if it is true, another if false."""
    return prior * if_true / (prior * if_true + (1 - prior) * if_false)


def _two_kinds(if_true: Array, if_false: Array, prior: float | Array, step: float) -> float | Array:
    prior = np.broadcast_to(prior, if_true.shape[:-1])
    weights = np.stack([prior, 1 - prior], axis=-1)
    return mutual_information_bits(np.stack([if_true, if_false], axis=-2), weights, step)


def _yes_or_no(chance: Array) -> Array:
    return np.stack([chance, 1 - chance], axis=-1)


def _unit_normal(x: Array) -> Array:
    return np.asarray(np.exp(-0.5 * x**2) / sqrt(2 * pi))
