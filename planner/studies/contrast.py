"""How many transits tell two atmospheres of one planet apart, and which bins do it.

Each atmosphere is the air of a scenario with all its candidates in it at the amounts stated: they are what is to be
told apart. All else is as unknown as in a plan. If A is true, B is ruled out with

    S/N^2 = t' (C_N + B_B B_B')^-1 t,    t = depth(A) - depth(B),

where ``B_B`` are the directions in which the spectrum of B can move: the distance between the spectrum of A and all
that B could be, in standard deviations. If B is true, A is ruled out with the directions of A. Nobody knows
beforehand which is true, so the number of transits asked for is the larger of the two.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import exp, inf, log, sqrt
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy import optimize, special

from planner import __version__
from planner.detection.significance import Measurement, target_snr
from planner.detection.simulate import matched_filter
from planner.scenario.records import Case, Scenario
from planner.studies.comparable import amounts_of, check_comparable
from planner.studies.contamination import bin_factors, contaminated, region_directions
from planner.studies.contrasts import ContrastResult, ContrastRow, ContrastSpectrum
from planner.studies.forward import BinnedDepth
from planner.studies.nuisances import Direction, directions, prior_widths
from planner.studies.observe import ModeView
from planner.studies.plan import CAUTIONS, assumptions, bands_of, cautions_about_star, costs_of, counts_of, gaps_of
from planner.studies.results import Counts, Verdict
from planner.studies.workshop import Progress, Workshop, measurement_of

__all__ = ["Trial", "contrast"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]

_AIR = Case(gases=(), mixing_ratios=())
"""A case that searches for nothing: the air with all its gases."""
_NO_SIGNAL_PPM = 0.1
_FIRST_LOOK = 100.0
"""Transits at which significances are compared where no number of transits is enough."""
_LEAST_LN, _MOST_LN = log(1e-6), log(1e7)


@dataclass(frozen=True, kw_only=True, eq=False)
class Trial:
    """The difference in one mode with the unknowns of the atmosphere to be ruled out, and with those of the true one.

    Attributes
    ----------
    wrong, true : Measurement
        Alike but for their directions.
    """

    wrong: Measurement
    true: Measurement

    def width(self, transits: float) -> float:
        """Standard deviation of the significance found against the wrong atmosphere.

        It would be 1 if the true one moved as the wrong one can; the unknowns of the two need not be the same.
        """
        weights = matched_filter(self.wrong, transits)
        noise = weights**2 @ self.wrong.white_ppm**2 / transits + weights @ self.wrong.floor_ppm2 @ weights
        return sqrt(noise + float(np.sum((self.true.directions_ppm @ weights) ** 2)))

    def transits_for(self, threshold_sigma: float, power: float) -> float | None:
        """The real-valued number of transits after which the wrong one is ruled out with a chance of ``power``."""
        quantile = float(special.ndtri(power))
        if quantile == 0.0 or self.wrong.snr_limit() <= threshold_sigma:
            return self.wrong.transits_for(threshold_sigma)

        def excess(transits_ln: float) -> float:
            transits = exp(transits_ln)
            return self.wrong.snr(transits) - threshold_sigma - quantile * self.width(transits)

        places = np.linspace(_LEAST_LN, _MOST_LN, 61)
        enough = [index for index, place in enumerate(places) if excess(place) >= 0]
        if not enough:
            return None
        first = enough[0]
        if first == 0:
            return exp(places[0])
        return exp(optimize.brentq(excess, places[first - 1], places[first], xtol=1e-6))


@dataclass(frozen=True, kw_only=True, eq=False)
class _Atmosphere:
    """One of the two, with the rooms set up for it."""

    scenario: Scenario
    workshop: Workshop
    held: tuple[str, ...]
    spectrum: tuple[BinnedDepth, ...]
    directions: list[Direction]

    @property
    def air(self) -> dict[str, float]:
        return self.workshop.scenario.air()


def contrast(
    first: Scenario, second: Scenario, *, lines_folder: Path | None = None, progress: Progress | None = None
) -> ContrastResult:
    """Transits that tell the atmospheres of two scenarios apart, for every mode.

    Parameters
    ----------
    first, second : Scenario
        Of one star and planet, with the same modes, goal, noise and bins, and one mixing ratio for each candidate.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.

    Raises
    ------
    ScenarioError
        If the scenarios differ in more than their air, or do not fix it.
    PlannerError
        If line data or modes cannot be read or used.
    """
    check_comparable(first, second)
    a, b = (_set_up(scenario, lines_folder, progress) for scenario in (first, second))
    pairs = [_in_mode(a, b, index) for index in range(len(a.workshop.views))]
    sentences = [s for x in (a, b) for s in (*x.workshop.line_data(), *x.workshop.store.notices)]
    return ContrastResult(
        title_a=first.title,
        title_b=second.title,
        gases_a=_listed(a),
        gases_b=_listed(b),
        held_a=a.held,
        held_b=b.held,
        invented=first.invented or second.invented,
        threshold_sigma=first.goal.threshold_sigma,
        power=first.goal.power,
        transits_available=first.goal.transits_available,
        transit_duration_h=first.transit_duration_h,
        rows=tuple(row for row, _ in pairs),
        spectra=tuple(spectrum for _, spectrum in pairs),
        line_data=tuple(dict.fromkeys(sentences)),
        assumptions=assumptions(a.workshop),
        nuisances_a=_widths(a),
        nuisances_b=_widths(b),
        cautions=(*CAUTIONS, *cautions_about_star(a.workshop)),
        version=__version__,
    )


def _set_up(scenario: Scenario, lines_folder: Path | None, progress: Progress | None) -> _Atmosphere:
    """The spectrum of a scenario's air with all candidates in it, and how it can move."""
    held = tuple(candidate.gas for candidate in scenario.candidates)
    background = {gas: share for gas, share in scenario.atmosphere.background.items() if gas not in held}
    update = {"absorbers": amounts_of(scenario), "background": background}
    full = scenario.model_copy(update={"atmosphere": scenario.atmosphere.model_copy(update=update)})
    workshop = Workshop(full, lines_folder=lines_folder, progress=progress)
    factors = bin_factors(scenario.star, workshop.views)
    clean = workshop.model.binned(_AIR, shares_of=tuple(update["absorbers"]))
    spectrum = tuple(contaminated(part, factor) for part, factor in zip(clean, factors, strict=True))
    unknown = [d for d in directions(workshop.thin, _AIR, spectrum, workshop.views) if d.name not in held]
    return _Atmosphere(
        scenario=scenario,
        workshop=workshop,
        held=held,
        spectrum=spectrum,
        directions=[*unknown, *region_directions(scenario.star, spectrum, workshop.views)],
    )


def _in_mode(a: _Atmosphere, b: _Atmosphere, index: int) -> tuple[ContrastRow, ContrastSpectrum]:
    scenario, view = a.scenario, a.workshop.views[index]
    usable = np.isfinite(view.noise.depth_error_ppm) & ~view.noise.saturated
    difference = a.spectrum[index].depth_ppm - b.spectrum[index].depth_ppm
    difference -= _untrusted(a, b, index) - _untrusted(b, a, index)
    with_a, with_b = (measurement_of(view, difference, usable, x.directions, index) for x in (a, b))
    trials = (Trial(wrong=with_b, true=with_a), Trial(wrong=with_a, true=with_b))
    counts = [_counts(trial, scenario, view) for trial in trials]
    hardest = max((0, 1), key=lambda i: _hardness(trials[i], counts[i]))
    measurement, required = trials[hardest].wrong, counts[hardest].transits_required
    target = target_snr(scenario.goal.threshold_sigma, scenario.goal.power)
    known = counts_of(measurement.known(), measurement.known().transits_for(target), scenario, view)
    look = known.transits_unrounded or _FIRST_LOOK
    shares, left = _where(measurement, required or view.on_offer(scenario))
    row = ContrastRow(
        mode=view.mode.name,
        verdict=_verdict(difference, usable, required, known.snr_limit <= target, view.on_offer(scenario)),
        transits_required=required,
        hours_required=counts[hardest].hours_required,
        b_excluded=counts[0],
        a_excluded=counts[1],
        all_known=known,
        best_bands=bands_of(view, usable, _positive(shares)),
        confusion=costs_of(measurement, look),
        confused_from=measurement.known().snr(look),
        confused_to=measurement.snr(look),
        uncovered_um=gaps_of(a.workshop, _differing(a, b), view),
        saturated_um=view.noise.saturated_um,
    )
    spectrum = ContrastSpectrum(
        mode=view.mode.name,
        detector=view.bins.detector,
        from_um=view.bins.from_um,
        to_um=view.bins.to_um,
        depth_a_ppm=a.spectrum[index].depth_ppm,
        depth_b_ppm=b.spectrum[index].depth_ppm,
        left_ppm=_on_all(left, usable),
        share=_on_all(shares, usable),
        noise_one_transit_ppm=view.noise.depth_error_ppm,
        floor_ppm=np.sqrt(np.diag(view.floor_ppm2)),
        usable=usable,
        transits=required or view.on_offer(scenario),
    )
    return row, spectrum


def _counts(trial: Trial, scenario: Scenario, view: ModeView) -> Counts:
    unrounded = trial.transits_for(scenario.goal.threshold_sigma, scenario.goal.power)
    return counts_of(trial.wrong, unrounded, scenario, view)


def _hardness(trial: Trial, counts: Counts) -> tuple[float, float]:
    """The more transits, and then the less significance, the harder."""
    transits = counts.transits_unrounded
    return (inf if transits is None else transits, -trial.wrong.snr(_FIRST_LOOK))


def _verdict(difference: Array, usable: Mask, required: int | None, floored: bool, on_offer: int) -> Verdict:
    if np.abs(difference).max(initial=0.0) < _NO_SIGNAL_PPM:
        return Verdict.NO_BAND
    if np.abs(difference[usable]).max(initial=0.0) < _NO_SIGNAL_PPM:
        return Verdict.SATURATED
    if required is None:
        return Verdict.FLOOR if floored else Verdict.CONFUSION
    return Verdict.WITHIN_REACH if required <= on_offer else Verdict.TOO_MANY


def _where(measurement: Measurement, transits: float) -> tuple[Array, Array]:
    """Share of each bin in the squared significance, and what of the template nothing can imitate, ``(bin,)`` each.

    With ``K^-1 t`` the former is ``t K^-1 t / S/N^2`` bin by bin, the latter ``C_N K^-1 t``: the template less the
    nuisances that imitate it best.
    """
    snr, template = measurement.snr(transits), measurement.template_ppm
    if snr == 0:
        return np.zeros_like(template), np.zeros_like(template)
    weights = matched_filter(measurement, transits)
    noise = measurement.white_ppm**2 / transits * weights + measurement.floor_ppm2 @ weights
    return template * weights / snr, noise * snr


def _positive(shares: Array) -> Array:
    kept = np.maximum(shares, 0.0)
    total = kept.sum()
    return np.asarray(kept / total if total > 0 else kept)


def _on_all(values: Array, usable: Mask) -> Array:
    result = np.zeros(usable.size)
    result[usable] = values
    return result


def _differing(a: _Atmosphere, b: _Atmosphere) -> list[str]:
    """Gases of either air whose amounts are not the same in both."""
    ours, theirs = a.air, b.air
    return [gas for gas in {**ours, **theirs} if ours.get(gas) != theirs.get(gas)]


def _untrusted(a: _Atmosphere, b: _Atmosphere, index: int) -> Array:
    """What gases that differ add to the depth of ``a`` where their data do not cover, ``(bin,)``."""
    workshop = a.workshop
    gases = [gas for gas in _differing(a, b) if gas in a.air and workshop.opacities.has_data(gas)]
    gaps = {gas: ~workshop.opacities.covered(gas) for gas in gases}
    gaps = {gas: gap for gas, gap in gaps.items() if gap.any()}
    view = workshop.views[index]
    if not gaps:
        return np.zeros(len(view.bins))
    spectrum = workshop.model.depth(_AIR, shares_of=tuple(gaps))
    total = sum((spectrum.depth - spectrum.depth_without[gas]) * gap for gas, gap in gaps.items())
    return np.asarray(view.means()(np.asarray(total)) * 1e6)


def _listed(x: _Atmosphere) -> tuple[tuple[str, float], ...]:
    return tuple(sorted(x.air.items(), key=lambda item: -item[1]))


def _widths(x: _Atmosphere) -> tuple[tuple[str, str], ...]:
    """Unknowns in words, without the gases that are held."""
    return tuple((name, words) for name, words in prior_widths(x.workshop.scenario) if name not in x.held)
