"""Noise of a slope fitted to an up-the-ramp integration, and how many groups a ramp has."""

from __future__ import annotations

import math

__all__ = ["WELL_SHARE", "choose_groups", "slope_variance_e2", "slope_variance_terms"]

WELL_SHARE = 0.8
"""Share of the full well that a ramp fills (common practice)."""


def slope_variance_terms(groups: int, frames_per_group: int, frame_time_s: float) -> tuple[float, float]:
    """Factors of the variance of ``slope * (groups - 1) * group_time`` from an unweighted straight-line fit.

    The variance in electrons squared is ``read_factor * read_noise^2 + rate_factor_s * rate``, with

    ``read_factor = 12 (n-1) / (m n (n+1))`` and
    ``rate_factor = 6 (n^2+1) / (5 n (n+1)) (n-1) t_g - 2 (m^2-1) (n-1) / (m n (n+1)) t_f``

    for n groups of m averaged frames, frame time t_f and group time t_g = m t_f: Rauscher et al. 2007, PASP 119,
    768, equation 1, with the third term as in the erratum, 2010, PASP 122, 1254.

    A weighted fit of a bright ramp would have up to a fifth less photon variance; plain fits are assumed.

    Parameters
    ----------
    groups, frames_per_group : int
        n >= 2, m >= 1.
    frame_time_s : float

    Returns
    -------
    read_factor : float
    rate_factor_s : float
    """
    n, m = groups, frames_per_group
    read_factor = 12 * (n - 1) / (m * n * (n + 1))
    within_groups_s = 2 * (m**2 - 1) * (n - 1) / (m * n * (n + 1)) * frame_time_s
    between_groups_s = 6 * (n**2 + 1) / (5 * n * (n + 1)) * (n - 1) * m * frame_time_s
    return read_factor, between_groups_s - within_groups_s


def slope_variance_e2(
    *, groups: int, frames_per_group: int, frame_time_s: float, rate_e_per_s: float, read_noise_e: float
) -> float:
    """Variance in electrons squared of one pixel's ``slope * (groups - 1) * group_time``."""
    read_factor, rate_factor_s = slope_variance_terms(groups, frames_per_group, frame_time_s)
    return read_factor * read_noise_e**2 + rate_factor_s * rate_e_per_s


def choose_groups(*, brightest_e_per_s: float, full_well_e: float, group_time_s: float, at_most: int) -> int:
    """Groups after which the brightest pixel has filled ``WELL_SHARE`` of the well, from 2 up to ``at_most``.

    Charge collects from the reset on, so that n groups hold ``n * group_time * rate``.
    """
    charge_e = brightest_e_per_s * group_time_s
    if charge_e * at_most <= WELL_SHARE * full_well_e:
        return at_most
    return max(2, math.floor(WELL_SHARE * full_well_e / charge_e))
