"""The command ``limbcast gases``: like the command line, it stands above the rooms it joins and imports them late."""

from __future__ import annotations

import click

__all__ = ["gases"]


@click.command()
@click.argument("name", required=False)
@click.option("--json", "json_path", type=click.Path(), metavar="FILE", help="Write the same, and more, as JSON.")
def gases(name: str | None, json_path: str | None) -> None:
    """What is known of the gases beside their spectra: the list, or one gas by formula or common name."""
    from rich.console import Console

    from planner import __version__
    from planner.catalogue.read import find_gas, read_catalogue, read_hypotheses
    from planner.report.gases import catalogue_view, gas_page
    from planner.report.gasjson import write_gases_json

    catalogue, hypotheses, console = read_catalogue(), read_hypotheses(), Console()
    chosen = [find_gas(name)] if name else list(catalogue.values())
    if json_path:
        write_gases_json(chosen, catalogue, hypotheses, __version__, json_path)
    width = console.width
    console.print(gas_page(chosen[0], catalogue, hypotheses, width) if name else catalogue_view(catalogue, width))
