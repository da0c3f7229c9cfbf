"""Measured cross-sections between their temperatures and pressures, and over one another."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.measured import MeasuredBands
from planner.spectroscopy.files.xsc import BAR_PER_TORR, CrossSectionTable

NO_PRESSURE = np.zeros(1)


def table(value, temperature=300.0, pressure=0.0, low=800.0, high=900.0, points=101, where="a.xsc:1"):
    values = np.broadcast_to(np.asarray(value, dtype=float), (points,)).copy()
    return CrossSectionTable(
        formula="CCl3F", from_per_cm=low, to_per_cm=high, temperature_k=temperature, pressure_torr=pressure,
        cross_section_cm2=values, largest_stated_cm2=float(values.max()), where=where,
    )  # fmt: skip


def at(bands, wavenumber, temperature, pressure_torr=0.0):
    return bands.cross_section_cm2(np.atleast_1d(wavenumber), temperature, np.array([pressure_torr * BAR_PER_TORR]))[0]


def test_wavenumbers_are_interpolated_and_nothing_is_outside():
    """A linear table comes back exactly; beyond its ends there is nothing."""
    bands = MeasuredBands([table(np.linspace(1e-18, 2e-18, 101))])
    np.testing.assert_allclose(
        at(bands, [799.9, 800.0, 833.33, 900.0, 900.1], 300.0), [0, 1e-18, 1.3333e-18, 2e-18, 0], rtol=1e-12
    )
    assert bands.intervals == ((800.0, 900.0),)


@pytest.mark.parametrize(
    ("temperature", "expected"),
    [(200.0, 3.0), (250.0, 2.0), (225.0, 2.5), (275.0, 1.5), (300.0, 1.0), (150, 3), (500, 1)],
)
def test_temperatures(temperature, expected):
    """Linear between tables, held outside; the order of the tables does not matter."""
    tables = [table(1.0, 300.0), table(3.0, 200.0, where="b.xsc:1"), table(2.0, 250.0, where="c.xsc:1")]
    for order in (tables, tables[::-1]):
        assert at(MeasuredBands(order), 850.0, temperature)[0] == pytest.approx(expected)


def test_pressures():
    """Linear in pressure between tables of one temperature, held outside; then linear in temperature."""
    tables = [
        table(1.0, 300.0, 0.0), table(2.0, 300.5, 100.0, where="b.xsc:1"), table(5.0, 200.0, 50.0, where="c.xsc:1"),
    ]  # fmt: skip
    bands = MeasuredBands(tables)
    assert bands.depends_on_pressure
    assert at(bands, 850.0, 300.5, 0.0)[0] == pytest.approx(1.0)
    assert at(bands, 850.0, 400.0, 25.0)[0] == pytest.approx(1.25)
    assert at(bands, 850.0, 400.0, 760.0)[0] == pytest.approx(2.0)
    assert at(bands, 850.0, 250.25, 100.0)[0] == pytest.approx(3.5)
    rows = bands.cross_section_cm2(np.array([850.0]), 300.5, np.array([0.0, 1.0, 1000.0]))
    assert rows.shape == (3, 1)


def test_one_pressure_gives_one_row():
    """Where the pressure does not matter no table over pressures is made."""
    bands = MeasuredBands([table(1.0, 300.0, 760.0)])
    assert not bands.depends_on_pressure
    assert bands.cross_section_cm2(np.array([850.0]), 300.0, np.logspace(-6, 1, 22)).shape == (1, 1)
    assert "760 Torr, held at all pressures" in bands.sentences[0]


def test_sets_with_more_temperatures_stand_first():
    """A broad table is used where the better measured one ends, and each wavenumber has one source."""
    broad = table(9.0, 298.0, 760.0, low=500.0, high=1500.0, where="broad.xsc:1")
    bands = MeasuredBands([broad, table(1.0, 300.0), table(2.0, 200.0, where="b.xsc:1")])
    np.testing.assert_allclose(at(bands, [700.0, 850.0, 1000.0], 300.0), [9.0, 1.0, 9.0])
    assert bands.intervals == ((500.0, 1500.0),)
    assert "over 500-800, 900-1500 per cm from broad.xsc (" in bands.sentences[1]


def test_tables_of_slightly_different_reach():
    """At the ragged end of a set only the tables that reach it are used."""
    bands = MeasuredBands([table(1.0, 300.0, high=905.0), table(3.0, 200.0, where="b.xsc:1")])
    np.testing.assert_allclose(at(bands, [850.0, 903.0], 200.0), [3.0, 1.0])


def test_what_is_taken_is_left_out():
    """Where line records stand the table is not used."""
    bands = MeasuredBands([table(1.0)], taken=[(820.0, 840.0)])
    assert bands.intervals == ((800.0, 820.0), (840.0, 900.0))
    np.testing.assert_allclose(at(bands, [810.0, 830.0, 850.0], 300.0), [1.0, 0.0, 1.0])


def test_one_state_twice_names_both_files():
    """Two tables of one temperature and pressure over one stretch are refused."""
    with pytest.raises(LineDataError, match=r"a\.xsc:1 and b\.xsc:1: CCl3F was measured twice at 300 K and 0 Torr"):
        MeasuredBands([table(1.0), table(2.0, 300.4, where="b.xsc:1")])


def test_negative_values_enter_as_zero_or_more():
    """An opacity is not negative, and the noise adds nothing to the integral; the sentence says so."""
    noise = np.random.default_rng(3).normal(0.0, 1e-20, 4096)
    noise[2000:2100] += 1e-18
    bands = MeasuredBands([table(noise, points=4096)])
    values = at(bands, np.linspace(800.0, 900.0, 4096), 300.0)
    assert values.min() >= 0
    assert values.sum() == pytest.approx(noise.sum(), rel=1e-9)
    assert "negative values are averaged with their neighbours" in bands.sentences[0]


def test_the_digest_tells_tables_apart():
    """Another value is another source."""
    assert MeasuredBands([table(1.0)]).digest != MeasuredBands([table(1.1)]).digest
