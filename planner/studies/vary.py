"""A scenario with some of its numbers changed: the points that spreads, maps and training sets visit.

Mean molar mass and gravity enter an isothermal column through their product alone, so another molar mass at the same
mixing ratios is set through the planet's mass; absorption then stays what the mixing ratios say.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from planner.scenario.records import Case, Cloud, Haze, Scenario, Star
from planner.scenario.surface import SurfaceRegion
from planner.star.heterogeneity import Region

__all__ = ["PARAMETERS", "Parameter", "parameter_of", "shifted_ratio", "vary"]

_LEAST_BACKGROUND = 1e-3
_WHOLE_DISC = 1 - 1e-12
"""A hair less than all, so that rounding does not make it more."""


@dataclass(frozen=True, kw_only=True)
class Parameter:
    """A number of a scenario that can be varied."""

    name: str
    unit: str
    logarithmic: bool
    """Steps and priors are even in the logarithm."""
    label: str
    """For axes and tables."""


PARAMETERS: Mapping[str, Parameter] = {
    parameter.name: parameter
    for parameter in (
        Parameter(name="mixing_ratio", unit="", logarithmic=True, label="mixing ratio"),
        Parameter(name="temperature", unit="K", logarithmic=False, label="temperature"),
        Parameter(name="mass", unit="M_earth", logarithmic=False, label="planet mass"),
        Parameter(name="radius", unit="R_earth", logarithmic=False, label="planet radius"),
        Parameter(name="molar_mass", unit="g/mol", logarithmic=False, label="mean molar mass"),
        Parameter(name="cloud_top", unit="bar", logarithmic=True, label="cloud-top pressure"),
        Parameter(name="haze", unit="", logarithmic=True, label="haze factor"),
        Parameter(name="star_radius", unit="R_sun", logarithmic=False, label="radius of the star"),
        Parameter(name="spots", unit="", logarithmic=False, label="share of the disc in spots"),
        Parameter(name="spot_temperature", unit="K", logarithmic=False, label="temperature of spots"),
        Parameter(name="faculae", unit="", logarithmic=False, label="share of the disc in faculae"),
        Parameter(name="facula_temperature", unit="K", logarithmic=False, label="temperature of faculae"),
    )
}
"""By name; besides these, every absorber of a scenario goes by its formula."""

_REGION_OF = {"spots": "spots", "spot_temperature": "spots", "faculae": "faculae", "facula_temperature": "faculae"}


def parameter_of(scenario: Scenario, name: str) -> Parameter | None:
    """The parameter of that name, absorbers included; ``None`` if the scenario has none."""
    if name in _REGION_OF and getattr(scenario.star, _REGION_OF[name]) is None:
        return None
    if name in scenario.atmosphere.absorbers:
        return Parameter(name=name, unit="", logarithmic=True, label=f"mixing ratio of {name}")
    return PARAMETERS.get(name)


def vary(scenario: Scenario, case: Case, values: Mapping[str, float]) -> tuple[Scenario, Case]:
    """The scenario and case with some parameters at other values.

    Parameters
    ----------
    values : mapping of parameter to float
        In the parameter's unit. ``mixing_ratio`` is that of the first searched gas, the others of a set keep their
        proportion to it. ``cloud_top`` at or below an opaque surface and ``haze`` of zero mean none. With
        ``radius`` alone the mass stays. Mixing ratios that leave no background are scaled down together, and so are
        spots and faculae that would cover more than the disc. Those of a region that the star lacks change nothing.

    Notes
    -----
    How well gravity is known stays as the scenario says, also where a changed mass would make it a different share.
    Duration of the transit, light of the star and noise are none of this function's business.
    """
    planet, star, atmosphere = scenario.planet, scenario.star, scenario.atmosphere
    case = _with_ratio(case, values["mixing_ratio"]) if "mixing_ratio" in values else case
    amounts = {gas: values.get(gas, ratio) for gas, ratio in atmosphere.absorbers.items()}
    amounts, case = _with_room(amounts, case)
    size = {
        "mass_mearth": values.get("mass", planet.mass_mearth),
        "radius_rearth": values.get("radius", planet.radius_rearth),
    }
    changed = scenario.model_copy(
        update={
            "planet": planet.model_copy(update=size),
            "star": star.model_copy(
                update={"radius_rsun": values.get("star_radius", star.radius_rsun), **_regions(star, values)}
            ),
            "atmosphere": atmosphere.model_copy(
                update={
                    "temperature_k": values.get("temperature", atmosphere.temperature_k),
                    "absorbers": amounts,
                    "cloud": _cloud(scenario, values),
                    "haze": _haze(scenario, values),
                }
            ),
            "nuisances": scenario.nuisances.model_copy(update={"given_gravity_fraction": scenario.gravity_fraction}),
        }
    )
    if "molar_mass" not in values:
        return changed, case
    size["mass_mearth"] *= values["molar_mass"] / changed.molar_mass_g(case)
    return changed.model_copy(update={"planet": planet.model_copy(update=size)}), case


def shifted_ratio(mixing_ratio: float, decades: float) -> float:
    """A mixing ratio moved by some decades in ``x / (1 - x)``: a factor for a trace gas, and never more than 1."""
    odds = mixing_ratio / (1 - mixing_ratio) * 10**decades
    return odds / (1 + odds)


def _with_ratio(case: Case, mixing_ratio: float) -> Case:
    factor = mixing_ratio / case.mixing_ratios[0]
    return Case(gases=case.gases, mixing_ratios=tuple(factor * ratio for ratio in case.mixing_ratios))


def _with_room(amounts: Mapping[str, float], case: Case) -> tuple[dict[str, float], Case]:
    """The amounts and the case, scaled down together where they leave no room for the background."""
    total = math.fsum(case.mixing_ratios) + math.fsum(x for gas, x in amounts.items() if gas not in case.gases)
    factor = min(1.0, (1 - _LEAST_BACKGROUND) / total)
    return {gas: factor * x for gas, x in amounts.items()}, _with_ratio(case, factor * case.mixing_ratios[0])


def _regions(star: Star, values: Mapping[str, float]) -> dict[str, SurfaceRegion]:
    """Spots and faculae at other values: cooler and warmer than the photosphere, or like it, and room for both."""
    shares = {
        name: min(max(values.get(name, region.fraction), 0.0), 1.0)
        for name, region in (("spots", star.spots), ("faculae", star.faculae))
        if region is not None
    }
    factor = min(1.0, _WHOLE_DISC / sum(shares.values())) if any(shares.values()) else 1.0
    found = {}
    if star.spots is not None:
        kelvin = min(values.get("spot_temperature", star.spots.temperature_k), star.temperature_k)
        found["given_spots"] = _region(star.spots, kelvin, factor * shares["spots"])
    if star.faculae is not None:
        kelvin = max(values.get("facula_temperature", star.faculae.temperature_k), star.temperature_k)
        found["given_faculae"] = _region(star.faculae, kelvin, factor * shares["faculae"])
    return found


def _region(region: Region, temperature_k: float, fraction: float) -> SurfaceRegion:
    return SurfaceRegion.model_construct(
        temperature_k=temperature_k,
        temperature_error_k=region.temperature_error_k,
        covered_fraction=fraction,
        covered_fraction_error=region.fraction_error,
    )


def _cloud(scenario: Scenario, values: Mapping[str, float]) -> Cloud | None:
    cloud, atmosphere = scenario.atmosphere.cloud, scenario.atmosphere
    if "cloud_top" not in values:
        return cloud
    top_bar = values["cloud_top"]
    if math.isinf(top_bar) or (atmosphere.surface and top_bar >= atmosphere.pressure_bar):
        return None
    covered = cloud.covered_fraction if cloud is not None else 1.0
    return Cloud.model_construct(top_bar=top_bar, covered_fraction=covered)


def _haze(scenario: Scenario, values: Mapping[str, float]) -> Haze | None:
    haze = scenario.atmosphere.haze
    if "haze" not in values:
        return haze
    if values["haze"] == 0:
        return None
    slope = haze.wavelength_slope if haze is not None else -4.0
    return Haze.model_construct(factor=values["haze"], wavelength_slope=slope)
