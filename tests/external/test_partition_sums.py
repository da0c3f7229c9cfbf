"""Partition sums and masses against tables and closed forms that we did not write."""

from __future__ import annotations

import csv

import numpy as np
import pytest

from planner.spectroscopy.molecules import find_molecule, isotopologue_mass_g, partition_sum

# Second radiation constant hc/k in cm K: CODATA 2018, exact in the SI of 2019.
C2_CM_K = 1.438776877


def test_tips_2021_table(reference_folder):
    """Q(T) equals the TIPS-2021 table (Gamache et al. 2021, JQSRT 271, 107713), extracted once with hapi."""
    path = reference_folder / "bands" / "TIPS2021_Q_100-1000K_from_hapi.csv"
    with path.open(newline="") as lines:
        rows = list(csv.DictReader(lines))
    assert len(rows) > 100
    for row in rows:
        number, isotopologue = int(row["molec_id"]), int(row["local_iso"])
        assert partition_sum(number, isotopologue, 296.0) == pytest.approx(float(row["Q296"]), rel=2e-6)
        for temperature in ("150", "300", "600"):
            assert partition_sum(number, isotopologue, float(temperature)) == pytest.approx(
                float(row[temperature]), rel=2e-6
            )


@pytest.mark.parametrize("temperature_k", [150.0, 296.0, 600.0])
def test_carbon_monoxide_by_direct_sum(temperature_k):
    """Q of 12C16O is the sum over levels of the constants of Huber and Herzberg 1979 (NIST WebBook), to 1e-4."""
    we, wexe, be, ae, de = 2169.81358, 13.28831, 1.93128087, 0.01750441, 6.1216e-6  # 1/cm
    v = np.arange(8)[:, None] + 0.5
    j = np.arange(150)[None, :]
    level = we * v - wexe * v**2 + (be - ae * v) * j * (j + 1) - de * (j * (j + 1)) ** 2
    total = np.sum((2 * j + 1) * np.exp(-C2_CM_K * (level - level[0, 0]) / temperature_k))
    assert partition_sum(5, 1, temperature_k) == pytest.approx(total, rel=1e-4)


@pytest.mark.parametrize(
    ("name", "mass_g"),
    [
        # Molecular weights of the NIST Chemistry WebBook (SRD 69), recalled from memory; they rest on an older
        # set of atomic weights, hence the tolerance of 1e-4.
        ("water", 18.0153),
        ("carbon dioxide", 44.0095),
        ("methane", 16.0425),
        ("ammonia", 17.0305),
        ("CFC-11", 137.368),
        ("CFC-12", 120.913),
        ("sulfur hexafluoride", 146.055),
        ("dimethyl sulfide", 62.134),
        ("isoprene", 68.1170),
        ("phosphine", 33.99758),
    ],
)
def test_molar_masses(name, mass_g):
    """Molar masses from atomic weights equal the handbook's."""
    assert find_molecule(name).molar_mass_g == pytest.approx(mass_g, rel=1e-4)


@pytest.mark.parametrize(
    ("number", "isotopologue", "mass_g"),
    [
        # Sums of nuclide masses of AME2020 (Wang et al. 2021, Chinese Phys. C 45, 030003), recalled from memory:
        # 1H 1.00782503, 12C 12, 13C 13.00335484, 14N 14.00307400, 16O 15.99491462, 18O 17.99915961
        (1, 1, 2 * 1.00782503 + 15.99491462),
        (2, 1, 12 + 2 * 15.99491462),
        (2, 2, 13.00335484 + 2 * 15.99491462),
        (4, 4, 2 * 14.00307400 + 17.99915961),
        (6, 1, 12 + 4 * 1.00782503),
    ],
)
def test_isotopologue_masses(number, isotopologue, mass_g):
    """Isotopologue masses are sums of nuclide masses; hapi gives seven digits."""
    assert isotopologue_mass_g(number, isotopologue) == pytest.approx(mass_g, rel=1e-6)
