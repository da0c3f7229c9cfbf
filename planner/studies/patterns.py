"""Sets of gases in one mode: what they are worth together, and which of them could be dropped.

Gases that the same mode sees cost no further time. A set is judged with its nuisances shared: the depth that all its
gases make goes into the significance, the products of their templates into the joint information.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import ceil

import numpy as np
from numpy.typing import NDArray

from planner.detection.pattern import Evidence, Levels, bits_of_evidence, lone_evidence, pattern_bits
from planner.detection.significance import Measurement, target_snr
from planner.detection.worth import Channel, Occurrence
from planner.scenario.records import Case
from planner.studies.choices import Pattern
from planner.studies.survey import Survey, snr_after
from planner.studies.workshop import measurement_of

__all__ = ["LITERATURE", "Candidate", "find_patterns"]

Array = NDArray[np.float64]

LITERATURE = (
    ("CH4", "CO2", "CO"),  # methane beside CO2 and without CO: Krissansen-Totton et al. 2018, AJ 156, 114
    ("N2O", "O3", "CH4"),  # oxygen's product with two reduced gases: Lovelock 1965, Nature 207, 568, in its spirit
    ("CCl3F", "CCl2F2", "CF4"),  # gases that industry makes: Haqq-Misra et al. 2022, PSJ 3, 60, and common practice
)
_MOST_MEMBERS = 4
_LEAST_GAIN = 0.05
"""A gas joins a set, and stays in it, for at least this share of the information."""
_LEAST_SNR = 0.3
"""A set is judged with a mode if two of its gases at least can reach this."""
_ROUNDING_BITS = 1e-12
_SEARCH_DRAWS = 2000
_DRAWS = 1500
_LEVELS = 60


@dataclass(frozen=True, kw_only=True, eq=False)
class Candidate:
    """A gas with a mode, for membership."""

    gas: str
    index: int
    channel: Channel
    if_true: Occurrence
    if_false: Occurrence
    bits: float
    """By itself."""


def find_patterns(
    survey: Survey,
    candidates: Sequence[Candidate],
    asked: Sequence[tuple[str, ...]],
    prior: float,
    rng: np.random.Generator,
) -> list[Pattern]:
    """Sets with each mode, the most worth first: those asked for, those of the literature, and those found.

    Parameters
    ----------
    survey : Survey
        That has seen the gases.
    candidates : sequence of Candidate
        Every gas with every mode.
    asked : sequence of sets of gases
    prior : float
        Of the hypothesis.
    rng : Generator
    """
    gases = {candidate.gas for candidate in candidates}
    wanted: dict[tuple[frozenset[str], int], tuple[tuple[str, ...], str]] = {}
    modes = sorted({candidate.index for candidate in candidates})
    for how, sets in (("asked for", asked), ("literature", LITERATURE)):
        for members in sets:
            if gases.issuperset(members):
                for index in modes:
                    wanted.setdefault((frozenset(members), index), (members, how))
    for index in modes:
        members = _greedy([c for c in candidates if c.index == index], prior, rng)
        wanted.setdefault((frozenset(members), index), (members, "found by adding what tells most"))
    by_place = {(candidate.gas, candidate.index): candidate for candidate in candidates}
    judge = _Judge(survey, by_place, prior, rng)
    found = [judge.pattern(members, index, how) for (_, index), (members, how) in wanted.items()]
    return sorted((pattern for pattern in found if pattern), key=lambda pattern: -pattern.joint.bits)


def _greedy(candidates: Sequence[Candidate], prior: float, rng: np.random.Generator) -> tuple[str, ...]:
    """Start from the gas that is worth most, add what tells most beside it; templates taken as uncorrelated."""
    evidence = {c.gas: _evidence(c, rng) for c in candidates if c.bits > _ROUNDING_BITS}
    nothing = Evidence(in_true=np.zeros(_SEARCH_DRAWS), in_false=np.zeros(_SEARCH_DRAWS))
    members: list[str] = []
    whole, bits = nothing, 0.0
    while len(members) < _MOST_MEMBERS and len(members) < len(evidence):
        tried = {g: bits_of_evidence(whole + e, prior)[0] for g, e in evidence.items() if g not in members}
        best = max(tried, key=lambda gas: tried[gas])
        if tried[best] < bits * (1 + _LEAST_GAIN) or tried[best] == 0:
            break
        members.append(best)
        whole, bits = whole + evidence[best], tried[best]
    return tuple(members)


def _evidence(candidate: Candidate, rng: np.random.Generator) -> Evidence:
    """Log likelihood ratios of drawn amplitudes of one gas."""
    levels = Levels.make(candidate.channel, candidate.if_true, candidate.if_false, _LEVELS)
    return lone_evidence(levels, rng, _SEARCH_DRAWS)


class _Judge:
    """Judges one set after another; the spectra of a set serve all modes."""

    def __init__(
        self,
        survey: Survey,
        candidates: dict[tuple[str, int], Candidate],
        prior: float,
        rng: np.random.Generator,
    ) -> None:
        self._survey, self._candidates, self._prior, self._rng = survey, candidates, prior, rng
        self._seen: dict[frozenset[str], list[tuple[Measurement, Array]]] = {}

    def pattern(self, gases: tuple[str, ...], index: int, how: str) -> Pattern | None:
        """The set with one mode; nothing where fewer than two of its gases show, or none tells anything."""
        members = [self._candidates[gas, index] for gas in gases]
        showing = sum(bool(member.channel.snr.max() >= _LEAST_SNR) for member in members)
        if showing < 2 or not any(member.bits > _ROUNDING_BITS for member in members):
            return None
        measurement, correlation = self._look(gases)[index]
        goal, view = self._survey.scenario.goal, self._survey.workshop.views[index]
        triples = [(member.channel, member.if_true, member.if_false) for member in members]
        joint = pattern_bits(triples, correlation, self._prior, self._rng, _DRAWS)
        unrounded = measurement.transits_for(target_snr(goal.threshold_sigma, goal.power))
        single = max((c for (_, i), c in self._candidates.items() if i == index), key=lambda c: c.bits)
        kept = (1 - _LEAST_GAIN) * joint.bits
        return Pattern(
            gases=gases,
            mode=view.mode.name,
            how=how,
            snr=snr_after(measurement, self._survey.transits[index]),
            transits_required=None if unrounded is None else max(1, ceil(unrounded - 1e-9)),
            joint=joint,
            alone_bits=tuple(member.bits for member in members),
            droppable=tuple(gas for gas, left in zip(gases, joint.without, strict=True) if left >= kept),
            best_single=(single.gas, single.bits),
        )

    def _look(self, gases: tuple[str, ...]) -> list[tuple[Measurement, Array]]:
        """Per mode: the measurement of the depth that all make, and the correlations of their templates."""
        key = frozenset(gases)
        if key not in self._seen:
            self._seen[key] = self._see(gases)
        return self._seen[key]

    def _see(self, gases: tuple[str, ...]) -> list[tuple[Measurement, Array]]:
        survey, workshop = self._survey, self._survey.workshop
        case = Case(gases=gases, mixing_ratios=tuple(map(survey.reference, gases)))
        there = survey.model.binned(case, shares_of=gases)
        null = survey.model.binned(case, transparent=gases)
        nuisances = survey.nuisances_of(gases)
        result = []
        for index, view in enumerate(workshop.views):
            usable = np.isfinite(view.noise.depth_error_ppm) & ~view.noise.saturated
            whole = there[index].depth_ppm - null[index].depth_ppm
            measurement = measurement_of(view, whole, usable, nuisances, index)
            shares = [there[index].shares_ppm[gas][usable] for gas in gases]
            result.append((measurement, _correlation(measurement, shares, max(survey.transits[index], 1))))
        return result


def _correlation(measurement: Measurement, templates: Sequence[Array], transits: float) -> Array:
    """Products of unit templates in the metric of noise and nuisances, from ``|a + b|^2 - |a|^2 - |b|^2``."""
    count = len(templates)

    def length(template: Array) -> float:
        return snr_after(replace(measurement, template_ppm=template), transits)

    lengths = [length(template) for template in templates]
    matrix = np.eye(count)
    for i in range(count):
        for j in range(i):
            if lengths[i] > 0 and lengths[j] > 0:
                a, b = templates[i] / lengths[i], templates[j] / lengths[j]
                matrix[i, j] = matrix[j, i] = np.clip((length(a + b) ** 2 - 2) / 2, -1, 1)
    return matrix
