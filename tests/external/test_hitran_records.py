"""Line records against HITRAN's own library and HITRAN's own files."""

from __future__ import annotations

import contextlib
import gzip
import io
import json
import re

import numpy as np
import pytest

from planner.spectroscopy.hitran import format_par, parse_par, read_par, write_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import embedded_formulas, part_lines, read_constants
from planner.spectroscopy.molecules import quiet_hapi

# our field, hapi's name of it
COLUMNS = {
    "molecule": "molec_id",
    "isotopologue": "local_iso_id",
    "wavenumber_per_cm": "nu",
    "intensity_cm": "sw",
    "einstein_a_per_s": "a",
    "air_width_per_cm_atm": "gamma_air",
    "self_width_per_cm_atm": "gamma_self",
    "lower_energy_per_cm": "elower",
    "temperature_exponent": "n_air",
    "air_shift_per_cm_atm": "delta_air",
    "upper_weight": "gp",
    "lower_weight": "gpp",
}


def hapi_table(folder):
    """The records in ``table.data`` of a folder as hapi reads them."""
    hapi = quiet_hapi()
    (folder / "table.header").write_text(json.dumps(hapi.HITRAN_DEFAULT_HEADER | {"table_name": "table"}))
    with contextlib.redirect_stdout(io.StringIO()):
        hapi.db_begin(str(folder))
    return hapi.LOCAL_TABLE_CACHE["table"]["data"]


def test_hapi_reads_what_we_write(tmp_path):
    """hapi reads our records, all twelve isotopologue codes included, to the numbers that we read ourselves."""
    rng = np.random.default_rng(1)
    n = 240
    lines = Lines.make(
        molecule=2,
        isotopologue=np.arange(n) % 12 + 1,
        wavenumber_per_cm=np.sort(rng.uniform(1.0, 20000.0, n)),
        intensity_cm=10.0 ** rng.uniform(-120, -17, n),
        einstein_a_per_s=10.0 ** rng.uniform(-12, 3, n),
        air_width_per_cm_atm=rng.uniform(0.0, 0.2, n),
        self_width_per_cm_atm=rng.uniform(0.0, 1.2, n),
        lower_energy_per_cm=np.where(np.arange(n) % 7, rng.uniform(0.0, 20000.0, n), -1.0),
        temperature_exponent=rng.uniform(-0.9, 1.5, n),
        air_shift_per_cm_atm=rng.uniform(-0.1, 0.1, n),
        upper_weight=2.0 * np.arange(n) + 1,
        lower_weight=2.0 * np.arange(n) + 3,
        lower_local="     R 12e",
    )
    write_par(tmp_path / "table.data", lines)
    theirs, ours = hapi_table(tmp_path), parse_par(format_par(lines), "here")
    for name, column in COLUMNS.items():
        np.testing.assert_array_equal(getattr(ours, name), np.asarray(theirs[column]), err_msg=name)
    assert [text.rstrip() for text in theirs["local_lower_quanta"]] == ours.lower_local.tolist()


LISTS = [formula for formula in embedded_formulas() if read_constants(formula).line_parts]
SHORT = {"CO", "HBr", "HCN", "HCl", "HF", "NO", "O2"}


@pytest.mark.parametrize(
    "formula", [pytest.param(name, marks=() if name in SHORT else pytest.mark.slow) for name in LISTS]
)
def test_hapi_reads_every_embedded_list(tmp_path, formula):
    """Each line of each list, written by us, comes back from hapi's reader, as numbers and labels, as it was.

    Within the digits of a record: wavenumbers 1e-6, intensities four digits, lower energies 1e-4.
    """
    constants = read_constants(formula)
    lines = Lines.join([part_lines(constants, part) for part in constants.line_parts])
    write_par(tmp_path / "table.data", lines)
    theirs = hapi_table(tmp_path)
    assert len(theirs["nu"]) == len(lines)
    for name, rtol, atol in (
        ("molecule", 0.0, 0.0),
        ("isotopologue", 0.0, 0.0),
        ("wavenumber_per_cm", 0.0, 0.51e-6),
        ("intensity_cm", 0.51e-3, 0.0),
        ("einstein_a_per_s", 0.51e-3, 0.0),
        ("air_width_per_cm_atm", 0.0, 0.51e-4),
        ("self_width_per_cm_atm", 0.0, 0.51e-3),
        ("lower_energy_per_cm", 0.0, 0.51e-4),
        ("temperature_exponent", 0.0, 0.51e-2),
        ("upper_weight", 0.0, 0.051),
        ("lower_weight", 0.0, 0.051),
    ):
        column = np.asarray(theirs[COLUMNS[name]], dtype=float)
        np.testing.assert_allclose(column, getattr(lines, name), rtol=rtol, atol=atol, err_msg=name)
    for column, labels in (("global_upper_quanta", lines.upper_global), ("local_lower_quanta", lines.lower_local)):
        assert [text.rstrip() for text in theirs[column]] == [text.rstrip() for text in labels.tolist()]


def test_reference_files_all_read(reference_folder):
    """Every published file at hand reads, with the count and sum of intensities of the folder's own table."""
    text = (reference_folder / "PROVENANCE.md").read_text()
    rows = re.findall(r"^\| (lines/\S+\.par\.gz) \|[^|]*\|[^|]*\|[^|]*\| (\d+) \| (\S+) \|", text, re.MULTILINE)
    assert len(rows) == len(list((reference_folder / "lines").glob("*.par.gz"))) > 40
    for name, count, total in rows:
        lines = read_par(reference_folder / name)
        assert len(lines) == int(count), name
        assert lines.intensity_cm.sum() == pytest.approx(float(total), rel=1e-4), name


@pytest.mark.parametrize(
    "name", ["HF_4034-4114_sfit", "CO2_3583.7-3604.7_hitran", "O3_1100-1106_hitran2012", "H2O_6000-6400_hitran2016"]
)
def test_reference_files_as_hapi_reads_them(reference_folder, tmp_path, name):
    """Our reader and hapi's give the same numbers for published records."""
    path = reference_folder / "lines" / f"{name}.par.gz"
    (tmp_path / "table.data").write_bytes(gzip.decompress(path.read_bytes()))
    theirs, ours = hapi_table(tmp_path), read_par(path)
    for field, column in COLUMNS.items():
        np.testing.assert_array_equal(getattr(ours, field), np.asarray(theirs[column]), err_msg=field)
