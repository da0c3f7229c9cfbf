"""How wide lines are in a mixture of gases: widths of the lines themselves where a file gives them, else factors.

Lorentz widths add in proportion to the partial pressures of the broadening gases. What the absorber does to its own
lines is left to the cross-sections (self width); the mixture meant here is the rest of the air.

The factors are means over lines of the width in a gas divided by that in air, all from memory. Compare Wilzewski et
al. 2016, JQSRT 168, 193 (H2, He, CO2 on SO2, NH3, OCS, C2H2); Tan et al. 2022, ApJS 262, 40 (the same on others);
Tan et al. 2019, JGR Atmospheres 124, 11580 (H2O); Brown et al. 2007, J. Mol. Spectrosc. 246, 1 (CO2 on H2O).
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.lines import Lines

__all__ = ["Broadened", "ForeignWidths", "broadened", "joined_widths", "width_factor"]

# factor on the air width and its uncertainty in per cent
_ANY_ABSORBER = {
    "N2": (1.0, 10),  # N2 broadens 1 to 10 % more than air
    "O2": (0.9, 15),
    "Ar": (0.8, 20),
    "CO2": (1.4, 25),
    "H2O": (1.9, 40),
    "H2": (1.0, 30),
    "He": (0.6, 30),
}
_BY_ABSORBER = {
    "H2O": {"H2": (0.75, 20), "He": (0.22, 25), "CO2": (1.7, 20)},
    "CO2": {"H2": (1.45, 15), "He": (0.8, 15), "H2O": (1.75, 15)},
    "CO": {"H2": (1.15, 10), "He": (0.78, 10), "CO2": (1.17, 15), "H2O": (1.7, 20)},
    "CH4": {"H2": (1.12, 10), "He": (0.68, 15), "CO2": (1.3, 15), "H2O": (1.35, 15)},
    "N2O": {"H2": (1.3, 20), "He": (0.75, 15), "CO2": (1.15, 20), "H2O": (1.8, 20)},
    "NH3": {"H2": (0.82, 15), "He": (0.3, 20), "CO2": (1.6, 20)},
    "C2H2": {"H2": (1.15, 15), "He": (0.55, 15), "CO2": (1.35, 15)},
    "HCN": {"H2": (1.05, 20), "He": (0.35, 25), "CO2": (1.35, 25)},
    "SO2": {"H2": (1.15, 20), "He": (0.52, 20), "CO2": (1.4, 20)},
    "OCS": {"H2": (1.2, 20), "He": (0.7, 20), "CO2": (1.3, 20)},
    "PH3": {"H2": (1.05, 20), "He": (0.6, 20)},
}
_LEAST_SHARE = 0.01


@dataclass(frozen=True, kw_only=True, eq=False)
class ForeignWidths:
    """Widths of lines in other gases than air.

    Attributes
    ----------
    by_gas : mapping of formula to (2, line) ndarray
        Half width at 296 K in 1/cm per atm, and the exponent of ``(296/T)**n``; not a number where unknown.
    digest : str
        Hash of their origin.
    """

    by_gas: Mapping[str, NDArray[np.float64]]
    digest: str

    def where(self, mask: NDArray[np.bool_]) -> ForeignWidths:
        """Those of the lines picked by a mask of shape ``(line,)``."""
        return ForeignWidths(by_gas={gas: values[:, mask] for gas, values in self.by_gas.items()}, digest=self.digest)


@dataclass(frozen=True, kw_only=True, eq=False)
class Broadened:
    """Lines as they are in a mixture.

    Attributes
    ----------
    lines : Lines
        Air widths and their exponents replaced by those of the mixture.
    key : str
        What was done, for the store.
    sentence : str
        What was done, for the user.
    """

    lines: Lines
    key: str
    sentence: str


def joined_widths(parts: Sequence[tuple[Lines, ForeignWidths | None]]) -> ForeignWidths | None:
    """Widths in the order of ``Lines.join`` of the same parts; None if no part has any."""
    known = [widths for _, widths in parts if widths is not None]
    if not known:
        return None
    order = np.argsort(np.concatenate([lines.wavenumber_per_cm for lines, _ in parts]), kind="stable")
    gases = dict.fromkeys(gas for widths in known for gas in widths.by_gas)

    def column(gas: str) -> NDArray[np.float64]:
        unknown = [np.full((2, len(lines)), np.nan) for lines, _ in parts]
        mine = [u if w is None else w.by_gas.get(gas, u) for u, (_, w) in zip(unknown, parts, strict=True)]
        return np.concatenate(mine, axis=1)[:, order]

    return ForeignWidths(by_gas={gas: column(gas) for gas in gases}, digest=" ".join(w.digest for w in known))


def width_factor(absorber: str, gas: str) -> tuple[float, int] | None:
    """Mean width in a gas over that in air, and its uncertainty in per cent; None where none is known."""
    return _BY_ABSORBER.get(absorber, {}).get(gas) or _ANY_ABSORBER.get(gas)


def broadened(formula: str, lines: Lines, widths: ForeignWidths | None, air: Mapping[str, float]) -> Broadened:
    """Lines of a gas as they are in a mixture.

    ``gamma(T) = sum_i x_i gamma_i (296/T)**n_i`` over the gases other than the absorber, their shares x_i scaled to
    one. It is written with one exponent, ``n = sum x gamma n / sum x gamma``, which has the right value and slope at
    296 K. A gas of less than 1 %, or without width or factor, broadens as air.

    Parameters
    ----------
    formula : str
        The absorber.
    lines : Lines
    widths : ForeignWidths or None
        In the order of the lines.
    air : mapping of formula to mixing ratio
    """
    shares = _shares(formula, air)
    width = (1.0 - sum(shares.values())) * lines.air_width_per_cm_atm
    slope = width * lines.temperature_exponent
    details = []
    for gas, share in shares.items():
        mine, exponent, told = _in_gas(formula, gas, lines, widths)
        width, slope = width + share * mine, slope + share * mine * exponent
        details.append(f"{share:.0%} {gas}: {told}")
    known = width > 0
    exponent = np.divide(slope, width, out=lines.temperature_exponent.copy(), where=known)
    mean = np.average(width[known] / lines.air_width_per_cm_atm[known]) if np.any(known) else 1.0
    return Broadened(
        lines=replace(lines, air_width_per_cm_atm=width, temperature_exponent=exponent),
        key=repr([(gas, share, width_factor(formula, gas)) for gas, share in shares.items()]),
        sentence=f"{formula} lines: {_summary(shares, mean)}" + (f" ({'; '.join(details)})" if details else ""),
    )


def _summary(shares: Mapping[str, float], mean: float) -> str:
    return "as wide as in air" if set(shares) <= {"N2"} else f"on average {mean:.3g} times as wide as in air"


def _shares(formula: str, air: Mapping[str, float]) -> dict[str, float]:
    """Shares of the broadening gases without the absorber, to whole per cents."""
    others = {gas: ratio for gas, ratio in air.items() if gas != formula}
    total = sum(others.values())
    shares = {gas: round(ratio / total, 2) for gas, ratio in others.items() if total > 0}
    return {gas: share for gas, share in shares.items() if share >= _LEAST_SHARE and width_factor(formula, gas)}


def _in_gas(
    formula: str, gas: str, lines: Lines, widths: ForeignWidths | None
) -> tuple[NDArray[np.float64], NDArray[np.float64], str]:
    """Widths and exponents in one gas, and how they came about."""
    factor, per_cent = width_factor(formula, gas) or (1.0, 0)
    width, exponent = factor * lines.air_width_per_cm_atm, lines.temperature_exponent
    times = "as air" if factor == 1 else f"{factor:g} times the air width"
    by_factor = f"{times}, from memory, +/- {per_cent} %"
    table = None if widths is None else widths.by_gas.get(gas)
    if table is None or not np.any(np.isfinite(table[0])):
        return width, exponent, by_factor
    given = np.isfinite(table[0])
    width = np.where(given, table[0], width)
    exponent = np.where(given & np.isfinite(table[1]), table[1], exponent)
    told = f"widths of the file for {np.mean(given):.0%} of the lines"
    return width, exponent, told if np.all(given) else f"{told}, else {by_factor}"
