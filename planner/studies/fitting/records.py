"""What a fit finds, as records for the report."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

__all__ = [
    "BinReport",
    "Evidence",
    "FitResult",
    "Found",
    "GoodnessOfFit",
    "Recheck",
    "Residual",
]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True, eq=False)
class Found:
    """The posterior of one parameter.

    Attributes
    ----------
    name, unit, prior : str
        The prior in words.
    gas : bool
    logarithmic : bool
        Whether ``draws`` and the ends of the prior are decadic logarithms of the value.
    low_95, low_68, median, high_68, high_95 : float
        Values; the middle 68 and 95 % lie between.
    upper_95 : float or None
        For a gas that is not told from none: the value below which 95 % lie.
    low_end_share : float
        Posterior over prior share of the lowest fifth of the prior's range. For a gas about one over the odds that
        the data give for its presence.
    draws : (draw,)
        Equally likely.
    prior_ends : (low, high)
    """

    name: str
    unit: str
    prior: str
    gas: bool
    logarithmic: bool
    low_95: float
    low_68: float
    median: float
    high_68: float
    high_95: float
    upper_95: float | None
    low_end_share: float
    draws: Array
    prior_ends: tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class Evidence:
    """Evidence of one model of the air."""

    without: str | None
    """A gas that it lacks."""
    ln_evidence: float
    error: float
    information: float
    """From prior to posterior, in nats."""
    parameters: int
    evaluations: int
    effective_size: float


@dataclass(frozen=True, kw_only=True)
class Residual:
    """A bin far from the best model."""

    from_um: float
    to_um: float
    sigma: float


@dataclass(frozen=True, kw_only=True)
class GoodnessOfFit:
    """Whether the model describes the data at all."""

    chi2: float
    bins: int
    parameters: int
    """Free ones, levels of detectors included."""
    p_value: float
    """Chance of a chi-squared as large or larger if the model is right and errors are as stated."""
    neighbours: float
    """Correlation of neighbouring residuals."""
    neighbours_sigma: float
    """The same over its scatter if residuals are independent."""
    largest: tuple[Residual, ...]
    verdict: str


@dataclass(frozen=True, kw_only=True)
class Recheck:
    """What the full grid says of posterior draws from reduced opacity."""

    draws: int
    effective_size: float
    """Of the draws with the weights that the full grid gives them."""
    ln_evidence_shift: float
    shifts: tuple[tuple[str, float], ...]
    """Name and change of the mean, in posterior widths, of every parameter."""
    worst_ppm: float
    """Largest difference of a depth."""


@dataclass(frozen=True, kw_only=True, eq=False)
class BinReport:
    """What the bins say, one by one; all arrays ``(bin,)`` unless stated.

    Attributes
    ----------
    depth_ppm, error_ppm : array
    detector : int array
    best_ppm : array
        Best model, levels included.
    bands_ppm : (5, bin)
        Quantiles 2.5, 16, 50, 84 and 97.5 % of the model, levels included.
    left_out_shift : (gas, bin)
        Change of the mean log10 mixing ratio of each gas once the bin is left out, in posterior widths.
    left_out_ln_density : array
        ln of the density at which the rest of the spectrum expects the bin's depth.
    left_out_gain : array or None
        By how much the air with the gas in question expects it better than the air without, in nats.
    left_out_size : array
        Effective number of draws behind these.
    trusted : bool array
        Whether that is enough.
    """

    from_um: Array
    to_um: Array
    depth_ppm: Array
    error_ppm: Array
    detector: NDArray[np.int64]
    best_ppm: Array
    bands_ppm: Array
    gases: tuple[str, ...]
    left_out_shift: Array
    left_out_ln_density: Array
    left_out_gain: Array | None
    left_out_size: Array
    trusted: NDArray[np.bool_]


@dataclass(frozen=True, kw_only=True, eq=False)
class FitResult:
    """All that is said about a spectrum."""

    title: str
    invented: bool
    spectrum: str
    """Name of the file."""
    seed: int
    live: int
    found: tuple[Found, ...]
    offsets: tuple[Found, ...]
    evidences: tuple[Evidence, ...]
    """With all gases; then without the gas in question, if one was named."""
    goodness: GoodnessOfFit
    recheck: Recheck
    bins: BinReport
    line_data: tuple[str, ...]
    assumptions: tuple[str, ...]
    cautions: tuple[str, ...]
    version: str

    @property
    def ln_bayes(self) -> tuple[float, float] | None:
        """ln of the Bayes factor for the gas in question, and its error."""
        if len(self.evidences) < 2:
            return None
        there, absent = self.evidences
        return there.ln_evidence - absent.ln_evidence, float(np.hypot(there.error, absent.error))
