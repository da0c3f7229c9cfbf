"""The catalogue in the terminal: its words for numbers, and that nothing is cut or left out."""

from __future__ import annotations

import re

import pytest

from planner.catalogue.read import find_gas, read_catalogue, read_hypotheses
from planner.report.gases import amount_text, catalogue_view, gas_page, lifetime_text, view_text
from planner.report.words import gas_text

CATALOGUE, HYPOTHESES = read_catalogue(), read_hypotheses()
HOUR, DAY = 1 / 8766, 1 / 365.25


def page(name: str, width: int) -> str:
    return view_text(gas_page(find_gas(name), CATALOGUE, HYPOTHESES, width), width)


def words(text: str) -> str:
    return " ".join(text.split())


@pytest.mark.parametrize(
    ("span", "text"),
    [
        (None, "-"),
        ((52, 52), "52 yr"),
        ((0.9, 0.9), "0.9 yr"),
        ((HOUR, 2 * HOUR), "1-2 h"),
        ((5 * HOUR, 5 * DAY), "5 h to 5 d"),
        ((5 * DAY, 12 * DAY), "5-12 d"),
        ((0.4, 1.5), "146 d to 1.5 yr"),
        ((3200, 3200), "3 200 yr"),
        ((50000, 50000), "50 000 yr"),
        ((2e6, 5e6), "2-5 Myr"),
        ((1e5, 1e6), "0.1-1 Myr"),
    ],
)
def test_lifetime_text(span, text) -> None:
    """Each end in the unit that suits it; the unit once where it is the same."""
    assert lifetime_text(span) == text


@pytest.mark.parametrize(
    ("span", "text"),
    [
        ((226e-12, 226e-12), "226 ppt"),
        ((1e-10, 5e-10), "100-500 ppt"),
        ((30e-9, 8e-6), "30 ppb to 8 ppm"),
        ((0, 0), "none"),
    ],
)
def test_amount_text(span, text) -> None:
    """One value, a pair in one unit, a pair in two, nothing."""
    assert amount_text(span) == text


@pytest.mark.parametrize("width", [80, 100, 120])
def test_list_shows_every_gas_uncut(width) -> None:
    """One row per gas, no line beyond the terminal, no cell cut short."""
    text = view_text(catalogue_view(CATALOGUE, width), width)
    assert max(map(len, text.splitlines())) <= width
    assert "…" not in text
    starts = [line.split()[0] for line in text.splitlines() if line and not line.startswith(" ")]
    assert {gas_text(formula) for formula in CATALOGUE} <= set(starts)
    row = next(line for line in text.splitlines() if line.startswith("CFC-11 "))
    for word in ("industrial", "52 yr", "226 ppt", "9.22"):
        assert word in row


@pytest.mark.parametrize("width", [80, 120])
@pytest.mark.parametrize("formula", list(CATALOGUE))
def test_page_says_all_that_the_record_holds(formula, width) -> None:
    """Each statement with its flag and source, at any width, nothing cut."""
    gas = CATALOGUE[formula]
    text = page(formula, width)
    assert max(map(len, text.splitlines())) <= width
    assert "…" not in text
    flat = words(text)
    lists = (gas.origins, gas.false_positives, gas.losses, gas.abundances, gas.cautions, gas.companions)
    for item in (item for items in lists for item in items):
        origin = f"{item.flag}: {item.source}" if item.source else item.flag
        assert item.says in flat
        assert f"[{origin}]" in flat
    for band in gas.bands:
        assert f"{band.from_um:.4g}-{band.to_um:.4g}" in flat


def test_page_shows_presence_as_judgement() -> None:
    """Both worlds of a hypothesis that the gas can tell, one row where it cannot, and the warning."""
    text = page("CFC-12", 120)
    assert "Presence, all judgement" in text
    assert re.search(r"^industry +0\.3 +0\.05-0\.7 +50 ppt to 50 ppb", text, re.M)
    assert re.search(r"^no industry +0\.0001 +1e-06-0\.01", text, re.M)
    assert re.search(r"^life or not +0\.001", text, re.M)
    assert "A detected gas is not detected life or industry." in text


def test_page_gives_flux_of_amounts() -> None:
    """500 Tg of isoprene a year are 2.7e10 molecules per cm2 and second (500e12 / 68.12 mol over Earth's area)."""
    assert "500 Tg a year, 2.7e+10 molecules per cm2 and s" in words(page("isoprene", 120))


def test_gas_that_shares_no_bands() -> None:
    """Said, not left blank."""
    assert "none of the catalogue" in page("O2", 80)
