"""What the studies of line data hand to the report: frozen records."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from planner.spectroscopy.accuracyfile import AccuracyTable

__all__ = ["CheckReport", "CheckedList", "GasListing"]


@dataclass(frozen=True, kw_only=True)
class GasListing:
    """One embedded gas."""

    gas: str
    also_called: str
    made_of: str
    covers_per_cm: str
    covers_um: str
    quality: str


@dataclass(frozen=True, kw_only=True)
class CheckedList:
    """One embedded list and what is wrong with it."""

    gas: str
    lines: int
    seconds: float
    """Time to build it anew and check it."""
    faults: tuple[str, ...]


@dataclass(frozen=True, kw_only=True)
class CheckReport:
    """Outcome of a check.

    Attributes
    ----------
    lists : tuple of CheckedList
        Every embedded list checked for faults; empty where lists were compared with real data.
    accuracy : AccuracyTable
        Computed from the real data, or else as stored.
    against : Path or None
        Folder of the real data.
    notices : tuple of str
        What the store has to say.
    """

    lists: tuple[CheckedList, ...]
    accuracy: AccuracyTable
    against: Path | None
    notices: tuple[str, ...]

    @property
    def sound(self) -> bool:
        """Whether no list has a fault."""
        return not any(checked.faults for checked in self.lists)
