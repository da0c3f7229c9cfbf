"""What a spectrum says: mixing ratios and everything else that is unknown, by nested sampling on reduced opacity.

Points of the unit cube are taken to atmospheres by the priors that the scenario states, and to spectra by the same
forward model as everywhere. Levels of detectors are integrated out. Draws from the posterior are then computed on the
full grid as well, and the change that this makes is reported.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from importlib import metadata
from pathlib import Path
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from planner import __version__
from planner.claims.spectrum import ObservedSpectrum
from planner.detection.nested import NestedRun, NestedState, advance, begin, outcome, remaining
from planner.errors import RangeError
from planner.scenario.records import Scenario
from planner.spectroscopy.store import digest
from planner.studies.fitting.draws import bin_report, drawn, offsets, recheck, with_level
from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.observed import fitted_gases, fitted_scenario, lacking, view_observed
from planner.studies.fitting.posterior import cut_by_its_prior, found_of, goodness_of
from planner.studies.fitting.problem import FitProblem
from planner.studies.fitting.records import Evidence, FitResult, Found
from planner.studies.fitting.unknowns import domain_of_fit, unknowns_of
from planner.studies.reduced import ReducedError, reduce_opacity
from planner.studies.workshop import Progress, Workshop

__all__ = ["SEED", "Keeper", "fit", "run_nested"]

Array = NDArray[np.float64]

SEED = 1
LIVE = 100
"""Live points: ln(evidence) is then good to about a quarter, and a fit of eight parameters takes minutes.

Models run one after the other: on few samples two threads wait for each other longer than they gain."""
_ENOUGH = 0.1
"""A run ends when what is left can raise ln(evidence) by no more than this."""
_CAUTIONS = (
    "These are estimates: air is isothermal with constant mixing ratios, and bins are taken as independent.",
    "Evidence and upper limits depend on the priors, those of the mixing ratios above all: a range that reaches "
    "further down lowers both. State them with the result.",
    "The evidence weighs only the models that were tried: a gas that is not in the scenario may do as well.",
    "A detected gas is not detected life or industry: most gases have other sources too.",
)


class Keeper(Protocol):
    """Keeps the state of a run where it outlasts the program."""

    def fetch(self, name: str, key: str) -> NestedState | None:
        """The state of that name, if there is one; refuses one with another key."""

    def keep(self, name: str, key: str, state: NestedState) -> None:
        """Put it there, whole or not at all."""


def fit(
    scenario: Scenario,
    observed: ObservedSpectrum,
    *,
    spectrum: str,
    without: str | None = None,
    live: int = LIVE,
    seed: int = SEED,
    keeper: Keeper | None = None,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
) -> FitResult:
    """Fit a spectrum.

    Parameters
    ----------
    scenario : Scenario
        Candidates, absorbers and rivals are all in the air at once.
    observed : ObservedSpectrum
    spectrum : str
        What to call it.
    without : str, optional
        Formula of a gas: a second fit to air without it tells how much the data speak for it.
    live : int
        Live points of the nested sampling.
    seed : int
    keeper : Keeper, optional
        Where states are kept between legs and taken up from.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.

    Raises
    ------
    PlannerError
        If line data cannot be read or used, no gas has data where the spectrum is, or a kept state is another fit's.
    """
    tell = progress or (lambda text, share: None)
    bench = _set_up(scenario, observed, without, lines_folder, tell)
    runs = [_run(bench, problem, live, seed, keeper, tell) for problem in bench.problems]
    posteriors = [
        drawn(problem, run, np.random.default_rng([seed, n]), tell)
        for n, (problem, run) in enumerate(zip(bench.problems, runs, strict=True))
    ]
    problem, run, posterior = bench.problems[0], runs[0], posteriors[0]
    found = tuple(found_of(u, d) for u, d in zip(problem.unknowns, posterior.shown.T, strict=True))
    best_ppm = with_level(problem.data, problem.spectrum_ppm(run.points[np.argmax(run.ln_likelihood)]))
    free = len(problem.unknowns) + (len(observed.detectors) if problem.data.offset_ppm else 0)
    return FitResult(
        title=scenario.title,
        invented=scenario.invented,
        spectrum=spectrum,
        seed=seed,
        live=live,
        found=found,
        offsets=offsets(observed, problem.data, posterior),
        evidences=tuple(_evidence(p, r) for p, r in zip(bench.problems, runs, strict=True)),
        goodness=goodness_of(problem.data, best_ppm, (observed.from_um, observed.to_um), free),
        recheck=recheck(problem, bench.workshop, posterior, tell),
        bins=bin_report(observed, problem, best_ppm, posteriors),
        line_data=(*bench.workshop.line_data(), *bench.workshop.store.notices),
        assumptions=_assumptions(scenario, problem, bench.error, live, seed),
        cautions=(*_CAUTIONS, *bench.cautions, *_cut(scenario, found)),
        version=__version__,
    )


def run_nested(
    problem: FitProblem,
    *,
    live: int,
    seed: int,
    state: NestedState | None = None,
    each: Callable[[NestedState], None] = lambda state: None,
) -> NestedRun:
    """A whole run from its beginning or from a kept state.

    Parameters
    ----------
    each : callable
        Called with the state after every leg.
    """
    ln_likelihood = problem.ln_likelihood
    if state is None:
        state = begin(ln_likelihood, len(problem.unknowns), live=live, seed=seed)
        each(state)
    while remaining(state) > _ENOUGH:
        state = advance(state, ln_likelihood, seed=seed)
        each(state)
    return outcome(state)


@dataclass(frozen=True, kw_only=True, eq=False)
class _Bench:
    workshop: Workshop
    problems: tuple[FitProblem, ...]
    """With all gases; without the gas in question."""
    error: ReducedError
    cautions: tuple[str, ...]


def _set_up(
    scenario: Scenario, observed: ObservedSpectrum, without: str | None, lines_folder: Path | None, tell: Progress
) -> _Bench:
    gases = fitted_gases(scenario)
    if without is not None and without not in gases:
        raise RangeError(f"{without} is not fitted; expected one of {', '.join(gases)}")
    fitted = fitted_scenario(scenario)
    workshop = Workshop(fitted, lines_folder=lines_folder, progress=tell, view=view_observed(fitted, observed))
    blind = [gas for gas in gases if not (workshop.opacities.has_data(gas) and workshop.opacities.covered(gas).any())]
    span = f"{observed.from_um.min():.3g} to {observed.to_um.max():.3g} um"
    if len(blind) == len(gases) or without in blind:
        raise RangeError(f"{', '.join(blind)}: no data from {span}; bring some with --lines, or fit other gases")
    reduced = reduce_opacity(workshop, domain_of_fit(fitted, unknowns_of(scenario)), progress=tell)
    data = LevelledData(
        depth_ppm=observed.depth_ppm,
        error_ppm=observed.error_ppm,
        detector=observed.detector,
        offset_ppm=scenario.nuisances.offset_ppm,
    )
    return _Bench(
        workshop=workshop,
        problems=tuple(
            FitProblem(
                scenario=lacking(fitted, gas) if gas else fitted,
                unknowns=unknowns_of(scenario, without=gas),
                data=data,
                wavelength_um=workshop.views[0].bins.centre_um,
                model=reduced.model,
                without=gas,
            )
            for gas in ((None, without) if without else (None,))
        ),
        error=reduced.error,
        cautions=tuple(
            f"{gas}: no data from {span}, taken as transparent: what is said of it is its prior" for gas in blind
        ),
    )


def _run(bench: _Bench, problem: FitProblem, live: int, seed: int, keeper: Keeper | None, tell: Progress) -> NestedRun:
    """One run, taken up where it was kept."""
    name = f"without-{problem.without}" if problem.without else "with-all"
    key = _key_of(bench, problem, live, seed)
    text = f"sampling air without {problem.without}" if problem.without else "sampling air with all gases"

    def each(state: NestedState) -> None:
        if keeper is not None:
            keeper.keep(name, key, state)
        left = np.log1p(remaining(state) / _ENOUGH)
        tell(text, float(min(1.0, state.legs / (state.legs + left))))

    problem.spectrum_ppm(np.full(len(problem.unknowns), 0.5))  # tells at once if the air cannot be
    kept = keeper.fetch(name, key) if keeper is not None else None
    return run_nested(problem, live=live, seed=seed, state=kept, each=each)


def _key_of(bench: _Bench, problem: FitProblem, live: int, seed: int) -> str:
    """Everything that a run depends on."""
    data, workshop = problem.data, bench.workshop
    gases = list(problem.scenario.air(problem.scenario.cases[0]))
    arrays = (data.depth_ppm, data.error_ppm, data.detector, problem.wavelength_um)
    samples = problem.model.opacities.wavenumber_per_cm
    versions = [f"{name} {metadata.version(name)}" for name in ("dynesty", "numpy", "scipy")]
    return digest(
        *(array.tobytes() for array in (*arrays, workshop.views[0].bins.from_um, samples)),
        problem.scenario.model_dump_json(),
        *(f"{unknown.name}: {unknown.words}" for unknown in problem.unknowns),
        *(workshop.library.gas(gas).digest for gas in gases if workshop.opacities.has_data(gas)),
        *workshop.library.pair_provenance(gases),
        f"{problem.without} {live} {seed} limbcast {__version__}",
        *versions,
    )


def _evidence(problem: FitProblem, run: NestedRun) -> Evidence:
    return Evidence(
        without=problem.without,
        ln_evidence=run.ln_evidence,
        error=run.error,
        information=run.information,
        parameters=len(problem.unknowns),
        evaluations=run.evaluations,
        effective_size=run.effective_size,
    )


def _cut(scenario: Scenario, found: Sequence[Found]) -> tuple[str, ...]:
    """Gases whose posterior the prior cuts off."""
    high = scenario.fit.mixing_ratio_range[1]
    return tuple(
        f"{one.name} runs into the upper end of its prior, {high:g}: its range would reach further with a wider "
        "mixing_ratio_range in [fit]"
        for one in found
        if cut_by_its_prior(one)
    )


def _assumptions(scenario: Scenario, problem: FitProblem, error: ReducedError, live: int, seed: int) -> tuple[str, ...]:
    """What a fit rests on, a sentence each."""
    background = ", ".join(scenario.atmosphere.background)
    offsets = f"{problem.data.offset_ppm:g} ppm about zero, integrated out" if problem.data.offset_ppm else "none"
    return (
        f"isothermal air with constant mixing ratios; the background is {background}; the star is as stated",
        f"errors are normal, independent from bin to bin and as stated; offset of each detector: {offsets}",
        f"nested sampling with {live} live points, seed {seed}; it ends when what is left can raise ln(evidence) by "
        f"{_ENOUGH:g}",
        f"reduced opacity: {error.samples} of {error.of_samples} samples; depths of {error.atmospheres} atmospheres "
        f"that it was not fitted to differ from the full model by {error.typical:.2g} of the errors (root mean square; "
        f"at most {error.worst:.2g}, {error.worst_ppm:.2g} ppm)",
        "which bins carry the result: draws are weighted by one over the density that they give to the bin's depth",
    )
