"""The spread of a plan in the terminal: transits over the priors, the chance of success, and what drives it."""

from __future__ import annotations

from collections.abc import Sequence

from rich.console import RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.words import count_text, gas_text, ratio_text
from planner.studies.results import PlanResult, PlanRow

__all__ = ["spreads_block"]

_DRIVERS_SHOWN = 4


def spreads_block(result: PlanResult) -> list[RenderableType]:
    """What the draws gave for each row; nothing where none were made."""
    rows = [row for row in result.rows if row.spread is not None]
    if not rows or rows[0].spread is None:
        return []
    head = Text("\nSpread over what is not known", style="bold")
    priors = "; ".join(f"{_unknown(name)} {prior}" for name, prior in result.spread_priors)
    words = (
        f"{rows[0].spread.draws} draws of each search from: {priors}. Chance: of passing the threshold with the "
        "transits asked for, and with all on offer. What drives it: share of the variance of the ranks in S/N."
    )
    return [head, Text(words), _numbers(rows), Text(), _drivers(rows)]


def _numbers(rows: Sequence[PlanRow]) -> Table:
    table = _started()
    for heading in ("transits\n16 %", "\n50 %", "\n84 %", "chance\nas asked", "chance\nwith all"):
        table.add_column(heading, justify="right", no_wrap=True)
    for row in rows:
        spread = row.spread
        assert spread is not None
        counts = (spread.transits_16, spread.transits_50, spread.transits_84)
        table.add_row(
            *_search(row),
            *map(count_text, counts),
            _chance(spread.chance_asked, spread.transits_asked),
            _chance(spread.chance_on_offer, spread.transits_on_offer),
        )
    return table


def _drivers(rows: Sequence[PlanRow]) -> Table:
    table = _started()
    table.add_column("\nwhat drives it", ratio=1)
    for row in rows:
        assert row.spread is not None
        shown = row.spread.drivers[:_DRIVERS_SHOWN]
        table.add_row(
            *_search(row), ", ".join(f"{_unknown(driver.name)} {100 * driver.share:.0f} %" for driver in shown) or "-"
        )
    return table


def _unknown(name: str) -> str:
    """A gas as people call it; other names are words in small letters."""
    return gas_text(name) if name[:1].isupper() else name


def _started() -> Table:
    """An empty table with the columns that say which search a row is."""
    table = Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="dim")
    table.add_column("\ngas", min_width=7)
    table.add_column("mixing\nratio", justify="right", no_wrap=True)
    table.add_column("\nmode", overflow="fold")
    return table


def _search(row: PlanRow) -> tuple[Text, str, str]:
    return Text(gas_text(row.gas), style="bold"), ratio_text(row.mixing_ratio), row.mode


def _chance(chance: float, transits: int) -> str:
    """``71 % (91)``: the chance, and the transits that it is for."""
    percent = "<1" if chance < 0.005 else ">99" if chance > 0.995 else f"{100 * chance:.0f}"
    return f"{percent} % ({count_text(transits)})"
