"""What absorbs in the column: records of one gas's opacity and of a pair's, on the forward model's wavenumbers."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.layers import Air

__all__ = ["GasOpacity", "PairOpacity", "check_opacities"]


@dataclass(frozen=True, kw_only=True, eq=False)
class GasOpacity:
    """What one gas absorbs and scatters by itself, on the wavenumbers of the forward model.

    Attributes
    ----------
    formula : str
    pressures_bar : (pressure,)
        Ascending; empty when there is no table. Below the lowest pressure the lowest row holds.
    log10_cross_section : (pressure, wavenumber) float32 or None
        Decadic logarithm of the cross-section in cm2 per molecule; minus infinity for none. Not a number is refused.
    flat_cross_section_cm2 : (wavenumber,) float64 or None
        What does not depend on pressure: Rayleigh scattering, dense bands, electronic absorption.
    """

    formula: str
    pressures_bar: NDArray[np.float64]
    log10_cross_section: NDArray[np.float32] | None
    flat_cross_section_cm2: NDArray[np.float64] | None

    def __post_init__(self) -> None:
        pressures = np.asarray(self.pressures_bar, dtype=np.float64)
        object.__setattr__(self, "pressures_bar", pressures)
        if self.log10_cross_section is not None:
            table = np.ascontiguousarray(self.log10_cross_section, dtype=np.float32)
            object.__setattr__(self, "log10_cross_section", table)
            if table.ndim != 2 or table.shape[0] != pressures.size or pressures.size == 0:
                raise ValueError(
                    f"GasOpacity {self.formula}: expected a table of shape ({pressures.size}, wavenumber) with at "
                    f"least one pressure, got {table.shape}"
                )
        if pressures.ndim != 1 or np.any(np.diff(pressures) <= 0) or np.any(pressures <= 0):
            raise ValueError(f"GasOpacity {self.formula}: pressures_bar must be positive and ascending")
        _check_not_negative(self.flat_cross_section_cm2, f"GasOpacity {self.formula}: flat_cross_section_cm2")


@dataclass(frozen=True, kw_only=True, eq=False)
class PairOpacity:
    """Absorption in proportion to the product of two densities: collision-induced pairs and continua.

    ``first`` and ``second`` are formulas; ``second = "*"`` means every gas of the air other than ``first``.
    The absorption coefficient is ``coefficient_cm5 * n_first * n_second`` in 1/cm; ``(wavenumber,)``.
    """

    first: str
    second: str
    coefficient_cm5: NDArray[np.float64]

    def __post_init__(self) -> None:
        _check_not_negative(self.coefficient_cm5, f"PairOpacity {self.first}-{self.second}: coefficient_cm5")


def check_opacities(
    air: Air,
    gases: Sequence[GasOpacity],
    pairs: Sequence[PairOpacity],
    wavenumber_per_cm: NDArray[np.float64],
    shares_of: Sequence[str],
) -> None:
    """Refuse opacities that do not fit the air or the wavenumbers.

    Raises
    ------
    ValueError
        For an array of another length, a gas that is not in the air, or one that is given twice.
    """
    size = wavenumber_per_cm.shape[-1]
    for gas in gases:
        for array in (gas.log10_cross_section, gas.flat_cross_section_cm2):
            if array is not None and array.shape[-1] != size:
                raise ValueError(f"GasOpacity {gas.formula}: expected {size} wavenumbers, got {array.shape[-1]}")
    for pair in pairs:
        if pair.coefficient_cm5.shape != (size,):
            raise ValueError(
                f"PairOpacity {pair.first}-{pair.second}: expected {size} wavenumbers, "
                f"got shape {pair.coefficient_cm5.shape}"
            )
    for names, what in (([gas.formula for gas in gases], "gases"), (list(shares_of), "shares_of")):
        unknown = sorted(set(names) - set(air.mixing_ratios))
        if unknown:
            raise ValueError(f"{what}: {unknown} not among the gases of the air {sorted(air.mixing_ratios)}")
        if len(set(names)) != len(names):
            raise ValueError(f"{what}: expected each formula once, got {names}")


def _check_not_negative(values: NDArray[np.float64] | None, where: str) -> None:
    if values is not None and not (values.ndim == 1 and np.all(values >= 0) and np.all(np.isfinite(values))):
        raise ValueError(f"{where}: expected a one-dimensional array of finite numbers >= 0")
