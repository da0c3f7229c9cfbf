"""Wavelength bins of a mode."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.instrument.modes import Mode, Photometer, Spectrometer, interpolate

__all__ = ["Bins", "make_bins"]

_TINY = 1e-9  # relative; keeps rounding from making an empty bin at a grid edge


@dataclass(frozen=True, kw_only=True, eq=False)
class Bins:
    """Bins of a mode, ordered by detector, then by wavelength. All arrays have shape ``(bin,)``, read-only.

    Attributes
    ----------
    detector : int64
        Index into ``Mode.detectors``.
    from_um, to_um : float64
        Edges, ``0 < from_um < to_um``.
    """

    detector: NDArray[np.int64]
    from_um: NDArray[np.float64]
    to_um: NDArray[np.float64]

    def __post_init__(self) -> None:
        for name, kind in (("detector", np.int64), ("from_um", np.float64), ("to_um", np.float64)):
            value = np.array(getattr(self, name), dtype=kind)
            value.flags.writeable = False
            object.__setattr__(self, name, value)
        if not self.detector.shape == self.from_um.shape == self.to_um.shape or self.detector.ndim != 1:
            raise ValueError("Bins: expected three arrays of one shape (bin,)")
        if not np.all((self.from_um > 0) & (self.to_um > self.from_um)):
            raise ValueError("Bins: expected 0 < from_um < to_um in every bin")

    def __len__(self) -> int:
        return int(self.detector.size)

    @property
    def centre_um(self) -> NDArray[np.float64]:
        """Geometric mean of the edges."""
        return np.sqrt(self.from_um * self.to_um)

    @property
    def width_ln(self) -> NDArray[np.float64]:
        """Width in ln(wavelength)."""
        return np.log(self.to_um / self.from_um)

    @property
    def resolving_power(self) -> NDArray[np.float64]:
        """One over the width in ln(wavelength)."""
        return 1.0 / self.width_ln


def make_bins(mode: Mode, resolving_power: float = 100.0) -> Bins:
    """Bins of the asked resolving power R or of one resolution element, whichever is coarser.

    Where the element permits, edges lie at ``ln(wavelength / 1 um) = k / R`` with whole k, the same for all modes,
    so that bins of 4 R nest in bins of R. Where the element is the coarser, bins of one element follow each other
    from the left. Bins end where a range of a detector ends. A remainder at either end of a range joins its
    neighbour if it is narrower than half the asked width or than the element there; otherwise it is a bin of its
    own. So no bin is narrower than the element at its centre, unless a whole range is, and none crosses a gap. A
    photometer is one bin.

    Parameters
    ----------
    mode : Mode
    resolving_power : float
        R, at least 1.

    Raises
    ------
    ValueError
        If ``resolving_power`` is below 1 or not finite.
    """
    if not (math.isfinite(resolving_power) and resolving_power >= 1):
        raise ValueError(f"resolving_power: expected a finite number from 1, got {resolving_power}")
    rows: list[tuple[int, float, float]] = []
    for index, detector in enumerate(mode.detectors):
        for start_um, end_um in detector.ranges_um:
            if isinstance(detector, Photometer):
                edges = [start_um, end_um]
            else:
                edges = _edges(detector, start_um, end_um, resolving_power)
            rows += [(index, low, high) for low, high in itertools.pairwise(edges)]
    indices, lows, highs = zip(*rows, strict=True)
    return Bins(detector=np.array(indices), from_um=np.array(lows), to_um=np.array(highs))


def _edges(detector: Spectrometer, start_um: float, end_um: float, resolving_power: float) -> list[float]:
    """Edges of the bins of one range, both ends included."""
    last = math.log(end_um)
    inner = [edge for edge in _walk(detector, math.log(start_um), last, resolving_power) if edge < last - _TINY]
    if inner:
        remainder = last - inner[-1]
        element = _element(detector, (inner[-1] + last) / 2)
        if remainder < max(element, 0.5 / resolving_power) * (1 - _TINY):
            inner.pop()
    return [start_um, *(math.exp(edge) for edge in inner), end_um]


def _walk(detector: Spectrometer, start: float, last: float, resolving_power: float) -> Iterator[float]:
    """Edges after ``start`` in ln(um), one bin after the other, until ``last`` is passed."""
    edge = start
    while edge < last:
        edge = _next_edge(detector, edge, resolving_power)
        yield edge


def _next_edge(detector: Spectrometer, edge: float, resolving_power: float) -> float:
    """Where the bin that starts at ``edge`` ends if nothing cuts it."""
    element = _native_width(detector, edge)
    if element > (1 + _TINY) / resolving_power:
        return edge + element
    least = max(element, 0.5 / resolving_power)
    return math.ceil((edge + least) * resolving_power - _TINY) / resolving_power


def _native_width(detector: Spectrometer, edge: float) -> float:
    """Width of a bin from ``edge`` on that is as wide as the element at its centre.

    Found by repeated substitution, which settles fast as the element changes little over itself; the element of
    the last pass is rounded up by a part in 1e9 to stay on the wide side.
    """
    width, before = _element(detector, edge), 0.0
    for _ in range(30):
        if abs(width - before) < 1e-3 * _TINY * width:
            break
        width, before = _element(detector, edge + width / 2), width
    return width * (1 + _TINY)


def _element(detector: Spectrometer, ln_um: float) -> float:
    """Width of the resolution element in ln(wavelength)."""
    return 1.0 / float(interpolate(detector.resolving_power, math.exp(ln_um)))
