"""The command ``limbcast contrast``: it stands above the rooms it joins and imports them late."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from planner.commands.options import progress_bar

if TYPE_CHECKING:
    from planner.studies.contrasts import ContrastResult

__all__ = ["contrast"]

_FILE = click.Path(path_type=Path, readable=False)
_FILES = ("contrast.json", "contrast.ecsv", "contrast.png", "contrast.pdf")


@click.command()
@click.argument("first", metavar="A.toml", type=_FILE)
@click.argument("second", metavar="B.toml", type=_FILE)
@click.option("--lines", "lines_folder", type=_FILE, metavar="DIR", help="Folder of real line data, as for plan.")
@click.option("--json", "json_file", type=_FILE, metavar="FILE", help="Write the result as JSON; - for stdout.")
@click.option("--out", type=_FILE, metavar="DIR", help="Write JSON, table of bins and figure into this folder.")
def contrast(first: Path, second: Path, lines_folder: Path | None, json_file: Path | None, out: Path | None) -> None:
    """How many transits tell the atmospheres of two scenarios apart.

    Both hold all their candidates at once, at the amounts stated; star, planet, modes and goal must be the same.
    """
    from planner.report.contrastjson import contrast_json, write_contrast_json
    from planner.report.files import check_writable, make_folder
    from planner.scenario import read_scenario
    from planner.studies.contrast import contrast as study

    a, b = read_scenario(first), read_scenario(second)
    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    if out is not None:
        make_folder(out)
    with progress_bar() as progress:
        result = study(a, b, lines_folder=lines_folder, progress=progress)
    if to_stdout:
        click.echo(contrast_json(result), nl=False)
    else:
        _show(result)
    if json_file is not None and not to_stdout:
        write_contrast_json(result, json_file)
    if out is not None:
        _write_all(result, out)


def _show(result: ContrastResult) -> None:
    from rich.console import Console

    from planner.report.contrasttable import contrast_view

    Console(highlight=False).print(contrast_view(result))


def _write_all(result: ContrastResult, folder: Path) -> None:
    from planner.report.contrastfigure import contrast_figure
    from planner.report.contrastjson import write_contrast_json
    from planner.report.contrasttable import bins_table
    from planner.report.ecsv import write_table
    from planner.report.figure import write_figure

    write_contrast_json(result, folder / _FILES[0])
    write_table(bins_table(result), folder / _FILES[1])
    figure = contrast_figure(result)
    for name in _FILES[2:]:
        write_figure(figure, folder / name)
    click.echo(f"wrote {', '.join(str(folder / name) for name in _FILES)}", err=True)
