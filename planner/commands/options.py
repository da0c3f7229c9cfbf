"""What the commands share: kinds of option with units, and the bar that shows progress."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import Any

import click

__all__ = ["Measured", "Stretch", "progress_bar"]


class Measured(click.ParamType):
    """A value with a unit, read into the unit of the named measure."""

    name = "value with unit"

    def __init__(self, kind: str, unit: str, example: str, *, zero_allowed: bool = False) -> None:
        self.kind, self.unit, self.example, self.zero_allowed = kind, unit, example, zero_allowed

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """The number in the measure's unit."""
        import astropy.units as u

        from planner.scenario.readings import Measure

        measure = Measure(kind=self.kind, unit=u.Unit(self.unit), example=self.example, zero_allowed=self.zero_allowed)
        try:
            return measure(value)
        except ValueError as error:
            self.fail(str(error), param, ctx)


class Stretch(click.ParamType):
    """``FROM:TO UNIT`` in wavenumber, wavelength or frequency, read as two ascending wavenumbers in 1/cm."""

    name = "from:to unit"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> tuple[float, float]:
        """The two wavenumbers."""
        import astropy.units as u

        from planner.scenario.quantities import quantity

        low, _, high = str(value).partition(":")
        try:
            end = quantity(high)
            ends = [q.to_value(u.cm**-1, equivalencies=u.spectral()) for q in (float(low) * end.unit, end)]
        except (ValueError, TypeError):
            self.fail(f'expected a range such as "2000:2300 1/cm" or "4.2:4.4 um", got "{value}"', param, ctx)
        return float(min(ends)), float(max(ends))


@contextmanager
def progress_bar() -> Iterator[Callable[[str, float], None] | None]:
    """A bar on stderr that goes away when the work is done; nothing where stderr is not a terminal."""
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn

    console = Console(stderr=True)
    if not console.is_terminal:
        yield None
        return
    columns = (TextColumn("{task.description}"), BarColumn(), TimeElapsedColumn())
    with Progress(*columns, console=console, transient=True) as bars:
        task = bars.add_task("starting", total=1.0)
        yield lambda message, fraction: bars.update(task, description=message, completed=fraction)
