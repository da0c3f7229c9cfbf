"""Published files read and imported as they are: HITRAN line records and collision files, measured cross-sections.

The cross-sections of the reference folder come in another layout; a helper here writes them as HITRAN .xsc, apart
from the program's own writer. What each file holds is stated in the PROVENANCE.md of that folder.
"""

from __future__ import annotations

import gzip
import re

import numpy as np
import pytest
from scipy.integrate import trapezoid

from planner.spectroscopy.files.cia import read_cia
from planner.spectroscopy.files.columns import evenly_spaced, parse_columns
from planner.spectroscopy.files.disk import read_whole
from planner.spectroscopy.files.importing import ColumnMeaning, import_files
from planner.spectroscopy.files.measured import MeasuredBands
from planner.spectroscopy.files.xsc import read_xsc
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store


def as_xsc(source, target):
    """Write a table of the reference folder as HITRAN .xsc: header of 100 columns, ten values of ten columns a row."""
    header, *rows = gzip.decompress(source.read_bytes()).decode("ascii", errors="replace").splitlines()
    low, high, count = float(header[10:20]), float(header[20:30]), int(header[30:40])
    kelvin, torr = float(header[40:50]), float(header[50:60])
    largest = float("".join(re.match(r" *(\d\.\d+) ?(E[+-]\d\d)", header[60:]).groups()))
    if abs(torr - 5.7436) < 1e-3:
        torr = 760.0  # PROVENANCE.md: measured at 1 atm, the number in the header is not in Torr
    values = [word for row in rows for word in re.findall(r"-?\d\.\d+E[+-]\d\d", row)][:count]
    name = source.name.split("_")[0]
    written = (
        name.rjust(20) + f"{low:10.4f}{high:10.4f}{count:7d}{kelvin:7.2f}{torr:6.1f}{largest:10.3E}"
        + "     " + " " * 15 + "    " + "air" + "  1"
    )  # fmt: skip
    columns = [value.rjust(10) for value in values]
    body = ["".join(columns[i : i + 10]) for i in range(0, count, 10)]
    target.write_text("\n".join([written, *body]) + "\n", encoding="ascii")


@pytest.fixture(scope="module")
def xsc_folder(reference_folder, tmp_path_factory):
    folder = tmp_path_factory.mktemp("cross sections")
    for source in sorted((reference_folder / "xsc").glob("*.aerxs.gz")):
        as_xsc(source, folder / (source.name.removesuffix(".aerxs.gz") + ".xsc"))
    return folder


@pytest.fixture
def store(tmp_path):
    return Store(tmp_path / "store")


# Integral in cm per molecule, PROVENANCE.md, section xsc.
INTEGRALS = {
    "CCl3F_CFC11_830-860_293K_0Torr": 6.1594e-17,
    "CCl2F2_CFC12_1080-1177_273K_0Torr": 6.7795e-17,
    "CF4_CFC14_1255-1290_203K_0Torr": 1.5232e-16,
    "CHClF2_HCFC22_765-855_287K_0Torr": 2.3608e-17,
    "SF6_560-6500_298K_760Torr": 2.1232e-16,
    "C5H8_isoprene_600-6500_298K_6Torr": 4.6469e-17,
    "HNO3_332-984_213K_250Torr": 4.1730e-17,
}


@pytest.mark.parametrize("name", INTEGRALS)
def test_integrals_of_cross_section_files(xsc_folder, name):
    """What is read integrates to what is stated of the file (five digits are stated)."""
    (table,) = read_xsc(xsc_folder / f"{name}.xsc")
    assert trapezoid(table.cross_section_cm2, table.wavenumber_per_cm) == pytest.approx(INTEGRALS[name], rel=1e-3)


def test_a_published_header_with_a_wrong_maximum_is_reported(xsc_folder):
    """The header of CFC-12 at 273 K gives a tenth of the largest value."""
    (table,) = read_xsc(xsc_folder / "CCl2F2_CFC12_1080-1177_273K_0Torr.xsc")
    assert "the header gives 1.605e-18 cm2 as the largest value, it is 1.605e-17" in table.remarks()


@pytest.mark.parametrize(
    ("name", "blocks", "negative"),
    # blocks counted and negative values found with a plain text search of the files
    [("CO2-CO2_2018", 20, 574), ("N2-H2_2011", 10, 0), ("N2-N2_2018", 4, 4)],
)
def test_collision_files(reference_folder, name, blocks, negative):
    """Every block and row of the published files is read, noise below zero included."""
    tables = read_cia(reference_folder / "cia" / f"{name}.cia.gz")
    assert len(tables) == blocks
    assert sum(int(np.sum(table.coefficient_cm5 < 0)) for table in tables) == negative
    for table in tables:
        assert table.coefficient_cm5.max() == pytest.approx(table.largest_stated_cm5, rel=1e-3)


@pytest.mark.slow
def test_cross_sections_replace_the_smooth_bands(xsc_folder, store, tmp_path):
    """Every file imports; each gas then has the measured values where it was measured and its embedded bands beside.

    The files of CF4 and of CFC-11 and CFC-12 hold six temperatures per band.
    """
    report = import_files([xsc_folder], tmp_path / "lines", store)
    assert len(report.files) == len(report.written) == len(list(xsc_folder.iterdir()))
    library = LineLibrary(store, tmp_path / "lines")
    freon = library.gas("CFC-11")
    assert freon.measured.intervals == ((830.001, 859.996), (1060.009, 1106.989))
    assert all("6 temperatures from 203 to 293 K" in sentence for sentence in freon.measured.sentences)
    (table,) = read_xsc(xsc_folder / "CCl3F_CFC11_830-860_233K_0Torr.xsc")
    inside = table.wavenumber_per_cm[1:-1]
    values = freon.smooth_cross_section(inside, 233.0, np.ones(1))
    np.testing.assert_allclose(values[0], table.cross_section_cm2[1:-1], rtol=1e-9)
    beside = np.linspace(900.0, 1000.0, 50)
    embedded = LineLibrary(store).gas("CFC-11").smooth_cross_section(beside, 233.0, np.ones(1))
    np.testing.assert_array_equal(freon.smooth_cross_section(beside, 233.0, np.ones(1)), embedded)


@pytest.mark.parametrize(
    ("name", "formula", "counted", "integral"),
    # counted with a plain text search of the files; integrals from PROVENANCE.md
    [
        ("SO2_NISTquantIR_575-3975_296K_1atm", "SO2", "40797 negative and 1 zero values of 56419", 3.4024e-17),
        ("CH3Br_NISTquantIR_575-3975_296K_1atm", "CH3Br", "1699 negative and 0 zero values of 14106", 1.1407e-17),
    ],
)
def test_noise_below_zero_in_two_columns(reference_folder, name, formula, counted, integral):
    """A measured spectrum with both signs of noise is taken in; its integral is kept, and no opacity is negative."""
    path = reference_folder / "xsc" / f"{name}.txt.gz"
    wavenumber, values = parse_columns(read_whole(path), str(path), x_unit="1/cm", y_unit="cm2")
    table, note = evenly_spaced(
        wavenumber, values, formula=formula, temperature_k=296.0, pressure_torr=760.0, where=f"{path}:1"
    )
    assert note == "evenly spaced as it stands"
    assert table.remarks()[0] == counted
    opacity = MeasuredBands([table]).cross_section_cm2(table.wavenumber_per_cm, 296.0, np.ones(1))[0]
    assert opacity.min() >= 0
    assert trapezoid(opacity, table.wavenumber_per_cm) == pytest.approx(integral, rel=2e-3)


def test_two_columns_import(reference_folder, store, tmp_path):
    """A table of two columns becomes a .xsc file that stands for its gas."""
    source = reference_folder / "xsc" / "CH3Br_NISTquantIR_575-3975_296K_1atm.txt.gz"
    meaning = ColumnMeaning(formula="CH3Br", x_unit="1/cm", y_unit="cm2", temperature_k=296.0, pressure_bar=1.01325)
    report = import_files([source], tmp_path / "lines", store, columns=meaning)
    (written,) = report.written
    assert written.name == "CH3Br_NISTquantIR_575-3975_296K_1atm.xsc"
    (table,) = read_xsc(written)
    assert trapezoid(table.cross_section_cm2, table.wavenumber_per_cm) == pytest.approx(1.1407e-17, rel=1e-3)
    assert LineLibrary(store, tmp_path / "lines").gas("CH3Br").measured.intervals == ((574.928, 3975.077),)


# gas, isotopologue, stretch that a file of the reference folder holds completely, file (PROVENANCE.md, section lines)
COMPLETE = [
    ("CO", 1, (2000.0, 2250.0), "CO_full400-10000_hitran2012.par.gz"),
    ("CO2", 1, (2100.0, 2293.0), "CO2_2100-2300_hitran2012.par.gz"),
    ("CO2", 1, (2294.0, 2304.0), "CO2_2293.6-2304.1_hitran2020.par.gz"),
    ("H2O", 1, (401.0, 3999.0), "H2O_iso1_400-4000_hitran2016.par.gz"),
    ("CH4", 1, (2833.0, 3246.0), "CH4_2833-3246_hitran2020.par.gz"),
]


@pytest.mark.slow
def test_line_files_import_as_they_are(reference_folder, store, tmp_path):
    """All line files at once: complete stretches are used, the newer edition first; selected bands are not."""
    report = import_files([reference_folder / "lines"], tmp_path / "lines", store)
    assert len(report.files) == len(list((reference_folder / "lines").glob("*.par.gz"))) == 43
    for gas, isotopologue, stretch, file in COMPLETE:
        (sentence,) = [
            s for s in report.used if s.startswith(f"{gas}: isotopologue {isotopologue} over") and f"from {file} " in s
        ]
        ranges = [tuple(map(float, r.split("-"))) for r in re.findall(r"[\d.]+-[\d.]+(?=,| per cm)", sentence)]
        assert any(low <= stretch[0] and high >= stretch[1] for low, high in ranges), sentence
    partial = "CO2_626_laserbands_selected_hitran2020.par.gz: CO2 isotopologue 1: 2198.17-2376.48 per cm: partial, not"
    assert any(sentence.startswith(partial) for sentence in report.unused)
    assert not any("laserbands" in s and "2300" in s for s in report.used)


@pytest.mark.slow
def test_nothing_is_counted_twice(reference_folder, store, tmp_path):
    """Where files stand, the lines of a gas are those of the files, no more and no fewer."""
    folder = tmp_path / "lines"
    names = ["CO2_2100-2300_hitran2012.par.gz", "CO2_2293.6-2304.1_hitran2020.par.gz"]
    import_files([reference_folder / "lines" / name for name in names], folder, store)
    lines = LineLibrary(store, folder).gas("CO2").lines
    here = (lines.isotopologue == 1) & (lines.wavenumber_per_cm > 2100) & (lines.wavenumber_per_cm < 2304.1)
    # 16769 lines of 2100.03-2299.99, of which those above 2293.58 give way to the 1279 of the newer file
    older = LineLibrary(store, folder)._files.line_files[0].lines
    expected = int(np.sum(older.wavenumber_per_cm < 2293.48)) + 1279 - 3  # three lines lie beyond 2304.1
    assert int(here.sum()) == pytest.approx(expected, abs=1)
