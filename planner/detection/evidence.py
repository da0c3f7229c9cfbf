"""What a significance can be worth as evidence, at most.

Sellke, Bayarri & Berger 2001, Am. Stat. 55, 62 (from memory): against whatever alternative one likes, the odds that a
p-value moves are at most ``B = 1 / (-e p ln p)`` for p below 1/e. It is an upper bound; a significance read off a
measured Bayes factor by turning it round overstates.
"""

from __future__ import annotations

from math import e, exp, log, log1p

from scipy import optimize, special

__all__ = ["STRENGTHS", "even_prior", "ln_bayes_bound", "sigma_of_bayes_bound", "strength_of"]

STRENGTHS = ((5.0, "strong"), (2.5, "moderate"), (1.0, "weak"), (0.0, "inconclusive"))
"""Least ln of a Bayes factor, and its name: Jeffreys' scale as in Trotta 2008, Contemp. Phys. 49, 71 (from memory)."""
_MOST_SIGMA = 1000.0


def ln_bayes_bound(sigma: float) -> float:
    """ln of the largest Bayes factor that a two-sided significance allows; 0 where p is 1/e or more."""
    ln_p = log(2) + float(special.log_ndtr(-sigma))
    return -(1 + ln_p + log(-ln_p)) if ln_p < -1 else 0.0


def sigma_of_bayes_bound(ln_bayes: float) -> float:
    """The two-sided significance whose bound is a Bayes factor; inverse of :func:`ln_bayes_bound`, > 0."""
    at_least = float(-special.ndtri(0.5 / e))
    return float(optimize.brentq(lambda sigma: ln_bayes_bound(sigma) - ln_bayes, at_least, _MOST_SIGMA))


def even_prior(ln_bayes: float) -> float:
    """The prior probability that a Bayes factor would bring to one half."""
    return exp(-ln_bayes - log1p(exp(-ln_bayes))) if ln_bayes < 700 else 0.0


def strength_of(ln_bayes: float) -> str:
    """The name that a Bayes factor has on Jeffreys' scale."""
    return next(name for least, name in STRENGTHS if ln_bayes >= least)
