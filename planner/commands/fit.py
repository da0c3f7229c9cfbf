"""The command ``limbcast fit``: it stands above the rooms it joins and imports them late."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from planner.commands.options import progress_bar

if TYPE_CHECKING:
    from planner.report.fitstate import FitFolder
    from planner.studies.fitting.records import FitResult

__all__ = ["fit"]

_FILE = click.Path(path_type=Path, readable=False)  # our own messages say what is wrong with a path
_FILES = ("fit.json", "posterior.ecsv", "bins.ecsv", "fit.png", "fit.pdf")


@click.command()
@click.argument("spectrum", type=_FILE)
@click.argument("scenario", metavar="SCENARIO.toml", type=_FILE)
@click.option("--without", "gas", metavar="GAS", help="Fit air without this gas as well, and compare the evidence.")
@click.option("--seed", type=click.IntRange(min=0), default=1, show_default=True, help="Of the sampling.")
@click.option("--lines", "lines_folder", type=_FILE, metavar="DIR", help="Folder of real line data, as for plan.")
@click.option(
    "--out",
    type=_FILE,
    metavar="DIR",
    required=True,
    help="Write JSON, posterior, bins and figure into this folder; the state is kept there until the fit is done.",
)
@click.pass_context
def fit(
    ctx: click.Context, spectrum: Path, scenario: Path, gas: str | None, seed: int, lines_folder: Path | None, out: Path
) -> None:
    """What a spectrum says: mixing ratios, limits, evidence, and whether the model fits at all.

    SPECTRUM is ECSV, CSV or FITS: wavelength, or from and to, depth and error, each with its unit, and perhaps
    detector. All gases of the scenario are in the air at once. A fit that is interrupted goes on from where it was
    when the same command is given again.
    """
    from planner.claims.spectrum import read_observed
    from planner.report.files import make_folder
    from planner.report.fitstate import FitFolder
    from planner.scenario import read_scenario
    from planner.spectroscopy.molecules import find_molecule
    from planner.studies.fit import fit as study

    read, observed = read_scenario(scenario), read_observed(spectrum)
    formula = find_molecule(gas).formula if gas is not None else None
    folder = FitFolder(make_folder(out))
    try:
        with progress_bar() as progress:
            result = study(
                read,
                observed,
                spectrum=spectrum.name,
                without=formula,
                seed=seed,
                keeper=folder,
                lines_folder=lines_folder,
                progress=progress,
            )
    except KeyboardInterrupt:
        click.echo(_interrupted(folder, out), err=True)
        ctx.exit(130)
    _show(result)
    _write_all(result, out)
    folder.clear()


def _interrupted(folder: FitFolder, out: Path) -> str:
    if not folder.kept:
        return "interrupted before sampling began; tables that were built are kept"
    return f"interrupted; the same command goes on from the state kept in {out}"


def _show(result: FitResult) -> None:
    from rich.console import Console

    from planner.report.fittable import fit_view

    Console(highlight=False).print(fit_view(result))


def _write_all(result: FitResult, folder: Path) -> None:
    from planner.report.ecsv import write_table
    from planner.report.figure import write_figure
    from planner.report.files import write_text
    from planner.report.fitfigure import fit_figure
    from planner.report.fitjson import fit_json
    from planner.report.fittable import bins_table, draws_table

    write_text(folder / _FILES[0], fit_json(result))
    write_table(draws_table(result), folder / _FILES[1])
    write_table(bins_table(result), folder / _FILES[2])
    figure = fit_figure(result)
    for name in _FILES[3:]:
        write_figure(figure, folder / name)
    click.echo(f"wrote {', '.join(str(folder / name) for name in _FILES)}", err=True)
