"""What hapi does not offer: which file to download by hand, and where to put it."""

from __future__ import annotations

from pathlib import Path

from planner.errors import LineDataError
from planner.spectroscopy.molecules import Molecule, find_molecule

__all__ = ["collision_file", "cross_section_files", "pair_of"]


def cross_section_files(molecule: Molecule, from_per_cm: float, to_per_cm: float, folder: Path) -> str:
    """How to get the measured cross-sections of a molecule that has no line records."""
    also = f" ({molecule.names[0]})" if molecule.names else ""
    return (
        f"{molecule.formula}{also}: HITRAN has no line records of it, and hapi offers no cross-section files. Download "
        f"them by hand: at https://hitran.org/xsc/ choose {molecule.formula}{also}, take every set of temperature and "
        f"pressure that reaches into {from_per_cm:g}-{to_per_cm:g} 1/cm, put the .xsc files into {folder} as they are, "
        f'and run: limbcast lines import "{folder}" --to "{folder}"'
    )


def collision_file(pair: tuple[str, str], folder: Path) -> str:
    """How to get the collision file of a pair."""
    one, other = pair
    names = f"{one}-{other}_YEAR.cia" + ("" if one == other else f" or {other}-{one}_YEAR.cia")
    return (
        f"{one}-{other}: hapi offers no collision files. Download it by hand: at https://hitran.org/cia/ take {names} "
        f"with the newest YEAR, put it into {folder} as it is, and run: "
        f'limbcast lines import "{folder}" --to "{folder}"'
    )


def pair_of(name: str) -> tuple[str, str] | None:
    """The formulas of a pair written such as ``N2-H2``; None if it is not one."""
    parts = name.split("-")
    if len(parts) != 2:
        return None
    try:
        return find_molecule(parts[0]).formula, find_molecule(parts[1]).formula
    except LineDataError:
        return None
