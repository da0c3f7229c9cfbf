"""The command ``limbcast audit``: it stands above the rooms it joins and imports them late."""

from __future__ import annotations

from pathlib import Path

import click

from planner.commands.options import progress_bar

__all__ = ["audit"]

_PATH = click.Path(path_type=Path, readable=False)  # our own messages say what is wrong with a path


@click.command()
@click.argument("claim", type=_PATH)
@click.option("--spectrum", type=_PATH, metavar="FILE", help="The spectrum that the claim rests on, .ecsv or .csv.")
@click.option("--json", "json_file", type=_PATH, metavar="FILE", help="Write the result as JSON; - for stdout.")
@click.option(
    "--lines",
    "lines_folder",
    type=_PATH,
    metavar="DIR",
    help="Folder of .par, .xsc and .cia files that take the place of embedded line data.",
)
def audit(claim: Path, spectrum: Path | None, json_file: Path | None, lines_folder: Path | None) -> None:
    """Is a claimed feature sound? Ten checks and a verdict with its weakest link.

    `limbcast new --claim FILE` writes a commented claim to start from.
    """
    from planner.claims.read import read_claim
    from planner.claims.spectrum import read_observed
    from planner.report.auditjson import audit_json
    from planner.report.files import check_writable, write_text
    from planner.studies.audit import audit as study

    read = read_claim(claim)
    observed = read_observed(spectrum) if spectrum is not None else None
    to_stdout = json_file == Path("-")
    if json_file is not None and not to_stdout:
        check_writable(json_file)
    with progress_bar() as progress:
        result = study(read, observed, lines_folder=lines_folder, progress=progress)
    if to_stdout:
        click.echo(audit_json(result), nl=False)
        return
    from rich.console import Console

    from planner.report.audit import audit_view

    console = Console(highlight=False)
    console.print(audit_view(result, console.width))
    if json_file is not None:
        write_text(json_file, audit_json(result))
        click.echo(f"wrote {json_file}", err=True)
