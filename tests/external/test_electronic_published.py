"""Oxygen bands and electronic cross-sections against published values and lists."""

from __future__ import annotations

import gzip
import tomllib

import numpy as np
import pytest

from planner.resources import data_folder
from planner.spectroscopy.lists.electronic import oxygen_lines, smooth_table_cross_section


def file_parts(formula):
    """The parts of a shipped file."""
    return tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())["part"]


def cross_section(formula, wavelength_nm, temperature_k):
    """Sum of all smooth tables at vacuum wavelengths."""
    tables = [part for part in file_parts(formula) if part["kind"] == "smooth-table"]
    return sum(smooth_table_cross_section(part, 1e7 / np.atleast_1d(wavelength_nm), temperature_k) for part in tables)


@pytest.fixture(scope="module")
def oxygen():
    """The shipped oxygen lines."""
    (part,) = file_parts("O2")
    return oxygen_lines(part, 7)


def test_oxygen_lines_of_hitran2012(reference_folder, oxygen):
    """Positions to 0.005 1/cm, energies to 0.011 1/cm, strong lines to 4 % and their mean to 1 % of HITRAN2012.

    Rothman et al. 2013 (JQSRT 130, 4); magnetic-dipole lines from the vibrational ground state. The 1.27 um band is
    known there only by its outer lines.
    """
    ours = {
        (u.split()[0] + u.split()[1], local.strip()): i
        for i, (u, local) in enumerate(zip(oxygen.upper_global, oxygen.lower_local, strict=True))
    }
    found = {}
    with gzip.open(reference_folder / "lines" / "O2_full400-16000_hitran2012.par.gz", "rt") as rows:
        for row in rows:
            if row[2] != "1" or row[126] != "d" or row[67:82].split()[0] not in "ab" or row[82:97].split()[1] != "0":
                continue
            index = ours[("".join(row[67:82].split()), row[112:127].strip())]
            found.setdefault(oxygen.upper_global[index].strip(), []).append(
                (index, float(row[3:15]), float(row[15:25]), float(row[45:55]), float(row[25:35]))
            )
    assert {key: len(lines) for key, lines in found.items()} == {
        "a      0": 18, "a      1": 161, "b      0": 91, "b      1": 87, "b      2": 75
    }  # fmt: skip
    for lines in found.values():
        index, position, intensity, energy, einstein = np.array(lines).T
        index = index.astype(int)
        assert np.abs(oxygen.wavenumber_per_cm[index] - position).max() < 0.005
        assert np.abs(oxygen.lower_energy_per_cm[index] - energy).max() < 0.011
        strong = intensity > 0.01 * intensity.max()
        ratio = oxygen.intensity_cm[index][strong] / intensity[strong]
        assert np.abs(ratio - 1.0).max() < 0.04
        assert abs(ratio.mean() - 1.0) < 0.01
        assert np.abs(oxygen.einstein_a_per_s[index][strong] / einstein[strong] - 1.0).max() < 0.05


@pytest.mark.parametrize(
    ("low", "high", "band_sum_cm", "tolerance"),
    [
        (12900.0, 13200.0, 2.28e-22, 0.03),  # A band, from memory
        (14250.0, 14600.0, 1.5e-23, 0.05),  # B band, from memory
        (7500.0, 8300.0, 3.7e-24, 0.2),  # 1.27 um, from memory; published values scatter between 3.1 and 3.7e-24
    ],
)
def test_band_sums(oxygen, low, high, band_sum_cm, tolerance):
    """Band sums at 296 K in cm per molecule, handbook values from memory."""
    inside = (oxygen.wavenumber_per_cm > low) & (oxygen.wavenumber_per_cm < high)
    assert oxygen.intensity_cm[inside].sum() == pytest.approx(band_sum_cm, rel=tolerance)


def test_lifetime_of_oxygen_b(oxygen):
    """The b-X 0-0 band radiates at 0.0887 per s to 5 % (Long et al. 2010, A band; from memory)."""
    band = oxygen.where(np.char.strip(oxygen.upper_global) == "b      0")
    level = band.where(band.upper_weight == 2.0 * 10 + 1.0)
    assert level.einstein_a_per_s.sum() == pytest.approx(0.0887, rel=0.05)


def test_ozone_at_the_mercury_line():
    """1.1329(35)e-17 cm2 at 253.65 nm in air, room temperature (Hodges et al. 2019, Metrologia 56, 034001); 1.5 %.

    The table is smoothed to R = 100, and its scale is uncertain to 2 %.
    """
    assert cross_section("O3", 253.73, 296.0)[0] == pytest.approx(1.1329e-17, rel=0.015)


def test_ozone_hartley_peak():
    """About 1.15e-17 cm2 near 255 nm (JPL evaluation, from memory), at R = 100; 3 %."""
    wavelength = np.linspace(240.0, 270.0, 301)
    values = cross_section("O3", wavelength, 295.0)
    assert values.max() == pytest.approx(1.15e-17, rel=0.03)
    assert abs(wavelength[values.argmax()] - 255.0) < 3.0


@pytest.mark.parametrize(("wavelength_nm", "value"), [(594.1, 4.67e-21), (604.6, 5.15e-21), (632.8, 3.41e-21)])
def test_ozone_at_helium_neon_lines(wavelength_nm, value):
    """Anderson & Mauersberger 1992 (Geophys. Res. Lett. 19, 933), from memory; 5 %: the table has R = 100."""
    assert cross_section("O3", wavelength_nm * 1.000277, 295.0)[0] == pytest.approx(value, rel=0.05)


def test_ozone_chappuis_peak():
    """5.1e-21 cm2 at 0.60 um (handbook, from memory); 4 %."""
    wavelength = np.linspace(560.0, 660.0, 501)
    values = cross_section("O3", wavelength, 295.0)
    assert values.max() == pytest.approx(5.1e-21, rel=0.04)
    assert abs(wavelength[values.argmax()] - 601.0) < 3.0


def test_nitrogen_dioxide_peak():
    """About 6e-19 cm2 near 0.4 um (handbook, from memory); 10 %."""
    assert cross_section("NO2", np.linspace(390.0, 410.0, 41), 294.0).mean() == pytest.approx(6e-19, rel=0.1)


def test_formaldehyde_at_304_nm():
    """7.23e-20 cm2 as a 1 nm mean near 304 nm (JPL evaluation 17, 2011); 25 %, since the table keeps R = 100."""
    values = cross_section("H2CO", np.linspace(302.5, 305.0, 26), 298.0)
    assert values.mean() == pytest.approx(7.23e-20, rel=0.25)


def test_sulfur_dioxide_bands():
    """B-X has 7.9e-19 cm2 near 287 nm at R = 100 (Vandaele et al. 2009); 6 %."""
    assert cross_section("SO2", np.linspace(283.0, 291.0, 81), 298.0).mean() == pytest.approx(7.9e-19, rel=0.06)
