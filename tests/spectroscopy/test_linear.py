"""Lines of linear molecules."""

from __future__ import annotations

import tomllib
from dataclasses import fields
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import relative_intensity
from planner.spectroscopy.lists.linear import linear_lines
from planner.spectroscopy.lists.linear_levels import E, F, Levels, honl_london

C2_CM_K = 1.438776877
NUMBERS = {"CO": 5, "CO2": 2, "N2O": 4, "HCN": 23, "C2H2": 26, "OCS": 19, "HCl": 15, "HF": 14, "HBr": 16}


def _part(levels: list[Any], bands: list[Any], **more: Any) -> dict[str, Any]:
    """A part of one isotopologue without cut-off."""
    species = {"isotopologue": 1, "nuclear_weights": [1, 1], "levels": levels, "bands": bands}
    widths = [[1, 0.08, 0.10, 0.70], [21, 0.06, 0.08, 0.60]]
    settings = {"weakest_cm": 0.0, "largest_j": 30, "widths": widths}
    settings |= {key: more.pop(key) for key in list(more) if key in settings}
    return {**settings, "species": [species | more]}


def _shipped(formula: str) -> dict[str, Any]:
    with (data_folder("linelists") / f"{formula}.toml").open("rb") as file:
        return tomllib.load(file)["part"][0]


def _chosen(lines: Lines, upper: str, lower: str, branch: str) -> tuple[SimpleNamespace, np.ndarray]:
    """Columns of one branch of one band of isotopologue 1, and the lower J, both by ascending J."""
    mask = (lines.upper_global == upper.rjust(15)) & (lines.lower_global == lower.rjust(15))
    mask &= np.array([label[5] == branch for label in lines.lower_local]) & (lines.isotopologue == 1)
    j = np.array([int(label[6:9]) for label in lines.lower_local[mask]])
    order = np.argsort(j)
    columns = {field.name: getattr(lines, field.name)[mask][order] for field in fields(lines)}
    return SimpleNamespace(**columns), j[order]


RIGID = [["0", 0, "", 0.0, 2.0, 0, 0, 0, 0, "x"], ["1", 0, "", 2000.0, 2.0, 0, 0, 0, 0, "x"]]
BENT = [
    ["0 0 0 0", 0, "", 0.0, 1.5, 3e-6, 1e-12, 0, 0, "x"],
    ["0 1 1 0", 1, "", 700.0, 1.49, 3.1e-6, 2e-12, 0.008, 1e-7, "x"],
    ["0 2 2 0", 2, "", 1410.0, 1.48, 3.2e-6, 0, -0.002, 3e-7, "x"],
    ["0 2 0 0", 0, "", 1400.0, 1.48, 4.0e-6, 0, 0, 0, "x"],
    ["1 1 1 0", 1, "", 2900.0, 1.47, 3.1e-6, 2e-12, 0.009, 1e-7, "x"],
]
BENT_BANDS = [
    ["0 1 1 0", "0 0 0 0", "", 1e-17, 0.01, 1e-4, "x"],
    ["0 2 2 0", "0 1 1 0", "", 5e-19, -0.004, 0, "x"],
    ["0 2 0 0", "0 1 1 0", "", 3e-19, 0, -1e-4, "x"],
    ["1 1 1 0", "0 1 1 0", "", 2e-19, 0.002, 2e-5, "x"],
]


def test_rigid_rotor_by_hand() -> None:
    """R(J) at 2000 + 2B(J+1), P(J) at 2000 - 2BJ, and the first intensities as worked out by hand."""
    lines = linear_lines(_part(RIGID, [["1", "0", "", 1e-18, 0, 0, "x"]]), 5)
    up, j = _chosen(lines, "1", "0", "R")
    assert np.allclose(up.wavenumber_per_cm, 2000.0 + 4.0 * (j + 1), atol=1e-9)
    down, j = _chosen(lines, "1", "0", "P")
    assert j[0] == 1
    assert np.allclose(down.wavenumber_per_cm, 2000.0 - 4.0 * j, atol=1e-9)
    # R(0): L = 1, E" = 0, 2004/cm; P(1): L = 1, E" = 4, 1996/cm; stimulated emission is 6e-5 of both
    expected = 2004.0 / (1996.0 * np.exp(-C2_CM_K * 4.0 / 296.0))
    assert up.intensity_cm[0] / down.intensity_cm[0] == pytest.approx(expected, rel=1e-5)
    assert down.lower_energy_per_cm[0] == pytest.approx(4.0)


def test_widths_follow_m_between_rows() -> None:
    """|m| = J in P, J + 1 in R; half way between two rows the widths are half way, beyond them constant."""
    lines = linear_lines(_part(RIGID, [["1", "0", "", 1e-18, 0, 0, "x"]]), 5)
    up, j = _chosen(lines, "1", "0", "R")
    assert up.air_width_per_cm_atm[j == 10][0] == pytest.approx(0.07)
    assert up.self_width_per_cm_atm[j == 10][0] == pytest.approx(0.09)
    assert up.temperature_exponent[j == 29][0] == pytest.approx(0.60)


@pytest.mark.parametrize(("lower", "step"), [(0, 0), (0, 1), (1, -1), (1, 0), (1, 1), (2, -1), (3, 0), (3, 1)])
def test_honl_london_sum_rule(lower: int, step: int) -> None:
    """The branches from one level add up to its 2J + 1 orientations."""
    j = np.arange(lower + 2, 60)
    total = sum(honl_london(branch, j, np.full(j.size, lower), np.full(j.size, lower + step)) for branch in (-1, 0, 1))
    assert np.allclose(total, 2 * j + 1, rtol=1e-12)


def test_honl_london_reverses() -> None:
    """A line has the same factor whichever level is taken as the lower: emission undoes absorption."""
    j = np.arange(3, 40)
    for low, up in ((0, 1), (1, 2), (1, 1), (2, 3)):
        forth = honl_london(1, j, np.full(j.size, low), np.full(j.size, up))
        back = honl_london(-1, j + 1, np.full(j.size, up), np.full(j.size, low))
        assert np.allclose(forth, back, rtol=1e-12)


def _reference_lines(part: dict[str, Any]) -> dict[tuple[str, str, str, int, int], tuple[float, float]]:
    """Position and intensity of every line, one at a time, straight from the formulae."""
    species = part["species"][0]
    levels = {row[0]: row for row in species["levels"]}

    def energy(name: str, j: int, parity: int) -> float:
        _, momentum, _, g, b, d, h, q, q_j, _ = levels[name]
        x, n = j * (j + 1) - momentum**2, j * (j + 1)
        return g + b * x - d * x**2 + h * x**3 - parity * (q * n - q_j * n * n) / 2

    def exists(name: str, j: int, parity: int) -> bool:
        momentum = levels[name][1]
        return j >= momentum and (momentum > 0 or parity == E)

    def factor(branch: int, j: int, low: int, up: int) -> float:
        # squares of Clebsch-Gordan coefficients <j low 1 (up - low) | j' up>, times 2J + 1 (Edmonds 1957, table 2)
        k = up - low
        s = 1 if k >= 0 else -1
        if branch == 1:
            square = {
                0: (j - low + 1) * (j + low + 1) / ((2 * j + 1) * (j + 1)),
                1: (j + s * low + 1) * (j + s * low + 2) / ((2 * j + 1) * (2 * j + 2)),
            }[abs(k)]
        elif branch == 0:
            square = {
                0: low**2 / (j * (j + 1)),
                1: (j + s * low + 1) * (j - s * low) / (2 * j * (j + 1)),
            }[abs(k)]
        else:
            square = {
                0: (j - low) * (j + low) / (j * (2 * j + 1)),
                1: (j - s * low - 1) * (j - s * low) / (2 * j * (2 * j + 1)),
            }[abs(k)]
        return square * (2 * j + 1)

    found = {}
    for upper, lower, _, total, a1, a2, _ in species["bands"]:
        band = {}
        for j in range(part["largest_j"] + 1):
            for parity in (E, F):
                for branch in (-1, 0, 1):
                    above = parity if branch else -parity
                    if not exists(lower, j, parity) or not exists(upper, j + branch, above) or (j == 0 and branch < 1):
                        continue
                    low = energy(lower, j, parity)
                    nu = energy(upper, j + branch, above) - low
                    m = {1: j + 1, 0: 0, -1: -j}[branch]
                    hw = 1 + a1 * m + a2 * (m * m if branch else j * (j + 1))
                    boltzmann = np.exp(-C2_CM_K * low / 296.0) * (1 - np.exp(-C2_CM_K * nu / 296.0))
                    strength = factor(branch, j, levels[lower][1], levels[upper][1]) * nu * boltzmann * hw**2
                    if strength > 0:
                        band[upper, lower, "PQR"[branch + 1], j, parity] = (nu, strength)
        scale = total / sum(strength for _, strength in band.values())
        found |= {key: (nu, strength * scale) for key, (nu, strength) in band.items()}
    return found


def test_against_line_by_line_reference() -> None:
    """Positions and intensities of bands with l-type doubling, hot and cold, as from the slow formulae."""
    part = _part(BENT, BENT_BANDS)
    expected = _reference_lines(part)
    lines = linear_lines(part, 23)
    assert len(lines) == len(expected)
    for index in range(len(lines)):
        label = lines.lower_local[index]
        parity = E if label[9] == "e" else F
        key = (lines.upper_global[index].strip(), lines.lower_global[index].strip(), label[5], int(label[6:9]), parity)
        position, intensity = expected[key]
        assert lines.wavenumber_per_cm[index] == pytest.approx(position, abs=1e-9)
        assert lines.intensity_cm[index] == pytest.approx(intensity, rel=1e-12)


def test_parity_rules() -> None:
    """From a Sigma state P and R reach e and Q reaches f levels, so the doubling parts Q from P and R."""
    doubled = [BENT[0], ["0 1 1 0", 1, "", 700.0, 1.5, 3e-6, 1e-12, 0.01, 0, "x"]]
    lines = linear_lines(_part(doubled, [["0 1 1 0", "0 0 0 0", "", 1e-17, 0, 0, "x"]]), 23)
    assert all(label[9] == "e" for label in lines.lower_local)
    central, j = _chosen(lines, "0 1 1 0", "0 0 0 0", "Q")
    levels = Levels.from_rows(doubled)
    index = np.ones(j.size, dtype=int)
    upper_f = levels.energy_per_cm(index, j, F)
    assert np.allclose(central.wavenumber_per_cm, upper_f - levels.energy_per_cm(0 * index, j, E), atol=1e-9)
    assert np.allclose(upper_f - levels.energy_per_cm(index, j, E), 0.01 * j * (j + 1), atol=1e-9)


def test_rows_may_speak_for_some_lines() -> None:
    """One row for P and R and one for Q, each with its own sum and shape."""
    bands = [["0 1 1 0", "0 0 0 0", "PR", 4e-18, 0, 0, "x"], ["0 1 1 0", "0 0 0 0", "Q", 7e-18, 0, 1e-3, "x"]]
    lines = linear_lines(_part(BENT, bands), 23)
    central, _ = _chosen(lines, "0 1 1 0", "0 0 0 0", "Q")
    assert central.intensity_cm.sum() == pytest.approx(7e-18, rel=1e-12)
    assert lines.intensity_cm.sum() == pytest.approx(1.1e-17, rel=1e-12)
    from_e = linear_lines(_part(BENT, [["1 1 1 0", "0 1 1 0", "ePR", 1e-18, 0, 0, "x"]]), 23)
    assert {label[5] + label[9] for label in from_e.lower_local} == {"Pe", "Re"}


def test_forbidden_bands_have_no_q_branch() -> None:
    """A band that changes l by two borrows P and R from l-type resonance, and has nothing else."""
    lines = linear_lines(_part(BENT, [["0 2 2 0", "0 0 0 0", "", 1e-21, 0.2, 0.2, "x"]]), 23)
    assert {label[5] for label in lines.lower_local} == {"P", "R"}


def test_cut_spares_lines_that_grow_with_temperature() -> None:
    """A line is dropped only if it stays below the cut-off both at 296 K and at 600 K."""
    whole = linear_lines(_part(BENT, BENT_BANDS), 23)
    cut = linear_lines(_part(BENT, BENT_BANDS, weakest_cm=1e-21), 23)
    assert len(cut) < len(whole)
    assert np.isclose(
        cut.intensity_cm[cut.intensity_cm >= 1e-21].sum(), whole.intensity_cm[whole.intensity_cm >= 1e-21].sum()
    )
    spared = cut.where(cut.intensity_cm < 1e-21)
    growth = relative_intensity(spared.wavenumber_per_cm, spared.lower_energy_per_cm, 600.0)
    growth /= relative_intensity(spared.wavenumber_per_cm, spared.lower_energy_per_cm, 296.0)
    assert len(spared)
    assert growth.min() > 1.0


def test_labels_and_weights_as_in_hitran() -> None:
    """Global labels fill 15 columns, local ones hold branch, J and e/f; weights are 2J + 1 times the nuclear part."""
    lines = linear_lines(_part(BENT, BENT_BANDS[:1], nuclear_weights=[6, 6]), 23)
    up, j = _chosen(lines, "0 1 1 0", "0 0 0 0", "R")
    assert up.lower_local[12] == "     R 12e"
    assert up.upper_global[12] == "        0 1 1 0"
    assert np.array_equal(up.lower_weight, 6 * (2 * j + 1))
    assert np.array_equal(up.upper_weight, 6 * (2 * j + 3))
    assert np.all(up.einstein_a_per_s > 0)


@pytest.mark.parametrize(
    ("levels", "bands", "message"),
    [
        (RIGID, [["2", "0", "", 1e-18, 0, 0, "x"]], "no level '2'"),
        (RIGID, [["1", "0", "", -1e-18, 0, 0, "x"]], "S > 0"),
        (RIGID, [["1", "0", "S", 1e-18, 0, 0, "x"]], "lines such as"),
        (RIGID, [["1", "0", 1e-18, 0, 0, "x"]], "expected upper, lower"),
        (RIGID, [["1", "0", "Q", 1e-18, 0, 0, "x"]], "row 1: it allows no line"),
        ([RIGID[0], RIGID[0]], [["0", "0", "", 1e-18, 0, 0, "x"]], "there twice"),
        ([RIGID[0], RIGID[1][:-1]], [["1", "0", "", 1e-18, 0, 0, "x"]], "expected name, l, symmetry"),
        ([RIGID[0], ["1", 0, "+", 1, 2, 0, 0, 0, 0, "x"]], [["1", "0", "", 1e-18, 0, 0, "x"]], "expected name"),
    ],
)
def test_broken_rows(levels: list[Any], bands: list[Any], message: str) -> None:
    """Each broken row is named with what was expected."""
    with pytest.raises(LineDataError, match=message):
        linear_lines(_part(levels, bands), 5)


def test_broken_widths() -> None:
    """Width rows must ascend."""
    with pytest.raises(LineDataError, match="ascending"):
        linear_lines(_part(RIGID, [["1", "0", "", 1e-18, 0, 0, "x"]], widths=[[2, 1, 1, 1], [1, 1, 1, 1]]), 5)


@pytest.mark.parametrize("formula", NUMBERS)
def test_band_sums_of_shipped_lists(formula: str) -> None:
    """The lines of every band of every shipped list add up to the stated intensity to 1 %."""
    part = _shipped(formula) | {"weakest_cm": 1e-60}
    lines = linear_lines(part, NUMBERS[formula])
    for species in part["species"]:
        own = lines.where(lines.isotopologue == species["isotopologue"])
        names = np.char.add(np.char.add(np.char.strip(own.upper_global), "<"), np.char.strip(own.lower_global))
        bands, index = np.unique(names, return_inverse=True)
        sums = dict(zip(bands.tolist(), np.bincount(index, weights=own.intensity_cm), strict=True))
        stated: dict[str, float] = {}
        for row in species["bands"]:
            key = f"{row[0].strip()}<{row[1].strip()}"
            stated[key] = stated.get(key, 0.0) + row[3]
        assert set(sums) == set(stated)
        for key, value in stated.items():
            assert sums[key] == pytest.approx(value, rel=0.01), key


@pytest.mark.parametrize("formula", NUMBERS)
def test_cut_of_shipped_lists_loses_little(formula: str) -> None:
    """What the cut-off drops is under 0.1 % of the whole at 296 K."""
    part = _shipped(formula)
    kept = linear_lines(part, NUMBERS[formula]).intensity_cm.sum()
    assert kept > 0.999 * linear_lines(part | {"weakest_cm": 1e-60}, NUMBERS[formula]).intensity_cm.sum()


@pytest.mark.parametrize("formula", NUMBERS)
def test_levels_of_shipped_lists_rise_with_j(formula: str) -> None:
    """No distortion term runs away: every level lies above the one before, up to the largest J that is used."""
    part = _shipped(formula)
    for species in part["species"]:
        levels = Levels.from_rows(species["levels"])
        index = np.arange(len(levels.names))[:, np.newaxis]
        j = levels.angular_momentum[index] + np.arange(part["largest_j"] + 2)
        for parity in (E, F):
            assert np.all(np.diff(levels.energy_per_cm(index, j, parity), axis=1) > 0)


@pytest.mark.parametrize("formula", NUMBERS)
def test_sources_of_shipped_lists(formula: str) -> None:
    """Every level and band names a source that the file explains, and no explanation is left over."""
    with (data_folder("linelists") / f"{formula}.toml").open("rb") as file:
        table = tomllib.load(file)
    rows = [row for part in table["part"] for s in part["species"] for row in s["levels"] + s["bands"]]
    assert {row[-1] for row in rows} <= set(table["sources"])


def test_carbon_dioxide_spin_statistics() -> None:
    """16O12C16O: its ground state has even J only; 16O12C18O has all (nuclear spin 0, Bose statistics)."""
    lines = linear_lines(_shipped("CO2"), 2)
    ground = lines.where(lines.lower_global == "0 0 0 01".rjust(15))
    j = np.array([int(label[6:9]) for label in ground.lower_local])
    assert np.all(j[ground.isotopologue == 1] % 2 == 0)
    assert set(np.unique(j[ground.isotopologue == 3] % 2)) == {0, 1}


def test_acetylene_spin_statistics() -> None:
    """H12C12CH: odd J three times even J in the ground state (two protons, Fermi statistics)."""
    lines = linear_lines(_shipped("C2H2"), 26)
    up, j = _chosen(lines, "0 0 0 0 1 1  u", "0 0 0 0 0 0+ g", "R")
    smooth = up.intensity_cm / relative_intensity(up.wavenumber_per_cm, up.lower_energy_per_cm)
    smooth /= honl_london(1, j, np.zeros(j.size), np.ones(j.size))
    ratio = smooth[1:30:2] / np.sqrt(smooth[0:29:2] * smooth[2:31:2])
    assert np.allclose(ratio, 3.0, rtol=1e-3)


@pytest.mark.parametrize(
    ("formula", "hot", "cold", "degeneracy"),
    [
        ("CO2", ("0 1 1 11", "0 1 1 01"), ("0 0 0 11", "0 0 0 01"), 2.0),
        ("N2O", ("0 1 1 1", "0 1 1 0"), ("0 0 0 1", "0 0 0 0"), 2.0),
        ("HCN", ("1 1 1 0", "0 1 1 0"), ("1 0 0 0", "0 0 0 0"), 2.0),
        ("OCS", ("0 1 1 1", "0 1 1 0"), ("0 0 0 1", "0 0 0 0"), 2.0),
    ],
)
def test_hot_bands_follow_boltzmann(
    formula: str, hot: tuple[str, str], cold: tuple[str, str], degeneracy: float
) -> None:
    """A stretch on top of one bending quantum: 2 exp(-c2 E/T) of the cold band, within 5 % (anharmonicity)."""
    species = _shipped(formula)["species"][0]
    energy = {row[0]: row[3] for row in species["levels"]}[hot[1]]

    def total(band: tuple[str, str]) -> float:
        return sum(row[3] for row in species["bands"] if tuple(row[:2]) == band)

    expected = degeneracy * np.exp(-C2_CM_K * energy / 296.0)
    assert total(hot) / total(cold) == pytest.approx(expected, rel=0.05)
