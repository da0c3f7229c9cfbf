"""What a constants file says of itself: the sums of its bands, their sources, and how good the sources claim to be."""

from __future__ import annotations

import re
from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from math import exp, log
from typing import Any

import numpy as np

from planner.spectroscopy.coverage import Interval
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import Constants, smooth_cross_section

__all__ = ["BandRow", "Claim", "band_rows", "claim_of", "plain_label", "stated_factor"]

_FITTED = re.compile(r"\bfit|\btotals of\b|\bsums? of the lines\b", re.IGNORECASE)
_UNSURE = re.compile(r"memory|guess|rule|estimate|rough|scaled|isotopic", re.IGNORECASE)
_NUMBER = r"(\d+(?:\.\d+)?)"
_FACTOR = re.compile(rf"factor (?:of )?{_NUMBER}(?: ?(?:-|to) ?{_NUMBER})?", re.IGNORECASE)
_PERCENT = re.compile(rf"{_NUMBER}(?: ?(?:-|to) ?{_NUMBER})? ?%")
_FITTED_FACTOR, _PUBLISHED_FACTOR, _UNSURE_FACTOR = 1.05, 1.1, 2.0
"""Where a source names no error: what HITRAN gives for well-known bands, what it gives for others, and caution."""

_SUM_COLUMN = {"linear": 3, "linear-pi": 2, "asymmetric": 3, "symmetric": 3}
"""Column of the sum in the band rows of each kind; upper and lower level come first, the source last."""
_LABEL_LENGTH = 15
"""Of HITRAN's records."""
_REACH_PER_CM = 100.0
"""How far lines without labels are taken to lie from the origin of their band."""
_REFERENCE_K = 296.0
_SMOOTH_STEP_PER_CM = 1.0


@dataclass(frozen=True, kw_only=True)
class BandRow:
    """One band, or set of coupled bands, of a constants file.

    ``uppers`` and ``lower`` are state names as `plain_label` gives them; ``origin_per_cm`` is None where the lines
    carry the names themselves.
    """

    isotopologue: int
    uppers: tuple[str, ...]
    lower: str
    sum_cm: float
    source: str
    origin_per_cm: float | None = None


@dataclass(frozen=True, kw_only=True)
class Claim:
    """On what the strength of a list rests in a stretch, by intensity.

    Attributes
    ----------
    fitted_fraction : float
        Share of the intensity whose band was fitted to real data.
    strength_factor : float
        Factor by which the strength may be wrong: the geometric mean of what the sources state.
    sources : tuple of str
        The sources, the most intensity first.
    """

    fitted_fraction: float
    strength_factor: float
    sources: tuple[str, ...]


def claim_of(constants: Constants, lines: Lines | None, stretch_per_cm: Interval) -> Claim:
    """What a molecule's constants say about a stretch; ``lines`` are all its lines, None if it has none."""
    weights: dict[str, float] = defaultdict(float)
    if lines is not None:
        _add_lines(weights, constants, lines, stretch_per_cm)
    _add_smooth(weights, constants, stretch_per_cm)
    total = sum(weights.values())
    if not total:
        return Claim(fitted_fraction=0.0, strength_factor=_UNSURE_FACTOR, sources=())
    texts = {key: constants.sources.get(key, key or "source not named") for key in weights}
    return Claim(
        fitted_fraction=sum(weight for key, weight in weights.items() if _is_fitted(texts[key])) / total,
        strength_factor=exp(sum(weight * log(stated_factor(texts[key])) for key, weight in weights.items()) / total),
        sources=tuple(texts[key] for key in sorted(weights, key=lambda key: -weights[key])),
    )


def stated_factor(text: str) -> float:
    """Factor by which a strength may be wrong by the words of its source: the largest error it names, else by its kind.

    ``"factor 2"`` gives 2, ``"20-30 %"`` 1.3; without a figure a fitted source counts as good to 5 %, a published
    one to 10 %, anything from memory, guessed or by rule to a factor 2.
    """
    factors = [float(value) for match in _FACTOR.finditer(text) for value in match.groups() if value]
    factors += [1.0 + float(value) / 100.0 for match in _PERCENT.finditer(text) for value in match.groups() if value]
    if factors:
        return max(factors)
    if _is_fitted(text):
        return _FITTED_FACTOR
    return _UNSURE_FACTOR if _UNSURE.search(text) else _PUBLISHED_FACTOR


def band_rows(part: Mapping[str, Any]) -> Iterator[BandRow]:
    """The bands of one part; none for kinds without band rows."""
    for table in part.get("species", (part,)):
        isotopologue = int(table.get("isotopologue", 1))
        if part["kind"] in _SUM_COLUMN:
            origins = _origins(part)
            for row in table.get("bands", ()):
                upper, lower = plain_label(row[0]), plain_label(row[1])
                yield BandRow(
                    isotopologue=isotopologue,
                    uppers=(upper,),
                    lower=lower,
                    sum_cm=float(row[_SUM_COLUMN[part["kind"]]]),
                    source=str(row[-1]),
                    origin_per_cm=origins[upper] - origins[lower] if upper in origins else None,
                )
        for group in table.get("coupled", ()):
            uppers = tuple(plain_label(name) for name in group.get("states") or (group["a1"], group["e"]))
            lower, origins = plain_label(group["lower"]), _origins(part)
            yield BandRow(
                isotopologue=isotopologue,
                uppers=uppers,
                lower=lower,
                sum_cm=float(group["sum_cm"]),
                source=str(group.get("source", part.get("source", ""))),
                origin_per_cm=origins[uppers[0]] - origins[lower] if uppers[0] in origins else None,
            )
        for band in table.get("band", ()):
            upper = plain_label(f"{band['upper']} {band['vibration']}")
            yield BandRow(
                isotopologue=isotopologue,
                uppers=(upper,),
                lower="X0",
                sum_cm=float(band["band_sum_cm"]),
                source=str(band["source"]),
            )


def plain_label(name: Any) -> str:
    """A state's name, as far as records hold it, without blanks, marks of mixing and the electronic state of NO."""
    return re.sub(r"^X\d/2|[\s*]", "", str(name)[:_LABEL_LENGTH].strip())


def _is_fitted(text: str) -> bool:
    """Whether a text speaks of a fit before it speaks of memory or guesses."""
    fitted, unsure = _FITTED.search(text), _UNSURE.search(text)
    return fitted is not None and (unsure is None or fitted.start() < unsure.start())


def _origins(part: Mapping[str, Any]) -> dict[str, float]:
    """Origins of the levels of a symmetric top, whose lines carry no names; empty for other kinds."""
    if part["kind"] != "symmetric":
        return {}
    return {plain_label(row[0]): float(row[2][0]) for row in part["levels"]}


def _add_lines(weights: dict[str, float], constants: Constants, lines: Lines, stretch: Interval) -> None:
    """Share the intensity of the lines in the stretch out among the sources of their bands."""
    first, last = np.searchsorted(lines.wavenumber_per_cm, stretch)
    here = lines.where(np.arange(first, last))
    rows = [row for part in constants.line_parts for row in band_rows(part)]
    source_of = {(row.isotopologue, upper, row.lower): row.source for row in rows for upper in row.uppers}
    nameless = _nameless_shares(constants, rows, stretch)
    labels = np.stack([here.isotopologue.astype(str), here.upper_global, here.lower_global])
    kinds, member = np.unique(labels, axis=1, return_inverse=True)
    sums = np.bincount(member.ravel(), here.intensity_cm, minlength=kinds.shape[1])
    for (isotopologue, upper, lower), intensity in zip(kinds.T.tolist(), sums.tolist(), strict=True):
        source = source_of.get((int(isotopologue), plain_label(upper), plain_label(lower)))
        for key, share in ({source: 1.0} if source is not None else nameless).items():
            weights[key] += share * intensity


def _nameless_shares(constants: Constants, rows: list[BandRow], stretch: Interval) -> dict[str, float]:
    """Shares of the sources in lines whose names lead to no row: bands by their origins, bins, else whole parts."""
    found: dict[str, float] = defaultdict(float)
    for row in rows:
        if row.origin_per_cm is not None and _overlap(stretch, row.origin_per_cm, row.origin_per_cm, _REACH_PER_CM):
            found[row.source] += row.sum_cm
    for part in constants.line_parts:
        for low, high, intensity, *_ in part.get("bins", ()):
            if _overlap(stretch, low, high):
                found[str(part.get("source", ""))] += intensity
    if not found:
        found |= {str(part.get("source", "")): 1.0 for part in constants.line_parts}
    total = sum(found.values())
    return {key: value / total for key, value in found.items()}


def _overlap(stretch: Interval, low: float, high: float, margin: float = 0.0) -> bool:
    return low - margin < stretch[1] and high + margin > stretch[0]


def _add_smooth(weights: dict[str, float], constants: Constants, stretch: Interval) -> None:
    """Add the integral of every smooth part over the stretch to its source."""
    grid = np.arange(*stretch, _SMOOTH_STEP_PER_CM)
    for part in constants.smooth_parts:
        values = smooth_cross_section(replace(constants, smooth_parts=(part,)), grid, _REFERENCE_K)
        if values is not None and np.any(values > 0):
            weights[str(part.get("source", ""))] += float(values.sum()) * _SMOOTH_STEP_PER_CM
