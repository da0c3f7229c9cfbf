"""Tables on disk: units, metadata, masks."""

from __future__ import annotations

import astropy.units as u
import numpy as np
import pytest
from astropy.table import Table

from planner.errors import OutputError
from planner.report.ecsv import plan_table, sigma_table, spectra_table, write_table


def test_plan_table_round_trip(fake_plan, tmp_path):
    """Units, masks and metadata survive the file."""
    write_table(plan_table(fake_plan), tmp_path / "plan.ecsv")
    table = Table.read(tmp_path / "plan.ecsv")
    assert list(table["gas"]) == [row.gas for row in fake_plan.rows]
    assert table["hours_required"].unit == u.h
    assert table["hours_required"][0] == fake_plan.rows[0].marginalised.hours_required
    assert list(table["transits_required"].mask) == [
        row.marginalised.transits_required is None for row in fake_plan.rows
    ]
    assert table["snr_limit_all_known"][0] == np.inf
    assert table.meta["invented"] is True
    assert table.meta["nuisances"]["temperature"] == "15 %"
    assert table.meta["line_data"] == list(fake_plan.line_data)
    assert table.meta["limbcast"] == "0.1.0"


def test_spectra_table_round_trip(fake_plan, tmp_path):
    """Spectra stand one below the other; gases that a spectrum lacks are masked there."""
    write_table(spectra_table(fake_plan.spectra, {"title": "x"}), tmp_path / "spectra.ecsv")
    table = Table.read(tmp_path / "spectra.ecsv")
    first = fake_plan.spectra[0]
    mine = table[(table["gas"] == first.gas) & (table["mode"] == first.mode)]
    assert len(table) == sum(spectrum.from_um.size for spectrum in fake_plan.spectra)
    assert np.array_equal(mine["depth_ppm"], first.depth_ppm)
    assert np.array_equal(mine["share_CH4_ppm"], first.shares_ppm["CH4"])
    assert np.array_equal(mine["usable"], first.usable)
    assert mine["share_O3_ppm"].mask.all()
    assert np.array_equal(mine["share_CO2_ppm"], first.shares_ppm["CO2"])
    assert table["from_um"].unit == u.um
    assert (1 * table["noise_one_transit_ppm"].unit).to_value(u.one) == pytest.approx(1e-6)
    assert table.meta["title"] == "x"


def test_sigma_table(tmp_path):
    """The wavenumber is the first column and the cross-section the last, with their units."""
    write_table(sigma_table(np.array([1.0, 2.0]), np.array([1e-20, 3e-300]), {"gas": "CO2"}), tmp_path / "s.ecsv")
    table = Table.read(tmp_path / "s.ecsv")
    assert (table.colnames[0], table.colnames[-1]) == ("wavenumber_per_cm", "cross_section_cm2")
    assert table["wavenumber_per_cm"].unit == u.cm**-1
    assert table["cross_section_cm2"].unit == u.cm**2
    assert list(table["cross_section_cm2"]) == [1e-20, 3e-300]


def test_csv(fake_plan, tmp_path):
    """CSV carries the numbers under names that hold their units."""
    write_table(plan_table(fake_plan), tmp_path / "plan.csv")
    table = Table.read(tmp_path / "plan.csv", format="ascii.csv")
    assert table["hours_required"][0] == fake_plan.rows[0].marginalised.hours_required
    assert "charged" not in (tmp_path / "plan.csv").read_text().splitlines()[0]


def test_other_endings_are_refused(fake_plan, tmp_path):
    """Only formats that are written are named."""
    with pytest.raises(OutputError, match=r"ends in .ecsv or .csv, got \".xlsx\""):
        write_table(plan_table(fake_plan), tmp_path / "plan.xlsx")
