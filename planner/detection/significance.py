"""How significant a template is, alone and with everything that can imitate it marginalised.

With the template ``t`` (depth change that the gas makes, per bin), the noise covariance after N transits
``C_N = diag(white^2)/N + C_floor`` and nuisance directions ``b_j`` scaled to one prior standard deviation each,

    S/N(N)^2 = t' (C_N + B B')^-1 t

is the squared expected significance of a linear matched filter in which every nuisance has been marginalised over its
Gaussian prior (e.g. Cowan et al. 2011, Eur. Phys. J. C 71, 1554, for the Gaussian case; the equivalence of adding
``B B'`` to the covariance and marginalising is that of Bayesian linear regression). Significances are one-sided.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize, special

__all__ = ["Measurement", "one_sided_probability", "one_sided_sigma", "target_snr"]

_MOST_TRANSITS = 1e7
"""Beyond this many transits a rising curve counts as one that never arrives."""
_ROUNDING = 1e-13
"""Variances this small beside the largest are rounding errors of zero."""
_NEGLIGIBLE = 1e-30
"""A floor whose variance is this share of that of one transit would show after 1e30 of them: there is none."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Measurement:
    """What one or several modes measure of a template in one transit.

    Attributes
    ----------
    template_ppm : (bin,)
        Depth change that the gas makes.
    white_ppm : (bin,)
        Standard error of depth in one transit, averaging down with the number of transits; > 0.
    floor_ppm2 : (bin, bin)
        Covariance that does not average down.
    nuisances : tuple of str
        Names of the nuisance directions.
    directions_ppm : (nuisance, bin)
        Depth change for one prior standard deviation of each nuisance.
    """

    template_ppm: NDArray[np.float64]
    white_ppm: NDArray[np.float64]
    floor_ppm2: NDArray[np.float64]
    nuisances: tuple[str, ...] = ()
    directions_ppm: NDArray[np.float64]

    def __post_init__(self) -> None:
        bins = self.template_ppm.size
        shapes = {
            "template_ppm": (self.template_ppm, (bins,)),
            "white_ppm": (self.white_ppm, (bins,)),
            "floor_ppm2": (self.floor_ppm2, (bins, bins)),
            "directions_ppm": (self.directions_ppm, (len(self.nuisances), bins)),
        }
        for name, (value, shape) in shapes.items():
            if value.shape != shape or not np.all(np.isfinite(value)):
                raise ValueError(f"Measurement.{name}: expected finite values of shape {shape}, got {value.shape}")
        if bins and self.white_ppm.min() <= 0:
            raise ValueError("Measurement.white_ppm: every error must be positive")

    @classmethod
    def join(cls, parts: Sequence[Measurement]) -> Measurement:
        """Several modes as one data set: nuisances of the same name are shared, noise is independent."""
        names = tuple(dict.fromkeys(name for part in parts for name in part.nuisances))
        empty = [np.zeros((len(names), part.template_ppm.size)) for part in parts]
        for directions, part in zip(empty, parts, strict=True):
            for name, direction in zip(part.nuisances, part.directions_ppm, strict=True):
                directions[names.index(name)] = direction
        return cls(
            template_ppm=np.concatenate([part.template_ppm for part in parts]),
            white_ppm=np.concatenate([part.white_ppm for part in parts]),
            floor_ppm2=linalg.block_diag(*[part.floor_ppm2 for part in parts]),
            nuisances=names,
            directions_ppm=np.concatenate(empty, axis=1),
        )

    def known(self, *names: str) -> Measurement:
        """The same with some nuisances known exactly; with no names, all of them."""
        kept = [i for i, name in enumerate(self.nuisances) if names and name not in names]
        return replace(self, nuisances=tuple(self.nuisances[i] for i in kept), directions_ppm=self.directions_ppm[kept])

    def only(self, name: str) -> Measurement:
        """The same with a single nuisance left unknown."""
        return self.known(*(other for other in self.nuisances if other != name))

    def snr(self, transits: float) -> float:
        """Expected significance after a number of transits (may be fractional); 0 for an empty template."""
        return self._distance(1.0 / transits) if self.template_ppm.any() else 0.0

    def snr_limit(self) -> float:
        """Best attainable significance, after infinitely many transits; infinite where no floor bounds it."""
        if not self.template_ppm.any():
            return 0.0
        if np.any(self._modes[0] == 0):
            return np.inf  # what has no floor averages down for ever
        return self._distance(0.0)

    @cached_property
    def _modes(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Independent modes of the noise: floor over white variance ``(mode,)``, and template and directions in them.

        In units of the white noise of one transit the covariance after N transits is ``1/N + F``; rotated to the
        eigenvectors of F it is diagonal for every N.
        """
        columns = np.vstack([self.template_ppm, self.directions_ppm]) / self.white_ppm
        floor = self.floor_ppm2 / np.outer(self.white_ppm, self.white_ppm)
        variances = np.diag(floor)
        if np.count_nonzero(floor) == np.count_nonzero(variances):
            return np.where(variances < _NEGLIGIBLE, 0.0, variances), columns.T
        variances, vectors = linalg.eigh(floor)
        # a floor common to all bins has a single mode
        variances[variances < max(_ROUNDING * variances[-1], _NEGLIGIBLE)] = 0.0
        return variances, vectors.T @ columns.T

    def _distance(self, white_share: float) -> float:
        """Distance of the template from what the nuisances can imitate, in standard deviations.

        ``t'(C + B B')^-1 t`` is the minimum over ``c`` of ``|L^-1 (t - B c)|^2 + |c|^2`` with ``C = L L'``; as a
        least-squares problem it stays accurate when the nuisances are much wider than the noise.
        """
        variances, columns = self._modes
        whitened = columns / np.sqrt(white_share + variances)[:, None]
        count = len(self.nuisances)
        design = np.vstack([whitened[:, 1:], np.eye(count)])
        target = np.concatenate([whitened[:, 0], np.zeros(count)])
        orthogonal, _ = np.linalg.qr(design)
        return float(np.linalg.norm(target - orthogonal @ (orthogonal.T @ target)))

    def transits_for(self, snr: float) -> float | None:
        """The real-valued number of transits at which the significance reaches ``snr``; None if it never does."""
        if self.snr_limit() <= snr or self.snr(_MOST_TRANSITS) < snr:
            return None
        if self.snr(1e-6) >= snr:
            return 1e-6

        def short(log_transits: float) -> float:
            return self.snr(np.exp(log_transits)) / snr - 1.0

        root = optimize.brentq(short, np.log(1e-6), np.log(_MOST_TRANSITS), xtol=1e-6)
        return float(np.exp(root))

    def information(self) -> NDArray[np.float64]:
        """Share of each bin in the squared significance of one transit, all else known; sums to 1, shape ``(bin,)``."""
        weight = (self.template_ppm / self.white_ppm) ** 2
        total = weight.sum()
        return weight / total if total > 0 else weight


def target_snr(threshold_sigma: float, power: float) -> float:
    """Expected significance that makes a detection at a threshold as likely as ``power``.

    The measured significance is normal with unit width around the expected one, so P(detect) = Phi(S/N - threshold).
    """
    return threshold_sigma + float(special.ndtri(power))


def one_sided_probability(sigma: float) -> float:
    """Chance of noise alone exceeding ``sigma``, one-sided."""
    return float(special.ndtr(-sigma))


def one_sided_sigma(probability: float) -> float:
    """The one-sided significance of a chance ``probability``; inverse of :func:`one_sided_probability`."""
    return float(-special.ndtri(probability))
