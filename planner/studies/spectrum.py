"""What the spectrum looks like and which gas does what: the binned model of every case and mode."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from planner.scenario.records import Scenario
from planner.studies.plan import Workshop, binned_spectrum, see
from planner.studies.results import BinnedSpectrum

__all__ = ["spectrum"]


def spectrum(
    scenario: Scenario, *, lines_folder: Path | None = None, progress: Callable[[str, float], None] | None = None
) -> list[BinnedSpectrum]:
    """Transit depth per bin, one column per gas's share, and the noise of one transit, for each case and mode.

    Raises
    ------
    PlannerError
        If line data or modes cannot be read or used.
    """
    workshop = Workshop(scenario, lines_folder=lines_folder, progress=progress)
    sights = [see(workshop, case) for case in scenario.cases]
    return [binned_spectrum(workshop, sight, index) for sight in sights for index in range(len(workshop.views))]
