"""The claimed gas through every mode at hand: what would settle the claim soonest, and where its other bands are."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from math import ceil
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner.detection.significance import Measurement
from planner.instrument.modefiles import list_modes
from planner.report.words import band_text, count_text, gas_text, hours_text
from planner.scenario.records import Scenario
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store
from planner.studies.checks.bench import Bench, height_ppm
from planner.studies.checks.findings import Check, Finding, Outcome
from planner.studies.checks.rivalry import Rivalry
from planner.studies.forward import Change, ForwardModel, opacities_of
from planner.studies.observe import ModeView, observing_grid, view_modes
from planner.studies.workshop import see

__all__ = ["SETTLED_SIGMA", "Prospect", "check_follow_up", "look_elsewhere"]

Array = NDArray[np.float64]
Progress = Callable[[str, float], None]

SETTLED_SIGMA = 5.0
"""A feature of the claimed size must be seen, or missed, by so much (common practice)."""
_STRIDE = 16
_RIVALS = 3
_LEAST_PPM = 0.1
_TRACE_RIVAL = 1e-5
_WHY = "The cheapest way out of a dispute is the observation that would see the claimed amount clearly, or not at all."


@dataclass(frozen=True, kw_only=True)
class Prospect:
    """The claimed amount of the gas with one mode."""

    mode: str
    height_ppm: float
    snr_one_transit: float
    """Unknowns of the air, offsets and the nearest rivals marginalised."""
    transits_required: int | None
    hours_required: float | None
    band_um: tuple[float, float]
    """The bins around the one that tells most."""


@dataclass(frozen=True, kw_only=True, eq=False)
class _Table:
    """A setting for `see`: every mode at once, on thinned samples."""

    views: Sequence[ModeView]
    model: ForwardModel

    @property
    def thin(self) -> ForwardModel:
        return self.model


def look_elsewhere(
    bench: Bench, rivalry: Rivalry | None, *, lines_folder: Path | None = None, progress: Progress | None = None
) -> tuple[Prospect, ...]:
    """The claimed gas with each shipped mode and the claim's own, soonest first; those that see nothing left out."""
    own = bench.claim.search.mode
    modes = (*list_modes(), *([own] if own is not None and own not in list_modes() else []))
    scenario = bench.claim.scenario(modes, bench.mixing_ratio)
    table = _table(scenario, lines_folder, progress)
    case = bench.case(bench.mixing_ratio)
    sight = see(table, case)
    stretch = bench.height_ppm / max(height_ppm(bench.template_at(bench.mixing_ratio)), 1e-9)
    rivals = list(rivalry.beyond)[:_RIVALS] if rivalry is not None else []
    base = table.model.binned(case, transparent=case.gases)
    moved = [table.model.binned(case, Change(added=((gas, _TRACE_RIVAL),)), transparent=case.gases) for gas in rivals]
    found = []
    for index, view in enumerate(table.views):
        usable, template = sight.usable[index], stretch * sight.templates_ppm[index]
        if usable.sum() < 2 or height_ppm(template[usable]) < _LEAST_PPM:
            continue
        shapes = [(part[index].depth_ppm - base[index].depth_ppm)[usable] for part in moved]
        measured = _with(replace(sight.measurements[index], template_ppm=template[usable]), rivals, shapes)
        found.append(_prospect(view, measured, usable))
    return tuple(sorted(found, key=lambda p: (p.hours_required is None, p.hours_required or -p.snr_one_transit)))


def _table(scenario: Scenario, lines_folder: Path | None, progress: Progress | None) -> _Table:
    grid = observing_grid(scenario)
    views, store = view_modes(scenario, grid), Store()
    opacities = opacities_of(scenario, LineLibrary(store, lines_folder), store, grid, progress)
    opacities = opacities.selection(np.arange(0, grid.count, _STRIDE), own_tables=True)
    return _Table(views=views, model=ForwardModel(scenario, opacities, [view.means(_STRIDE) for view in views]))


def _with(measured: Measurement, names: Sequence[str], shapes_ppm: Sequence[Array]) -> Measurement:
    """The measurement with rivals unknown by as much as would make a feature of the claimed height."""
    height = height_ppm(measured.template_ppm)
    wide = [shape * (height / tall) for shape in shapes_ppm if (tall := height_ppm(shape)) > _LEAST_PPM * 1e-2]
    kept = [name for name, shape in zip(names, shapes_ppm, strict=True) if height_ppm(shape) > _LEAST_PPM * 1e-2]
    if not kept:
        return measured
    return replace(
        measured,
        nuisances=(*measured.nuisances, *(f"rival {name}" for name in kept)),
        directions_ppm=np.vstack([measured.directions_ppm, *wide]),
    )


def _prospect(view: ModeView, measured: Measurement, usable: NDArray[np.bool_]) -> Prospect:
    unrounded = measured.transits_for(SETTLED_SIGMA)
    transits = None if unrounded is None else max(1, ceil(unrounded - 1e-9))
    index = np.flatnonzero(usable)
    information = measured.information()
    best = int(np.argmax(information))
    inside = information > 0.3 * information[best]
    low = high = best
    while low > 0 and inside[low - 1]:
        low -= 1
    while high < inside.size - 1 and inside[high + 1]:
        high += 1
    return Prospect(
        mode=view.mode.name,
        height_ppm=height_ppm(measured.template_ppm),
        snr_one_transit=measured.snr(1.0),
        transits_required=transits,
        hours_required=None if transits is None else transits * view.charged_hours,
        band_um=(float(view.bins.from_um[index[low]]), float(view.bins.to_um[index[high]])),
    )


def check_follow_up(bench: Bench | None, prospects: Sequence[Prospect], trouble: str | None = None) -> Finding:
    """Mode and number of transits that would settle the claim soonest; ``trouble`` is why nothing could be found."""
    tested = f"transits in which each mode would see the claimed amount with {SETTLED_SIGMA:g} sigma, rivals unknown"
    if bench is None or trouble is not None:
        says = trouble or "star, planet or air are not given"
        return Finding(check=Check.FOLLOW_UP, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY)
    reachable = [prospect for prospect in prospects if prospect.transits_required is not None]
    figures: dict[str, float | str | None] = {f"{p.mode} (transits)": p.transits_required for p in prospects}
    if not reachable:
        says = f"no mode at hand reaches {SETTLED_SIGMA:g} sigma on the claimed amount in any number of transits"
        return Finding(
            check=Check.FOLLOW_UP, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY, figures=figures
        )
    first = reachable[0]
    on_offer = bench.scenario.transits_on_offer
    count = first.transits_required or 0
    late = f", more than the {on_offer} that the orbit offers in five years" if count > on_offer else ""
    says = (
        f"soonest: {count_text(count)} transit{'s' * (count > 1)} with {first.mode} "
        f"({hours_text(first.hours_required)} h), most by {gas_text(bench.gas)} at {band_text(*first.band_um)} um{late}"
    )
    if len(reachable) > 1:
        second = reachable[1]
        says += f"; then {count_text(second.transits_required)} with {second.mode}"
    return Finding(
        check=Check.FOLLOW_UP,
        outcome=Outcome.UNTESTED if late else Outcome.PASSED,
        tested=tested, says=says, why=_WHY, figures=figures,
    )  # fmt: skip
