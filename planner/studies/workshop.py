"""The rooms set up for one scenario, and one case seen through all its modes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from planner.detection.significance import Measurement
from planner.pool import Progress
from planner.scenario.records import Case, Scenario
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store
from planner.studies.ahead import build_ahead
from planner.studies.contamination import bin_factors, contaminated, region_directions
from planner.studies.forward import BinnedDepth, ForwardModel, opacities_of
from planner.studies.nuisances import Direction, directions
from planner.studies.observe import ModeView, observing_grid, view_modes

__all__ = ["Progress", "Setting", "Sight", "Workshop", "measurement_of", "see", "through"]

Array = NDArray[np.float64]

_STRIDE = 4
"""Differences for nuisance directions use every fourth sample."""


class Setting(Protocol):
    """What it takes to see a case: the modes, the forward model, and one of the same bins for differences."""

    @property
    def views(self) -> Sequence[ModeView]: ...
    @property
    def model(self) -> ForwardModel: ...
    @property
    def thin(self) -> ForwardModel: ...


class Workshop:
    """The rooms set up for one scenario: grid, modes, opacities, forward model.

    Parameters
    ----------
    scenario : Scenario
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    samples_per_unit_ln : int, optional
        Finer sampling than the scenario needs, for tests of convergence.
    view : ModeView, optional
        What was observed, in place of the scenario's modes.
    """

    def __init__(
        self,
        scenario: Scenario,
        *,
        lines_folder: Path | None = None,
        progress: Progress | None = None,
        samples_per_unit_ln: int | None = None,
        view: ModeView | None = None,
    ) -> None:
        self.scenario = scenario
        self.store = Store()
        build_ahead(self._first_needed_first(), self.store, owner=self)
        self.library = LineLibrary(self.store, lines_folder)
        grid = view.grid if view is not None else observing_grid(scenario, samples_per_unit_ln)
        self.views = [view] if view is not None else view_modes(scenario, grid)
        self.opacities = opacities_of(scenario, self.library, self.store, grid, progress)
        self.model = self._on_every(1)
        self.thin = self._on_every(_STRIDE)

    def _on_every(self, stride: int) -> ForwardModel:
        """The forward model on every ``stride``-th sample."""
        index = np.arange(0, self.opacities.grid.count, stride)
        opacities = self.opacities if stride == 1 else self.opacities.selection(index)
        return ForwardModel(self.scenario, opacities, [view.means(stride) for view in self.views])

    def _gases(self) -> dict[str, None]:
        """Every gas of the scenario, the searched ones first."""
        atmosphere = self.scenario.atmosphere
        searched = [gas for case in self.scenario.cases for gas in case.gases]
        return dict.fromkeys([*searched, *atmosphere.absorbers, *atmosphere.background])

    def _first_needed_first(self) -> dict[str, None]:
        """The same in the order in which their lines are needed: what the first search is about, the air, the rest."""
        atmosphere, cases = self.scenario.atmosphere, self.scenario.cases
        first = cases[0].gases if cases else ()
        return dict.fromkeys([*first, *atmosphere.absorbers, *atmosphere.background, *self._gases()])

    def line_data(self) -> tuple[str, ...]:
        """One sentence per source used and per stretch not used, for every gas of the scenario."""
        gases = self._gases()
        sentences: list[str] = []
        for gas in gases:
            if self.opacities.has_data(gas):
                source = self.library.gas(gas)
                sentences += [*source.provenance, *source.partial]
        return (*sentences, *self.library.pair_provenance(gases), *self.opacities.broadening_notes)


@dataclass(frozen=True, kw_only=True, eq=False)
class Sight:
    """One case through all modes: the spectrum and everything that judges it."""

    case: Case
    measurements: tuple[Measurement, ...]
    """Per mode, usable bins only."""
    usable: tuple[NDArray[np.bool_], ...]
    templates_ppm: tuple[Array, ...]
    """Per mode, all bins; zero where the gas's data do not cover."""
    spectrum: tuple[BinnedDepth, ...]


def see(setting: Setting, case: Case) -> Sight:
    """The spectrum of a case, its template and nuisances, in the bins of every mode."""
    model, views = setting.model, setting.views
    others = [gas for gas in model.scenario.air(case) if gas not in case.gases]
    factors = bin_factors(model.scenario.star, views)
    spectrum = through(factors, model.binned(case, shares_of=[*case.gases, *others]))
    null = through(factors, setting.thin.binned(case, shares_of=others, transparent=case.gases))
    templates = _templates(model, case, spectrum, factors)
    nuisances = directions(setting.thin, case, null, views)
    nuisances += region_directions(model.scenario.star, null, views)
    usable = [np.isfinite(view.noise.depth_error_ppm) & ~view.noise.saturated for view in views]
    return Sight(
        case=case,
        measurements=tuple(measurement_of(view, templates[i], usable[i], nuisances, i) for i, view in enumerate(views)),
        usable=tuple(usable),
        templates_ppm=tuple(templates),
        spectrum=spectrum,
    )


def through(factors: Sequence[Array], spectrum: Sequence[BinnedDepth]) -> tuple[BinnedDepth, ...]:
    """A spectrum as spots and faculae of the star make it look.

    Directions by steps of the forward model go without the factor: it changes them by the per cent that it differs
    from 1, and nobody knows their prior widths as well.
    """
    return tuple(contaminated(part, factor) for part, factor in zip(spectrum, factors, strict=True))


def _templates(
    model: ForwardModel, case: Case, spectrum: Sequence[BinnedDepth], factors: Sequence[Array]
) -> list[Array]:
    """What the searched gases make: for one, its share where its data cover; for a set, all that goes with it."""
    if len(case.gases) == 1:
        return [part.shares_ppm[case.gases[0]] for part in spectrum]
    absent = through(factors, model.binned(case, transparent=case.gases))
    return [part.depth_ppm - without.depth_ppm for part, without in zip(spectrum, absent, strict=True)]


def measurement_of(
    view: ModeView, template: Array, usable: NDArray[np.bool_], nuisances: list[Direction], mode: int
) -> Measurement:
    """What one mode measures of a template ``(bin,)``, in its usable bins."""
    mine = [d for d in nuisances if np.any(d.per_mode_ppm[mode][usable])]
    return Measurement(
        template_ppm=template[usable],
        white_ppm=view.noise.depth_error_ppm[usable],
        floor_ppm2=view.floor_ppm2[np.ix_(usable, usable)],
        nuisances=tuple(d.name for d in mine),
        directions_ppm=np.array([d.per_mode_ppm[mode][usable] for d in mine]).reshape(len(mine), int(usable.sum())),
    )
