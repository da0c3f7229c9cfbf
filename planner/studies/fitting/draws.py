"""Draws from a posterior: their spectra, what the full grid says of them, and what each bin does."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner.claims.spectrum import ObservedSpectrum
from planner.detection.nested import NestedRun, draws
from planner.pool import in_threads
from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.posterior import LeftOut, effective_size, leave_out_each, offset_of
from planner.studies.fitting.problem import FitProblem
from planner.studies.fitting.records import BinReport, Found, Recheck
from planner.studies.workshop import Progress, Workshop

__all__ = ["Posterior", "bin_report", "drawn", "offsets", "recheck", "with_level"]

Array = NDArray[np.float64]

_DRAWS = 1000
_RECHECKED = 200
_TABLES_FOR = 16
"""Full-grid draws, sorted by temperature, between two clearings of the memory."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Posterior:
    """Equally likely draws.

    Attributes
    ----------
    points : (draw, parameter)
        In the unit cube.
    shown : (draw, parameter)
        As they are reported.
    model_ppm : (draw, bin)
        Spectra without levels.
    levels_ppm : (draw, detector)
    left_out : LeftOut
    """

    points: Array
    shown: Array
    model_ppm: Array
    levels_ppm: Array
    left_out: LeftOut


def drawn(problem: FitProblem, run: NestedRun, rng: np.random.Generator, tell: Progress) -> Posterior:
    """Draws from a posterior, with spectra, levels and what is left without each bin."""
    points = run.points[draws(run, _DRAWS, rng)]
    spectra = np.array(in_threads(problem.spectrum_ppm, list(points), text="spectra of the draws", progress=tell))
    levels = np.array([_level(problem.data, spectrum, rng) for spectrum in spectra])
    shown = problem.shown(points)
    return Posterior(
        points=points,
        shown=shown,
        model_ppm=spectra,
        levels_ppm=levels,
        left_out=leave_out_each(problem.data.ln_densities(spectra + levels[:, problem.data.detector]), shown),
    )


def _level(data: LevelledData, spectrum_ppm: Array, rng: np.random.Generator) -> Array:
    mean, width = data.level(spectrum_ppm)
    return mean + width * rng.standard_normal(mean.size)


def with_level(data: LevelledData, spectrum_ppm: Array) -> Array:
    return spectrum_ppm + data.level(spectrum_ppm)[0][data.detector]


def recheck(problem: FitProblem, workshop: Workshop, posterior: Posterior, tell: Progress) -> Recheck:
    """Weights that the full grid gives to some draws."""
    full = problem.on(workshop.model)
    chosen = np.arange(0, _DRAWS, _DRAWS // _RECHECKED)
    chosen = chosen[np.argsort([problem.temperature_k(point) for point in posterior.points[chosen]])]
    spectra: list[Array] = []
    for start in range(0, chosen.size, _TABLES_FOR):
        tell("draws on the full grid", start / chosen.size)
        some = chosen[start : start + _TABLES_FOR]
        spectra += in_threads(full.spectrum_ppm, list(posterior.points[some]))
        workshop.opacities.let_go()
    few = posterior.model_ppm[chosen]
    change = [
        problem.data.ln_likelihood(one) - problem.data.ln_likelihood(other)
        for one, other in zip(spectra, few, strict=True)
    ]
    weights = special.softmax(change)
    shown = posterior.shown[chosen]
    shifts = (weights @ shown - shown.mean(axis=0)) / posterior.shown.std(axis=0)
    return Recheck(
        draws=chosen.size,
        effective_size=effective_size(change),
        ln_evidence_shift=float(special.logsumexp(change) - np.log(chosen.size)),
        shifts=tuple((u.name, float(s)) for u, s in zip(problem.unknowns, shifts, strict=True)),
        worst_ppm=float(np.abs(np.array(spectra) - few).max()),
    )


def offsets(observed: ObservedSpectrum, data: LevelledData, posterior: Posterior) -> tuple[Found, ...]:
    if data.offset_ppm == 0:
        return ()
    pairs = zip(observed.detectors, posterior.levels_ppm.T, strict=True)
    return tuple(offset_of(name, levels, data.offset_ppm) for name, levels in pairs)


def bin_report(
    observed: ObservedSpectrum, problem: FitProblem, best_ppm: Array, posteriors: Sequence[Posterior]
) -> BinReport:
    posterior = posteriors[0]
    gases = [number for number, unknown in enumerate(problem.unknowns) if unknown.gas]
    left_out = [p.left_out for p in posteriors]
    seen = posterior.model_ppm + posterior.levels_ppm[:, problem.data.detector]
    return BinReport(
        from_um=observed.from_um,
        to_um=observed.to_um,
        depth_ppm=observed.depth_ppm,
        error_ppm=observed.error_ppm,
        detector=observed.detector,
        best_ppm=best_ppm,
        bands_ppm=np.quantile(seen, (0.025, 0.16, 0.5, 0.84, 0.975), axis=0),
        gases=tuple(problem.unknowns[number].name for number in gases),
        left_out_shift=left_out[0].means[gases],
        left_out_ln_density=left_out[0].ln_density,
        left_out_gain=left_out[0].ln_density - left_out[1].ln_density if len(left_out) > 1 else None,
        left_out_size=np.min([part.size for part in left_out], axis=0),
        trusted=np.all([part.trusted for part in left_out], axis=0),
    )
