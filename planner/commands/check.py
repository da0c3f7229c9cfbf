"""The command ``limbcast lines check``."""

from __future__ import annotations

from pathlib import Path

import click

from planner.commands.options import progress_bar

__all__ = ["check"]

_PIPE_WIDTH = 180
"""Columns where the output goes to a file or a pipe."""
_PATH = click.Path(path_type=Path, readable=False)  # our own messages say what is wrong with a path


@click.command()
@click.option("--against", type=_PATH, metavar="DIR", help="Folder of real .par and .xsc files to compare with.")
@click.option("--write", is_flag=True, help="Store the table with the lists, in a checkout: accuracy.toml and README.")
@click.pass_context
def check(ctx: click.Context, against: Path | None, write: bool) -> None:
    """Check the embedded lists for faults, or score them against real data.

    Alone, builds every list anew, looks for faults and shows the stored accuracy table. With --against, scores the
    lists against the files of a folder: over the ranges that coverage.toml beside them declares, that their names hold
    (CO2_2100-2300_hitran2012.par), or else over their own runs of lines. Exit status 1 if a list has a fault.
    """
    from rich.console import Console

    from planner.report.accuracytable import check_view
    from planner.studies.linedata import check as study
    from planner.studies.linedata import list_gases

    if write and against is None:
        raise click.UsageError("--write stores a table of scores; give --against DIR too")
    with progress_bar() as progress:
        report = study(against, progress)
    console = Console(highlight=False)
    if not console.is_terminal:
        console.width = _PIPE_WIDTH
    console.print(check_view(report, console.width))
    if write:
        from planner.report.accuracypage import write_accuracy

        written = write_accuracy(report.accuracy, list_gases())
        click.echo(f"wrote {', '.join(str(path) for path in written)}", err=True)
    if not report.sound:
        ctx.exit(1)
