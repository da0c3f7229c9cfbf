"""What of the embedded lists was never compared with real spectra, on what it rests, and published band intensities."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.accuracyfile import JudgedWindow, Judgement, UnseenWindow
from planner.spectroscopy.claims import claim_of
from planner.spectroscopy.coverage import Interval, subtract
from planner.spectroscopy.heights import bin_edges
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import Constants, build_lines, read_constants, smooth_cross_section
from planner.spectroscopy.store import Store
from planner.spectroscopy.windows import band_windows
from planner.studies.judging import smooth_sum_cm, sum_cm

__all__ = ["PublishedBand", "parse_published", "published_bands", "unseen_windows"]

PUBLISHED_FILE = "published.toml"
_SHOWS_CM2 = 3.3e-26
"""Mean cross-section from which a bin reaches half a scale height at a mixing ratio of 1e-2 (1e-4: a hundred times)."""
_STRONG_GASES = 100.0
"""Gases without lines are judged up to 1e-4 only; see `planner.spectroscopy.accuracy.STRONG_MARKS`."""
_RESOLVING_POWER = 100.0
_TEMPERATURE_K = 250.0
_SMOOTH_STEP_PER_CM = 0.5


@dataclass(frozen=True, kw_only=True)
class PublishedBand:
    """A published band intensity at 296 K."""

    gas: str
    from_per_cm: float
    to_per_cm: float
    sum_cm: float
    within_factor: float
    """What the source says of its error, or what is known of such figures."""
    source: str

    @property
    def reach(self) -> Interval:
        """Where its sum is taken."""
        return self.from_per_cm, self.to_per_cm

    def agrees(self, sum_cm: float) -> bool:
        """Whether a sum lies within its factor."""
        return 1.0 / self.within_factor <= sum_cm / self.sum_cm <= self.within_factor

    def words(self, sum_cm: float) -> str:
        """How a sum compares with it, in words."""
        return (
            f"{sum_cm / self.sum_cm:.2f} of the published {self.sum_cm:.2g} at {self.from_per_cm:g}-{self.to_per_cm:g} "
            f"per cm, {'within' if self.agrees(sum_cm) else 'not within'} its factor {self.within_factor:g} "
            f"({self.source})"
        )


def published_bands() -> tuple[PublishedBand, ...]:
    """The published band intensities that ship with the lists."""
    path = data_folder("linelists") / PUBLISHED_FILE
    return parse_published(path.read_text(encoding="utf-8"), path)


def parse_published(text: str, where: Path) -> tuple[PublishedBand, ...]:
    """Published bands from a text; ``where`` is named in errors.

    Raises
    ------
    LineDataError
        If the text breaks its layout.
    """
    try:
        table = tomllib.loads(text)
        return tuple(
            PublishedBand(
                gas=row["gas"],
                from_per_cm=float(row["range_per_cm"][0]),
                to_per_cm=float(row["range_per_cm"][1]),
                sum_cm=float(row["sum_cm"]),
                within_factor=float(row["within_factor"]),
                source=table["sources"][row["source"]],
            )
            for row in table["band"]
        )
    except (tomllib.TOMLDecodeError, KeyError, IndexError, TypeError, ValueError) as error:
        raise LineDataError(f"{where}: not a table of published band intensities: {error!r}") from error


def unseen_windows(
    formulas: Iterable[str], judged: Sequence[JudgedWindow], published: Sequence[PublishedBand], store: Store
) -> tuple[UnseenWindow, ...]:
    """Band regions of these gases that no judged window covers, where the gas can show at all."""
    found: list[UnseenWindow] = []
    for formula in sorted(formulas):
        constants = read_constants(formula)
        lines = build_lines(constants, store)
        mine = [row for row in judged if row.gas == formula and row.verdict is not Judgement.NARROW]
        seen = [(row.from_per_cm, row.to_per_cm) for row in mine]
        bands = [band for band in published if band.gas == formula]
        for window in _showing(constants, lines, subtract(constants.covers_per_cm, seen)):
            found.append(_row(constants, lines, window, bands))
    return tuple(found)


def _showing(constants: Constants, lines: Lines | None, free: Sequence[Interval]) -> list[Interval]:
    """Band regions of free intervals whose bins of R = 100 absorb enough to show."""
    least_cm2 = _SHOWS_CM2 if constants.line_parts else _STRONG_GASES * _SHOWS_CM2
    windows: list[Interval] = []
    for interval in free:
        edges = bin_edges(interval, _RESOLVING_POWER)
        means = _means_cm2(constants, lines, edges)
        shows = np.flatnonzero(means > least_cm2)
        ends = np.stack([edges[shows], edges[shows + 1]], axis=1).ravel()
        windows += band_windows(ends, np.repeat(means[shows], 2), interval)
    return windows


def _means_cm2(constants: Constants, lines: Lines | None, edges: NDArray[np.float64]) -> NDArray[np.float64]:
    """Mean cross-section per bin, lines at 296 K and smooth parts at 250 K, shape ``(bin,)``."""
    total = np.zeros(edges.size - 1)
    if lines is not None:
        total += np.histogram(lines.wavenumber_per_cm, edges, weights=lines.intensity_cm)[0] / np.diff(edges)
    if constants.smooth_parts:
        grid = np.arange(edges[0], edges[-1], _SMOOTH_STEP_PER_CM)
        smooth = smooth_cross_section(constants, grid, _TEMPERATURE_K)
        counts = np.maximum(np.histogram(grid, edges)[0], 1)
        total += np.histogram(grid, edges, weights=smooth)[0] / counts
    return total


def _row(
    constants: Constants, lines: Lines | None, window: Interval, published: Sequence[PublishedBand]
) -> UnseenWindow:
    claim = claim_of(constants, lines, window)
    mine = [band for band in published if window[0] <= 0.5 * (band.from_per_cm + band.to_per_cm) < window[1]]
    sums = {band: _sum_cm(constants, lines, band.reach) for band in mine}
    total = _sum_cm(constants, lines, window)
    checked = [band.within_factor for band in mine if band.agrees(sums[band]) and sums[band] > 0.5 * total]
    return UnseenWindow(
        gas=constants.molecule.formula,
        from_per_cm=round(window[0], 1),
        to_per_cm=round(window[1], 1),
        sum_cm=float(f"{total:.3g}"),
        strength_factor=round(min([claim.strength_factor, *checked]), 2),
        rests_on=claim.sources[0] if claim.sources else "source not named",
        published="; ".join(band.words(sums[band]) for band in mine),
    )


def _sum_cm(constants: Constants, lines: Lines | None, window: Interval) -> float:
    return sum_cm(lines, window) + smooth_sum_cm(constants, window)
