"""How far the embedded list of a gas can be trusted where a plan leans on it."""

from __future__ import annotations

from dataclasses import dataclass
from math import log

from planner.spectroscopy.accuracyfile import AccuracyTable, JudgedWindow, Judgement, UnseenWindow, stored_accuracy
from planner.spectroscopy.coverage import Interval, subtract
from planner.spectroscopy.molecules import find_molecule

__all__ = ["WindowQuality", "quality_summary", "window_quality"]

_SLIVER_FRACTION = 0.05
"""Windows that hold less of a stretch than this are not what it leans on."""


@dataclass(frozen=True, kw_only=True)
class WindowQuality:
    """What is known of the strength of an embedded list in one window.

    Attributes
    ----------
    gas : str
    from_um, to_um : float
        The window, as far as it lies in the stretch that was asked for.
    compared : bool
        Whether it was compared with real spectra.
    meets : bool
        Whether it met the marks; False where it was not compared.
    strength_factor : float
        Factor by which the strength may be wrong.
    basis : str
        What it was compared with, or what it rests on.
    """

    gas: str
    from_um: float
    to_um: float
    compared: bool
    meets: bool
    strength_factor: float
    basis: str

    @property
    def uncertainty_scale_heights(self) -> float:
        """Half the logarithm of the strength error: what it does to an effective height."""
        return 0.5 * log(self.strength_factor)


def window_quality(
    formula: str, from_um: float, to_um: float, table: AccuracyTable | None = None
) -> list[WindowQuality]:
    """Quality of an embedded list in the windows of the accuracy table that a stretch leans on, by wavelength.

    Parameters
    ----------
    formula : str
        Formula or common name of the gas.
    from_um, to_um : float
        The stretch, ascending.
    table : AccuracyTable, optional
        By default the one that ships with the lists.

    Returns
    -------
    list of WindowQuality
        Windows that hold at least a twentieth of the stretch; where a part of it was judged against several sources,
        it counts by the widest window. Empty where the list has nothing that shows.
    """
    table = stored_accuracy() if table is None else table
    gas = find_molecule(formula).formula
    free: tuple[Interval, ...] = ((1e4 / to_um, 1e4 / from_um),)
    least = _SLIVER_FRACTION * (free[0][1] - free[0][0])
    found: list[WindowQuality] = []
    for row in _by_precedence(table, gas):
        inside = [(max(low, row.from_per_cm), min(high, row.to_per_cm)) for low, high in free]
        inside = [(low, high) for low, high in inside if high > low]
        if inside and sum(high - low for low, high in inside) >= least:
            found.append(_quality(row, 1e4 / inside[-1][1], 1e4 / inside[0][0]))
            free = subtract(free, inside)
    return sorted(found, key=lambda window: window.from_um)


def _by_precedence(table: AccuracyTable, gas: str) -> list[JudgedWindow | UnseenWindow]:
    """A gas's windows, those that were compared first, the widest first among them."""
    judged = [row for row in table.judged if row.gas == gas and row.verdict is not Judgement.NARROW]
    rows: list[JudgedWindow | UnseenWindow] = [*sorted(judged, key=lambda row: row.from_per_cm - row.to_per_cm)]
    return [*rows, *(row for row in table.unseen if row.gas == gas)]


def quality_summary(formula: str, table: AccuracyTable | None = None) -> str:
    """One line on a gas: windows that meet the marks, and how many were never compared."""
    table = stored_accuracy() if table is None else table
    judged = [row for row in table.judged if row.gas == formula and row.verdict is not Judgement.NARROW]
    unseen = sum(row.gas == formula for row in table.unseen)
    meeting = sum(row.verdict is Judgement.MEETS for row in judged)
    parts = [f"{meeting} of {len(judged)} windows meet the marks"] if judged else []
    if unseen:
        parts.append(f"{unseen} never compared")
    return ", ".join(parts) or "no accuracy stored"


def _quality(row: JudgedWindow | UnseenWindow, from_um: float, to_um: float) -> WindowQuality:
    return WindowQuality(
        gas=row.gas,
        from_um=from_um,
        to_um=to_um,
        compared=isinstance(row, JudgedWindow),
        meets=isinstance(row, JudgedWindow) and row.verdict is Judgement.MEETS,
        strength_factor=row.strength_factor,
        basis=row.compared_with if isinstance(row, JudgedWindow) else row.rests_on,
    )
