"""Check 3: the other bands of the gas, in the observed range and in other modes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import sqrt

import numpy as np

from planner.catalogue.read import find_gas, has_gas
from planner.report.words import band_text, gas_text
from planner.studies.checks.bench import Bench
from planner.studies.checks.elsewhere import Prospect
from planner.studies.checks.findings import NEEDED_SIGMA, Check, Finding, Outcome

__all__ = ["BandSize", "bands_in_range", "check_companions"]

_VISIBLE_SIGMA = NEEDED_SIGMA
_SHOWN = 3
_WHY = "A gas has several bands of known relative strength: one alone could be anything, and one missing is telling."


@dataclass(frozen=True, kw_only=True)
class BandSize:
    """Bands of the gas that touch, as they would show at the claimed amount."""

    from_um: float
    to_um: float
    height_ppm: float
    sigma: float
    """Over the level beside it with the claim's errors, all else known."""


def bands_in_range(bench: Bench) -> tuple[BandSize, ...]:
    """The stretches of the catalogue's bands inside the spectrum, strongest first; empty without errors."""
    if bench.error_ppm is None or not has_gas(bench.gas):
        return ()
    found = []
    over_level = bench.template_ppm - bench.template_ppm.min()
    for low, high in _stretches(bench):
        inside = (bench.bins.centre_um >= low) & (bench.bins.centre_um <= high)
        if inside.any():
            sigma = sqrt(float(np.sum((over_level[inside] / bench.error_ppm[inside]) ** 2)))
            height = float(over_level[inside].max())
            found.append(BandSize(from_um=low, to_um=high, height_ppm=height, sigma=sigma))
    return tuple(sorted(found, key=lambda band: -band.sigma))


def _stretches(bench: Bench) -> list[tuple[float, float]]:
    """Bands of the catalogue inside the spectrum, those that overlap joined."""
    first, last = float(bench.bins.from_um.min()), float(bench.bins.to_um.max())
    joined: list[tuple[float, float]] = []
    for band in find_gas(bench.gas).bands:
        low, high = max(band.from_um, first), min(band.to_um, last)
        if low >= high:
            continue
        if joined and low <= joined[-1][1]:
            joined[-1] = (joined[-1][0], max(high, joined[-1][1]))
        else:
            joined.append((low, high))
    return joined


def check_companions(bench: Bench | None, prospects: Sequence[Prospect]) -> Finding:
    """Which other bands should show, and whether the claim says that they do."""
    tested = "every other band of the gas in the spectrum and in other modes, predicted size against error"
    if bench is None or bench.error_ppm is None:
        missing = "star, planet or air are not given" if bench is None else bench.unweighed
        return Finding(check=Check.COMPANIONS, outcome=Outcome.UNTESTED, tested=tested, says=missing, why=_WHY)
    bands = bands_in_range(bench)
    others = [band for band in bands if not _claimed(bench, band, bands)]
    visible = [band for band in others if band.sigma >= _VISIBLE_SIGMA]
    word, sigma = bench.claim.claim.other_bands, bench.claim.claim.sigma or 0.0
    figures: dict[str, float | str | None] = {
        f"{band_text(band.from_um, band.to_um)} um (sigma)": band.sigma for band in bands
    }
    figures |= {f"{p.mode} (ppm)": p.height_ppm for p in prospects}
    says, outcome, left = _visible_words(visible, word, sigma)
    if not visible:
        faint = ", ".join(f"{band_text(b.from_um, b.to_um)} um ({b.sigma:.1g} sigma)" for b in others[:_SHOWN])
        says = "it rests on one band" + (f"; others are too faint to tell: {faint}" if faint else " in this range")
        says += _elsewhere(bench, prospects)
    return Finding(
        check=Check.COMPANIONS,
        outcome=outcome,
        tested=tested,
        says=f"{gas_text(bench.gas)}: {says}",
        why=_WHY,
        figures=figures,
        left_sigma=left,
    )


def _visible_words(visible: Sequence[BandSize], word: str, sigma: float) -> tuple[str, Outcome, float | None]:
    named = ", ".join(
        f"{band_text(b.from_um, b.to_um)} um ({b.height_ppm:.3g} ppm, {b.sigma:.2g} sigma)" for b in visible[:_SHOWN]
    )
    if visible and word == "not seen":
        missing = sqrt(sum(band.sigma**2 for band in visible))
        left = sqrt(max(0.0, sigma**2 - missing**2))
        return f"bands that should show are not seen: {named}", Outcome.FAILED, left
    if visible and word == "seen":
        return f"other bands that should show are seen: {named}", Outcome.PASSED, None
    return f"other bands should show, and the claim does not tell of them: {named}", Outcome.UNTESTED, None


def _claimed(bench: Bench, band: BandSize, bands: Sequence[BandSize]) -> bool:
    """Whether a stretch is the one that the claim rests on: the one named, else the strongest."""
    low, high = bench.claim.claim.feature_from_um, bench.claim.claim.feature_to_um
    if low is None or high is None:
        return band is bands[0]
    return band.from_um < high and band.to_um > low


def _elsewhere(bench: Bench, prospects: Sequence[Prospect]) -> str:
    """The mode that would show another band best."""
    low, high = bench.claim.claim.from_um, bench.claim.claim.to_um
    outside = [p for p in prospects if p.band_um[0] > high or p.band_um[1] < low]
    if not outside:
        return ""
    best = max(outside, key=lambda p: p.snr_one_transit)
    return (
        f"; {band_text(*best.band_um)} um would show {best.height_ppm:.3g} ppm, {best.snr_one_transit:.2g} sigma in "
        f"one transit with {best.mode}"
    )
