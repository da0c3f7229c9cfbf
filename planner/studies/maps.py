"""How the transits move over two numbers of a scenario: mixing ratio by cloud-top pressure, unless others are asked."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner import __version__
from planner.detection.significance import Measurement, target_snr
from planner.errors import RangeError, ScenarioError
from planner.pool import in_threads
from planner.scenario.records import Case, Scenario
from planner.spectroscopy.molecules import find_molecule
from planner.studies.domain import distinct_cases, domain_of
from planner.studies.nuisances import prior_widths
from planner.studies.observe import ModeView
from planner.studies.outcomes import MapAxis, MapResult
from planner.studies.plan import CAUTIONS, assumptions, cautions_about_star
from planner.studies.reduced import reduce_opacity
from planner.studies.vary import PARAMETERS, Parameter, parameter_of, vary
from planner.studies.workshop import Progress, Workshop, see

__all__ = ["Axis", "map_transits"]

Array = NDArray[np.float64]

_LEVELS = (1, 3, 10, 30, 100, 300, 1000)
_APART_LN = 0.5
"""Contours closer to that of the transits on offer than this would run into it."""
_STEPS = 17
_DECADES = 3.0
"""Either side of the scenario's mixing ratio, where no axis is given."""
_HIGHEST_CLOUD = 1e-4
"""Cloud top over the pressure at the base, where no axis is given."""
_MOST_RATIO = 0.9


@dataclass(frozen=True, kw_only=True)
class Axis:
    """A parameter and the even steps over which it goes; in the logarithm where the parameter is logarithmic."""

    name: str
    low: float
    high: float
    steps: int = _STEPS

    def values(self, parameter: Parameter) -> Array:
        """The steps, ascending."""
        spaced = np.geomspace if parameter.logarithmic else np.linspace
        return spaced(self.low, self.high, self.steps)


def map_transits(
    scenario: Scenario,
    *,
    x: Axis | None = None,
    y: Axis | None = None,
    gas: str | None = None,
    mode: str | None = None,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
) -> MapResult:
    """Transits for one gas with one mode at every pair of values of two parameters.

    Parameters
    ----------
    scenario : Scenario
    x, y : Axis, optional
        Mixing ratio of the searched gas, and cloud-top pressure, when left out.
    gas : str, optional
        Formula or common name of a candidate, or those of a set with plus signs between them; the first candidate
        when left out.
    mode : str, optional
        Name of one of the scenario's modes; the first when left out.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.

    Raises
    ------
    ScenarioError
        If there is no such gas, mode or parameter.
    RangeError
        If an axis is empty or holds values that cannot be.
    PlannerError
        If line data or modes cannot be read or used.
    """
    case = _case(scenario, gas)
    x = x or Axis(name="mixing_ratio", low=case.mixing_ratios[0] / 10**_DECADES, high=_highest_ratio(case))
    y = y or Axis(name="cloud_top", low=_HIGHEST_CLOUD * _base_bar(scenario), high=_base_bar(scenario))
    parameters = _checked(scenario, case, (x, y))
    workshop = Workshop(scenario, lines_folder=lines_folder, progress=progress)
    index = _index(workshop.views, mode)
    ranges = {axis.name: (axis.low, axis.high) for axis in (x, y)}
    ratios = {case.gases: ranges.pop("mixing_ratio")} if "mixing_ratio" in ranges else {}
    reduced = reduce_opacity(workshop, domain_of(scenario, wider=ranges, mixing_ratios=ratios), progress=progress)
    columns, rows = (axis.values(parameter) for axis, parameter in zip((x, y), parameters, strict=True))

    def search(place: tuple[float, float]) -> Measurement:
        changed, its_case = vary(scenario, case, dict(zip((x.name, y.name), place, strict=True)))
        return see(reduced.of(changed), its_case).measurements[index]

    places = [(float(column), float(row)) for row in rows for column in columns]
    measurements = in_threads(search, places, text=f"map of {case.label}", progress=progress)
    return _result(workshop, case, index, (x, y), parameters, measurements, reduced.error.sentence)


def _result(
    workshop: Workshop,
    case: Case,
    index: int,
    axes: tuple[Axis, Axis],
    parameters: tuple[Parameter, Parameter],
    measurements: Sequence[Measurement],
    sentence: str,
) -> MapResult:
    scenario, view = workshop.scenario, workshop.views[index]
    goal, on_offer = scenario.goal, view.on_offer(scenario)
    wanted = target_snr(goal.threshold_sigma, goal.power)
    levels = tuple(sorted([on_offer, *(n for n in _LEVELS if abs(np.log(n / on_offer)) > _APART_LN)]))
    shape = (axes[1].steps, axes[0].steps)

    def field(number: Callable[[Measurement], float]) -> Array:
        return np.array([number(measurement) for measurement in measurements]).reshape(shape)

    return MapResult(
        title=scenario.title,
        invented=scenario.invented,
        gas=case.label,
        mode=view.mode.name,
        x=_axis(scenario, case, axes[0], parameters[0]),
        y=_axis(scenario, case, axes[1], parameters[1]),
        threshold_sigma=goal.threshold_sigma,
        power=goal.power,
        transits_on_offer=on_offer,
        charged_hours_per_transit=view.charged_hours,
        transits_unrounded=field(lambda m: m.transits_for(wanted) or np.inf),
        snr_limit=field(Measurement.snr_limit),
        snr_one_transit=field(lambda m: m.snr(1)),
        levels=levels,
        snr_wanted=wanted,
        snr_after=np.array([field(partial(Measurement.snr, transits=level)) for level in levels]),
        line_data=(*workshop.line_data(), *workshop.store.notices),
        assumptions=(*assumptions(workshop), sentence),
        nuisances=prior_widths(scenario),
        cautions=(*CAUTIONS, *cautions_about_star(workshop)),
        version=__version__,
    )


def _axis(scenario: Scenario, case: Case, axis: Axis, parameter: Parameter) -> MapAxis:
    stated = _stated(scenario, case, axis.name)
    inside = stated is not None and axis.low * (1 - 1e-9) <= stated <= axis.high * (1 + 1e-9)
    return MapAxis(
        name=axis.name,
        label=f"mixing ratio of {case.gases[0]}" if axis.name == "mixing_ratio" else parameter.label,
        unit=parameter.unit,
        logarithmic=parameter.logarithmic,
        values=axis.values(parameter),
        stated=stated if inside else None,
    )


def _stated(scenario: Scenario, case: Case, name: str) -> float | None:
    """The scenario's own value of a parameter; for a clear sky over a surface a cloud top at the surface."""
    atmosphere = scenario.atmosphere
    cloud = atmosphere.cloud.top_bar if atmosphere.cloud else atmosphere.pressure_bar if atmosphere.surface else None
    spots, faculae = scenario.star.spots, scenario.star.faculae
    return {
        "mixing_ratio": case.mixing_ratios[0],
        "temperature": atmosphere.temperature_k,
        "mass": scenario.planet.mass_mearth,
        "radius": scenario.planet.radius_rearth,
        "molar_mass": scenario.molar_mass_g(case),
        "cloud_top": cloud,
        "haze": atmosphere.haze.factor if atmosphere.haze else None,
        "star_radius": scenario.star.radius_rsun,
        "spots": spots.fraction if spots else None,
        "spot_temperature": spots.temperature_k if spots else None,
        "faculae": faculae.fraction if faculae else None,
        "facula_temperature": faculae.temperature_k if faculae else None,
        **atmosphere.absorbers,
    }[name]


def _case(scenario: Scenario, gas: str | None) -> Case:
    cases = distinct_cases(scenario)
    if gas is None:
        return cases[0]
    wanted = [find_molecule(name.strip()).formula for name in gas.split("+")]
    for case in cases:
        if sorted(case.gases) == sorted(wanted):
            return case
    known = ", ".join(case.label for case in cases)
    raise ScenarioError(f"{scenario.place('candidates')}: expected one of {known} for the gas of a map, got {gas}")


def _index(views: Sequence[ModeView], mode: str | None) -> int:
    names = [view.mode.name for view in views]
    if mode is None:
        return 0
    if mode not in names:
        raise ScenarioError(f"mode of a map: expected one of the scenario's modes {', '.join(names)}, got {mode}")
    return names.index(mode)


def _checked(scenario: Scenario, case: Case, axes: tuple[Axis, Axis]) -> tuple[Parameter, Parameter]:
    """The parameters of both axes, once their names and ends are found to make sense."""
    found = []
    for axis in axes:
        parameter = parameter_of(scenario, axis.name)
        if parameter is None or axis.name in case.gases:
            names = [name for name in [*PARAMETERS, *scenario.atmosphere.absorbers] if name not in case.gases]
            known = ", ".join(name for name in names if parameter_of(scenario, name) is not None)
            raise ScenarioError(f"axis of a map: expected one of {known}, got {axis.name}")
        if not 0 < axis.low < axis.high < np.inf or axis.steps < 2:
            raise RangeError(
                f"axis {axis.name}: expected 0 < from < to and at least 2 steps, "
                f"got {axis.low:g} to {axis.high:g} in {axis.steps} steps"
            )
        if parameter.label.startswith("mixing ratio") and axis.high > _MOST_RATIO:
            raise RangeError(f"axis {axis.name}: expected mixing ratios up to {_MOST_RATIO:g}, got {axis.high:g}")
        found.append(parameter)
    if axes[0].name == axes[1].name:
        raise ScenarioError(f"axes of a map: expected two parameters, got {axes[0].name} twice")
    return found[0], found[1]


def _highest_ratio(case: Case) -> float:
    return float(min(case.mixing_ratios[0] * 10**_DECADES, 0.5 * case.mixing_ratios[0] / sum(case.mixing_ratios)))


def _base_bar(scenario: Scenario) -> float:
    return scenario.atmosphere.pressure_bar
