"""Levels of asymmetric tops against published levels and microwave frequencies.

The constants were fitted to or recalled from data of the same kind, so these are checks of conventions, labels and
transcription, not of predictions; only the isotopologues of water were scaled and never fitted.
"""

from __future__ import annotations

import tomllib
from functools import cache

import numpy as np
import pytest

from planner.resources import data_folder
from planner.spectroscopy.hitran import read_par
from planner.spectroscopy.lists.asymmetric_parts import parse_asymmetric_part
from planner.spectroscopy.lists.asymmetric_rotor import coupled_levels, spin_rotation

GHZ_PER_CM = 29.9792458


@cache
def ground_levels(formula, isotopologue=1, state="000", j_max=15):
    """Energies (1/cm) of one state of a shipped list by (J, Ka, Kc)."""
    table = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())
    part = next(p for p in table["part"] if p["kind"] == "asymmetric" and p["isotopologue"] == isotopologue)
    rotors, _ = parse_asymmetric_part(part, formula)
    levels = {}
    for block in coupled_levels([rotors[state]], [], j_max, j_max):
        for j, i in zip(*np.nonzero(block.exists), strict=True):
            levels[int(j), int(block.ka[j, i]), int(block.kc[j, i])] = float(block.energy_per_cm[j, i])
    return levels


# Tennyson et al. 2009, 2010, 2013 (IUPAC critical evaluations, JQSRT 110, 573; 111, 2160; 117, 29), recalled from
# memory: level -> energy in 1/cm
PUBLISHED_LEVELS = {
    ("H2O", 1): {
        (1, 0, 1): 23.7944, (1, 1, 1): 37.1371, (1, 1, 0): 42.3717, (2, 0, 2): 70.0908, (2, 1, 2): 79.4964,
        (2, 1, 1): 95.1759, (2, 2, 1): 134.9016, (2, 2, 0): 136.1639, (3, 0, 3): 136.7617, (3, 1, 3): 142.2785,
        (3, 3, 0): 285.4186, (5, 5, 0): 742.0763, (10, 10, 0): 2701.888,
    },
    ("H2O", 2): {
        (1, 0, 1): 23.7549, (1, 1, 1): 36.7487, (1, 1, 0): 42.0234, (2, 0, 2): 69.9274, (2, 2, 1): 133.4758,
        (2, 2, 0): 134.7831, (3, 0, 3): 136.3366,
    },
    ("H2O", 4): {(1, 0, 1): 15.5082, (1, 1, 1): 29.8086, (1, 1, 0): 32.4963, (2, 2, 0): 109.2712},
}  # fmt: skip


@pytest.mark.parametrize(("formula", "isotopologue"), PUBLISHED_LEVELS)
def test_published_levels(formula, isotopologue):
    """Ground-state levels of H2 16O, H2 18O and HDO to 0.02 1/cm, the scatter of the effective constants."""
    levels = ground_levels(formula, isotopologue)
    for label, energy in PUBLISHED_LEVELS[formula, isotopologue].items():
        assert levels[label] == pytest.approx(energy, abs=0.02), label


# Rest frequencies in GHz (Lovas 2004, J. Phys. Chem. Ref. Data 33, 177, and the JPL catalogue), recalled from memory:
# upper, lower, frequency. Tolerance in MHz: what the constants of each list are good for.
MICROWAVE = {
    ("H2O", 1): (1200.0, [
        ((6, 1, 6), (5, 2, 3), 22.2351), ((3, 1, 3), (2, 2, 0), 183.3101), ((4, 1, 4), (3, 2, 1), 380.1974),
        ((1, 1, 0), (1, 0, 1), 556.9360), ((2, 1, 1), (2, 0, 2), 752.0331), ((2, 0, 2), (1, 1, 1), 987.9268),
        ((1, 1, 1), (0, 0, 0), 1113.3430),
    ]),
    ("H2O", 2): (300.0, [((3, 1, 3), (2, 2, 0), 203.4075), ((1, 1, 0), (1, 0, 1), 547.6764)]),
    ("H2O", 4): (200.0, [
        ((1, 1, 0), (1, 1, 1), 80.5783), ((3, 1, 2), (2, 2, 1), 225.8967), ((2, 1, 1), (2, 1, 2), 241.5616),
        ((1, 0, 1), (0, 0, 0), 464.9245),
    ]),
    ("H2CO", 1): (30.0, [
        ((1, 1, 0), (1, 1, 1), 4.8297), ((2, 1, 1), (2, 1, 2), 14.4885), ((1, 0, 1), (0, 0, 0), 72.8379),
        ((2, 1, 2), (1, 1, 1), 140.8395), ((2, 0, 2), (1, 0, 1), 145.6029), ((3, 0, 3), (2, 0, 2), 218.2222),
    ]),
    ("SO2", 1): (30.0, [
        ((3, 1, 3), (2, 0, 2), 104.0294), ((12, 1, 11), (12, 0, 12), 131.0149), ((5, 1, 5), (4, 0, 4), 135.6960),
        ((12, 0, 12), (11, 1, 11), 203.3916), ((11, 1, 11), (10, 0, 10), 221.9652),
    ]),
    ("O3", 1): (60.0, [((6, 1, 5), (6, 0, 6), 110.8360), ((10, 1, 9), (10, 0, 10), 142.1751)]),
    ("H2S", 1): (60.0, [
        ((1, 1, 0), (1, 0, 1), 168.7628), ((2, 2, 0), (2, 1, 1), 216.7104), ((3, 3, 0), (3, 2, 1), 300.5056),
    ]),
}  # fmt: skip


@pytest.mark.parametrize(("formula", "isotopologue"), MICROWAVE)
def test_microwave_lines(formula, isotopologue):
    """Differences of ground-state levels are the known microwave frequencies."""
    tolerance_mhz, lines = MICROWAVE[formula, isotopologue]
    levels = ground_levels(formula, isotopologue)
    for upper, lower, ghz in lines:
        found = (levels[upper] - levels[lower]) * GHZ_PER_CM
        assert found == pytest.approx(ghz, abs=tolerance_mhz / 1000), (upper, lower)


# file, formula, median and 90th percentile of the difference of lower energies in 1/cm, J up to 12
LISTS = [
    ("H2O_iso1_400-4000_hitran2016", "H2O", 0.02, 0.15),
    ("H2S_994-1574_hitran2012", "H2S", 0.002, 0.01),
    ("O3_4000-5000_hitran2020", "O3", 0.001, 0.003),
    ("NO2_2059.9-2074.7_hitran2020", "NO2", 0.02, 0.05),
]


@pytest.mark.parametrize(("file", "formula", "median", "p90"), LISTS)
def test_lower_energies(reference_folder, file, formula, median, p90):
    """Lower energies of HITRAN lists, level by level with the list's own labels (in-sample for the constants)."""
    lines = read_par(reference_folder / "lines" / f"{file}.par.gz")
    ours = ground_levels(formula)
    differences = {}
    for name, text, energy in zip(lines.lower_global, lines.lower_local, lines.lower_energy_per_cm, strict=True):
        label = int(text[:3]), int(text[3:6]), int(text[6:9])
        if name.split() == ["0", "0", "0"] and label[0] <= 12:
            differences.setdefault(label, []).append(energy - ours[label])
    assert len(differences) > 10
    absolute = np.abs([np.mean(values) for values in differences.values()])  # the mean over NO2's spin doublets
    assert np.median(absolute) <= median
    assert np.percentile(absolute, 90) <= p90


def test_spin_doublets(reference_folder):
    """Doublet splittings of NO2's lower levels in HITRAN2020 to 10 % and 0.005 1/cm, the size of the second order."""
    table = tomllib.loads((data_folder("linelists") / "NO2.toml").read_text())
    part = next(p for p in table["part"] if p["kind"] == "asymmetric")
    rotors, _ = parse_asymmetric_part(part, "NO2")
    ours = {}
    for block in coupled_levels([rotors["000"]], [], 40, 12):
        value = spin_rotation(block, part["spin_rotation_per_cm"])
        for n, i in zip(*np.nonzero(block.exists), strict=True):
            if n > 0:
                ours[int(n), int(block.ka[n, i]), int(block.kc[n, i])] = value[n, i] / (2 * n + 2) + value[n, i] / (
                    2 * n
                )
    lines = read_par(reference_folder / "lines" / "NO2_2059.9-2074.7_hitran2020.par.gz")
    pairs = {}
    for name, text, energy in zip(lines.lower_global, lines.lower_local, lines.lower_energy_per_cm, strict=True):
        if name.split() == ["0", "0", "0"]:
            label = int(text[:3]), int(text[3:6]), int(text[6:9])
            pairs.setdefault(label, {})[text[9:].strip()[0]] = energy
    checked = [
        (pair["+"] - pair["-"], ours[label]) for label, pair in pairs.items() if len(pair) == 2 and label in ours
    ]
    assert len(checked) > 20
    published, found = np.transpose(checked)
    np.testing.assert_allclose(found, published, rtol=0.1, atol=0.005)
