"""The forward model on few samples: chosen once per scenario and domain, for studies that run it thousands of times.

Samples and weights are fitted (`planner.spectroscopy.quadrature`) to atmospheres drawn over all that a study will
visit, computed on the full grid, and proved on others that had no part in the choice. What they must reproduce is all
that a significance is made of: depths with and without the searched gases, their shares, the slopes by absorbers.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property, lru_cache
from math import log
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.scenario.records import Case, Scenario
from planner.spectroscopy.quadrature import Quadrature, fit_until
from planner.spectroscopy.store import digest
from planner.studies.domain import Domain, drawn
from planner.studies.forward import Change, ForwardModel
from planner.studies.observe import ModeView
from planner.studies.workshop import Progress, Workshop

__all__ = ["Reduced", "ReducedError", "SparseMeans", "Variant", "reduce_opacity"]

Array = NDArray[np.float64]

_TRAINING = 72
_TRAINING_PER_CASE = 12
_CHECKS = 24
_PROOFS = 16
_ROUNDS = 3
"""Bins that fail the proof are fitted again, more closely and to more atmospheres, at most so often; then they keep
all their samples."""
_STRIDE = 4
"""Samples are chosen among every fourth of the grid; the means that they must give are those of all."""
_AIM = 0.04
_ALLOWED = 0.1
"""Largest error in units of the noise: aimed at in the choice, and allowed in the proof."""


class SparseMeans:
    """Means over bins from few samples with weights.

    Parameters
    ----------
    bins : sequence of (positions, weights)
        Per bin, at least one sample; positions among the samples.
    """

    def __init__(self, bins: Sequence[Quadrature]) -> None:
        self._starts = np.cumsum([0, *(len(index) for index, _ in bins[:-1])])
        self._index = np.concatenate([index for index, _ in bins])
        self._weights = np.concatenate([weights for _, weights in bins])

    def __call__(self, samples: Array) -> Array:
        """Means of ``(..., wavenumber)`` over the bins, ``(..., bin)``."""
        weighted = samples[..., self._index] * self._weights
        means: Array = np.add.reduceat(weighted, self._starts, axis=-1)
        return means


@dataclass(frozen=True, kw_only=True)
class ReducedError:
    """How well few samples do on atmospheres that had no part in the choice.

    The noise is that of each bin after ``transits``, floor included.
    """

    samples: int
    of_samples: int
    bins: int
    atmospheres: int
    transits: int
    worst: float
    """Largest error of any depth, share or slope, in units of the noise."""
    typical: float
    """Root mean square."""
    worst_ppm: float

    @property
    def sentence(self) -> str:
        """For the output."""
        return (
            f"reduced opacity: {self.samples} of {self.of_samples} samples, {self.samples / self.bins:.0f} per bin; "
            f"depths of {self.atmospheres} atmospheres that it was not fitted to differ from the full model by "
            f"{self.typical:.2g} of the noise after {self.transits} transits (root mean square; at most "
            f"{self.worst:.2g}, {self.worst_ppm:.2g} ppm)"
        )


@dataclass(frozen=True, kw_only=True, eq=False)
class Variant:
    """A scenario on reduced opacity: what `planner.studies.workshop.see` wants."""

    views: Sequence[ModeView]
    model: ForwardModel

    @property
    def thin(self) -> ForwardModel:
        """The same: it cannot get thinner."""
        return self.model


@dataclass(frozen=True, kw_only=True, eq=False)
class Reduced:
    """A scenario's opacities and bin means on few samples, for it and for every variation of it."""

    views: Sequence[ModeView]
    model: ForwardModel
    """Of the scenario itself."""
    error: ReducedError

    def of(self, scenario: Scenario) -> Variant:
        """The setting for a variation of the scenario; light and noise stay those of the original."""
        return Variant(views=self.views, model=self.model.of(scenario))


def reduce_opacity(workshop: Workshop, domain: Domain, *, progress: Progress | None = None) -> Reduced:
    """Choose the samples for a domain, or fetch the choice from the store.

    Raises
    ------
    PlannerError
        If the forward model cannot be run somewhere in the domain.
    """
    choice = _Choice(workshop, domain, progress or (lambda text, share: None))
    error, *rows = workshop.store.fetch("reduced", choice.key, choice.make)
    table = np.array(rows)
    bins = [[_bin_of(table, mode, b) for b in range(len(view.bins))] for mode, view in enumerate(choice.views)]
    if workshop.scenario.combines:
        bins.append([pair for mode in bins for pair in mode])
    index = np.unique(table[:, 2].astype(np.intp))
    return Reduced(
        views=workshop.views,
        model=ForwardModel(
            workshop.scenario,
            workshop.opacities.selection(index, own_tables=True),
            [SparseMeans([(np.searchsorted(index, i), w) for i, w in mode]) for mode in bins],
        ),
        error=ReducedError(
            samples=index.size,
            of_samples=workshop.opacities.grid.count,
            bins=sum(len(view.bins) for view in choice.views),
            atmospheres=_PROOFS,
            transits=workshop.scenario.transits_on_offer,
            worst=float(error[0]),
            typical=float(error[1]),
            worst_ppm=float(error[2]),
        ),
    )


def _bin_of(table: Array, mode: int, number: int) -> Quadrature:
    rows = table[(table[:, 0] == mode) & (table[:, 1] == number)]
    return rows[:, 2].astype(np.intp), rows[:, 3]


@dataclass(frozen=True, kw_only=True, eq=False)
class _Functions:
    """What a set of atmospheres makes of each sample, and of each bin, in ppm."""

    thin: NDArray[np.float32]
    """``(function, every fourth sample)``"""
    means: tuple[Array, ...]
    """Per mode, ``(function, bin)``, over all samples."""

    def and_also(self, other: _Functions) -> _Functions:
        return _Functions(
            thin=np.concatenate([self.thin, other.thin]),
            means=tuple(np.concatenate(pair) for pair in zip(self.means, other.means, strict=True)),
        )


class _Choice:
    """The work of choosing, done when its result is asked for.

    Attributes
    ----------
    views : list of ModeView
        The single modes; a combination has the bins of its parts.
    """

    def __init__(self, workshop: Workshop, domain: Domain, progress: Progress) -> None:
        self._workshop, self._domain, self._progress = workshop, domain, progress
        self.views = [view for view in workshop.views if not view.parts]
        self._means = [view.means() for view in self.views]

    @property
    def key(self) -> dict[str, Any]:
        """Everything that the choice depends on."""
        workshop = self._workshop
        gases = sorted({gas for case in workshop.scenario.cases for gas in workshop.scenario.air(case)})
        gases += sorted(workshop.scenario.nuisances.rivals)
        return {
            "code": _code_digest(),
            "scenario": workshop.scenario.model_dump_json(exclude={"title", "goal", "spread"}),
            "transits": workshop.scenario.transits_on_offer,
            "light": [digest(v.weights.tobytes(), v.noise.depth_error_ppm.tobytes()) for v in self.views],
            "bins": [digest(v.bins.from_um.tobytes(), v.floor_ppm2.tobytes()) for v in self.views],
            "grid": [workshop.opacities.grid.first, workshop.opacities.grid.samples_per_unit_ln],
            "gases": [workshop.library.gas(g).digest for g in gases if workshop.opacities.has_data(g)],
            "pairs": workshop.library.pair_provenance(gases),
            "ranges": sorted(self._domain.ranges.items()),
            "mixing_ratios": sorted(self._domain.mixing_ratios.items()),
        }

    def make(self) -> Array:
        """A row with the errors (worst, typical, worst in ppm), then rows of mode, bin, position and weight."""
        count = max(_TRAINING, _TRAINING_PER_CASE * len(self._domain.mixing_ratios))
        training = self._functions(count, seed=1, to_the_ends=True)
        checks = self._functions(_CHECKS, seed=2)
        every = [(mode, b) for mode, view in enumerate(self.views) for b in range(len(view.bins))]
        chosen = {place: self._fit(place, training, checks, _AIM) for place in every}
        for number in range(_ROUNDS + 1):
            proofs = self._functions(_PROOFS, seed=3 + number, slopes=True)
            errors = {place: self._errors(place, chosen[place], proofs) for place in every}
            failed = [place for place in every if np.abs(errors[place]).max() > _ALLOWED]
            if not failed:
                break
            if number == _ROUNDS:
                chosen |= {place: self._whole(place) for place in failed}
                errors |= {place: np.zeros_like(errors[place]) for place in failed}
                break
            training, checks = training.and_also(checks), checks.and_also(proofs)
            chosen |= {place: self._fit(place, training, checks, _AIM / 2 ** (number + 1)) for place in failed}
        rows = [(m, b, i, w) for (m, b), pair in chosen.items() for i, w in zip(*pair, strict=True)]
        return np.array([self._summary(errors), *rows])

    def _summary(self, errors: dict[tuple[int, int], Array]) -> tuple[float, ...]:
        ppm = [np.abs(error).max() * self._noise[m][b] for (m, b), error in errors.items() if error.any()]
        everything = np.concatenate(list(errors.values()))
        return float(np.abs(everything).max()), float(np.sqrt(np.mean(everything**2))), max(ppm, default=0.0), 0.0

    def _fit(self, place: tuple[int, int], training: _Functions, checks: _Functions, aim: float) -> Quadrature:
        candidates, share = self._candidates(place)
        values, means = self._in_noise(place, training)
        held_out, held_out_means = self._in_noise(place, checks)
        index, weights = fit_until(values, share, means, held_out, held_out_means, aim)
        return candidates[index] * _STRIDE, weights

    def _whole(self, place: tuple[int, int]) -> Quadrature:
        """Every sample of a bin that no few of them stand for, with its share of the photons: no error at all."""
        mode, number = place
        means = self._means[mode]
        samples = np.arange(means.start[number], means.stop[number])
        photons = self.views[mode].weights[self.views[mode].bins.detector[number], samples]
        counting = photons > 0
        return samples[counting], photons[counting] / photons.sum()

    def _errors(self, place: tuple[int, int], chosen: Quadrature, proofs: _Functions) -> Array:
        positions, weights = chosen
        noise = self._noise[place[0]][place[1]]
        return (proofs.thin[:, positions // _STRIDE] @ weights - proofs.means[place[0]][:, place[1]]) / noise

    def _in_noise(self, place: tuple[int, int], functions: _Functions) -> tuple[Array, Array]:
        """Values at the candidates of a bin and the means over it, in units of its noise."""
        mode, number = place
        noise = self._noise[mode][number]
        candidates, _ = self._candidates(place)
        return functions.thin[:, candidates] / noise, functions.means[mode][:, number] / noise

    def _candidates(self, place: tuple[int, int]) -> tuple[NDArray[np.intp], Array]:
        """Samples to choose from, as positions among every fourth, and their share of the photons."""
        mode, number = place
        view, means = self.views[mode], self._means[mode]
        inside = np.arange(-(-means.start[number] // _STRIDE), -(-means.stop[number] // _STRIDE))
        photons = view.weights[view.bins.detector[number], inside * _STRIDE]
        return inside, photons / photons.sum() if photons.sum() > 0 else np.full(inside.size, 1 / inside.size)

    @cached_property
    def _noise(self) -> list[Array]:
        """Noise of each bin after all the transits on offer, in ppm; infinite where the bin is not usable."""
        transits = self._workshop.scenario.transits_on_offer
        noise = []
        for view in self.views:
            variance = view.noise.depth_error_ppm**2 / transits + np.diag(view.floor_ppm2)
            noise.append(np.where(view.noise.saturated | ~np.isfinite(variance), np.inf, np.sqrt(variance)))
        return noise

    def _functions(self, count: int, seed: int, *, to_the_ends: bool = False, slopes: bool = False) -> _Functions:
        """What so many atmospheres make; slopes double the work, and what fits the depths fits them."""
        thin: list[NDArray[np.float32]] = []
        means: list[list[Array]] = [[] for _ in self._means]
        atmospheres = drawn(self._workshop.scenario, self._domain, count, seed, to_the_ends=to_the_ends)
        temperature_k = 0.0
        for number, (scenario, case) in enumerate(sorted(atmospheres, key=_temperature_of)):
            if scenario.atmosphere.temperature_k != temperature_k:
                temperature_k = scenario.atmosphere.temperature_k
                self._workshop.opacities.let_go()  # tables of one temperature at a time
            self._progress("choosing samples", number / count)
            rows = _rows(ForwardModel(scenario, self._workshop.opacities, ()), case, slopes=slopes)
            thin.append(rows[:, ::_STRIDE].astype(np.float32))
            for part, mean in zip(means, self._means, strict=True):
                part.append(mean(rows))
        return _Functions(thin=np.concatenate(thin), means=tuple(np.concatenate(part) for part in means))


def _temperature_of(atmosphere: tuple[Scenario, Case]) -> float:
    return atmosphere[0].atmosphere.temperature_k


def _rows(model: ForwardModel, case: Case, *, slopes: bool) -> Array:
    """What the significance of a case is made of, sample by sample, ``(function, wavenumber)``, in ppm."""
    scenario = model.scenario
    there = model.depth(case, shares_of=case.gases)
    rows = [there.depth, *(model.where_covered(gas, there.depth - there.depth_without[gas]) for gas in case.gases)]
    if slopes:
        others = [gas for gas in scenario.atmosphere.absorbers if gas not in case.gases]
        width = scenario.nuisances.absorbers_dex * log(10)
        null = model.depth(case, shares_of=others, transparent=case.gases)
        rows += [null.depth, *(width * model.where_covered(gas, null.derivative[gas]) for gas in others)]
    elif len(case.gases) == 1:
        rows.append(there.depth_without[case.gases[0]])
    else:
        rows.append(model.depth(case, transparent=case.gases).depth)
    for rival in scenario.nuisances.rivals.items():
        rows.append(model.depth(case, Change(added=(rival,)), transparent=case.gases).depth)
    return np.array(rows) * 1e6


@lru_cache(maxsize=1)
def _code_digest() -> str:
    """Hash of the code that depths and the choice come from."""
    here = Path(__file__).parent
    files = sorted(path for room in ("atmosphere", "spectroscopy") for path in (here.parent / room).rglob("*.py"))
    files += [here / name for name in ("domain.py", "forward.py", "observe.py", "reduced.py", "vary.py")]
    return digest(*(path.read_bytes() for path in files))
