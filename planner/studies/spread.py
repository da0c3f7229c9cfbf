"""How far the answer moves with what is not known: transits over the priors, the chance of success, what drives it.

Every number that a scenario holds with an error is drawn from its prior (quasi-random: a scrambled Sobol sequence),
and the whole search, nuisances included, is worked out for each draw on reduced opacity. The draws are of how things
may truly be; within each, the nuisances are marginalised as ever. Light and noise stay those of the scenario.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from math import ceil, log2

import numpy as np
from numpy.typing import NDArray
from scipy import special
from scipy.stats import qmc, rankdata

from planner.detection.significance import Measurement, target_snr
from planner.pool import in_threads
from planner.scenario.records import Case, Scenario, Star
from planner.studies.domain import domain_of
from planner.studies.nuisances import CLEAR_SKY_DECK_BAR
from planner.studies.outcomes import Driver, TransitSpread
from planner.studies.reduced import Reduced, reduce_opacity
from planner.studies.results import PlanResult, PlanRow
from planner.studies.vary import shifted_ratio, vary
from planner.studies.workshop import Progress, Workshop, see

__all__ = ["Prior", "add_spread", "draw_searches", "priors_of", "summary", "variance_shares"]

Array = NDArray[np.float64]

SEED = 1
_QUANTILES = (0.16, 0.5, 0.84)
_FARTHEST = 3.0
"""Priors end at so many widths; beyond lies one draw in 370."""
_LEAST_SHARE = 0.01
_CHANCES = 20
"""Numbers of transits at which the chance of success is worked out."""
_FAR_BEYOND = 10


@dataclass(frozen=True, kw_only=True)
class Prior:
    """A number that is not known exactly, and what a draw makes of it.

    Attributes
    ----------
    name : str
        For the output.
    words : str
        The prior in words.
    value : callable
        From a standard normal number to a value in the unit of `planner.studies.vary`, or a factor.
    one_sided : bool
        Whether the scenario stands at an end of what can be (a clear sky): the normal number then loses its sign.
    """

    name: str
    words: str
    value: Callable[[float], float]
    one_sided: bool = False

    def at(self, quantile: float) -> float:
        """The value at a quantile from 0 to 1; of a one-sided prior, larger ones lie farther from the scenario."""
        number = special.ndtri((1 + quantile) / 2 if self.one_sided else quantile)
        return self.value(float(np.clip(number, -_FARTHEST, _FARTHEST)))


def add_spread(workshop: Workshop, result: PlanResult, *, draws: int, progress: Progress | None = None) -> PlanResult:
    """A plan with the spread of each of its rows.

    Parameters
    ----------
    workshop : Workshop
        That of the plan.
    result : PlanResult
        Its rows go case by case, with every mode in turn.
    draws : int
        Per case; rounded up to a power of two.
    progress : callable, optional
        Called with a text and the share done.
    """
    scenario, rows = workshop.scenario, iter(result.rows)
    reduced = reduce_opacity(workshop, domain_of(scenario, temperature=True), progress=progress)
    found: list[PlanRow] = []
    words: dict[str, str] = {}
    for case in scenario.cases:
        priors = priors_of(scenario, case)
        words |= {prior.name: prior.words for prior in priors}
        quantiles, searches = draw_searches(reduced, case, draws=draws, seed=SEED, progress=progress)
        for index, view in enumerate(workshop.views):
            row = next(rows)
            spread = summary(
                scenario,
                [prior.name for prior in priors],
                quantiles,
                [search[index] for search in searches],
                required=row.marginalised.transits_required,
                on_offer=view.on_offer(scenario),
                seed=SEED,
            )
            found.append(replace(row, spread=spread))
    return replace(
        result,
        rows=tuple(found),
        spread_priors=tuple(words.items()),
        assumptions=(*result.assumptions, reduced.error.sentence),
    )


def priors_of(scenario: Scenario, case: Case) -> list[Prior]:
    """Everything that is drawn for a case: the searched gas and absorbers by formula.

    Widths are those of the nuisances, and of ``[spread]`` for what is no nuisance. Gravity, molar mass and the radii
    are drawn as factors.
    """
    widths, spread = scenario.nuisances, scenario.spread
    fractions = [
        ("radius", widths.radius_fraction),
        ("temperature", widths.temperature_fraction),
        ("gravity", scenario.gravity_fraction),
        ("molar mass", widths.molar_mass_fraction),
        ("radius of the star", spread.star_radius_fraction),
    ]
    ratios = [(case.label, case.mixing_ratios[0], spread.mixing_ratio_dex)]
    ratios += [(g, x, widths.absorbers_dex) for g, x in scenario.atmosphere.absorbers.items() if g not in case.gases]
    return [
        *(_factor(name, width) for name, width in fractions if width),
        *(_ratio(gas, ratio, decades) for gas, ratio, decades in ratios if decades),
        *_cloud(scenario),
        *_haze(scenario),
        *_regions(scenario.star),
    ]


def draw_searches(
    reduced: Reduced, case: Case, *, draws: int, seed: int, progress: Progress | None = None
) -> tuple[Array, list[tuple[Measurement, ...]]]:
    """What each mode measures of the gas in every draw.

    Parameters
    ----------
    reduced : Reduced
        Chosen for a domain with temperatures.
    draws : int
        Rounded up to a power of two, with which a Sobol sequence is balanced.
    seed : int
        Of the scrambling.

    Returns
    -------
    quantiles : (draw, prior) ndarray
        Where each draw stands in each prior, 0 to 1.
    measurements : list of tuple
        Per draw and mode.
    """
    scenario = reduced.model.scenario
    priors = priors_of(scenario, case)
    quantiles = qmc.Sobol(len(priors), seed=seed).random_base2(ceil(log2(draws)))

    def search(at: Array) -> tuple[Measurement, ...]:
        drawn = {prior.name: prior.at(float(u)) for prior, u in zip(priors, at, strict=True)}
        changed, its_case = vary(scenario, case, _values(scenario, case, drawn))
        return see(reduced.of(changed), its_case).measurements

    return quantiles, in_threads(search, list(quantiles), text=f"spread of {case.label}", progress=progress)


def summary(
    scenario: Scenario,
    names: Sequence[str],
    quantiles: Array,
    measurements: Sequence[Measurement],
    *,
    required: int | None,
    on_offer: int,
    seed: int,
) -> TransitSpread:
    """Transits, chances and drivers of the draws of one case with one mode.

    Parameters
    ----------
    names : sequence of str
        Of the priors.
    quantiles : (draw, prior)
    measurements : sequence of Measurement
        Per draw.
    required : int or None
        Transits that the plan asks for.
    on_offer : int
        Transits that there are.
    """
    goal = scenario.goal
    target = target_snr(goal.threshold_sigma, goal.power)
    transits = np.array([measurement.transits_for(target) or np.inf for measurement in measurements])
    asked = min(required or on_offer, on_offer)
    significance = np.array([measurement.snr(asked) for measurement in measurements])
    best = np.array([measurement.snr(on_offer) for measurement in measurements])
    low, middle, high = np.quantile(transits, _QUANTILES, method="inverted_cdf")
    shares = sorted(zip(variance_shares(quantiles, significance), names, strict=True), reverse=True)
    return TransitSpread(
        draws=len(measurements),
        seed=seed,
        transits_16=_whole(low),
        transits_50=_whole(middle),
        transits_84=_whole(high),
        unreachable_share=float(np.mean(np.isinf(transits))),
        transits_asked=asked,
        chance_asked=float(special.ndtr(significance - goal.threshold_sigma).mean()),
        transits_on_offer=on_offer,
        chance_on_offer=float(special.ndtr(best - goal.threshold_sigma).mean()),
        transits_drawn=tuple(_whole(number) for number in np.sort(transits)),
        chances=_chances(measurements, goal.threshold_sigma, on_offer, _whole(high)),
        drivers=tuple(Driver(name=name, share=float(share)) for share, name in shares if share >= _LEAST_SHARE),
    )


def variance_shares(quantiles: Array, outcome: Array) -> Array:
    """First-order share of each input in the variance of an outcome's ranks, ``(input,)``.

    Ranks are regressed on the first two Legendre polynomials of every input's quantile together; with polynomials
    that are orthonormal over the inputs the squared coefficients are the variances due to each (a polynomial chaos
    expansion without mixed terms: Sudret 2008, Reliab. Eng. Syst. Saf. 93, 964, from memory). What chance alone would
    give a coefficient is taken off. Ranks, because transits have no upper end. All zero where the outcome does not vary
    or there are no more draws than coefficients.

    Parameters
    ----------
    quantiles : (draw, input)
        Uniform over 0 to 1.
    outcome : (draw,)
    """
    draws, inputs = quantiles.shape
    ranks = rankdata(outcome)
    if np.ptp(ranks) == 0 or draws <= 2 * inputs + 1:
        return np.zeros(inputs)
    centred = 2 * quantiles - 1
    polynomials = np.hstack([np.sqrt(3) * centred, np.sqrt(5) * (3 * centred**2 - 1) / 2])
    design = np.column_stack([np.ones(draws), polynomials])
    coefficients, *_ = np.linalg.lstsq(design, ranks, rcond=None)
    left = ranks - design @ coefficients
    by_chance = left @ left / (draws - design.shape[1])
    squares = np.maximum((coefficients[1:] ** 2 - by_chance / draws).reshape(2, inputs).sum(axis=0), 0.0)
    explained = max(0.0, 1.0 - by_chance / ranks.var(ddof=1))
    # over few draws the polynomials are not quite orthonormal: together they get what the regression explains
    shares: Array = explained * squares / max(squares.sum(), np.finfo(float).tiny)
    return shares


def _values(scenario: Scenario, case: Case, drawn: dict[str, float]) -> dict[str, float]:
    """A draw in the terms of `vary`.

    Transits measure the ratio of the radii: the planet's follows the star's. Gravity is drawn, mass follows. Another
    molar mass acts as another gravity.
    """
    planet, star = scenario.planet, scenario.star
    star_radius = drawn.pop("radius of the star", 1.0)
    radius = drawn.pop("radius", 1.0) * star_radius
    weight = drawn.pop("gravity", 1.0) * drawn.pop("molar mass", 1.0)
    drawn["temperature"] = drawn.pop("temperature", 1.0) * scenario.atmosphere.temperature_k
    if case.label in drawn:
        drawn["mixing_ratio"] = drawn.pop(case.label)
    return {name.replace(" ", "_"): value for name, value in drawn.items()} | {
        "star_radius": star.radius_rsun * star_radius,
        "radius": planet.radius_rearth * radius,
        "mass": planet.mass_mearth * weight * radius**2,
    }


def _factor(name: str, width: float) -> Prior:
    return Prior(name=name, words=f"{100 * width:.3g} %", value=lambda z: float(np.exp(width * z)))


def _ratio(gas: str, ratio: float, decades: float) -> Prior:
    return Prior(name=gas, words=f"{decades:g} dex in mixing ratio", value=lambda z: shifted_ratio(ratio, decades * z))


def _cloud(scenario: Scenario) -> list[Prior]:
    width, cloud = scenario.nuisances.cloud_top_dex, scenario.atmosphere.cloud
    base_bar = scenario.atmosphere.pressure_bar
    if width == 0 or (cloud is None and base_bar <= CLEAR_SKY_DECK_BAR):
        return []
    if cloud is not None:
        top_bar = cloud.top_bar
        words = f"{width:g} dex in its top pressure"
        return [Prior(name="cloud top", words=words, value=lambda z: float(top_bar * 10 ** (width * z)))]
    depth = float(np.log(base_bar / CLEAR_SKY_DECK_BAR))
    words = f"one-sided: a deck, with its top at {CLEAR_SKY_DECK_BAR:g} bar at one sigma (the sky is clear)"
    return [Prior(name="cloud top", words=words, value=lambda z: float(base_bar * np.exp(-depth * z)), one_sided=True)]


def _haze(scenario: Scenario) -> list[Prior]:
    width, haze = scenario.nuisances.haze_dex, scenario.atmosphere.haze
    if width == 0:
        return []
    if haze is not None:
        factor = haze.factor
        return [Prior(name="haze", words=f"{width:g} dex", value=lambda z: float(factor * 10 ** (width * z)))]
    words = f"one-sided: scattering up by {width:g} dex over that of the air at one sigma (there is none)"
    return [Prior(name="haze", words=words, value=lambda z: float(10 ** (width * z) - 1), one_sided=True)]


def _regions(star: Star) -> list[Prior]:
    """Shares of the disc and temperatures of spots and faculae; a share is never less than none."""
    found = []
    for name, one, region in (("spots", "spot", star.spots), ("faculae", "facula", star.faculae)):
        if region is None:
            continue
        if region.fraction_error:
            words = f"{100 * region.fraction:.3g} +/- {100 * region.fraction_error:.3g} % of the disc, cut at none"
            found.append(Prior(name=name, words=words, value=_shifted(region.fraction, region.fraction_error)))
        if region.temperature_error_k:
            words = f"{region.temperature_k:.0f} +/- {region.temperature_error_k:.0f} K"
            shift = _shifted(region.temperature_k, region.temperature_error_k)
            found.append(Prior(name=f"{one} temperature", words=words, value=shift))
    return found


def _shifted(middle: float, width: float) -> Callable[[float], float]:
    return lambda z: max(0.0, middle + width * z)


def _chances(
    measurements: Sequence[Measurement], threshold_sigma: float, on_offer: int, upper: int | None
) -> tuple[tuple[int, float], ...]:
    """Chance of passing the threshold from one transit to all on offer, or to what five in six draws need.

    Not beyond ten times what is on offer: nobody plans so far.
    """
    most = max(on_offer, min(upper or on_offer, _FAR_BEYOND * on_offer))
    numbers = np.unique(np.rint(np.geomspace(1, most, _CHANCES)).astype(int)).tolist()
    return tuple(
        (number, float(np.mean([special.ndtr(m.snr(number) - threshold_sigma) for m in measurements])))
        for number in numbers
    )


def _whole(transits: float) -> int | None:
    return None if np.isinf(transits) else max(1, ceil(transits - 1e-9))
