"""Simulated observations beside the rates that a plan states, as a block of its table."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.words import count_text, gas_text, ratio_text
from planner.studies.results import PlanRow, Simulation

__all__ = ["simulations_block"]


def simulations_block(rows: Sequence[PlanRow]) -> list[RenderableType]:
    """What simulated observations gave for each row; nothing where none were made."""
    tried = [(row, row.simulation) for row in rows if row.simulation is not None]
    if not tried:
        return []
    first = tried[0][1]
    text = (
        f"Tried on {count_text(first.draws)} simulated observations with the gas, and as many without: chance of a "
        f"detection, false alarms at {first.false_alarm_sigma:g} sigma, and the significance that a feature needs in "
        "its place when the place was not chosen in advance."
    )
    return [Text(), Text("Simulated observations", style="bold"), Text(text), _table(tried)]


def _table(tried: Sequence[tuple[PlanRow, Simulation]]) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="dim")
    table.add_column("\ngas", min_width=7)
    table.add_column("mixing\nratio", justify="right", no_wrap=True)
    table.add_column("\nmode", overflow="fold")
    headings = ("\ntransits", "chance\nstated", "chance\nfound", "alarms\nstated", "alarms\nfound", "needed\nanywhere")
    for heading in headings:
        table.add_column(heading, justify="right", no_wrap=True)
    for row, simulation in tried:
        table.add_row(
            Text(gas_text(row.gas), style="bold"),
            ratio_text(row.mixing_ratio),
            row.mode,
            count_text(simulation.transits),
            f"{100 * simulation.power_stated:.1f} %",
            f"{100 * simulation.power_found:.1f}±{100 * simulation.power_error:.1f}",
            f"{100 * simulation.false_alarms_stated:.2f} %",
            f"{100 * simulation.false_alarms_found:.2f}±{100 * simulation.false_alarms_error:.2f}",
            f"{simulation.sigma_anywhere:.1f}",
        )
    return table
