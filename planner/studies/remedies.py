"""What would help a search: another mode beside it, a lower floor, more of the gas, a clearer sky; each quantified.

Other modes and changed airs are seen on every fourth sample of the grid, which is enough for advice.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property, lru_cache
from math import ceil, exp, inf, log
from pathlib import Path

import numpy as np
from numpy.typing import NDArray
from scipy import optimize

from planner.detection.significance import Measurement, target_snr
from planner.errors import RangeError
from planner.instrument.modefiles import list_modes, read_mode
from planner.scenario.records import Case, Scenario
from planner.star.flux import photon_flux
from planner.studies.contamination import bin_factors
from planner.studies.forward import ForwardModel
from planner.studies.observe import ModeView, source_of_light
from planner.studies.results import PlanRow, Remedy, RemedyKind, Verdict
from planner.studies.rivals import absent_rivals, rival_directions, try_rivals
from planner.studies.vary import vary
from planner.studies.workshop import Progress, Sight, Workshop, see

__all__ = ["Adviser"]

Array = NDArray[np.float64]

_MODES_TOLD = 2
_WORTH_TELLING = 1.05
"""An added mode is told of when the significance grows by more than this factor."""
_CHUNK_LN = 0.1
"""Width in ln(wavelength) of the stretches that are compared within an added mode."""
_MOST_OF_THE_AIR = 0.9
"""The searched gases and the absorbers together are not raised beyond this."""
_STEP_LN = log(3.0)
_TOLERANCE = 0.02
"""Relative, on what is solved for."""


@dataclass(frozen=True, kw_only=True, eq=False)
class _Thin:
    """A setting on every fourth sample alone."""

    views: Sequence[ModeView]
    model: ForwardModel

    @property
    def thin(self) -> ForwardModel:
        return self.model


@dataclass(frozen=True, kw_only=True, eq=False)
class _Observed:
    """A case in one mode."""

    view: ModeView
    usable: NDArray[np.bool_]
    measurement: Measurement


@dataclass(frozen=True, kw_only=True, eq=False)
class _Search:
    """One row of a plan and what is asked of it."""

    case: Case
    index: int
    here: _Observed
    elsewhere: tuple[_Observed, ...]
    """The other modes of the scenario."""
    target: float
    transits: float

    def snr(self, measurement: Measurement) -> float:
        return measurement.snr(self.transits)


class Adviser:
    """Finds remedies for the rows of a plan.

    Parameters
    ----------
    workshop : Workshop
        Of the plan.
    thorough : bool
        Also what takes forward models: modes that the scenario does not have, rivals that the air is not said to
        hold, other amounts of the gas and other skies.
    lines_folder : Path, optional
        As for the plan.
    """

    def __init__(
        self,
        workshop: Workshop,
        *,
        thorough: bool,
        lines_folder: Path | None = None,
        progress: Progress | None = None,
    ) -> None:
        self._workshop = workshop
        self._thorough = thorough
        self._lines_folder = lines_folder
        self._progress = progress
        self._more = lru_cache(maxsize=1)(self._see_more)
        self._rivals = lru_cache(maxsize=1)(self._find_rivals)

    def advise(self, row: PlanRow, sight: Sight, index: int) -> PlanRow:
        """The row with the rivals that were tried and with what would help."""
        search = self._search(row, sight, index)
        if not search.here.measurement.template_ppm.size:
            return row
        if row.verdict in (Verdict.NO_BAND, Verdict.SATURATED):
            return replace(row, remedies=tuple(self._modes(search)[:1] if self._thorough else []))
        remedies = self._modes(search)
        if row.verdict is not Verdict.WITHIN_REACH:
            remedies += self._changes(search)
        rivals = try_rivals(search.here.measurement, self._rival_parts(search), search.transits)
        return replace(row, rivals=rivals, remedies=tuple(remedies))

    def _search(self, row: PlanRow, sight: Sight, index: int) -> _Search:
        scenario = self._workshop.scenario
        observed = [*_observed(self._workshop.views, sight)]
        here = observed[index]
        reached = row.verdict is Verdict.WITHIN_REACH
        return _Search(
            case=sight.case,
            index=index,
            here=here,
            elsewhere=() if here.view.parts else tuple(o for o in observed if o is not here and not o.view.parts),
            target=target_snr(scenario.goal.threshold_sigma, scenario.goal.power),
            transits=(row.marginalised.transits_required if reached else None) or here.view.on_offer(scenario),
        )

    def _modes(self, search: _Search) -> list[Remedy]:
        """The modes that raise the significance most when as many transits are taken with them as well."""
        others = [*search.elsewhere, *(self._more(search.case) if self._thorough else ())]
        joined = [(search.snr(_join(search, other)), other) for other in others if other.measurement.template_ppm.size]
        best = sorted(joined, key=lambda item: -item[0])[:_MODES_TOLD]
        least = _WORTH_TELLING * search.snr(search.here.measurement)
        return [self._mode(search, other) for snr, other in best if snr > least]

    def _mode(self, search: _Search, other: _Observed) -> Remedy:
        both = _join(search, other)
        unrounded = both.transits_for(search.target)
        required = None if unrounded is None else max(1, ceil(unrounded - 1e-9))
        on_offer = self._workshop.scenario.transits_on_offer
        hours = search.here.view.charged_hours + other.view.charged_hours
        return Remedy(
            kind=RemedyKind.MODE,
            enough=required is not None and required * (search.here.view.transits_each + 1) <= on_offer,
            transits=round(search.transits),
            snr=search.snr(both),
            mode=other.view.mode.name,
            band_um=_best_stretch(search, other),
            transits_required=required,
            hours_required=None if required is None else required * hours,
        )

    def _see_more(self, case: Case) -> tuple[_Observed, ...]:
        """A case in the shipped modes that the scenario does not have."""
        return tuple(_observed(self._others.views, see(self._others, case))) if self._others.views else ()

    @cached_property
    def _others(self) -> _Thin:
        scenario = self._workshop.scenario
        names = tuple(name for name in list_modes() if name not in scenario.modes and _has_light(scenario, name))
        if not names:
            return _Thin(views=(), model=self._workshop.thin)
        changed = scenario.model_copy(update={"modes": names})
        workshop = Workshop(changed, lines_folder=self._lines_folder, progress=self._progress)
        return _Thin(views=workshop.views, model=workshop.thin)

    def _rival_parts(self, search: _Search) -> dict[str, Array]:
        if not self._thorough:
            return {}
        directions = self._rivals(search.case)
        return {gas: per_mode[search.index][search.here.usable] for gas, per_mode in directions.items()}

    def _find_rivals(self, case: Case) -> dict[str, tuple[Array, ...]]:
        return rival_directions(self._workshop.thin, case, absent_rivals(self._workshop, case))

    def _changes(self, search: _Search) -> Iterator[Remedy]:
        floor = _lower_floor(search)
        if floor is not None:
            yield floor
        if self._thorough:
            yield self._more_gas(search)
            if self._workshop.scenario.atmosphere.cloud is not None:
                yield self._clearer_sky(search)

    def _more_gas(self, search: _Search) -> Remedy:
        """The mixing ratio that brings the search within reach, the unknowns as they are."""
        case, scenario = search.case, self._workshop.scenario
        others = sum(x for gas, x in scenario.atmosphere.absorbers.items() if gas not in case.gases)
        most = log((_MOST_OF_THE_AIR - others) / sum(case.mixing_ratios))

        def snr(factor_ln: float) -> float:
            template = self._template(_scaled(case, exp(factor_ln)), search)
            return search.snr(replace(search.here.measurement, template_ppm=template))

        factor_ln, reached = _first_above(snr, search.target, 0.0, most, _STEP_LN)
        return Remedy(
            kind=RemedyKind.AMOUNT,
            enough=reached >= search.target,
            transits=round(search.transits),
            snr=reached,
            mixing_ratio=case.mixing_ratios[0] * exp(factor_ln),
        )

    def _template(self, case: Case, search: _Search) -> Array:
        model = self._workshop.thin
        if len(case.gases) == 1:
            template = model.binned(case, shares_of=case.gases)[search.index].shares_ppm[case.gases[0]]
        else:
            there, absent = model.binned(case), model.binned(case, transparent=case.gases)
            template = there[search.index].depth_ppm - absent[search.index].depth_ppm
        factor = bin_factors(self._workshop.scenario.star, [search.here.view])[0]
        return (template * factor)[search.here.usable]

    def _clearer_sky(self, search: _Search) -> Remedy:
        """The cloud top that brings the search within reach, or what no cloud at all gives."""
        cloud, base_bar = self._workshop.scenario.atmosphere.cloud, self._workshop.scenario.atmosphere.pressure_bar
        assert cloud is not None

        def snr(top_ln: float) -> float:
            return self._under(search, exp(top_ln))

        lowest = log(base_bar) - _TOLERANCE
        top_ln, reached = _first_above(snr, search.target, log(cloud.top_bar), lowest, _STEP_LN)
        top_bar = exp(top_ln)
        if reached < search.target:
            top_bar, reached = inf, self._under(search, inf)
        return Remedy(
            kind=RemedyKind.SKY,
            enough=reached >= search.target,
            transits=round(search.transits),
            snr=reached,
            cloud_top_bar=top_bar,
        )

    def _under(self, search: _Search, cloud_top_bar: float) -> float:
        """The significance under a cloud at some pressure, the unknowns as they are there."""
        scenario, case = vary(self._workshop.scenario, search.case, {"cloud_top": cloud_top_bar})
        setting = _Thin(views=self._workshop.views, model=self._workshop.thin.of(scenario))
        return search.snr(see(setting, case).measurements[search.index])


def _observed(views: Sequence[ModeView], sight: Sight) -> Iterator[_Observed]:
    for view, usable, measurement in zip(views, sight.usable, sight.measurements, strict=True):
        yield _Observed(view=view, usable=usable, measurement=measurement)


def _join(search: _Search, other: _Observed) -> Measurement:
    return Measurement.join([search.here.measurement, other.measurement])


def _has_light(scenario: Scenario, mode: str) -> bool:
    """Whether the star's spectrum goes as far as a mode does."""
    try:
        photon_flux(source_of_light(scenario), np.array(read_mode(mode).span_um))
    except RangeError:
        return False
    return True


def _best_stretch(search: _Search, other: _Observed) -> tuple[float, float]:
    """The stretch of an added mode that by itself raises the significance most."""
    bins, usable, whole = other.view.bins, other.usable, other.measurement
    number = np.floor(np.log(bins.centre_um[usable]) / _CHUNK_LN).astype(int)

    def gain(chunk: int) -> float:
        return search.snr(Measurement.join([search.here.measurement, _part(whole, number == chunk)]))

    mine = np.flatnonzero(usable)[number == max(np.unique(number).tolist(), key=gain)]
    return float(bins.from_um[mine].min()), float(bins.to_um[mine].max())


def _part(measurement: Measurement, mask: NDArray[np.bool_]) -> Measurement:
    return replace(
        measurement,
        template_ppm=measurement.template_ppm[mask],
        white_ppm=measurement.white_ppm[mask],
        floor_ppm2=measurement.floor_ppm2[np.ix_(mask, mask)],
        directions_ppm=measurement.directions_ppm[:, mask],
    )


def _lower_floor(search: _Search) -> Remedy | None:
    """The floor that brings the search within reach, or what none at all gives; nothing where there is none."""
    measurement, floor = search.here.measurement, search.here.view.mode.floor
    if not measurement.floor_ppm2.any():
        return None

    def snr(factor: float) -> float:
        return search.snr(replace(measurement, floor_ppm2=factor**2 * measurement.floor_ppm2))

    enough = snr(0.0) >= search.target
    factor = optimize.brentq(lambda f: snr(f) - search.target, 0.0, 1.0, rtol=1e-3) if enough else 0.0
    return Remedy(
        kind=RemedyKind.FLOOR,
        enough=enough,
        transits=round(search.transits),
        snr=search.target if enough else snr(0.0),
        floor_factor=factor,
        floor_ppm=None if search.here.view.parts else factor * floor.depth_ppm,
    )


def _scaled(case: Case, factor: float) -> Case:
    return Case(gases=case.gases, mixing_ratios=tuple(factor * ratio for ratio in case.mixing_ratios))


def _first_above(
    value: Callable[[float], float], target: float, start: float, end: float, step: float
) -> tuple[float, float]:
    """Where a value first reaches a target between two ends, found in steps and then between them.

    Returns the place and the value there; the place with the highest value, if none reaches the target.
    """
    places = [start, *np.arange(start + step, end, step).tolist(), end]
    seen = [(start, value(start))]
    for place in places[1:]:
        seen.append((place, value(place)))
        if seen[-1][1] >= target:
            low = seen[-2][0]
            root = optimize.brentq(lambda x: value(x) / target - 1.0, low, place, xtol=_TOLERANCE)
            return float(root), target
    return max(seen, key=lambda pair: pair[1])
