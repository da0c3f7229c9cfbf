"""The wavenumber samples of the forward model: even in the logarithm, and the same points for every scenario."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import ceil, floor, log

import numpy as np
from numpy.typing import NDArray

from planner.errors import RangeError

__all__ = ["BLOCK", "SAMPLES_PER_UNIT_LN", "LogGrid"]

SAMPLES_PER_UNIT_LN = 50_000
"""500 samples in a bin of R = 100; at R = 100 the sampling noise is 0.03 to 0.07 scale heights rms."""

BLOCK = 16_384
"""Tables are built and stored in blocks of this many samples, counted from 1 per cm."""


@dataclass(frozen=True, kw_only=True)
class LogGrid:
    """Samples ``exp(k / samples_per_unit_ln)`` per cm for ``k = first ... first + count - 1``.

    The points depend on ``samples_per_unit_ln`` alone, so two grids of one density share their common points.
    """

    first: int
    count: int
    samples_per_unit_ln: int = SAMPLES_PER_UNIT_LN

    @classmethod
    def covering(cls, from_um: float, to_um: float, samples_per_unit_ln: int = SAMPLES_PER_UNIT_LN) -> LogGrid:
        """The smallest grid that covers a wavelength range.

        Raises
        ------
        RangeError
            If the range is empty or the sampling coarser than ``SAMPLES_PER_UNIT_LN``.
        """
        if not 0 < from_um < to_um:
            raise RangeError(f"wavelength range: expected 0 < from < to in um, got {from_um:g} to {to_um:g}")
        if samples_per_unit_ln < SAMPLES_PER_UNIT_LN:
            raise RangeError(
                f"sampling: expected at least {SAMPLES_PER_UNIT_LN} samples per unit of ln(wavenumber), "
                f"got {samples_per_unit_ln}; coarser sampling adds noise to the spectrum"
            )
        first = floor(log(1e4 / to_um) * samples_per_unit_ln)
        last = ceil(log(1e4 / from_um) * samples_per_unit_ln)
        return cls(first=first, count=last - first + 1, samples_per_unit_ln=samples_per_unit_ln)

    @cached_property
    def wavenumber_per_cm(self) -> NDArray[np.float64]:
        """Samples in ascending wavenumber, shape ``(wavenumber,)``."""
        samples = np.exp(np.arange(self.first, self.first + self.count) / self.samples_per_unit_ln)
        samples.flags.writeable = False
        return samples

    @property
    def wavelength_um(self) -> NDArray[np.float64]:
        """The same samples as vacuum wavelengths, descending."""
        return 1e4 / self.wavenumber_per_cm

    def blocks(self) -> list[LogGrid]:
        """The whole blocks of ``BLOCK`` samples that cover this grid, in order."""
        start, stop = self.first // BLOCK, (self.first + self.count - 1) // BLOCK
        return [
            LogGrid(first=k * BLOCK, count=BLOCK, samples_per_unit_ln=self.samples_per_unit_ln)
            for k in range(start, stop + 1)
        ]

    def part_of(self, block: LogGrid) -> tuple[slice, slice]:
        """Where a block and this grid overlap: the slice of this grid and the slice of the block."""
        low = max(self.first, block.first)
        high = min(self.first + self.count, block.first + block.count)
        return slice(low - self.first, high - self.first), slice(low - block.first, high - block.first)
