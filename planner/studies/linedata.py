"""Which line data there are, building them ahead of use, and checking how good they are."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

from planner.spectroscopy.lists.build import Constants, build_lines, embedded_formulas, read_constants
from planner.spectroscopy.store import Store

__all__ = ["GasListing", "build", "list_gases"]


@dataclass(frozen=True, kw_only=True)
class GasListing:
    """One embedded gas."""

    gas: str
    also_called: str
    made_of: str
    covers_per_cm: str
    covers_um: str


def list_gases() -> list[GasListing]:
    """All embedded gases, sorted by formula."""
    return [_listing(read_constants(formula)) for formula in embedded_formulas()]


def build(gases: Sequence[str] = (), progress: Callable[[str, float], None] | None = None) -> list[str]:
    """Build and store the lists of some gases, or of all; one sentence each.

    Raises
    ------
    LineDataError
        If a gas has no embedded data.
    """
    store = Store()
    names = list(gases) or embedded_formulas()
    sentences = []
    for done, name in enumerate(names):
        constants = read_constants(name)
        if progress:
            progress(constants.molecule.formula, done / len(names))
        lines = build_lines(constants, store)
        kind = "smooth bands only" if lines is None else f"{len(lines)} lines"
        sentences.append(f"{constants.molecule.formula}: {kind}")
    return [*sentences, *store.notices]


def _listing(constants: Constants) -> GasListing:
    kinds = dict.fromkeys(str(part["kind"]) for part in (*constants.line_parts, *constants.smooth_parts))
    return GasListing(
        gas=constants.molecule.formula,
        also_called=", ".join(constants.molecule.names),
        made_of=", ".join(kinds),
        covers_per_cm=", ".join(f"{low:g}-{high:g}" for low, high in constants.covers_per_cm),
        covers_um=", ".join(f"{1e4 / high:.3g}-{1e4 / low:.3g}" for low, high in reversed(constants.covers_per_cm)),
    )
