"""Bands of the gas catalogue against complete HITRAN files and measured cross-sections.

Sources: HITRAN2012 molecule files of CO, HCN, C2H2, PH3, CH3OH (complete from 400 to 10,000 per cm, CH3OH only at
10 um), HITRAN2020 N2O, main isotopologue, 2000 to 3200 and 3333 to 7797 per cm; cited as Rothman et al. 2013, Gordon
et al. 2022. They are not shipped.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.catalogue.read import find_gas
from planner.spectroscopy.hitran import read_par

# gas: files, and the stretch in um that they cover completely
FILES = {
    "CO": (["CO_full400-10000_hitran2012"], (1.0, 25.0)),
    "HCN": (["HCN_full400-10000_hitran2012"], (1.0, 25.0)),
    "C2H2": (["C2H2_full400-10000_hitran2012"], (1.0, 25.0)),
    "PH3": (["PH3_full400-10000_hitran2012"], (2.5, 25.0)),
    "CH3OH": (["CH3OH_full400-10000_hitran2012"], (8.6, 11.0)),
    "N2O": (["N2O_2000-3200_hitran2020", "N2O_3333-7797_hitran2020"], (1.3, 4.9)),
}


@pytest.mark.parametrize("name", FILES)
def test_band_sums_of_hitran(name: str, reference_folder: Path) -> None:
    """Each band's intensity within 5 % of the sum of its lines, and all bands together hold 98 % of the sum.

    5 %: two digits in the record, and lines of neighbours in the stretch.
    """
    files, (from_um, to_um) = FILES[name]
    wavelength_um, intensity_cm = [], []
    for file in files:
        lines = read_par(reference_folder / "lines" / f"{file}.par.gz")
        wavelength_um += list(1e4 / lines.wavenumber_per_cm)
        intensity_cm += list(lines.intensity_cm)
    rows = list(zip(wavelength_um, intensity_cm, strict=True))
    bands = [band for band in find_gas(name).bands if from_um <= band.from_um and band.to_um <= to_um]
    assert bands
    inside = 0.0
    for band in bands:
        total = sum(s for um, s in rows if band.from_um <= um < band.to_um)
        assert band.intensity_cm == pytest.approx(total, rel=0.05), band.name
        inside += total
    assert inside >= 0.98 * sum(s for um, s in rows if from_um <= um < to_um)
