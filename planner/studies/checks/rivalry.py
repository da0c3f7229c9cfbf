"""Check 4: which other gases of the catalogue make the same shape?"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.read import read_catalogue
from planner.catalogue.records import GasRecord
from planner.errors import RangeError
from planner.report.words import gas_text
from planner.studies.checks.bench import Bench, height_ppm
from planner.studies.checks.findings import Check, Finding, Outcome

__all__ = ["AS_WELL", "Rivalry", "check_rivals", "try_all"]

Array = NDArray[np.float64]

AS_WELL = 2.0
"""A rival within so many sigma of the gas (a difference in chi-squared of four) does as well."""
_RATIOS = (1e-7, 1e-5, 1e-3)
"""Amounts at which the shape of a rival is tried: thin, middling, saturated."""
_INFORMATIVE = 0.3
_LEAST_PPM = 0.1
_NAMED = 5
_WHY = "A feature is a gas only if no other gas makes it: a band shared by many names none of them."


@dataclass(frozen=True, kw_only=True, eq=False)
class Rivalry:
    """What all rivals come to: sigma by which the gas fits better than each, and than each pair; and shapes."""

    beyond: Mapping[str, float]
    pairs: Mapping[tuple[str, str], float]
    shapes_ppm: Mapping[str, Array]
    not_tried: tuple[str, ...]


def try_all(bench: Bench) -> Rivalry:
    """Every gas of the catalogue with a band where the claimed one absorbs, alone and in pairs."""
    fits = bench.fits
    shapes: dict[str, Array] = {}
    not_tried: list[str] = []
    for gas in _candidates(bench):
        try:
            found = [shape for ratio in _RATIOS if height_ppm(shape := bench.rival_at(gas, ratio)) > _LEAST_PPM]
        except RangeError:
            not_tried.append(gas)
            continue
        if found:
            shapes[gas] = found[0] if fits is None else min(found, key=lambda shape: fits.chi2([shape]))
    if fits is None:
        return Rivalry(beyond={}, pairs={}, shapes_ppm=shapes, not_tried=tuple(not_tried))
    template = bench.template_ppm
    beyond = {gas: fits.beyond(template, [shape]) for gas, shape in shapes.items()}
    weaker = [gas for gas, sigma in beyond.items() if sigma >= AS_WELL]
    pairs = {(a, b): fits.beyond(template, [shapes[a], shapes[b]]) for a, b in combinations(weaker, 2)}
    return Rivalry(
        beyond=dict(sorted(beyond.items(), key=lambda item: item[1])),
        pairs=dict(sorted(pairs.items(), key=lambda item: item[1])),
        shapes_ppm=shapes,
        not_tried=tuple(not_tried),
    )


def _candidates(bench: Bench) -> list[str]:
    """Gases with data and a band where the template is high; those of industry only against one of industry."""
    catalogue, industrial = read_catalogue(), _industrial(bench)
    high = bench.template_ppm - bench.template_ppm.min() > _INFORMATIVE * bench.height_ppm
    present = set(bench.scenario.air(bench.case(bench.mixing_ratio)))
    return [
        gas.formula
        for gas in catalogue.values()
        if gas.formula not in present
        and (industrial or gas.gas_class != "industrial")
        and _absorbs(gas, bench, high)
        and bench.model.opacities.has_data(gas.formula)
    ]


def _industrial(bench: Bench) -> bool:
    """Whether the claimed gas is one that industry alone makes."""
    own = read_catalogue().get(bench.gas)
    return own is not None and own.gas_class == "industrial"


def _absorbs(gas: GasRecord, bench: Bench, where: NDArray[np.bool_]) -> bool:
    bins = bench.bins
    return any(np.any(where & (bins.to_um > band.from_um) & (bins.from_um < band.to_um)) for band in gas.bands)


def check_rivals(bench: Bench | None, rivalry: Rivalry | None) -> Finding:
    """How many gases, and pairs of gases, do as well."""
    tested = "the catalogue's other absorbers fitted in place of the gas, one by one and in pairs"
    tested += "" if bench is None or _industrial(bench) else "; gases that industry alone makes left out"
    if bench is None or rivalry is None or bench.fits is None:
        missing = "star, planet or air are not given" if bench is None else bench.unweighed
        return Finding(check=Check.RIVALS, outcome=Outcome.UNTESTED, tested=tested, says=missing, why=_WHY)
    if not rivalry.beyond:
        says = "no other gas of the catalogue that there are data for absorbs there"
        return Finding(check=Check.RIVALS, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY)
    as_well = [gas for gas, sigma in rivalry.beyond.items() if sigma < AS_WELL]
    pairs = [pair for pair, sigma in rivalry.pairs.items() if sigma < AS_WELL]
    first, least = next(iter(rivalry.beyond.items()))
    says = f"of {len(rivalry.beyond)} gases tried "
    if as_well:
        more = f" and {len(as_well) - _NAMED} more" if len(as_well) > _NAMED else ""
        named = ", ".join(map(gas_text, as_well[:_NAMED]))
        says += f"{len(as_well)} {'do' if len(as_well) > 1 else 'does'} as well within {AS_WELL:g} sigma: {named}{more}"
    else:
        says += f"none does as well; the nearest, {gas_text(first)}, leaves {least:.2g} sigma"
    if pairs:
        a, b = pairs[0]
        says += (
            f"; and {len(pairs)} pair{'s' * (len(pairs) > 1)} of the others, such as {gas_text(a)} with {gas_text(b)}"
        )
    if rivalry.not_tried:
        says += f" (not tried, no data at this temperature: {', '.join(map(gas_text, rivalry.not_tried))})"
    figures: dict[str, float | str | None] = {
        "rivals_tried": len(rivalry.beyond),
        "rivals_as_good": len(as_well),
        "pairs_tried": len(rivalry.pairs),
        "pairs_as_good": len(pairs),
        "nearest_rival": first,
        **{f"left_by_{gas}_sigma": sigma for gas, sigma in list(rivalry.beyond.items())[:_NAMED]},
    }
    return Finding(
        check=Check.RIVALS,
        outcome=Outcome.FAILED if least < AS_WELL else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY,
        figures=figures,
        left_sigma=least,
        decides=False,
        on_data=bench.on_data,
    )
