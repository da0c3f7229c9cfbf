"""Coupling of an angular momentum with a vector, which makes the rotational factors of line intensities."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["clebsch_gordan"]

Floats = NDArray[np.float64]


def clebsch_gordan(j: Any, k: Any, j_step: int, k_step: int) -> Floats:
    """Coefficients (J k; 1 k_step | J+j_step k+k_step), zero where the upper level does not exist.

    E.g. Varshalovich et al. 1988, Quantum theory of angular momentum, table 8.2; Condon-Shortley phases.
    """
    j, m = np.broadcast_arrays(np.asarray(j, dtype=np.float64), np.asarray(k, dtype=np.float64) + k_step)
    upper = j + j_step
    if j_step == 1:
        square = {1: (j + m) * (j + m + 1) / 2, 0: (j - m + 1) * (j + m + 1), -1: (j - m) * (j - m + 1) / 2}
        norm, sign = (2 * j + 1) * (j + 1), np.ones_like(m)
    elif j_step == 0:
        square = {1: (j + m) * (j - m + 1) / 2, 0: m**2, -1: (j - m) * (j + m + 1) / 2}
        norm, sign = j * (j + 1), {1: -np.ones_like(m), 0: np.sign(m), -1: np.ones_like(m)}[k_step]
    else:
        square = {1: (j - m) * (j - m + 1) / 2, 0: (j - m) * (j + m), -1: (j + m + 1) * (j + m) / 2}
        norm, sign = j * (2 * j + 1), (-1.0 if k_step == 0 else 1.0) * np.ones_like(m)
    exists = (np.abs(m) <= upper) & (np.abs(k) <= j) & (norm > 0)
    value = np.where(exists, square[k_step], 0.0) / np.where(exists, norm, 1.0)
    return np.asarray(sign * np.sqrt(value))
