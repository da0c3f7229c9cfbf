"""Cross-section and collision files over the embedded data: one source each, joined at the ends, and said."""

from __future__ import annotations

import re

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.collisions import collision_coefficient
from planner.spectroscopy.files.cia import CollisionTable
from planner.spectroscopy.files.folder import DataFiles, LineFile
from planner.spectroscopy.files.xsc import CrossSectionTable
from planner.spectroscopy.grid import LogGrid
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import read_constants, smooth_cross_section
from planner.spectroscopy.opacity import Opacities, pressure_rows
from planner.spectroscopy.sources import LineLibrary, NoDataError
from planner.spectroscopy.store import Store

GRID = LogGrid.covering(10.0, 13.0)  # 769 to 1000 per cm
NU = GRID.wavenumber_per_cm


def table(formula, value, low=820.0, high=870.0, temperature=250.0, pressure=0.0, where="measured.xsc:1"):
    return CrossSectionTable(
        formula=formula, from_per_cm=low, to_per_cm=high, temperature_k=temperature, pressure_torr=pressure,
        cross_section_cm2=np.full(51, value), largest_stated_cm2=value, where=where,
    )  # fmt: skip


def line_file(formula_number, tmp_path, low=800.0, high=850.0):
    nu = np.arange(low, high, 0.5)
    lines = Lines.make(
        molecule=formula_number, isotopologue=1, wavenumber_per_cm=nu, intensity_cm=1e-20, lower_energy_per_cm=100.0,
        air_width_per_cm_atm=0.07, temperature_exponent=0.7,
    )  # fmt: skip
    return LineFile(path=tmp_path / "real.par", lines=lines, widths=None, digest="0" * 24)


@pytest.fixture
def library(tmp_path):
    def make(**files):
        return LineLibrary(Store(tmp_path / "store"), files=DataFiles(**files))

    return make


def opacities(library, tmp_path, air=None):
    return Opacities(library, Store(tmp_path / "store"), GRID, air=air or {"N2": 1.0})


def test_measured_bands_replace_embedded_ones_in_their_range(library, tmp_path):
    """Inside the table its values, outside the embedded bands, nothing added up; the sentence names both."""
    source = library(tables=(table("CCl3F", 5e-18),)).gas("CFC-11")
    inside = (NU >= 820) & (NU <= 870)
    values = source.smooth_cross_section(NU, 250.0, pressure_rows())
    assert values.shape == (1, NU.size)
    np.testing.assert_allclose(values[0, inside], 5e-18)
    embedded = smooth_cross_section(read_constants("CCl3F"), NU, 250.0)
    np.testing.assert_array_equal(values[0, ~inside], embedded[~inside])
    assert any("embedded" in s and "where no file is named" in s for s in source.provenance)
    assert any(
        re.search(r"measured\.xsc \([0-9a-f]{8}\), in place of all embedded data there, joined without", s)
        for s in source.provenance
    )


def test_the_digest_knows_the_tables(library):
    """What is kept by the hash of a gas's data is made anew when a measured table changes."""
    digests = {
        library(tables=tables).gas("CFC-11").digest for tables in ((), *((table("CCl3F", v),) for v in (1e-18, 2e-18)))
    }
    assert len(digests) == 3


def test_opacity_takes_measured_bands(library, tmp_path):
    """The forward model's opacity is the measured cross-section."""
    gas = opacities(library(tables=(table("CCl3F", 5e-18),)), tmp_path).gas("CCl3F", 250.0)
    assert gas.log10_cross_section is None
    inside = (NU >= 820) & (NU <= 870)
    np.testing.assert_allclose(gas.flat_cross_section_cm2[inside], 5e-18, rtol=1e-6)


def test_opacity_follows_measured_pressures(library, tmp_path):
    """Tables of several pressures become rows of the opacity, held outside their pressures."""
    tables = (table("CCl3F", 1e-18), table("CCl3F", 3e-18, pressure=750.0, where="other.xsc:1"))
    gas = opacities(library(tables=tables), tmp_path).gas("CCl3F", 250.0)
    column = 10.0 ** gas.log10_cross_section[:, NU.searchsorted(850.0)].astype(float)
    assert column[0] == pytest.approx(1e-18, rel=1e-3)
    assert column[-1] == pytest.approx(3e-18, rel=1e-3)
    at_half = np.interp(0.5, pressure_rows(), column)
    assert at_half == pytest.approx(2e-18, rel=0.03)  # half a bar is 375 Torr


def test_a_gas_known_from_cross_sections_alone(library, tmp_path):
    """A gas without embedded data is covered where it was measured."""
    made = library(tables=(table("GeH4", 1e-18),))
    source = made.gas("germane")
    assert source.covers_per_cm == ((820.0, 870.0),)
    assert source.constants is None
    assert source.lines is None
    covered = opacities(made, tmp_path).covered("GeH4")
    np.testing.assert_array_equal(covered, (NU >= 820) & (NU <= 870))


def test_lines_do_not_count_where_cross_sections_stand(library, tmp_path):
    """Embedded lines give way to a measured table, and keep their wings beside it."""
    made = library(tables=(table("CF4", 1e-25, low=830.0, high=900.0),), line_files=())
    assert made.gas("CF4").measured_at(np.array([829.0, 830.0, 900.0, 901.0])).tolist() == [False, True, True, False]


def test_real_lines_go_before_cross_sections(library, tmp_path):
    """Line records follow temperature and pressure; where they stand the table does not, and that is said."""
    from planner.spectroscopy.coverage import Declaration

    file = line_file(43, tmp_path)
    declared = {"real.par": [Declaration(formula="C4H2", interval_per_cm=(800.0, 850.0))]}
    source = library(tables=(table("C4H2", 1e-20),), line_files=(file,), declared=declared).gas("C4H2")
    assert source.measured.intervals == ((850.0, 870.0),)
    assert "C4H2: measured cross-sections over 820-850 per cm not used: line records stand there" in source.partial[0]
    assert source.covers_per_cm == ((800.0, 870.0),)


def test_a_conflict_is_not_taken_for_a_gas_without_data(library, tmp_path):
    """Two tables of one state stop the work; they do not make the gas transparent."""
    tables = (table("GeH4", 1e-18), table("GeH4", 2e-18, where="other.xsc:1"))
    with pytest.raises(LineDataError, match="measured twice"):
        opacities(library(tables=tables), tmp_path).gas("GeH4", 250.0)
    with pytest.raises(NoDataError):
        library().gas("GeH4")


def block(pair, value, temperature=250.0):
    wavenumber = np.linspace(820.0, 870.0, 51)
    return CollisionTable(
        pair=pair, temperature_k=temperature, wavenumber_per_cm=wavenumber, coefficient_cm5=np.full(51, value),
        largest_stated_cm5=value, where="pair_2018.cia:1",
    )  # fmt: skip


def test_collision_files_replace_embedded_coefficients(library, tmp_path):
    """Inside the file's wavenumbers and temperatures its values, elsewhere the embedded ones."""
    made = library(blocks=(block(("H2", "N2"), 3e-44),))
    inside = (NU >= 820) & (NU <= 870)
    embedded = collision_coefficient(("H2", "N2"), NU, 250.0)
    values = made.collision_coefficient(("N2", "H2"), NU, 250.0)
    np.testing.assert_allclose(values[inside], 3e-44)
    np.testing.assert_array_equal(values[~inside], embedded[~inside])
    np.testing.assert_array_equal(
        made.collision_coefficient(("N2", "H2"), NU, 500.0), collision_coefficient(("H2", "N2"), NU, 500.0)
    )
    assert made.pair_provenance(["N2", "CO2"]) == ()
    other = library(blocks=(block(("H2", "N2"), 4e-44),))
    assert made.pair_provenance(["N2", "H2"]) != other.pair_provenance(["N2", "H2"])
    assert "H2-N2 pairs" in made.pair_provenance(["N2", "H2"])[0]


def test_a_new_pair_from_a_file(library, tmp_path):
    """A pair that is not embedded absorbs where the file says so."""
    made = library(blocks=(block(("Ar", "CO2"), 3e-44),))
    assert ("Ar", "CO2") in made.collision_pairs()
    (found,) = [p for p in opacities(made, tmp_path).pairs(["CO2", "Ar"], 250.0) if p.first == "Ar"]
    assert found.coefficient_cm5[NU.searchsorted(850.0)] == pytest.approx(3e-44)
    assert found.coefficient_cm5[0] == 0.0
