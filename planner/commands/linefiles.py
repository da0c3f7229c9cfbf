"""The commands ``limbcast lines fetch`` and ``limbcast lines import``."""

from __future__ import annotations

from pathlib import Path

import click

from planner.commands.options import Measured, Stretch, progress_bar

__all__ = ["fetch", "import_"]

_PATH = click.Path(path_type=Path, readable=False)  # our own messages say what is wrong with a path
_FOLDER = click.option(
    "--to", "folder", type=_PATH, metavar="DIR", required=True, help="Folder that --lines will name."
)


class _Numbers(click.ParamType):
    """Whole numbers with commas between them."""

    name = "numbers"

    def convert(self, value: str, param: click.Parameter | None, ctx: click.Context | None) -> tuple[int, ...]:
        """The numbers."""
        words = value.split(",")
        if not all(word.strip().isdecimal() for word in words):
            self.fail(f'expected whole numbers such as "1,2,3", got "{value}"', param, ctx)
        return tuple(int(word) for word in words)


@click.command()
@click.argument("gases", nargs=-1, required=True, metavar="GAS...")
@click.option("--range", "stretch", type=Stretch(), required=True, help='Such as "500:10000 1/cm" or "1:5 um".')
@_FOLDER
@click.option(
    "--abundance",
    type=click.FloatRange(min=0.0, max=1.0),
    default=1e-6,
    show_default=True,
    help="Leave out isotopologues that are rarer.",
)
@click.option(
    "--pause", type=click.FloatRange(min=0.5), default=1.0, show_default=True, help="Seconds between requests."
)
@click.option("--service", "address", metavar="URL", help="Another address of the service, such as that of a mirror.")
def fetch(
    gases: tuple[str, ...],
    stretch: tuple[float, float],
    folder: Path,
    abundance: float,
    pause: float,
    address: str | None,
) -> None:
    """Fetch line data from HITRANonline through hapi.

    What has come is kept: run the same command again after a failure or an interrupt, and it goes on from there. For
    cross-sections and collision pairs (such as N2-H2), which hapi does not offer, it says what to download by hand.
    """
    from datetime import UTC, datetime

    from planner.spectroscopy.files.service import LineService
    from planner.studies.linefiles import fetch as study

    with progress_bar() as progress:
        sentences = study(
            gases,
            *stretch,
            folder,
            least_abundance=abundance,
            today=datetime.now(UTC).date().isoformat(),
            service=LineService(address, pause_s=pause),
            progress=progress,
        )
        for sentence in sentences:
            click.echo(sentence)


@click.command("import")
@click.argument("paths", nargs=-1, required=True, type=_PATH, metavar="PATH...")
@_FOLDER
@click.option("--covers", type=Stretch(), help="The line files are complete over this range.")
@click.option("--isotopologues", type=_Numbers(), help='They are so for these only, such as "1,2".')
@click.option("--edition", metavar="NAME", help="Edition of the line files, such as HITRAN2020.")
@click.option("--gas", help="Of a two-column file: its gas.")
@click.option("--units", nargs=2, metavar="X Y", help='Of a two-column file: such as "1/cm" "cm2" or nm "1e-20 cm2".')
@click.option("--temperature", type=Measured("a temperature", "K", "296 K"), help="Of a two-column file.")
@click.option(
    "--pressure", type=Measured("a pressure", "bar", "1 atm", zero_allowed=True), help="Of a two-column file."
)
def import_(
    paths: tuple[Path, ...],
    folder: Path,
    covers: tuple[float, float] | None,
    isotopologues: tuple[int, ...] | None,
    edition: str | None,
    gas: str | None,
    units: tuple[str, str] | None,
    temperature: float | None,
    pressure: float | None,
) -> None:
    """Check files of line data and take them into a folder.

    PATHs are .par, .xsc or .cia files as HITRAN publishes them, plain or gzip, folders of such files, or text of two
    columns with --gas, --units, --temperature and --pressure. Says what the files hold, what of it stands from now
    on, and what does not. Nothing is written if anything is wrong.
    """
    from planner.spectroscopy.files.importing import ColumnMeaning, Promise
    from planner.spectroscopy.molecules import find_molecule
    from planner.studies.linefiles import take_in

    if covers is None and (isotopologues is not None or edition is not None):
        raise click.UsageError("--isotopologues and --edition say more about --covers; give that too")
    promise = None
    if covers is not None:
        promise = Promise(interval_per_cm=covers, isotopologues=isotopologues, edition=edition)
    columns = None
    if gas is not None and units is not None and temperature is not None and pressure is not None:
        formula = find_molecule(gas).formula
        columns = ColumnMeaning(
            formula=formula, x_unit=units[0], y_unit=units[1], temperature_k=temperature, pressure_bar=pressure
        )
    elif not all(value is None for value in (gas, units, temperature, pressure)):
        raise click.UsageError("a two-column file needs all of --gas, --units, --temperature and --pressure")
    report = take_in(paths, folder, promise=promise, columns=columns)
    for title, sentences in (("read", report.files), ("stands", report.used), ("not used", report.unused)):
        for sentence in sentences:
            click.echo(f"{title}: {sentence}")
    click.echo(f"wrote {len(report.written)} files to {folder}", err=True)
