"""The gas catalogue in the terminal: one line per gas, or one gas on a page; fit for 80 columns and more."""

from __future__ import annotations

import io
from collections.abc import Iterable, Mapping, Sequence
from itertools import groupby

from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.catalogue.conversions import surface_flux_per_cm2_s
from planner.catalogue.records import Abundance, Band, GasRecord, Hypotheses, Origin, Presence, Sourced
from planner.catalogue.sharing import rivals_among, shared_bands
from planner.report.words import gas_text, ratio_text
from planner.spectroscopy.molecules import find_molecule

__all__ = ["amount_text", "catalogue_view", "gas_page", "lifetime_text", "view_text"]

_CLASS_STYLES = {"biogenic": "green", "industrial": "magenta", "either": "yellow", "abiotic": "dim"}
_WIDE = 110
"""Columns from which the list has room for common names and more rivals."""
_BANDS_SHOWN = 3
_HOURS_PER_YEAR = 365.25 * 24
_LAST_WORDS = (
    "Probabilities and ranges under a hypothesis are judgement: change them and see what moves.",
    "A detected gas is not detected life or industry.",
)


def view_text(view: RenderableType, width: int = 100) -> str:
    """A view on a plain terminal of this width."""
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(view)
    return "\n".join(line.rstrip() for line in file.getvalue().splitlines()) + "\n"


def lifetime_text(span_yr: tuple[float, float] | None) -> str:
    """A lifetime in the units that suit it: ``1-2 h``, ``5 h to 5 d``, ``0.9 yr``, ``50 000 yr``, ``2-5 Myr``."""
    return "-" if span_yr is None else _span(*(_one_lifetime(end) for end in span_yr))


def amount_text(span: tuple[float, float]) -> str:
    """A mixing ratio or two: ``226 ppt``, ``30 ppb to 8 ppm``, ``none``."""
    return _span(*(ratio_text(end) if end else "none" for end in span))


def catalogue_view(catalogue: Mapping[str, GasRecord], width: int) -> Group:
    """The catalogue as something a rich console of this width prints, a line per gas, grouped by class."""
    wide = width >= _WIDE
    table = _table()
    table.add_column("\ngas", no_wrap=True)
    if wide:
        table.add_column("\nname", max_width=24)
    table.add_column("first\nread as", no_wrap=True, max_width=10)
    table.add_column("lifetime\non Earth", justify="right", no_wrap=True)
    table.add_column("Earth's air\ntoday", justify="right", max_width=20)
    table.add_column("strongest\nbands, um", max_width=24)
    table.add_column("shares\nbands with", ratio=1)
    for gas in sorted(catalogue.values(), key=lambda gas: (list(_CLASS_STYLES).index(gas.gas_class), gas.formula)):
        present = gas.abundance("present")
        rivals = [gas_text(other) for other in rivals_among(gas, catalogue)]
        shown = rivals[: 6 if wide else 3]
        more = f" and {len(rivals) - len(shown)} more" if len(rivals) > len(shown) else ""
        table.add_row(
            Text(gas_text(gas.formula), style="bold"),
            *([_plain_name(gas)] if wide else []),
            Text(gas.gas_class, style=_CLASS_STYLES[gas.gas_class]),
            lifetime_text(gas.lifetime_yr),
            amount_text(present.mixing_ratio) if present else "-",
            ", ".join(f"{_centre_um(band):.3g}" for band in _strongest(gas)),
            (", ".join(shown) or "none") + more,
        )
    return Group(
        table, Text("\n`limbcast gases NAME` shows one gas with the source of every statement.\n" + _LAST_WORDS[1])
    )


def gas_page(gas: GasRecord, catalogue: Mapping[str, GasRecord], hypotheses: Hypotheses, width: int) -> Group:
    """One gas as something a rich console of this width prints: every statement with its source and flag."""
    return Group(
        _heading(gas),
        *_section("On Earth made by", [(f"{o.who}: {o.says}{_flux_text(gas, o)}", o) for o in gas.origins]),
        *_section("Lost by", [(f"{i.says}{_after(lifetime_text(i.lifetime_yr))}", i) for i in gas.losses]),
        *_section("In Earth's air", [(_abundance_text(item), item) for item in gas.abundances]),
        *_greenhouse(gas),
        *_section("Could pass for", [(f"{item.mimics}: {item.says}", item) for item in gas.false_positives]),
        *_section("Take care", [(f"{item.about}: {item.says}", item) for item in gas.cautions]),
        *_section(
            "Companions",
            [(f"{gas_text(c.gas)} {c.seen}, favours {c.favours}: {c.says}", c) for c in gas.companions],
        ),
        *_bands(gas),
        *_sharing(gas, catalogue),
        *_presences(gas, hypotheses, width),
        Text("\n" + "\n".join(_LAST_WORDS)),
    )


def _table() -> Table:
    return Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")


def _one_lifetime(lifetime_yr: float) -> str:
    units = ((2 / 365.25, _HOURS_PER_YEAR, "h"), (0.5, 365.25, "d"), (9.9e4, 1.0, "yr"), (float("inf"), 1e-6, "Myr"))
    scale, unit = next((scale, unit) for limit, scale, unit in units if lifetime_yr < limit)
    return f"{_number(lifetime_yr * scale)} {unit}"


def _number(value: float) -> str:
    return f"{value:.3g}" if value < 999.5 else f"{value:,.0f}".replace(",", " ")


def _span(low: str, high: str) -> str:
    """Two values with units, as one when they are equal, with the unit once when it is the same."""
    if low == high:
        return low
    number, _, unit = low.rpartition(" ")
    return f"{number}-{high}" if number and high.endswith(f" {unit}") else f"{low} to {high}"


def _after(text: str) -> str:
    return "" if text == "-" else f"; lifetime {text}"


def _plain_name(gas: GasRecord) -> str:
    return next((name for name in gas.names if name != gas_text(gas.formula)), gas.formula)


def _centre_um(band: Band) -> float:
    """Middle of the band in wavenumber, as a wavelength."""
    return 2 / (1 / band.from_um + 1 / band.to_um)


def _strongest(gas: GasRecord) -> list[Band]:
    ranked = sorted(gas.bands, key=lambda band: -band.mean_cross_section_cm2)[:_BANDS_SHOWN]
    return sorted(ranked, key=lambda band: band.from_um)


def _heading(gas: GasRecord) -> Text:
    text = Text()
    text.append(gas_text(gas.formula), style="bold")
    others = [name for name in (gas.formula, *gas.names) if name != gas_text(gas.formula)]
    text.append(f"  {', '.join(others)}\n" if others else "\n")
    text.append("First read as ")
    text.append(gas.gas_class, style=_CLASS_STYLES[gas.gas_class])
    text.append(f". {gas.summary}")
    return text


def _section(title: str, items: Iterable[tuple[str, Sourced]]) -> list[RenderableType]:
    lines: list[RenderableType] = [_bullet(text, item) for text, item in items]
    return [Text(), Text(title, style="bold"), *lines] if lines else []


def _bullet(text: str, sourced: Sourced) -> RenderableType:
    grid = Table.grid(padding=(0, 1, 0, 0))
    line = Text(text + " ")
    line.append(f"[{_origin_text(sourced.flag, sourced.source)}]", style="dim")
    grid.add_row(Text("-"), line)
    return grid


def _origin_text(flag: str, source: str | None) -> str:
    return f"{flag}: {source}" if source else flag


def _flux_text(gas: GasRecord, origin: Origin) -> str:
    """The amount per year, also as molecules per cm2 and second on an Earth-sized planet."""
    if origin.amount_tg_per_yr is None:
        return ""
    molar_mass_g = find_molecule(gas.formula).molar_mass_g
    low, high = (surface_flux_per_cm2_s(amount, molar_mass_g) for amount in origin.amount_tg_per_yr)
    flux = f"{low:.2g}" if low == high else f"{low:.2g} to {high:.2g}"
    mass = _span(*(f"{_number(amount)} Tg" for amount in origin.amount_tg_per_yr))
    return f"; {mass} a year, {flux} molecules per cm2 and s"


def _abundance_text(item: Abundance) -> str:
    return f"{item.epoch}: {amount_text(item.mixing_ratio)}, {item.says}"


def _greenhouse(gas: GasRecord) -> list[RenderableType]:
    if gas.greenhouse is None:
        return []
    warming = gas.greenhouse.gwp_100
    text = f"{gas.greenhouse.radiative_efficiency_w_per_m2_ppb:.3g} W per m2 and ppb"
    return _section("Warms by", [(text + (f"; GWP-100 {warming:g}" if warming else ""), gas.greenhouse)])


def _bands(gas: GasRecord) -> list[RenderableType]:
    table = _table()
    table.add_column("um", no_wrap=True, justify="right")
    table.add_column("cm per\nmolecule", no_wrap=True, justify="right")
    table.add_column("band")
    table.add_column("from", ratio=1, style="dim")
    last = None
    for band in gas.bands:
        origin = _origin_text(band.flag, band.source)
        stretch = f"{band.from_um:.4g}-{band.to_um:.4g}"
        table.add_row(stretch, f"{band.intensity_cm:.1e}", band.name, "same" if origin == last else Text(origin))
        last = origin
    return [Text(), Text("Bands at 296 K", style="bold"), table]


def _sharing(gas: GasRecord, catalogue: Mapping[str, GasRecord]) -> list[RenderableType]:
    """One row per rival, the most alike first, with the stretches shared."""
    table = _table()
    table.add_column("gas", no_wrap=True)
    table.add_column("where, um", ratio=1)
    shared = shared_bands(gas, [catalogue[other] for other in rivals_among(gas, catalogue)])
    for other, stretches in groupby(shared, key=lambda item: item.gas):
        table.add_row(gas_text(other), ", ".join(f"{s.from_um:.4g}-{s.to_um:.4g}" for s in stretches))
    title = Text("Shares bands with, the most alike first", style="bold")
    return [Text(), title, table if shared else Text("none of the catalogue")]


def _presences(gas: GasRecord, hypotheses: Hypotheses, width: int) -> list[RenderableType]:
    table = _table()
    table.add_column("on a world\nwith", no_wrap=True)
    table.add_column("chance", no_wrap=True, justify="right")
    table.add_column("range", no_wrap=True)
    table.add_column("mixing ratio", max_width=None if width >= _WIDE else 14)
    table.add_column("because", ratio=1)
    for name in ("life", "industry"):
        for label, presence in _worlds(gas, name):
            low, high = presence.probability_range
            table.add_row(
                label,
                f"{presence.probability:.3g}",
                f"{low:.3g}-{high:.3g}",
                amount_text(presence.mixing_ratio_range),
                presence.says,
            )
    title = Text("Presence, all judgement", style="bold")
    return [Text(), title, Text(f"On {hypotheses.context}.", style="italic"), table]


def _worlds(gas: GasRecord, name: str) -> Sequence[tuple[str, Presence]]:
    hypothesis = gas.hypothesis(name)
    if not hypothesis.tells:
        return [(f"{name} or not", hypothesis.presence(True))]
    return [(name, hypothesis.presence(True)), (f"no {name}", hypothesis.presence(False))]
