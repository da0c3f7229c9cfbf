"""What some transits can reach: the smallest mixing ratio detectable, and what seeing nothing would exclude.

For a gas at each of a row of mixing ratios the whole search is worked out on reduced opacity, nuisances included; the
expected significance against mixing ratio then gives both answers for any number of transits. A gas is detectable
where it passes the threshold with the chance asked for. A null result, with noise that happens to be zero, excludes
the mixing ratios whose expected significance exceeds the quantile of the confidence: 1.64 for 95 %, one-sided.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import log10
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner import __version__
from planner.detection.significance import Measurement, target_snr
from planner.pool import in_threads
from planner.scenario.records import Case, Scenario
from planner.studies.domain import distinct_cases, domain_of
from planner.studies.nuisances import prior_widths
from planner.studies.outcomes import LimitCurve, LimitPoint, LimitResult, Obstacle
from planner.studies.plan import CAUTIONS, assumptions, cautions_about_star
from planner.studies.reduced import Reduced, reduce_opacity
from planner.studies.vary import vary
from planner.studies.workshop import Progress, Sight, Workshop, see

__all__ = ["TRANSITS", "first_reach", "last_short", "limit"]

Array = NDArray[np.float64]

TRANSITS = (1, 5, 10, 20, 50, 100)
_PER_DECADE = 6
_DECADES = 4.0
"""How far the mixing ratios reach to either side of those of the scenario."""
_MOST_RATIO = 0.5
_LEAST_RATIO = 1e-16
_NOTHING_SNR = 0.5
"""The row of mixing ratios goes on downwards until the most transits give no more than this."""
_NO_SIGNAL_PPM = 0.1


def limit(
    scenario: Scenario,
    *,
    transits: Sequence[int] = TRANSITS,
    confidence: float = 0.95,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
) -> LimitResult:
    """Detectable mixing ratios and upper limits against transits, for each gas or set of gases and each mode.

    Parameters
    ----------
    scenario : Scenario
    transits : sequence of int
        Numbers of transits.
    confidence : float
        Of the upper limits, one-sided.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.

    Raises
    ------
    PlannerError
        If line data or modes cannot be read or used.
    """
    workshop = Workshop(scenario, lines_folder=lines_folder, progress=progress)
    spans = {case.gases: _span(scenario, case.gases) for case in distinct_cases(scenario)}
    reduced = reduce_opacity(workshop, domain_of(scenario, mixing_ratios=spans), progress=progress)
    curves = []
    for case in distinct_cases(scenario):
        growth = _Growth(reduced, scenario, case, spans[case.gases], max(transits), progress)
        curves += [_curve(growth, index, transits, confidence) for index in range(len(workshop.views))]
    return LimitResult(
        title=scenario.title,
        invented=scenario.invented,
        threshold_sigma=scenario.goal.threshold_sigma,
        power=scenario.goal.power,
        confidence=confidence,
        curves=tuple(curves),
        line_data=(*workshop.line_data(), *workshop.store.notices),
        assumptions=(*assumptions(workshop), reduced.error.sentence),
        nuisances=prior_widths(scenario),
        cautions=(*CAUTIONS, *cautions_about_star(workshop)),
        version=__version__,
    )


def first_reach(ratios: Array, snr: Array, wanted: float) -> float | None:
    """Smallest mixing ratio at which a significance is reached; ``None`` where none does.

    Parameters
    ----------
    ratios : (ratio,)
        Ascending.
    snr : (ratio,)
        Taken as a power law between neighbours, and as proportional to the ratio below the first.
    wanted : float
    """
    above = np.flatnonzero(snr >= wanted)
    return _crossing(ratios, snr, wanted, int(above[0])) if above.size else None


def last_short(ratios: Array, snr: Array, wanted: float) -> float | None:
    """Mixing ratio beyond which a significance is exceeded throughout; ``None`` if not even at the largest."""
    if snr[-1] < wanted:
        return None
    below = np.flatnonzero(snr < wanted)
    return _crossing(ratios, snr, wanted, int(below[-1]) + 1 if below.size else 0)


def _crossing(ratios: Array, snr: Array, wanted: float, upper: int) -> float:
    """Where the significance passes a value between the point before ``upper`` and it."""
    if upper == 0:
        return float(ratios[0] * wanted / snr[0])
    low, high = np.log(np.maximum(snr[upper - 1 : upper + 1], 1e-300))
    share = (np.log(wanted) - low) / (high - low)
    return float(ratios[upper - 1] ** (1 - share) * ratios[upper] ** share)


class _Growth:
    """A gas at a row of mixing ratios, seen with every mode; down to where the most transits see nothing of it."""

    def __init__(
        self,
        reduced: Reduced,
        scenario: Scenario,
        case: Case,
        span: tuple[float, float],
        most_transits: int,
        progress: Progress | None,
    ) -> None:
        self.scenario, self.case, self.views = scenario, case, reduced.views
        self._reduced, self._most_transits, self._progress = reduced, most_transits, progress
        decades = log10(span[1] / span[0])
        self.ratios = np.geomspace(*span, max(2, round(_PER_DECADE * decades) + 1))
        self.sights = self.seen(self.ratios)
        while self.ratios[0] > _LEAST_RATIO and self._is_noticed(self.sights[0]):
            more = self.ratios[0] * 10.0 ** (-np.arange(_PER_DECADE, 0, -1) / _PER_DECADE)
            self.ratios, self.sights = np.concatenate([more, self.ratios]), [*self.seen(more), *self.sights]

    def seen(self, ratios: Array, **values: float) -> list[Sight]:
        """The gas at some mixing ratios, other numbers of the scenario changed as well."""

        def search(ratio: float) -> Sight:
            scenario, case = vary(self.scenario, self.case, {"mixing_ratio": float(ratio), **values})
            return see(self._reduced.of(scenario), case)

        return in_threads(search, list(ratios), text=f"limits on {self.case.label}", progress=self._progress)

    def measurements(self, index: int) -> list[Measurement]:
        """With one mode, per mixing ratio."""
        return [sight.measurements[index] for sight in self.sights]

    def _is_noticed(self, sight: Sight) -> bool:
        """Whether some transits that are asked about, or endless ones, would make something of it."""
        goal = self.scenario.goal
        return any(
            measurement.snr(max(self._most_transits, view.on_offer(self.scenario))) > _NOTHING_SNR
            or target_snr(goal.threshold_sigma, goal.power) < measurement.snr_limit() < np.inf
            for measurement, view in zip(sight.measurements, self.views, strict=True)
        )


def _span(scenario: Scenario, gases: tuple[str, ...]) -> tuple[float, float]:
    """Range of the first gas's mixing ratio: some decades about the scenario's, within what leaves a background."""
    cases = [case for case in scenario.cases if case.gases == gases]
    ratios = [case.mixing_ratios[0] for case in cases]
    most = _MOST_RATIO * min(case.mixing_ratios[0] / sum(case.mixing_ratios) for case in cases)
    return min(ratios) / 10**_DECADES, max(min(max(ratios) * 10**_DECADES, most), *ratios)


def _curve(growth: _Growth, index: int, transits: Sequence[int], confidence: float) -> LimitCurve:
    scenario, view, measurements = growth.scenario, growth.views[index], growth.measurements(index)
    wanted = target_snr(scenario.goal.threshold_sigma, scenario.goal.power)
    exceeded = float(special.ndtri(confidence))

    def point(number: int) -> LimitPoint:
        snr = np.array([measurement.snr(number) for measurement in measurements])
        return LimitPoint(
            transits=number,
            hours=number * view.charged_hours,
            detectable_ratio=first_reach(growth.ratios, snr, wanted),
            upper_limit_ratio=last_short(growth.ratios, snr, exceeded),
        )

    on_offer = view.on_offer(scenario)
    best = np.array([measurement.snr_limit() for measurement in measurements])
    at_all = first_reach(growth.ratios, best, wanted)
    features = np.array([np.abs(m.template_ppm).max(initial=0.0) for m in measurements])
    obstacle, words = (None, "") if at_all is not None else _obstacle(growth, index, wanted, float(features.max()))
    return LimitCurve(
        gas=growth.case.label,
        mode=view.mode.name,
        stated_ratios=tuple(c.mixing_ratios[0] for c in scenario.cases if c.gases == growth.case.gases),
        points=tuple(point(number) for number in sorted(set(transits))),
        at_best=point(on_offer),
        detectable_at_all=at_all,
        obstacle=obstacle,
        obstacle_words=words,
        ratios=growth.ratios,
        feature_ppm=features,
        snr_one_transit=np.array([measurement.snr(1) for measurement in measurements]),
        snr_on_offer=np.array([measurement.snr(on_offer) for measurement in measurements]),
        scale_height_ppm=scenario.scale_height_ppm(growth.case),
    )


def _obstacle(growth: _Growth, index: int, wanted: float, feature_ppm: float) -> tuple[Obstacle, str]:
    """Why no mixing ratio of the range is ever detectable: what would have to go for one to be."""
    cloud = growth.scenario.atmosphere.cloud
    if cloud is not None:
        clear = growth.seen(growth.ratios, cloud_top=np.inf)
        found = first_reach(growth.ratios, np.array([s.measurements[index].snr_limit() for s in clear]), wanted)
        if found is not None:
            return Obstacle.CLOUDS, f"under a clear sky {found:.2g} would be detectable, given transits enough"
    if feature_ppm < _NO_SIGNAL_PPM:
        return Obstacle.NO_BAND, f"no share of the gas exceeds {_NO_SIGNAL_PPM:g} ppm"
    known = np.array([measurement.known().snr_limit() for measurement in growth.measurements(index)])
    found = first_reach(growth.ratios, known, wanted)
    if found is not None:
        return Obstacle.CONFUSION, f"were all else known, {found:.2g} would be detectable, given transits enough"
    return Obstacle.FLOOR, f"at most {known.max():.2g} sigma, however many transits"
