"""The commands ``limbcast limit`` and ``limbcast map``: a scenario over a range of its numbers."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from planner.commands.options import progress_bar

if TYPE_CHECKING:
    from planner.studies.maps import Axis
    from planner.studies.outcomes import LimitResult, MapResult

__all__ = ["limit", "map_"]

_FILE = click.Path(path_type=Path, readable=False)
_LINES = click.option("--lines", "lines_folder", type=_FILE, metavar="DIR", help="Real line data, as for plan.")


class _Counts(click.ParamType):
    """Whole numbers with commas between them."""

    name = "counts"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> tuple[int, ...]:
        try:
            counts = tuple(int(part) for part in str(value).split(","))
        except ValueError:
            counts = ()
        if not counts or min(counts) < 1:
            self.fail(f'expected numbers of transits such as "1,10,100", got "{value}"', param, ctx)
        return counts


class _Axis(click.ParamType):
    """``NAME=FROM:TO`` or ``NAME=FROM:TO:STEPS``."""

    name = "axis"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> Axis:
        from planner.studies.maps import Axis

        name, _, ends = str(value).partition("=")
        parts = ends.split(":")
        try:
            steps = {"steps": int(parts.pop(2))} if len(parts) == 3 else {}
            low, high = map(float, parts)
        except ValueError:
            self.fail(
                f'expected an axis such as "cloud_top=1e-4:1" or "temperature=200:350:9", got "{value}"', param, ctx
            )
        return Axis(name=name.strip(), low=low, high=high, **steps)


@click.command()
@click.argument("scenario", type=_FILE)
@click.option(
    "--transits", type=_Counts(), metavar="N,N,...", default="1,5,10,20,50,100", show_default=True, help="How many."
)
@click.option(
    "--confidence",
    type=click.FloatRange(0.5, 1, min_open=True, max_open=True),
    default=0.95,
    show_default=True,
    help="Of what a null result excludes, one-sided.",
)
@_LINES
@click.option("--json", "json_file", type=_FILE, metavar="FILE", help="Write the result as JSON; - for stdout.")
@click.option("--out", type=_FILE, metavar="DIR", help="Write tables, JSON and figure into this folder.")
def limit(
    scenario: Path,
    transits: tuple[int, ...],
    confidence: float,
    lines_folder: Path | None,
    json_file: Path | None,
    out: Path | None,
) -> None:
    """What N transits can detect, and what seeing nothing excludes."""
    from planner.report.files import check_writable, make_folder
    from planner.report.limits import limit_json, write_limit_json
    from planner.scenario import read_scenario
    from planner.studies.limit import limit as study

    read = read_scenario(scenario)
    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    if out is not None:
        make_folder(out)
    with progress_bar() as progress:
        result = study(read, transits=transits, confidence=confidence, lines_folder=lines_folder, progress=progress)
    if to_stdout:
        click.echo(limit_json(result), nl=False)
    else:
        _show_limits(result)
    if json_file is not None and not to_stdout:
        write_limit_json(result, json_file)
    if out is not None:
        _write_limits(result, out)


@click.command("map")
@click.argument("scenario", type=_FILE)
@click.option("--x", type=_Axis(), metavar="NAME=FROM:TO[:STEPS]", help="Default: mixing_ratio about the scenario's.")
@click.option("--y", type=_Axis(), metavar="NAME=FROM:TO[:STEPS]", help="Default: cloud_top, up from the base.")
@click.option("--gas", metavar="GAS", help="A candidate by formula, or a set as A+B; the first by default.")
@click.option("--mode", metavar="MODE", help="One of the scenario's modes; the first by default.")
@_LINES
@click.option("--out", type=_FILE, metavar="DIR", required=True, help="Write figure and table into this folder.")
def map_(
    scenario: Path,
    x: Axis | None,
    y: Axis | None,
    gas: str | None,
    mode: str | None,
    lines_folder: Path | None,
    out: Path,
) -> None:
    """Transits over two numbers of a scenario, as a figure.

    The numbers go by the names mixing_ratio, temperature (K), mass (Earth masses), radius (Earth radii), molar_mass
    (g/mol), cloud_top (bar), haze, star_radius (solar radii), spots and faculae (share of the disc),
    spot_temperature and facula_temperature (K), and absorbers by their formula.
    """
    from planner.report.files import make_folder
    from planner.scenario import read_scenario
    from planner.studies.maps import map_transits

    read = read_scenario(scenario)
    make_folder(out)
    with progress_bar() as progress:
        result = map_transits(read, x=x, y=y, gas=gas, mode=mode, lines_folder=lines_folder, progress=progress)
    _write_map(result, out)


def _show_limits(result: LimitResult) -> None:
    from rich.console import Console

    from planner.report.limitview import limit_view

    Console(highlight=False).print(limit_view(result))


def _write_limits(result: LimitResult, folder: Path) -> None:
    from planner.report.ecsv import write_table
    from planner.report.figure import write_figure
    from planner.report.limitfigure import limit_figure
    from planner.report.limits import growth_table, limit_table, write_limit_json

    names = ("limits.json", "limits.ecsv", "growth.ecsv", "limits.png", "limits.pdf")
    paths = [folder / name for name in names]
    write_limit_json(result, paths[0])
    write_table(limit_table(result), paths[1])
    write_table(growth_table(result), paths[2])
    figure = limit_figure(result)
    write_figure(figure, paths[3])
    write_figure(figure, paths[4])
    _tell_written(paths)


def _write_map(result: MapResult, folder: Path) -> None:
    from planner.report.ecsv import write_table
    from planner.report.figure import write_figure
    from planner.report.maps import map_figure, map_table

    paths = [folder / name for name in ("map.ecsv", "map.png", "map.pdf")]
    write_table(map_table(result), paths[0])
    figure = map_figure(result)
    write_figure(figure, paths[1])
    write_figure(figure, paths[2])
    _tell_written(paths)


def _tell_written(paths: list[Path]) -> None:
    click.echo(f"wrote {', '.join(str(path) for path in paths)}", err=True)
