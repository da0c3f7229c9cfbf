"""What files of spectroscopic data hold, in sentences."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np

from planner.spectroscopy.files.cia import CollisionTable
from planner.spectroscopy.files.folder import DataFiles, LineFile
from planner.spectroscopy.files.rows import header_at_odds, signs_of
from planner.spectroscopy.files.xsc import CrossSectionTable
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.molecules import MOLECULES

__all__ = ["descriptions", "formulas_in"]

_FORMULAS = {molecule.hitran_number: molecule.formula for molecule in MOLECULES if molecule.hitran_number}
_IDENTITY = (
    "molecule", "isotopologue", "wavenumber_per_cm", "intensity_cm", "lower_energy_per_cm", "upper_global",
    "lower_global", "upper_local", "lower_local",
)  # fmt: skip
"""Fields in which two records must agree to be the same line."""


def formulas_in(lines: Lines) -> list[str]:
    """Formulas of the molecules that lines belong to, as far as a scenario can name them."""
    return [_FORMULAS[number] for number in np.unique(lines.molecule).tolist() if number in _FORMULAS]


def descriptions(files: DataFiles) -> tuple[str, ...]:
    """One sentence per file of lines, table, and pair of a file: what it holds, and what a reader should know."""
    pairs: dict[tuple[str, tuple[str, str]], list[CollisionTable]] = {}
    for block in files.blocks:
        pairs.setdefault((block.where.rpartition(":")[0], block.pair), []).append(block)
    return (
        *(_of_lines(file) for file in files.line_files),
        *(_of_table(table) for table in files.tables),
        *(_of_blocks(Path(path).name, blocks) for (path, _), blocks in pairs.items()),
    )


def _of_lines(file: LineFile) -> str:
    lines = file.lines
    gases = ", ".join(
        f"{_FORMULAS.get(number, f'molecule {number} (no scenario can name it)')} "
        f"{' '.join(map(str, np.unique(lines.isotopologue[lines.molecule == number])))}"
        for number in np.unique(lines.molecule).tolist()
    )
    nu = lines.wavenumber_per_cm
    twice = len(lines) - len({*zip(*(getattr(lines, name).tolist() for name in _IDENTITY), strict=True)})
    return (
        f"{file.path.name}: {len(lines)} line records from {nu[0]:.2f} to {nu[-1]:.2f} per cm, gases and isotopologues "
        f"{gases}" + (f"; {twice} records stand twice" if twice else "")
        + (f"; widths in {', '.join(file.widths.by_gas)} beside it" if file.widths else "")
    )  # fmt: skip


def _of_table(table: CrossSectionTable) -> str:
    return "; ".join(
        (
            f"{Path(table.where).name}: cross-sections of {table.formula} at {table.temperature_k:g} K and "
            f"{table.pressure_torr:g} Torr from {table.from_per_cm:.2f} to {table.to_per_cm:.2f} per cm, "
            f"{table.cross_section_cm2.size} points {table.step_per_cm:.3g} apart",
            *table.remarks(),
        )
    )


def _of_blocks(name: str, blocks: Sequence[CollisionTable]) -> str:
    kelvin = [block.temperature_k for block in blocks]
    low = min(block.wavenumber_per_cm[0] for block in blocks)
    high = max(block.wavenumber_per_cm[-1] for block in blocks)
    at_odds = [
        f"block at line {block.where.rpartition(':')[2]}: {remark}"
        for block in blocks
        for remark in header_at_odds(block.coefficient_cm5, block.largest_stated_cm5, "cm5")
    ]
    unusable = () if blocks[0].usable else ("not used: no scenario can name this pair",)
    return "; ".join(
        (
            f"{name}: {len(blocks)} blocks of {'-'.join(blocks[0].pair)} pairs at {min(kelvin):g} to {max(kelvin):g} K "
            f"from {low:.2f} to {high:.2f} per cm",
            *unusable,
            *signs_of([block.coefficient_cm5 for block in blocks]),
            *at_odds,
        )
    )
