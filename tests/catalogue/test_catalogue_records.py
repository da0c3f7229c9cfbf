"""What the records say, taken together: flags, sources, and Earth as a test of the ranges."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from planner.catalogue.read import find_gas, read_catalogue
from planner.catalogue.records import GasRecord, Sourced
from planner.spectroscopy.lists.build import read_constants, smooth_cross_section

CATALOGUE = read_catalogue()
each_gas = pytest.mark.parametrize("gas", CATALOGUE.values(), ids=list(CATALOGUE))


def statements(gas: GasRecord) -> list[Sourced]:
    lists = (gas.origins, gas.false_positives, gas.losses, gas.abundances, gas.cautions, gas.companions)
    found: list[Sourced] = [item for items in lists for item in items]
    return [*found, *gas.band_groups, *([gas.greenhouse] if gas.greenhouse else [])]


def overlap(a: tuple[float, float], b: tuple[float, float]) -> bool:
    return a[0] <= b[1] and b[0] <= a[1]


@each_gas
def test_record_is_whole(gas: GasRecord) -> None:
    """Every gas has origins, losses with a lifetime, today's abundance, bands and a caution or false positive."""
    assert gas.lifetime_yr is not None
    assert gas.abundance("present") is not None
    assert len(gas.bands) >= 2
    assert gas.cautions or gas.false_positives
    assert gas.companions


@each_gas
def test_earth_today_is_a_world_with_industry(gas: GasRecord) -> None:
    """Today's abundance lies in, or overlaps, the range under industry; that of 1750 the ranges of a living world."""
    today, before = gas.abundance("present"), gas.abundance("pre-industrial")
    assert today is not None
    assert overlap(today.mixing_ratio, gas.industry.presence(True).mixing_ratio_range)
    if before is not None and before.mixing_ratio[1] > 0:
        assert overlap(before.mixing_ratio, gas.life.presence(True).mixing_ratio_range)
        assert overlap(before.mixing_ratio, gas.industry.presence(False).mixing_ratio_range)


@each_gas
def test_class_agrees_with_what_it_tells(gas: GasRecord) -> None:
    """Gases read as life tell of life and are likelier with it; gases of industry likewise, and of nothing else."""
    life, industry = gas.life, gas.industry
    if gas.gas_class == "biogenic":
        assert life.tells
        assert life.presence(True).probability > life.presence(False).probability
    if gas.gas_class == "industrial":
        assert not life.tells
        assert industry.tells
        assert industry.presence(True).probability > industry.presence(False).probability


@each_gas
def test_either_way_is_the_same_under_both(gas: GasRecord) -> None:
    """A hypothesis that a gas cannot tell has one presence, so its worth is exactly nothing."""
    for name in ("life", "industry"):
        hypothesis = gas.hypothesis(name)
        same = hypothesis.presence(True) == hypothesis.presence(False)
        assert same is not hypothesis.tells


def test_sources_and_memory_are_kept_apart() -> None:
    """Enough was read to stand on, and what was recalled says so in its flag, not in its source."""
    flags = Counter(item.flag for gas in CATALOGUE.values() for item in statements(gas))
    assert flags["read"] > 50
    assert flags["from memory"] > 100
    for gas in CATALOGUE.values():
        for item in statements(gas):
            if item.source and item.flag == "from memory":
                assert "memory" not in item.source


def test_amounts_and_lifetimes_have_their_units() -> None:
    """Strings with units become floats in the unit of the name; one value stands for both ends."""
    gas = find_gas("isoprene")
    assert gas.origins[0].amount_tg_per_yr == (500, 500)
    assert gas.lifetime_yr == pytest.approx((1 / 8766, 2 / 8766))
    assert find_gas("CF4").lifetime_yr == (50000, 50000)
    assert find_gas("SF6").greenhouse.radiative_efficiency_w_per_m2_ppb == 0.567
    assert find_gas("CFC-11").abundance("pre-industrial").mixing_ratio == (0, 0)
    assert find_gas("CFC-11").abundance("present").mixing_ratio == (226e-12, 226e-12)


def test_bands_are_sorted_and_carry_their_source() -> None:
    """All groups in one list by wavelength."""
    gas = find_gas("CH4")
    starts = [band.from_um for band in gas.bands]
    assert starts == sorted(starts)
    assert {band.flag for band in gas.bands} == {"computed", "from memory"}
    nu4 = next(band for band in gas.bands if band.name.startswith("nu4"))
    assert nu4.mean_cross_section_cm2 == pytest.approx(5.2e-18 / (1e4 / 7.0 - 1e4 / 8.5))


SMOOTH = [f for f, g in CATALOGUE.items() if g.gas_class == "industrial"] + ["C2H6S", "CH3SH", "C5H8", "CH3CN"]


@pytest.mark.parametrize("formula", SMOOTH)
def test_bands_describe_the_embedded_spectrum(formula: str) -> None:
    """The rows hold 95 % of what the embedded contours absorb from 2 to 20 um; each within 15 % of its integral.

    15 % leaves room for rounding the edges; a band left out or typed wrongly is off by far more.
    """
    wavenumber = np.arange(300.0, 5000.0, 0.25)
    sigma = smooth_cross_section(read_constants(formula), wavenumber, 296.0)
    assert sigma is not None

    def integral(from_um: float, to_um: float) -> float:
        return float(sigma[(wavenumber >= 1e4 / to_um) & (wavenumber < 1e4 / from_um)].sum() * 0.25)

    inside = 0.0
    for band in CATALOGUE[formula].bands:
        expected = integral(band.from_um, band.to_um)
        assert band.intensity_cm == pytest.approx(expected, rel=0.15), band.name
        inside += expected
    assert inside >= 0.95 * integral(2.0, 20.0)
