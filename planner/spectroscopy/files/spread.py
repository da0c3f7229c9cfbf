"""What becomes of negative values where an opacity is needed."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["SPREAD_RULE", "spread_negatives"]

SPREAD_RULE = "negative values are averaged with their neighbours until none is left, which keeps the integral"


def spread_negatives(values: NDArray[np.float64], widths: NDArray[np.float64]) -> NDArray[np.float64]:
    """Values without negative ones, with the same integral.

    Noise around zero has both signs; setting its negative half to zero would leave absorption that is not there.
    Instead blocks of 2, 4, 8 ... points that still hold a negative value are replaced by their mean, until none is
    negative. Blocks without one are not touched. Where even the mean of all is negative the result is zero.

    Parameters
    ----------
    values : (point,) ndarray
    widths : (point,) ndarray
        Share of each point in the integral, > 0.
    """
    count = values.size
    padded = 1 << max(count - 1, 1).bit_length()
    result, weight = np.zeros(padded), np.zeros(padded)
    result[:count], weight[:count] = values, widths
    size = 1
    while size < padded and result.min() < 0:
        size *= 2
        blocks, shares = result.reshape(-1, size), weight.reshape(-1, size)
        bad = blocks.min(axis=1) < 0
        mean = np.sum(blocks[bad] * shares[bad], axis=1) / np.sum(shares[bad], axis=1)
        blocks[bad] = np.where(shares[bad] > 0, mean[:, np.newaxis], 0.0)
    return np.maximum(result[:count], 0.0)
