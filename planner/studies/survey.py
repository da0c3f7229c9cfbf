"""Every gas seen with every mode: significance along its range of mixing ratios, and what looks like it.

A gas is seen at its reference mixing ratio and at a few others, on every fourth sample of the grid;
`planner.detection.worth.Response` runs through them. The nuisances of trace gases are those of the air without them,
worked out once.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from math import ceil, inf, log, log10, sqrt

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.sharing import sharing_bands
from planner.detection.significance import Measurement
from planner.detection.worth import Response
from planner.scenario.records import Case
from planner.studies.beliefs import MOST_RATIO, believed_gas, span
from planner.studies.choices import Resembling
from planner.studies.contamination import bin_factors, region_directions
from planner.studies.forward import BinnedDepth, ForwardModel
from planner.studies.nuisances import Direction, directions
from planner.studies.plan import plan_row
from planner.studies.results import PlanRow
from planner.studies.rivals import rival_ratio
from planner.studies.workshop import Progress, Sight, Workshop, measurement_of, through

__all__ = ["Curve", "Survey", "snr_after"]

Array = NDArray[np.float64]

_STRIDE = 4
_NODE_DEX = 1.3
_NODES = (4, 6)
"""Computed mixing ratios per gas: about one per so many decades from the top, within these numbers."""
_TRACE = 0.02
"""Up to here a gas leaves the rest of the air, and so its nuisances, as they are."""
_NO_GAS = Case(gases=(), mixing_ratios=())
_MOST_SNR = 1e4
"""What an S/N without any limit is taken as."""
_AT_ONCE = 8
"""Gases whose tables and lists of lines are held in memory together."""
_SAME_LN = 1e-3
"""Mixing ratios closer than this in their logarithm count as one."""
_NOTICED_SNR = 0.5
"""Relative errors of smaller ones do not count."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Curve:
    """One gas with one mode: significance against mixing ratio."""

    at_hours: Response
    at_limit: Response
    """After infinitely many transits."""
    miss: float
    """By how much the curve through the other points misses the reference."""


class Survey:
    """Gases with the modes of a workshop, each mode for a number of transits.

    Parameters
    ----------
    workshop : Workshop
    hypothesis : str
        ``"life"`` or ``"industry"``: decides at which mixing ratios a gas is seen.
    transits : sequence of int
        Per mode.
    progress : callable
        Called with a text and the share done.

    Attributes
    ----------
    model : ForwardModel
        On every fourth sample, with tables of its own: a quarter of those of the whole grid to build, check and read.
    sights : dict of gas to Sight
        At the references.
    curves : dict of (gas, mode's position) to Curve
    rows : dict of (gas, mode's position) to PlanRow
        At the references.
    line_data : list of str
        Sentences on the sources of the gases.
    """

    def __init__(self, workshop: Workshop, hypothesis: str, transits: Sequence[int], progress: Progress) -> None:
        self.workshop, self.scenario = workshop, workshop.scenario
        index = np.arange(0, workshop.opacities.grid.count, _STRIDE)
        self.model = ForwardModel(
            self.scenario,
            workshop.opacities.selection(index, own_tables=True),
            [view.means(_STRIDE) for view in workshop.views],
        )
        self.transits = transits
        self.sights: dict[str, Sight] = {}
        self.curves: dict[tuple[str, int], Curve] = {}
        self.rows: dict[tuple[str, int], PlanRow] = {}
        self.line_data: list[str] = []
        self._hypothesis, self._progress = hypothesis, progress
        self._shapes: dict[str, tuple[Array, ...]] = {}
        self._alike: dict[str, tuple[str, ...]] = {}

    def look(self, gases: Sequence[str]) -> None:
        """See every gas that there are data for, at its reference and along its range, and those like it at theirs."""
        for number, gas in enumerate(gases):
            self._progress(f"looking for {gas}", number / len(gases))
            if not self.workshop.opacities.has_data(gas):
                continue
            nuisances = self.nuisances_of((gas,))
            self.sights[gas] = self._sight(gas, self.reference(gas), nuisances)
            ratios = self._nodes(gas)
            others = [self._sight(gas, ratio, nuisances) for ratio in ratios]
            for index in range(len(self.transits)):
                self.curves[gas, index] = self._curve(ratios, others, self.sights[gas], index)
                self.rows[gas, index] = plan_row(self.workshop, self.sights[gas], index)
            if gas not in self.scenario.air():
                self._shapes[gas] = self._shape(gas)
            source = self.workshop.library.gas(gas)
            self.line_data += [*source.provenance, *source.partial]
            if number % _AT_ONCE == _AT_ONCE - 1:
                self._let_go()
        self._alike = {gas: sharing_bands(gas) for gas in self.sights}
        for other in dict.fromkeys(other for alike in self._alike.values() for other in alike):
            known = {*self._shapes, *self.scenario.air()}
            if other not in known and self.workshop.opacities.has_data(other):
                self._shapes[other] = self._shape(other)
                self._let_go()

    def reference(self, gas: str) -> float:
        """Geometric middle of the range where the hypothesis is true."""
        low, high = believed_gas(self.scenario.beliefs, gas, self._hypothesis).presence(True).mixing_ratio_range
        return sqrt(low * min(high, MOST_RATIO))

    def nuisances_of(self, gases: tuple[str, ...]) -> list[Direction]:
        """Directions of the air without some gases; for gases that are but traces, those of the air as it is."""
        atmosphere = self.scenario.atmosphere
        part_of_the_air = any(gas in atmosphere.absorbers or gas in atmosphere.background for gas in gases)
        if not part_of_the_air and all(self.reference(gas) <= _TRACE for gas in gases):
            return self._common
        return self._directions(Case(gases=gases, mixing_ratios=tuple(map(self.reference, gases))))

    def rivals(self, gas: str, index: int) -> tuple[Resembling | None, float]:
        """The gas hardest to tell apart, and the share of the S/N that all gases with like bands leave together.

        Each with the prior width of `planner.studies.rivals`. Gases of the scenario's air are among the nuisances
        already.
        """
        sight = self.sights[gas]
        measurement, transits = sight.measurements[index], max(self.transits[index], 1)
        whole = snr_after(measurement, transits)
        alike = {o: self._shapes[o][index][sight.usable[index]] for o in self._alike[gas] if o in self._shapes}
        alike = {other: shape for other, shape in alike.items() if np.any(shape)}
        if not alike or whole == 0:
            return None, 1.0
        left = {other: snr_after(_beside(measurement, [shape]), transits) / whole for other, shape in alike.items()}
        worst = min(left, key=lambda other: left[other])
        resembling = Resembling(gas=worst, mixing_ratio=rival_ratio(worst), snr_left=left[worst])
        return resembling, snr_after(_beside(measurement, list(alike.values())), transits) / whole

    def accuracy(self, leading: Sequence[str]) -> tuple[str, ...]:
        """What thinned samples and interpolation cost, as found on this very run; some gases on the whole grid."""
        missed = max((curve.miss for curve in self.curves.values()), default=0.0)
        worst = max((self._thinning_error(self.sights[gas]) for gas in leading), default=0.0)
        return (
            f"S/N between computed mixing ratios: interpolation missed the references by {100 * missed:.2g} % at most, "
            "before they were added to the points",
            f"S/N on every fourth sample of the grid: within {100 * worst:.2g} % of the whole grid for "
            f"{' and '.join(leading)}",
        )

    def _let_go(self) -> None:
        """Free the tables and lists of lines held in memory; the store has them."""
        self.workshop.opacities.let_go()
        self.model.opacities.let_go()
        self.workshop.library.gas.cache_clear()

    @cached_property
    def _common(self) -> list[Direction]:
        return self._directions(_NO_GAS)

    def _directions(self, case: Case) -> list[Direction]:
        others = [gas for gas in self.scenario.air(case) if gas not in case.gases]
        views, star = self.workshop.views, self.scenario.star
        null = through(self._factors, self.model.binned(case, shares_of=others, transparent=case.gases))
        return [*directions(self.model, case, null, views), *region_directions(star, null, views)]

    @cached_property
    def _factors(self) -> tuple[Array, ...]:
        """What spots and faculae multiply the depth with, per mode."""
        return bin_factors(self.scenario.star, self.workshop.views)

    def _seen(self, gas: str, ratio: float) -> tuple[BinnedDepth, ...]:
        """The spectrum with some of a gas, with its share, as the star makes it look."""
        case = Case(gases=(gas,), mixing_ratios=(ratio,))
        return through(self._factors, self.model.binned(case, shares_of=[gas]))

    def _sight(self, gas: str, ratio: float, nuisances: list[Direction]) -> Sight:
        case = Case(gases=(gas,), mixing_ratios=(ratio,))
        spectrum = self._seen(gas, ratio)
        templates = tuple(part.shares_ppm[gas] for part in spectrum)
        views = self.workshop.views
        usable = tuple(np.isfinite(view.noise.depth_error_ppm) & ~view.noise.saturated for view in views)
        measured = tuple(measurement_of(v, templates[i], usable[i], nuisances, i) for i, v in enumerate(views))
        return Sight(case=case, measurements=measured, usable=usable, templates_ppm=templates, spectrum=spectrum)

    def _shape(self, gas: str) -> tuple[Array, ...]:
        """Share of a gas for one prior width of it as a rival, per mode."""
        return tuple(part.shares_ppm[gas] for part in self._seen(gas, rival_ratio(gas)))

    def _nodes(self, gas: str) -> Array:
        """Mixing ratios to compute, ascending; below the lowest the gas is thin."""
        low, high = span(believed_gas(self.scenario.beliefs, gas, self._hypothesis))
        wide = log10(high / low)
        count = int(np.clip(ceil(wide / _NODE_DEX) + 1, *_NODES))
        return np.logspace(log10(high) - min(wide, _NODE_DEX * (count - 1)), log10(high), count)

    def _curve(self, ratios: Array, others: Sequence[Sight], reference: Sight, index: int) -> Curve:
        transits = self.transits[index]
        at = {float(x): sight.measurements[index] for x, sight in zip(ratios, others, strict=True)}
        own, place = reference.measurements[index], reference.case.mixing_ratios[0]
        rough = _response(at, transits)
        found = snr_after(own, transits)
        miss = abs(float(rough(np.array([log(place)]))[0]) / found - 1) if found > _NOTICED_SNR else 0.0
        points = {x: measurement for x, measurement in at.items() if abs(log(x / place)) > _SAME_LN} | {place: own}
        return Curve(at_hours=_response(points, transits), at_limit=_response(points, inf), miss=miss)

    def _thinning_error(self, sight: Sight) -> float:
        gas = sight.case.gases[0]
        whole = through(self._factors, self.workshop.model.binned(sight.case, shares_of=[gas]))
        self._let_go()
        worst = 0.0
        for index, (measurement, usable) in enumerate(zip(sight.measurements, sight.usable, strict=True)):
            transits = max(self.transits[index], 1)
            exact = snr_after(replace(measurement, template_ppm=whole[index].shares_ppm[gas][usable]), transits)
            if exact > _NOTICED_SNR:
                worst = max(worst, abs(snr_after(measurement, transits) / exact - 1))
        return worst


def snr_after(measurement: Measurement, transits: float) -> float:
    """Expected significance; none without a transit or a usable bin, the best attainable one for infinitely many."""
    if not measurement.template_ppm.size or not transits:
        return 0.0
    return min(measurement.snr_limit(), _MOST_SNR) if transits == inf else measurement.snr(transits)


def _response(measured: Mapping[float, Measurement], transits: float) -> Response:
    """Significance against mixing ratio, from measurements by mixing ratio."""
    ratios = sorted(measured)
    snr = [snr_after(measured[ratio], transits) for ratio in ratios]
    return Response(ln_mixing_ratio=np.log(ratios), snr=np.array(snr))


def _beside(measurement: Measurement, shapes: Sequence[Array]) -> Measurement:
    """The same with further amplitudes unknown."""
    return replace(
        measurement,
        nuisances=(*measurement.nuisances, *(f"shape {i}" for i in range(len(shapes)))),
        directions_ppm=np.vstack([measurement.directions_ppm, *shapes]),
    )
