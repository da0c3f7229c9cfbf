"""Opacities of an atmosphere: tables of cross-sections made when needed, interpolated to one temperature.

Tables hold log10 of the line cross-section as float32 on (pressure, wavenumber), one per gas, temperature node and
block of the grid. Temperature nodes stand 12 % apart and are interpolated in 1/T, in which a Boltzmann factor is
linear. Pressures are three per decade from 1e-6 to 10 bar, higher where the air reaches deeper, and one Doppler-limited
row that is held below.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from copy import copy
from functools import lru_cache
from math import ceil, floor, log, log10
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.transmission import GasOpacity, PairOpacity
from planner.pool import Progress, in_threads
from planner.spectroscopy.broadening import Broadened, broadened
from planner.spectroscopy.grid import LogGrid
from planner.spectroscopy.rayleigh import rayleigh_cross_section
from planner.spectroscopy.sources import GasSource, LineLibrary, NoDataError
from planner.spectroscopy.store import Store, digest
from planner.spectroscopy.watercontinuum import WINDOWS_PER_CM, water_continuum

__all__ = ["LEAST_SELF_FRACTION", "TEMPERATURE_STEP", "Opacities", "pressure_rows", "temperature_nodes"]

_ROWS_PER_DECADE = 3
_HIGHEST_BAR = 10.0
TEMPERATURE_STEP = 1.12
_LOWEST_K = 100.0
_NOTHING = np.float32(-60.0)
"""log10 of a cross-section that is zero."""

LEAST_SELF_FRACTION = 0.05
"""Below this mixing ratio self-broadening changes no width by more than a few per cent and is left out."""


def temperature_nodes(temperature_k: float) -> tuple[float, float]:
    """The two nodes that bracket a temperature; equal if it stands on a node."""
    steps = log(temperature_k / _LOWEST_K) / log(TEMPERATURE_STEP)
    low = floor(steps + 1e-9)
    high = low if abs(steps - low) < 1e-6 else low + 1
    return _LOWEST_K * TEMPERATURE_STEP**low, _LOWEST_K * TEMPERATURE_STEP**high


def pressure_rows(highest_bar: float = _HIGHEST_BAR) -> NDArray[np.float64]:
    """Pressures of the tables in bar, shape ``(pressure,)``: to 10 bar, or as far above as they are asked for."""
    steps = ceil(_ROWS_PER_DECADE * log10(max(highest_bar, _HIGHEST_BAR)) - 1e-9)
    rows = np.logspace(-6, steps / _ROWS_PER_DECADE, 6 * _ROWS_PER_DECADE + steps + 1)
    return np.concatenate([[1e-8], rows])


class Opacities:
    """Cross-sections of gases and pairs on one grid, or on a selection of its samples.

    Parameters
    ----------
    library : LineLibrary
        Where the lines come from.
    store : Store
        Keeps the tables.
    grid : LogGrid
        The samples.
    air : mapping of formula to mixing ratio
        Sets the broadening.
    highest_bar : float
        The tables reach at least this pressure, and at least 10 bar.
    wing_per_cm : float
        Line wings are cut at this distance.
    water_continuum : bool
        Whether the water continuum is on; in its windows the lines then lose their value at the cut, which it holds.
    progress : callable, optional
        Called with a text and the share done while tables are built.
    """

    def __init__(
        self,
        library: LineLibrary,
        store: Store,
        grid: LogGrid,
        *,
        air: Mapping[str, float],
        highest_bar: float = _HIGHEST_BAR,
        wing_per_cm: float = 25.0,
        water_continuum: bool = True,
        progress: Progress | None = None,
    ) -> None:
        self.grid = grid
        self.wavenumber_per_cm = grid.wavenumber_per_cm
        self.pressures_bar = pressure_rows(highest_bar)
        self._air = dict(air)
        self._library = library
        self._store = store
        self._wing_per_cm = wing_per_cm
        self._water_continuum = water_continuum
        self._progress = progress or (lambda text, share: None)
        self._node = lru_cache(maxsize=64)(self._build_node)
        self._broadened: dict[str, Broadened] = {}
        self._has_data: dict[str, bool] = {}
        self._remember()

    def _remember(self) -> None:
        self._rayleigh = lru_cache(maxsize=64)(lambda formula: rayleigh_cross_section(formula, self.wavenumber_per_cm))
        self._gas = lru_cache(maxsize=64)(self._build_gas)
        self._pairs = lru_cache(maxsize=16)(self._build_pairs)

    def selection(self, index: NDArray[np.intp], *, own_tables: bool = False) -> Opacities:
        """The same opacities on some samples of the grid only.

        Parameters
        ----------
        index : (selected,)
            Positions on the grid, ascending.
        own_tables : bool
            Lines are summed on these samples alone, which is the cheaper the fewer they are. Otherwise the tables
            of the whole grid are built and shared.
        """
        chosen = copy(self)
        chosen.wavenumber_per_cm = self.wavenumber_per_cm[index]
        whole = self._node
        chosen._node = lru_cache(maxsize=64)(
            chosen._sum_node
            if own_tables
            else lambda formula, node_k, share: np.ascontiguousarray(whole(formula, node_k, share)[:, index])
        )
        chosen._remember()
        return chosen

    def let_go(self) -> None:
        """Let go of the tables held in memory, 14 MB each on the grid of three modes; the store has them.

        What a selection has taken from them stays with it.
        """
        self._node.cache_clear()
        self._gas.cache_clear()

    def gas(self, formula: str, temperature_k: float, mixing_ratio: float = 0.0) -> GasOpacity:
        """What one gas absorbs and scatters by itself at a temperature.

        The mixing ratio enters through self-broadening alone, in steps of a tenth.
        """
        share = round(mixing_ratio, 1) if mixing_ratio >= LEAST_SELF_FRACTION else 0.0
        return self._gas(formula, temperature_k, share)

    @property
    def broadening_notes(self) -> tuple[str, ...]:
        """How the lines of the gases used so far are broadened, one sentence for each."""
        return tuple(self._broadened[formula].sentence for formula in sorted(self._broadened))

    def has_data(self, formula: str) -> bool:
        """Whether the gas has lines or bands at all (noble gases and homonuclear ones may have none)."""
        if formula not in self._has_data:
            try:
                self._library.gas(formula)
            except NoDataError:
                self._has_data[formula] = False
            else:
                self._has_data[formula] = True
        return self._has_data[formula]

    def pairs(self, formulas: Sequence[str], temperature_k: float) -> list[PairOpacity]:
        """Collision-induced absorption of every known pair among the gases, and the water continuum."""
        return self._pairs(frozenset(formulas), temperature_k)

    def covered(self, formula: str) -> NDArray[np.bool_]:
        """Where the gas's data can be trusted, shape ``(wavenumber,)``."""
        wavenumber = self.wavenumber_per_cm
        mask = np.zeros(wavenumber.size, dtype=bool)
        for low, high in self._library.gas(formula).covers_per_cm:
            mask |= (wavenumber >= low) & (wavenumber <= high)
        return mask

    def _build_gas(self, formula: str, temperature_k: float, self_fraction: float) -> GasOpacity:
        wavenumber = self.wavenumber_per_cm
        flat = self._rayleigh(formula)
        source = self._library.gas(formula) if self.has_data(formula) else None
        table = None
        if source is not None:
            if source.lines is not None and len(source.lines):
                table = self._interpolated(source, temperature_k, self_fraction)
                if source.measured is not None:
                    table = np.where(source.measured_at(wavenumber), _NOTHING, table)
            smooth = source.smooth_cross_section(wavenumber, temperature_k, self.pressures_bar)
            if smooth is not None and len(smooth) == 1:
                flat = flat + smooth[0]
            elif smooth is not None:
                table = _log10(smooth if table is None else smooth + 10.0**table)
        return GasOpacity(
            formula=formula,
            pressures_bar=self.pressures_bar,
            log10_cross_section=table,
            flat_cross_section_cm2=flat if np.any(flat) else None,
        )

    def _build_pairs(self, present: frozenset[str], temperature_k: float) -> list[PairOpacity]:
        wavenumber = self.wavenumber_per_cm
        found = [
            PairOpacity(
                first=a,
                second=b,
                coefficient_cm5=self._library.collision_coefficient((a, b), wavenumber, temperature_k),
            )
            for a, b in self._library.collision_pairs()
            if a in present and b in present
        ]
        if self._water_continuum and "H2O" in present:
            own, foreign = water_continuum(wavenumber, temperature_k)
            found += [
                PairOpacity(first="H2O", second="H2O", coefficient_cm5=own),
                PairOpacity(first="H2O", second="*", coefficient_cm5=foreign),
            ]
        return [pair for pair in found if np.any(pair.coefficient_cm5)]

    def _interpolated(self, source: GasSource, temperature_k: float, share: float) -> NDArray[np.float32]:
        low_k, high_k = temperature_nodes(temperature_k)
        low = self._node(source.molecule.formula, low_k, share)
        if high_k == low_k:
            return low
        weight = np.float32((1 / low_k - 1 / temperature_k) / (1 / low_k - 1 / high_k))
        between = self._node(source.molecule.formula, high_k, share) - low
        between *= weight
        between += low
        return between

    def _build_node(self, formula: str, temperature_k: float, self_fraction: float) -> NDArray[np.float32]:
        """Table on the whole grid at a temperature node, shape ``(pressure, wavenumber)``."""
        source, mixed = self._mixed(formula)

        def sums(block: LogGrid) -> NDArray[np.float32] | None:
            place = [block.first, block.count, block.samples_per_unit_ln]
            return self._sums(source, mixed, block.wavenumber_per_cm, place, temperature_k, self_fraction)

        table = np.full((self.pressures_bar.size, self.grid.count), _NOTHING, dtype=np.float32)
        blocks = self.grid.blocks()
        found = in_threads(sums, blocks, text=f"{formula} at {temperature_k:.0f} K", progress=self._progress)
        for block, values in zip(blocks, found, strict=True):
            if values is not None:
                mine, theirs = self.grid.part_of(block)
                table[:, mine] = values[:, theirs]
        return table

    def _sum_node(self, formula: str, temperature_k: float, self_fraction: float) -> NDArray[np.float32]:
        """The same on the samples of a selection alone, not by way of the whole grid."""
        source, mixed = self._mixed(formula)
        wavenumber = np.ascontiguousarray(self.wavenumber_per_cm)
        values = self._sums(source, mixed, wavenumber, digest(wavenumber.tobytes()), temperature_k, self_fraction)
        return np.full((self.pressures_bar.size, wavenumber.size), _NOTHING, np.float32) if values is None else values

    def _mixed(self, formula: str) -> tuple[GasSource, Broadened]:
        """The data of a gas with lines, and its lines as the air broadens them."""
        source = self._library.gas(formula)
        assert source.lines is not None
        if formula not in self._broadened:
            self._broadened[formula] = broadened(formula, source.lines, source.widths, self._air)
        return source, self._broadened[formula]

    def _sums(
        self,
        source: GasSource,
        mixed: Broadened,
        wavenumber: NDArray[np.float64],
        place: list[int] | str,
        temperature_k: float,
        self_fraction: float,
    ) -> NDArray[np.float32] | None:
        """Table on some wavenumbers, from the store if it is there; ``place`` names them. None where no line is."""
        lines = mixed.lines
        reach = self._wing_per_cm + 1.0
        first, last = np.searchsorted(lines.wavenumber_per_cm, [wavenumber[0] - reach, wavenumber[-1] + reach])
        if first == last:
            return None
        lowered = self._lowered(source, wavenumber)
        key: dict[str, Any] = {
            "source": source.digest,
            "kernel": _kernel_digest(),
            "temperature_k": round(temperature_k, 6),
            "self_fraction": self_fraction,
            "broadening": mixed.key,
            "wing_per_cm": self._wing_per_cm,
            "lowered_at_the_cut": int(lowered.sum()),
            "block": place,
            "pressures_bar": self.pressures_bar.tolist(),
        }

        def build() -> NDArray[np.float32]:
            from planner.spectroscopy.crosssections import cross_sections

            values = np.empty((self.pressures_bar.size, wavenumber.size))
            for where, subtract in ((~lowered, False), (lowered, True)):
                values[:, where] = cross_sections(
                    lines.where(slice(first, last)),
                    wavenumber[where],
                    temperature_k=temperature_k,
                    pressures_bar=self.pressures_bar,
                    self_fraction=self_fraction,
                    wing_per_cm=self._wing_per_cm,
                    subtract_at_wing=subtract,
                )
            return _log10(values)

        return self._store.fetch(source.molecule.formula, key, build)

    def _lowered(self, source: GasSource, wavenumber_per_cm: NDArray[np.float64]) -> NDArray[np.bool_]:
        """Where lines lose their value at the cut: those of water inside the windows of its continuum."""
        mask = np.zeros(wavenumber_per_cm.size, dtype=bool)
        if self._water_continuum and source.molecule.formula == "H2O":
            for low, high in WINDOWS_PER_CM:
                mask |= (wavenumber_per_cm >= low) & (wavenumber_per_cm <= high)
        return mask


def _log10(cross_section_cm2: NDArray[np.float64]) -> NDArray[np.float32]:
    with np.errstate(divide="ignore"):
        return np.maximum(np.log(cross_section_cm2) / log(10.0), _NOTHING).astype(
            np.float32
        )  # log10 takes twice as long


@lru_cache(maxsize=1)
def _kernel_digest() -> str:
    folder = Path(__file__).parent
    names = ("crosssections.py", "voigt.py", "_kernels.py", "molecules.py")
    return digest(*((folder / name).read_bytes() for name in names if (folder / name).is_file()))
