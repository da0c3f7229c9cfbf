"""The command line: parse, load, call, render, exit.

Everything heavy is imported inside the commands, so that help and usage errors come at once. Results go to stdout or
to files, talk goes to stderr. A `PlannerError` becomes one message on stderr and exit status 2; an interrupt becomes
one line and 130.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from planner import __version__
from planner.commands.audit import audit
from planner.commands.check import check
from planner.commands.choose import choose, odds
from planner.commands.contrast import contrast
from planner.commands.fit import fit
from planner.commands.gases import gases
from planner.commands.linefiles import fetch, import_
from planner.commands.options import Measured, Stretch, progress_bar
from planner.commands.ranges import limit, map_
from planner.errors import PlannerError

if TYPE_CHECKING:
    from planner.scenario import Scenario
    from planner.studies.results import PlanResult

__all__ = ["cli", "main"]

Progress = Callable[[str, float], None]
_FILE = click.Path(path_type=Path, readable=False)  # our own messages say what is wrong with a path
_LINES = click.option(
    "--lines",
    "lines_folder",
    type=_FILE,
    metavar="DIR",
    help="Folder of .par, .xsc and .cia files that take the place of embedded line data.",
)


class _Group(click.Group):
    """A group that turns the errors of users into one message."""

    def invoke(self, ctx: click.Context) -> Any:
        try:
            return super().invoke(ctx)
        except PlannerError as error:
            click.echo(str(error), err=True)
            ctx.exit(2)
        except KeyboardInterrupt:
            click.echo("interrupted", err=True)
            ctx.exit(130)


@click.group(cls=_Group, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="limbcast", message="%(prog)s %(version)s")
def cli() -> None:
    """Plan and judge searches for telling gases in the air of transiting planets.

    Start with `limbcast demo`, then `limbcast new my.toml` and `limbcast plan my.toml`.
    """


cli.add_command(gases)
cli.add_command(contrast)
cli.add_command(choose)
cli.add_command(odds)
cli.add_command(audit)
cli.add_command(fit)
cli.add_command(limit)
cli.add_command(map_)


@cli.command()
@click.argument("scenario", type=_FILE)
@_LINES
@click.option("--json", "json_file", type=_FILE, metavar="FILE", help="Write the result as JSON; - for stdout.")
@click.option("--out", type=_FILE, metavar="DIR", help="Write tables, spectra and figure into this folder.")
@click.option(
    "--simulate",
    "simulated",
    type=click.IntRange(min=100),
    is_flag=False,
    flag_value=2000,
    metavar="[N]",
    help="Try the stated rates on N simulated observations of each search; last on the line, N may be left out: 2000.",
)
@click.option(
    "--remedies",
    is_flag=True,
    help="Work out all that would help: other modes, more of the gas, a clearer sky; and try rivals of the catalogue.",
)
@click.option(
    "--spread",
    type=click.IntRange(min=32),
    is_flag=False,
    flag_value=128,
    metavar="[N]",
    help="Transits over the priors, chance of success and what drives it, from N draws; last on the line: 128.",
)
def plan(
    scenario: Path,
    lines_folder: Path | None,
    json_file: Path | None,
    out: Path | None,
    simulated: int | None,
    remedies: bool,
    spread: int | None,
) -> None:
    """How many transits for each gas, with each mode."""
    from planner.report.files import check_writable, make_folder
    from planner.report.jsonio import plan_json, write_plan_json
    from planner.scenario import read_scenario

    read = read_scenario(scenario)
    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    if out is not None:
        make_folder(out)
    result = _planned(read, lines_folder, simulated=simulated, remedies=remedies, spread=spread)
    if to_stdout:
        click.echo(plan_json(result), nl=False)
    else:
        _show_plan(result)
    if json_file is not None and not to_stdout:
        write_plan_json(result, json_file)
    if out is not None:
        _write_all(result, out, remedies=remedies)


@cli.command()
@click.option("--out", type=_FILE, metavar="DIR", default=Path("limbcast-demo"), show_default=True, help="Folder.")
def demo(out: Path) -> None:
    """Plan a search around an invented planet and write all outputs."""
    from planner.report.files import make_folder
    from planner.resources import data_folder
    from planner.scenario import read_scenario

    make_folder(out)
    result = _planned(read_scenario(data_folder("configs") / "scenarios" / "demo.toml"), None)
    _show_plan(result)
    _write_all(result, out)


@cli.command()
@click.argument("file", type=_FILE)
@click.option("--claim", "kind", flag_value="claim", help="A claim to audit instead.")
@click.option("--ledger", "kind", flag_value="ledger", help="A ledger of findings to weigh instead.")
def new(file: Path, kind: str | None) -> None:
    """Write a commented scenario to start from."""
    from shlex import quote

    from planner.catalogue.ledger import starting_ledger
    from planner.claims.read import starting_claim
    from planner.errors import OutputError
    from planner.report.files import write_text
    from planner.scenario import starting_scenario

    if file.exists():
        raise OutputError(f"{file}: exists already; choose another name or remove it first")
    starts = {
        None: (starting_scenario, "plan"),
        "claim": (starting_claim, "audit"),
        "ledger": (starting_ledger, "odds"),
    }
    text, command = starts[kind]
    write_text(file, text())
    click.echo(f"wrote {file}; next: limbcast {command} {quote(str(file))}", err=True)


@cli.command()
@click.argument("scenario", type=_FILE)
@_LINES
@click.option("--out", type=_FILE, metavar="FILE", required=True, help="Table to write, .ecsv or .csv.")
@click.option("--figure", type=_FILE, metavar="FILE", help="Figure to write, .png, .pdf or .svg.")
@click.option(
    "--transits",
    type=click.IntRange(min=1),
    default=1,
    show_default=True,
    help="Transits that the simulated points of the figure are for.",
)
def spectrum(scenario: Path, lines_folder: Path | None, out: Path, figure: Path | None, transits: int) -> None:
    """Transit depth per bin, the share of each gas, and the noise."""
    from planner.report.ecsv import check_table_name, spectra_table, write_table
    from planner.report.files import check_writable
    from planner.scenario import read_scenario
    from planner.studies.spectrum import spectrum as study

    check_table_name(out)
    check_writable(out)
    if figure is not None:
        _check_figure(figure)
    planned = read_scenario(scenario)
    with progress_bar() as progress:
        spectra = study(planned, lines_folder=lines_folder, progress=progress)
    meta = {"title": planned.title, "invented": planned.invented, "limbcast": __version__}
    write_table(spectra_table(spectra, meta), out)
    if figure is not None:
        from planner.report.figure import spectra_figure, write_figure

        drawn = spectra_figure(
            spectra, title=planned.title, version=__version__, invented=planned.invented, transits=transits
        )
        write_figure(drawn, figure)
    _tell_written(out, *([figure] if figure else []))


@cli.command()
@click.argument("gas")
@click.option("--temperature", type=Measured("a temperature", "K", "296 K"), required=True, help='Such as "296 K".')
@click.option("--pressure", type=Measured("a pressure", "bar", "1 bar"), required=True, help='Such as "1 bar".')
@click.option("--range", "stretch", type=Stretch(), required=True, help='Such as "2000:2300 1/cm" or "4:5 um".')
@click.option(
    "--step",
    type=Measured("a step in wavenumber", "cm-1", "0.01 1/cm"),
    default="0.01 1/cm",
    show_default=True,
    help="Step of the even grid.",
)
@_LINES
@click.option("--out", type=_FILE, metavar="FILE", required=True, help="Table to write, .ecsv or .csv.")
def sigma(
    gas: str,
    temperature: float,
    pressure: float,
    stretch: tuple[float, float],
    step: float,
    lines_folder: Path | None,
    out: Path,
) -> None:
    """Absorption cross-section of a gas, in cm2 per molecule."""
    from planner.report.ecsv import check_table_name, sigma_table, write_table
    from planner.report.files import check_writable
    from planner.studies.sigma import sigma as study

    check_table_name(out)
    check_writable(out)
    wavenumber, cross_section, provenance = study(gas, temperature, pressure, *stretch, step, lines_folder=lines_folder)
    meta = {"gas": gas, "temperature_k": temperature, "pressure_bar": pressure}
    meta |= {"provenance": list(provenance), "limbcast": __version__}
    write_table(sigma_table(wavenumber, cross_section, meta), out)
    for sentence in provenance:
        click.echo(sentence)
    _tell_written(out)


@cli.group()
def lines() -> None:
    """Line data: what there is, building it, checking it."""


@lines.command("list")
def list_lines() -> None:
    """The gases there are data for, where, and how good they are."""
    from planner.studies.linedata import list_gases

    _show_records(list_gases())


@lines.command()
@click.argument("gases", nargs=-1)
def build(gases: tuple[str, ...]) -> None:
    """Build the lists of some gases, or of all, ahead of their first use."""
    from planner.studies.linedata import build as study

    with progress_bar() as progress:
        sentences = study(gases, progress)
    for sentence in sentences:
        click.echo(sentence)


lines.add_command(check)


lines.add_command(fetch)
lines.add_command(import_)


def _planned(scenario: Scenario, lines_folder: Path | None, **asked: Any) -> PlanResult:
    from planner.studies.plan import plan as study

    with progress_bar() as progress:
        return study(scenario, lines_folder=lines_folder, progress=progress, **asked)


def _write_all(result: PlanResult, folder: Path, *, remedies: bool = False) -> None:
    """Everything a plan leaves as files; a figure of remedies where all of them were asked for."""
    from planner.report.ecsv import plan_meta, plan_table, spectra_table, write_table
    from planner.report.figure import plan_figure, write_figure
    from planner.report.jsonio import write_plan_json
    from planner.report.remedyfigure import remedy_figure
    from planner.report.simulationfigure import simulation_figure
    from planner.report.spreadfigure import spread_figure

    write_plan_json(result, folder / "plan.json")
    write_table(plan_table(result), folder / "plan.ecsv")
    write_table(spectra_table(result.spectra, plan_meta(result)), folder / "spectra.ecsv")
    figures = {"plan": plan_figure(result)}
    if any(row.spread for row in result.rows):
        figures["spread"] = spread_figure(result)
    if any(row.simulation for row in result.rows):
        figures["simulation"] = simulation_figure(result)
    if remedies and any(row.remedies for row in result.rows):
        figures["remedies"] = remedy_figure(result)
    names = ["plan.json", "plan.ecsv", "spectra.ecsv"]
    for name, figure in figures.items():
        for ending in ("png", "pdf"):
            names.append(f"{name}.{ending}")
            write_figure(figure, folder / names[-1])
    _tell_written(*(folder / name for name in names))


def _check_figure(path: Path) -> None:
    from planner.report.figure import check_figure_name
    from planner.report.files import check_writable

    check_figure_name(path)
    check_writable(path)


def _show_plan(result: PlanResult) -> None:
    from rich.console import Console

    from planner.report.table import plan_view

    console = Console(highlight=False)
    console.print(plan_view(result, console.width))


def _show_records(records: Any) -> None:
    from rich.console import Console

    from planner.report.table import records_view

    Console(highlight=False).print(records_view(records))


def _tell_written(*paths: Path) -> None:
    click.echo(f"wrote {', '.join(str(path) for path in paths)}", err=True)


def main() -> None:
    """Entry point of the ``limbcast`` command."""
    cli(prog_name="limbcast")
