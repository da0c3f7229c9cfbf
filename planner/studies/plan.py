"""How many transits for each gas, here, with each mode: the main study."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace
from math import ceil
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner import __version__
from planner.detection.significance import Measurement, target_snr
from planner.instrument.binning import Bins
from planner.scenario.records import Scenario
from planner.star.flux import star_cautions
from planner.studies.contamination import bin_factors, mimic_cautions, mimicry, usual_caution
from planner.studies.linecautions import line_cautions
from planner.studies.nuisances import prior_widths
from planner.studies.observe import ModeView, source_of_light
from planner.studies.remedies import Adviser
from planner.studies.results import BandShare, BinnedSpectrum, Counts, PlanResult, PlanRow, StarMimic, Verdict
from planner.studies.simulation import simulate_search
from planner.studies.workshop import Progress, Sight, Workshop, see

__all__ = [
    "CAUTIONS",
    "Sight",
    "Workshop",
    "assumptions",
    "bands_of",
    "cautions_about_star",
    "costs_of",
    "counts_of",
    "gaps_of",
    "plan",
    "plan_row",
    "see",
]

Array = NDArray[np.float64]

CAUTIONS = (
    "These are estimates: confirm exposure settings and noise with the observatory's own tools and staff before "
    "submitting.",
    "A detected gas is not detected life or industry: most gases have other sources too.",
)
SEED = 1
"""Of simulated observations."""
_NO_SIGNAL_PPM = 0.1
"""A share that nowhere exceeds this counts as no band in range."""
_MISSION_YEARS = 5.0
_BAND_INFORMATION = 0.8
_NOTHING_SEEN = (Verdict.NO_BAND, Verdict.SATURATED)
_CONFUSION_TRANSITS = 100.0
"""Transits at which confusion is quoted where even perfect knowledge does not suffice."""


def plan(
    scenario: Scenario,
    *,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
    simulated: int | None = None,
    remedies: bool = False,
    spread: int | None = None,
) -> PlanResult:
    """Transits, hours and verdict for every case and mode of a scenario.

    Parameters
    ----------
    scenario : Scenario
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.
    simulated : int, optional
        Observations to simulate of each search, to try the rates that are stated.
    remedies : bool
        Work out all that would help; without, only what takes no further forward model.
    spread : int, optional
        Draws from the priors of all that is not known, for the spread of the transits.

    Raises
    ------
    PlannerError
        If line data or modes cannot be read or used.
    """
    workshop = Workshop(scenario, lines_folder=lines_folder, progress=progress)
    adviser = Adviser(workshop, thorough=remedies, lines_folder=lines_folder, progress=progress)
    rows: list[PlanRow] = []
    spectra: list[BinnedSpectrum] = []
    for case in scenario.cases:
        sight = see(workshop, case)
        for index in range(len(workshop.views)):
            row = adviser.advise(plan_row(workshop, sight, index), sight, index)
            rows.append(_tried(row, workshop, sight, index, simulated) if simulated else row)
            spectra.append(binned_spectrum(workshop, sight, index))
    result = PlanResult(
        title=scenario.title,
        invented=scenario.invented,
        threshold_sigma=scenario.goal.threshold_sigma,
        power=scenario.goal.power,
        transits_available=scenario.goal.transits_available,
        transit_duration_h=scenario.transit_duration_h,
        charged_hours_per_transit=max(view.charged_hours for view in workshop.views if not view.parts),
        scale_height_km=scenario.scale_height_km(),
        scale_height_ppm=scenario.scale_height_ppm(),
        rows=tuple(rows),
        spectra=tuple(spectra),
        line_data=(*workshop.line_data(), *workshop.store.notices),
        assumptions=assumptions(workshop),
        nuisances=prior_widths(scenario),
        cautions=(*CAUTIONS, *cautions_about_star(workshop), *_surface_cautions(scenario, rows)),
        version=__version__,
    )
    if not spread:
        return result
    from planner.studies.spread import add_spread

    return add_spread(workshop, result, draws=spread, progress=progress)


def plan_row(workshop: Workshop, sight: Sight, index: int) -> PlanRow:
    """What a case comes down to with one mode."""
    scenario, view, measurement = workshop.scenario, workshop.views[index], sight.measurements[index]
    target = target_snr(scenario.goal.threshold_sigma, scenario.goal.power)
    known = counts_of(measurement.known(), _reach(measurement.known(), target), scenario, view)
    marginalised = counts_of(measurement, _reach(measurement, target), scenario, view)
    transits = known.transits_unrounded or _CONFUSION_TRANSITS
    verdict = _verdict(sight, index, known, marginalised, target, view.on_offer(scenario))
    mimic = _mimic(workshop, sight, index, marginalised) if verdict not in _NOTHING_SEEN else None
    best_bands = bands_of(view, sight.usable[index], measurement.information())
    about_lines = line_cautions(workshop.library, sight.case.gases, best_bands)
    return PlanRow(
        gas=sight.case.label,
        mixing_ratio=sight.case.mixing_ratios[0],
        mode=view.mode.name,
        verdict=verdict,
        marginalised=marginalised,
        all_known=known,
        best_bands=best_bands,
        confusion=costs_of(measurement, transits),
        confused_from=measurement.known().snr(transits),
        confused_to=measurement.snr(transits),
        uncovered_um=gaps_of(workshop, [*sight.case.gases, *scenario.atmosphere.absorbers], view),
        saturated_um=view.noise.saturated_um,
        cautions=(*(mimic_cautions(mimic) if mimic else ()), *about_lines),
        star=mimic,
    )


def _mimic(workshop: Workshop, sight: Sight, index: int, counts: Counts) -> StarMimic:
    view, usable = workshop.views[index], sight.usable[index]
    return mimicry(
        sight.measurements[index],
        sight.spectrum[index].depth_ppm[usable],
        workshop.scenario.star,
        view.bins.centre_um[usable],
        counts.transits_required or view.on_offer(workshop.scenario),
    )


def _tried(row: PlanRow, workshop: Workshop, sight: Sight, index: int, draws: int) -> PlanRow:
    """The row with its rates tried on simulated observations, the same ones every time."""
    if not row.best_bands or row.verdict in _NOTHING_SEEN:
        return row
    bins, usable = workshop.views[index].bins, sight.usable[index]
    simulation = simulate_search(
        sight.measurements[index],
        Bins(detector=bins.detector[usable], from_um=bins.from_um[usable], to_um=bins.to_um[usable]),
        row.best_bands[0],
        transits=row.marginalised.transits_required or workshop.views[index].on_offer(workshop.scenario),
        threshold_sigma=workshop.scenario.goal.threshold_sigma,
        draws=draws,
        rng=np.random.default_rng(SEED),
    )
    return replace(row, simulation=simulation)


def _reach(measurement: Measurement, target: float) -> float | None:
    return measurement.transits_for(target) if measurement.template_ppm.size else None


def counts_of(measurement: Measurement, unrounded: float | None, scenario: Scenario, view: ModeView) -> Counts:
    """Significance of a measurement, and the hours of the real-valued number of transits that it needs."""
    required = None if unrounded is None else max(1, ceil(unrounded - 1e-9))
    in_transit_h = view.transits_each * scenario.transit_duration_h
    return Counts(
        snr_one_transit=measurement.snr(1.0) if measurement.template_ppm.size else 0.0,
        snr_limit=measurement.snr_limit() if measurement.template_ppm.size else 0.0,
        transits_required=required,
        transits_unrounded=unrounded,
        hours_required=None if required is None else required * view.charged_hours,
        in_transit_hours_required=None if required is None else required * in_transit_h,
    )


def _verdict(sight: Sight, index: int, known: Counts, marginalised: Counts, target: float, available: int) -> Verdict:
    template, usable = np.abs(sight.templates_ppm[index]), sight.usable[index]
    if template.max(initial=0.0) < _NO_SIGNAL_PPM:
        return Verdict.NO_BAND
    if template[usable].max(initial=0.0) < _NO_SIGNAL_PPM:
        return Verdict.SATURATED
    if marginalised.transits_required is None:
        return Verdict.FLOOR if known.snr_limit <= target else Verdict.CONFUSION
    return Verdict.WITHIN_REACH if marginalised.transits_required <= available else Verdict.TOO_MANY


def costs_of(measurement: Measurement, transits: float) -> tuple[tuple[str, float], ...]:
    """What each nuisance alone leaves of the significance that all known would give; the three dearest."""
    full = measurement.known().snr(transits)
    left = sorted(((name, measurement.only(name).snr(transits)) for name in measurement.nuisances), key=lambda c: c[1])
    return tuple((name, snr) for name, snr in left[:3] if snr < 0.98 * full)


def bands_of(view: ModeView, usable: NDArray[np.bool_], shares: Array) -> tuple[BandShare, ...]:
    """The stretches that hold most of the information: fewest bins with 80 % of it, neighbours joined, best first.

    Parameters
    ----------
    view : ModeView
    usable : (bin,)
    shares : (usable bin,)
        Of the information, each from 0; they add up to 1.
    """
    information = np.zeros(len(view.bins))
    information[usable] = shares
    order = np.argsort(information)[::-1]
    needed = int(np.searchsorted(np.cumsum(information[order]), _BAND_INFORMATION)) + 1
    chosen = np.zeros(len(view.bins), dtype=bool)
    chosen[order[:needed]] = information[order[:needed]] > 0
    bands: list[BandShare] = []
    for run in _runs(chosen, view.bins.detector):
        bands.append(
            BandShare(
                from_um=float(view.bins.from_um[run[0]]),
                to_um=float(view.bins.to_um[run[-1]]),
                share=float(information[run].sum()),
            )
        )
    return tuple(sorted(bands, key=lambda band: -band.share)[:3])


def _runs(mask: NDArray[np.bool_], detector: NDArray[np.int64]) -> list[NDArray[np.intp]]:
    """Index runs where the mask holds, on one detector each; single bins left out between are bridged."""
    index = np.flatnonzero(mask)
    if not index.size:
        return []
    breaks = np.flatnonzero((np.diff(index) > 2) | (np.diff(detector[index]) != 0)) + 1
    return list(np.split(index, breaks))


def gaps_of(workshop: Workshop, gases: Iterable[str], view: ModeView) -> tuple[tuple[str, float, float], ...]:
    """Stretches of a mode that the data of some gases do not cover: gas, from and to in um."""
    wavelength = view.grid.wavelength_um
    seen = view.weights.sum(axis=0) > 0
    found: list[tuple[str, float, float]] = []
    for gas in gases:
        if not workshop.opacities.has_data(gas):
            continue
        missing = np.flatnonzero(seen & ~workshop.opacities.covered(gas))
        for run in np.split(missing, np.flatnonzero(np.diff(missing) > 1) + 1):
            if run.size > 1:
                found.append((gas, float(wavelength[run[-1]]), float(wavelength[run[0]])))
    return tuple(found)


def binned_spectrum(workshop: Workshop, sight: Sight, index: int) -> BinnedSpectrum:
    """The spectrum of a case in the bins of one mode, with the shares, the noise and the floor."""
    view = workshop.views[index]
    return BinnedSpectrum(
        gas=sight.case.label,
        mixing_ratio=sight.case.mixing_ratios[0],
        mode=view.mode.name,
        detector=view.bins.detector,
        from_um=view.bins.from_um,
        to_um=view.bins.to_um,
        depth_ppm=sight.spectrum[index].depth_ppm,
        shares_ppm=sight.spectrum[index].shares_ppm,
        noise_one_transit_ppm=view.noise.depth_error_ppm,
        floor_ppm=np.sqrt(np.diag(view.floor_ppm2)),
        usable=sight.usable[index],
        scale_height_ppm=workshop.scenario.scale_height_ppm(sight.case),
        contamination_ppm=_contamination(workshop, sight, index),
    )


def _contamination(workshop: Workshop, sight: Sight, index: int) -> Array | None:
    """What spots and faculae as stated add to the depth in each bin."""
    star = workshop.scenario.star
    if star.spots is None and star.faculae is None:
        return None
    factor = bin_factors(star, workshop.views)[index]
    return np.asarray(sight.spectrum[index].depth_ppm * (1 - 1 / factor))


def cautions_about_star(workshop: Workshop) -> tuple[str, ...]:
    """What to mind about the star, seen with the modes of a scenario."""
    spans = [view.mode.span_um for view in workshop.views]
    star = source_of_light(workshop.scenario)
    return star_cautions(star, min(a for a, _ in spans), max(b for _, b in spans))


def _surface_cautions(scenario: Scenario, rows: Sequence[PlanRow]) -> tuple[str, ...]:
    """What the usual spots and faculae are, where the scenario states none and they would matter."""
    silent = any(row.star is not None and row.star.serious and not row.star.stated for row in rows)
    return (usual_caution(scenario.star),) if silent else ()


def assumptions(workshop: Workshop) -> tuple[str, ...]:
    """What a result rests on, a sentence each."""
    scenario = workshop.scenario
    goal = scenario.goal
    baseline = scenario.out_of_transit_h
    available = scenario.transits_on_offer
    sentences = [
        f"detection: one-sided threshold of {goal.threshold_sigma:g} sigma reached with probability {goal.power:g}",
        f"bins of R = {scenario.bins.resolving_power:g}, or the resolution element where that is wider",
        f"one transit: {scenario.transit_duration_h:.2f} h in transit, {baseline:.2f} h out of transit",
        f"transits available: {available}"
        + ("" if goal.transits_available else f" (all in {_MISSION_YEARS:g} years; visibility not considered)"),
        "isothermal air with constant mixing ratios; white noise averages down with transits, the floor does not",
    ]
    for view in workshop.views:
        if view.parts:
            sentences.append(
                f"{view.mode.name}: {view.mode.summary}; its transits count those with each, its hours all of them "
                f"({view.charged_hours:.2f} h for one of each)"
            )
            continue
        floor_at = view.mode.floor
        groups = ", ".join(
            f"{d.name} {n}" for d, n in zip(view.mode.detectors, view.noise.groups.tolist(), strict=True)
        )
        sentences.append(
            f"{view.mode.name}: floor {floor_at.depth_ppm:g} ppm at R = {floor_at.resolving_power:g}, "
            f"{view.charged_hours:.2f} h charged per transit, groups per ramp: {groups}"
        )
    return tuple(sentences)
