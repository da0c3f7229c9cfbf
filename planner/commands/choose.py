"""The commands ``limbcast choose`` and ``limbcast odds``: they stand above the rooms they join and import them late."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from planner.commands.options import Measured, progress_bar

if TYPE_CHECKING:
    from planner.scenario import Scenario
    from planner.studies.choices import ChoiceResult

__all__ = ["choose", "odds"]

_FILE = click.Path(path_type=Path, readable=False)
_FILES = ("choice.json", "choice.ecsv", "worth.png", "worth.pdf", "transits.png", "transits.pdf")


class _Names(click.ParamType):
    """Names with commas between them."""

    name = "names"

    def convert(self, value: object, param: click.Parameter | None, ctx: click.Context | None) -> tuple[str, ...]:
        names = tuple(name.strip() for name in str(value).split(",") if name.strip())
        if not names:
            self.fail("expected names with commas between them", param, ctx)
        return names


@click.command()
@click.argument("scenario", type=_FILE)
@click.option("--gases", type=_Names(), metavar="A,B,...", help="Gases to weigh; all of the catalogue.")
@click.option("--modes", type=_Names(), metavar="A,B,...", help="In place of the scenario's modes.")
@click.option(
    "--hours", type=Measured("a time", "h", "60 h"), help='Charged time with each mode, "60 h"; all transits on offer.'
)
@click.option("--hypothesis", type=click.Choice(["life", "industry"]), default="life", show_default=True)
@click.option("--pattern", "patterns", type=_Names(), multiple=True, metavar="A,B,...", help="A set to judge as one.")
@click.option("--lines", "lines_folder", type=_FILE, metavar="DIR", help="Folder of real line data, as for plan.")
@click.option("--json", "json_file", type=_FILE, metavar="FILE", help="Write the result as JSON; - for stdout.")
@click.option("--out", type=_FILE, metavar="DIR", help="Write table, JSON and figures into this folder.")
def choose(
    scenario: Path,
    gases: tuple[str, ...] | None,
    modes: tuple[str, ...] | None,
    hours: float | None,
    hypothesis: str,
    patterns: tuple[tuple[str, ...], ...],
    lines_folder: Path | None,
    json_file: Path | None,
    out: Path | None,
) -> None:
    """Which gas to go for in the hours there are, and what it would tell."""
    from planner.report.choicejson import choice_json, write_choice_json
    from planner.report.files import check_writable, make_folder
    from planner.scenario import read_scenario
    from planner.studies.choose import choose as study

    read = _with_modes(read_scenario(scenario), modes or ())
    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    if out is not None:
        make_folder(out)
    with progress_bar() as progress:
        result = study(
            read,
            hypothesis=hypothesis,
            gases=gases or (),
            hours=hours,
            together=patterns,
            lines_folder=lines_folder,
            progress=progress,
        )
    if to_stdout:
        click.echo(choice_json(result), nl=False)
    else:
        _show(result)
    if json_file is not None and not to_stdout:
        write_choice_json(result, json_file)
    if out is not None:
        _write_all(result, out)


@click.command()
@click.argument("ledger", type=_FILE)
@click.option("--json", "json_file", type=_FILE, metavar="FILE", help="Write the result as JSON; - for stdout.")
def odds(ledger: Path, json_file: Path | None) -> None:
    """What the findings about a planet say of life or industry, as a range."""
    from rich.console import Console

    from planner.catalogue.ledger import read_ledger
    from planner.report.files import check_writable, write_text
    from planner.report.odds import odds_json, odds_view
    from planner.studies.odds import weigh

    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    result = weigh(read_ledger(ledger))
    if to_stdout:
        click.echo(odds_json(result), nl=False)
        return
    Console(highlight=False).print(odds_view(result))
    if json_file is not None:
        write_text(json_file, odds_json(result))


def _with_modes(scenario: Scenario, modes: tuple[str, ...]) -> Scenario:
    """The scenario with other modes: short names of shipped ones, or paths of own files."""
    from planner.instrument.modefiles import read_mode

    if not modes:
        return scenario
    named = tuple(Path(mode) if mode.endswith(".toml") else mode for mode in dict.fromkeys(modes))
    for mode in named:
        read_mode(mode)  # refuses what is not there before the work begins
    return scenario.model_copy(update={"modes": named})


def _show(result: ChoiceResult) -> None:
    from rich.console import Console

    from planner.report.choices import choice_view

    console = Console(highlight=False)
    console.print(choice_view(result, console.width))


def _write_all(result: ChoiceResult, folder: Path) -> None:
    from planner.report.choicefigure import chart_figure, worth_figure
    from planner.report.choicejson import write_choice_json
    from planner.report.choicetable import choice_table
    from planner.report.ecsv import write_table
    from planner.report.figure import write_figure

    write_choice_json(result, folder / "choice.json")
    write_table(choice_table(result), folder / "choice.ecsv")
    for name, figure in (("worth", worth_figure(result)), ("transits", chart_figure(result))):
        for suffix in ("png", "pdf"):
            write_figure(figure, folder / f"{name}.{suffix}")
    click.echo(f"wrote {', '.join(str(folder / name) for name in _FILES)}", err=True)
