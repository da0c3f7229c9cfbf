"""The user's own spectrum of the star."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from planner.errors import ScenarioError
from planner.star import StarSpectrum, parse_spectrum, read_spectrum

CSV = "wavelength [um],flux [W / (m2 um)]\n1.0,2e-9\n2.0,1e-9\n"
ECSV = """# %ECSV 1.0
# ---
# datatype:
# - {name: w, unit: nm, datatype: float64}
# - {name: f, unit: Jy, datatype: float64}
w f
2000.0 3.0
1000.0 5.0
"""
PHOTON_ENERGY_1UM_J = 1.98644586e-19  # h c / 1 um, CODATA


def test_csv_in_energy_becomes_photons() -> None:
    """Energy over the energy of one photon."""
    spectrum = parse_spectrum(CSV, "star.csv")
    assert spectrum.wavelength_um == pytest.approx([1.0, 2.0])
    expected = [2e-9 / PHOTON_ENERGY_1UM_J, 1e-9 / (PHOTON_ENERGY_1UM_J / 2)]
    assert spectrum.photons_per_s_m2_um == pytest.approx(expected, rel=1e-8)
    assert not spectrum.at_earth


def test_ecsv_in_jansky_becomes_photons_and_is_sorted() -> None:
    """Photons s-1 m-2 um-1 are ``F_nu / (h lambda)``."""
    spectrum = parse_spectrum(ECSV, "star.ecsv", at_earth=True)
    assert spectrum.wavelength_um == pytest.approx([1.0, 2.0])
    expected = np.array([5e-26, 3e-26]) / (6.62607015e-34 * np.array([1.0, 2.0]))
    assert spectrum.photons_per_s_m2_um == pytest.approx(expected, rel=1e-8)
    assert spectrum.at_earth


@pytest.mark.parametrize(
    ("first", "second"),
    [
        ("wavelength [AA],flux [erg / (s cm2 AA)]", ["10000,2e-10", "20000,1e-10"]),
        ("nu [THz],flux [photon / (s m2 um)]", ["299.792458,1.00682e10", "149.896229,1.00682e10"]),
        ("k [1/cm],flux [W / (m2 um)]", ["10000,2e-9", "5000,1e-9"]),
    ],
)
def test_units_do_not_matter(first: str, second: list[str]) -> None:
    """The same spectrum in other units of either column."""
    expected = parse_spectrum(CSV, "star.csv")
    found = parse_spectrum("\n".join([first, *second]), "other.csv")
    assert found.wavelength_um == pytest.approx(expected.wavelength_um, rel=1e-9)
    assert found.photons_per_s_m2_um == pytest.approx(expected.photons_per_s_m2_um, rel=1e-5)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", r"s\.csv: expected a table of two columns"),
        ("wavelength,flux\n1,2\n2,3\n", r'the name "wavelength" without a unit'),
        ("w [um],f [W / (m2 um)],g [um]\n1,2,3\n4,5,6\n", r"got 3 columns"),
        ("w [um],f [furlong]\n1,2\n2,3\n", r'column "f": "furlong" is not a unit'),
        ("w [kg],f [Jy]\n1,2\n2,3\n", r'first column in a unit such as um, got "kg"'),
        ("w [um],f [kg]\n1,2\n2,3\n", r'unit of flux density .*got "kg"'),
        ("w [um],f [Jy]\n1,2\n2,abc\n", r'column "f \[Jy\]": expected a number in every row'),
        ("w [um],f [Jy]\n1,2\n2,\n", r'column "f \[Jy\]": expected a number in every row'),
        ("w [um],f [Jy]\n1,2\n2\n", r"s\.csv: column .*expected a number in every row"),
        ("w [um],f [Jy]\n1,2\n2,3,4\n", r"s\.csv: expected a table of two columns"),
        ("w [um],f [Jy]\n1,2\n", r"at least two rows"),
        ("w [um],f [Jy]\n1,2\n1,3\n", r"all different"),
        ("w [um],f [Jy]\n-1,2\n1,3\n", r"finite, positive"),
        ("w [um],f [Jy]\n1,2\n2,-3\n", r"not negative"),
        ("w [um],f [Jy]\n1,2\n2,nan\n", r"s\.csv: .*finite"),
        ("w [um],f [Jy]\n1,0\n2,0\n", r"not all zero"),
        (ECSV.replace("unit: Jy, ", ""), r'column "f": expected a unit in the header, got none'),
    ],
)
def test_parse_spectrum_invalid(text: str, message: str) -> None:
    """Each fault is named with the file."""
    with pytest.raises(ScenarioError, match=message):
        parse_spectrum(text, "s.csv")


def test_read_spectrum(tmp_path: Path) -> None:
    """A file reads as its text does; a missing or binary file is named."""
    good = tmp_path / "star.csv"
    good.write_text(CSV)
    assert np.array_equal(read_spectrum(good).wavelength_um, parse_spectrum(CSV, "x").wavelength_um)
    with pytest.raises(ScenarioError, match=r"none\.csv: expected a text file"):
        read_spectrum(tmp_path / "none.csv")
    (tmp_path / "bad.csv").write_bytes(b"\xff\xfe\x00\x80")
    with pytest.raises(ScenarioError, match=r"bad\.csv: expected a text file"):
        read_spectrum(tmp_path / "bad.csv")


def test_record_is_read_only() -> None:
    """The arrays of a spectrum cannot be changed behind its back, nor through the caller's own array."""
    own = np.array([1.0, 2.0])
    spectrum = StarSpectrum(wavelength_um=own, photons_per_s_m2_um=own, at_earth=True)
    own[0] = -5.0
    assert spectrum.wavelength_um[0] == 1.0
    with pytest.raises(ValueError, match="read-only"):
        spectrum.wavelength_um[0] = 3.0
