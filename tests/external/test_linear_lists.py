"""Embedded lists of linear molecules and NO against published HITRAN lists.

Line files: HITRAN2012 (Rothman et al. 2013, JQSRT 130, 4), HITRAN2016 (Gordon et al. 2017, JQSRT 203, 3), HITRAN2020
(Gordon et al. 2022, JQSRT 277, 107949). Most constants were fitted to these same lists, so the scores tell how well a
few numbers per band carry a list, not how well they would have foretold it; the exceptions are named below.
"""

from __future__ import annotations

from functools import cache
from pathlib import Path

import numpy as np
import pytest

from planner.spectroscopy.accuracy import WindowScore, compare
from planner.spectroscopy.hitran import read_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import read_constants
from planner.spectroscopy.lists.doublet import doublet_lines
from planner.spectroscopy.lists.linear import linear_lines

FILES = {
    "CO": "CO_full400-10000_hitran2012",
    "CO2 2.1": "CO2_2100-2300_hitran2012",
    "CO2 2.3": "CO2_2293.6-2304.1_hitran2020",
    "CO2 2.4": "CO2_iso1_2380-2400_hitran2016",
    "CO2 3.6": "CO2_3583.7-3604.7_hitran",
    "CO2 0.7": "CO2_691.4-692.7_hitran2020",
    "CO2 4": "CO2_4000-5000_hitran2020",
    "CO2 6": "CO2_6000-6400_hitran2016",
    "N2O 2": "N2O_2000-3200_hitran2020",
    "N2O 3": "N2O_3333-7797_hitran2020",
    "HCN": "HCN_full400-10000_hitran2012",
    "C2H2": "C2H2_full400-10000_hitran2012",
    "OCS": "OCS_4034-4114_sfit",
    "HCl": "HCl_2972-2991_sfit",
    "HF": "HF_4034-4114_sfit",
    "NO": "NO_1921.3-1930.5_hitran2020",
}

WINDOWS = [
    ("CO", 2000.0, 2300.0),
    ("CO", 4100.0, 4400.0),
    ("CO", 6200.0, 6450.0),
    ("CO2 2.1", 2100.0, 2300.0),
    ("CO2 4", 4000.0, 5000.0),
    ("CO2 6", 6000.0, 6400.0),
    ("N2O 2", 2000.6, 3199.6),
    ("N2O 3", 3334.0, 7796.6),
    ("HCN", 600.0, 840.0),
    ("HCN", 1250.0, 1570.0),
    ("HCN", 3150.0, 3420.0),
    ("C2H2", 620.0, 850.0),
    ("C2H2", 1200.0, 1450.0),
    ("C2H2", 2600.0, 2800.0),
    ("C2H2", 3150.0, 3390.0),
    ("C2H2", 3800.0, 4200.0),
    ("C2H2", 4400.0, 4800.0),
    ("C2H2", 6450.0, 6650.0),
    ("C2H2", 7000.0, 7500.0),
    ("C2H2", 9500.0, 9700.0),
]

FRAGMENTS = [
    ("CO2 0.7", 691.4, 692.6),
    ("CO2 2.3", 2293.6, 2304.1),
    ("CO2 2.4", 2380.1, 2399.9),
    ("CO2 3.6", 3583.8, 3604.6),
    ("OCS", 4034.7, 4043.2),
    ("OCS", 4105.5, 4114.2),
    ("HCl", 2973.2, 2990.8),
    ("HF", 4034.7, 4043.2),
    ("HF", 4105.5, 4113.9),
    ("NO", 1921.4, 1930.4),
]


@cache
def _real(folder: Path, key: str) -> Lines:
    return read_par(folder / "lines" / f"{FILES[key]}.par.gz")


@cache
def _embedded(formula: str) -> Lines:
    constants = read_constants(formula)
    number = constants.molecule.hitran_number
    assert number is not None
    make = doublet_lines if formula == "NO" else linear_lines
    return Lines.join([make(part, number) for part in constants.line_parts])


def _score(folder: Path, key: str, low: float, high: float, **how: bool) -> WindowScore:
    score = compare(_embedded(key.split()[0]), _real(folder, key), (low, high), **how)
    print(f"\n{key}: {score.describe()}")
    return score


@pytest.mark.slow
@pytest.mark.parametrize(("key", "low", "high"), WINDOWS)
def test_windows_meet_the_marks(reference_folder: Path, key: str, low: float, high: float) -> None:
    """Every window with bins of R = 100 meets the project's marks at all mixing ratios."""
    assert _score(reference_folder, key, low, high).passes()


@pytest.mark.slow
@pytest.mark.parametrize(("key", "low", "high"), FRAGMENTS)
def test_fragments_meet_the_marks(reference_folder: Path, key: str, low: float, high: float) -> None:
    """Fragments too narrow for bins of R = 100 meet the marks as a whole and in bins of R = 1000."""
    score = _score(reference_folder, key, low, high)
    assert score.passes()
    assert score.passes(resolving_power=1000.0)


@pytest.mark.slow
@pytest.mark.parametrize("key", ["N2O 2", "N2O 3"])
def test_nitrous_oxide_is_as_close_as_the_cut_allows(reference_folder: Path, key: str) -> None:
    """Lines above the real list's cut-off of 2e-25: within 0.05 scale heights in nine of ten bins, even at R = 1000.

    The rest of the difference at a mixing ratio of 1e-2 is weak lines that the published list leaves out.
    """
    ours, real = (
        lines.where(lines.intensity_cm >= 2e-25) for lines in (_embedded("N2O"), _real(reference_folder, key))
    )
    window = (2000.6, 3199.6) if key == "N2O 2" else (3334.0, 7796.6)
    score = compare(ours, real, window)
    print(f"\n{key}, both above 2e-25: {score.describe()}")
    assert score.percentile_90.max() < 0.05
    assert np.abs(score.mean).max() < 0.02


def _held(embedded: Lines, real: Lines) -> Lines:
    """Embedded lines of bands that the real list holds, up to the largest J that it holds of each."""

    def keys(lines: Lines) -> list[tuple[str, str]]:
        return [(u.strip(), low.strip()) for u, low in zip(lines.upper_global, lines.lower_global, strict=True)]

    def j(lines: Lines) -> list[int]:
        return [int(label[6:9]) for label in lines.lower_local]

    largest: dict[tuple[str, str], int] = {}
    for key, value in zip(keys(real), j(real), strict=True):
        largest[key] = max(value, largest.get(key, 0))
    mask = [value <= largest.get(key, -1) for key, value in zip(keys(embedded), j(embedded), strict=True)]
    return embedded.where(np.array(mask))


@pytest.mark.slow
@pytest.mark.parametrize(("key", "low", "high"), [("HCN", 2000.0, 2200.0), ("C2H2", 2000.0, 2250.0)])
def test_windows_where_the_published_list_breaks_off(reference_folder: Path, key: str, low: float, high: float) -> None:
    """HITRAN2012 has no hot bands of HCN here and stops C2H2 where measured lines end (S about 1e-24).

    Compared as they are, the embedded lists show 0.2 scale heights more; the bands and J that both hold agree.
    """
    real, ours = _real(reference_folder, key), _embedded(key)
    _score(reference_folder, key, low, high)
    assert compare(_held(ours, real), real, (low, high)).passes()


def _by_label(lines: Lines, upper: str, lower: str) -> dict[tuple[int, str], int]:
    """Where in a list each line of a band stands: by isotopologue, branch and J; e is left out where it is implied."""
    labels = zip(lines.isotopologue, lines.upper_global, lines.lower_global, lines.lower_local, strict=True)
    return {
        (int(isotopologue), local.strip().rstrip("e")): index
        for index, (isotopologue, up, low, local) in enumerate(labels)
        if up.strip() == upper and low.strip() == lower
    }


@pytest.mark.parametrize(
    ("key", "upper", "lower"),
    [
        ("CO", "1", "0"),
        ("CO2 2.1", "1 1 1 11", "1 1 1 01"),
        ("N2O 2", "0 0 0 1", "0 0 0 0"),
        ("N2O 2", "0 1 1 1", "0 1 1 0"),
        ("HCN", "0 1 1 0", "0 0 0 0"),
        ("C2H2", "0 0 0 0 1 1  u", "0 0 0 0 0 0+ g"),
    ],
)
def test_lines_one_by_one(reference_folder: Path, key: str, upper: str, lower: str) -> None:
    """Lines of a band, matched by label: position 0.003 per cm, lower energy, Einstein A, widths and weights."""
    embedded, published = _embedded(key.split()[0]), _real(reference_folder, key)
    ours, real = (_by_label(lines, upper, lower) for lines in (embedded, published))
    strong = published.intensity_cm[list(real.values())].max() * 1e-3
    pairs = [(ours[label], index) for label, index in real.items() if published.intensity_cm[index] > strong]
    assert len(pairs) > 40
    a, b = np.array(pairs).T
    assert np.abs(embedded.wavenumber_per_cm[a] - published.wavenumber_per_cm[b]).max() < 0.003
    assert np.abs(embedded.lower_energy_per_cm[a] - published.lower_energy_per_cm[b]).max() < 0.01
    assert np.allclose(embedded.intensity_cm[a], published.intensity_cm[b], rtol=0.03)
    assert np.allclose(embedded.einstein_a_per_s[a], published.einstein_a_per_s[b], rtol=0.04)
    assert np.allclose(embedded.air_width_per_cm_atm[a], published.air_width_per_cm_atm[b], rtol=0.1)
    assert np.array_equal(embedded.upper_weight[a], published.upper_weight[b])
    assert np.array_equal(embedded.lower_weight[a], published.lower_weight[b])
