"""Lines of asymmetric tops: sums, spin statistics, factors, widths, merging, and what bad input gets."""

from __future__ import annotations

import copy
import tomllib

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lists.asymmetric import asymmetric_lines
from planner.spectroscopy.lists.asymmetric_parts import parse_asymmetric_part

FORMULAS = {"H2O": 1, "O3": 3, "SO2": 9, "NO2": 10, "H2S": 31, "H2CO": 20, "C2H4": 38, "HNO3": 12}
C2_CM_K = 1.438776877


def small_part(**changes):
    """A made-up molecule with three states, one band, and one coupled pair."""
    part = {
        "kind": "asymmetric",
        "isotopologue": 1,
        "cut_cm": 1e-32,
        "spin_weights": [1, 3, 3, 1],
        "width_j_scale": 6.0,
        "air_width": [0.07, 0.02, 0.01, 0.005],
        "self_width": [0.3, 0.1, 0.0, 0.0],
        "air_exponent": [0.7, 0.0, 0.0, 0.0],
        "distortion": {"none": [], "some": [0.0, 1e-4, -3e-4, 1e-3]},
        "states": {
            "000": [0.0, 10.4, 9.0, 4.7, "some", "made up"],
            "010": [1180.0, 10.7, 9.2, 4.67, "some", "made up"],
            "100": [2600.0, 10.2, 8.9, 4.6, "none", "made up"],
            "001": [2630.0, 10.2, 8.8, 4.6, "none", "made up"],
        },
        "bands": [["010", "000", "b", 8e-20, 9, [], "made up"]],
        "coupled": [
            {
                "states": ["100", "001"],
                "lower": "000",
                "sum_cm": 3e-20,
                "j_max": 8,
                "couplings": [["100", "001", "c", 0.3]],
                "moments": {"100": ["b", 0.7], "001": ["a", 1.0]},
            }
        ],
    }
    return copy.deepcopy(part) | changes


def lines_of(**changes):
    """Lines of the made-up molecule."""
    return asymmetric_lines(small_part(**changes), 31)


def columns(lines):
    """J, Ka, Kc of the upper and lower levels, shape (line, 6)."""
    texts = [f"{u} {low}" for u, low in zip(lines.upper_local, lines.lower_local, strict=True)]
    return np.array([text.split() for text in texts], dtype=int)


def test_sums():
    """Every band and every coupled set has its stated sum."""
    lines = lines_of()
    bending = lines.upper_global == "010"
    assert lines.intensity_cm[bending].sum() == pytest.approx(8e-20)
    assert lines.intensity_cm[~bending].sum() == pytest.approx(3e-20)
    assert set(lines.upper_global) == {"010", "100", "001"}


@pytest.mark.parametrize(("axis", "parities"), [("a", (0, 1)), ("b", (1, 1)), ("c", (1, 0))])
def test_selection_rules(axis, parities):
    """An a band changes the parity of Kc, a b band of Ka and Kc, a c band of Ka; J changes by one at most."""
    quantum = columns(lines_of(bands=[["010", "000", axis, 1e-20, 6, [], ""]], coupled=[]))
    assert set(np.unique(quantum[:, 0] - quantum[:, 3])) == {-1, 0, 1}
    for place, parity in zip((1, 2), parities, strict=True):
        assert np.all((quantum[:, place] - quantum[:, place + 3]) % 2 == parity)


def test_energies_close_cycles():
    """Wavenumber plus lower energy depends on the upper level alone: lines that share it agree."""
    lines = lines_of()
    upper: dict[str, list[float]] = {}
    for name, local, energy in zip(
        lines.upper_global, lines.upper_local, lines.wavenumber_per_cm + lines.lower_energy_per_cm, strict=True
    ):
        upper.setdefault(f"{name} {local}", []).append(energy)
    shared = [energies for energies in upper.values() if len(energies) > 1]
    assert len(shared) > 100
    assert max(np.ptp(energies) for energies in shared) < 1e-9


def test_spin_weights():
    """Doubling the weights of odd levels doubles the share of their lines exactly."""
    shares = []
    for weights in ([1, 1, 1, 1], [1, 2, 2, 1]):
        lines = lines_of(spin_weights=weights, coupled=[])
        odd = columns(lines)[:, 4:].sum(axis=1) % 2 == 1
        shares.append(lines.intensity_cm[odd].sum() / lines.intensity_cm[~odd].sum())
    assert shares[1] / shares[0] == pytest.approx(2.0, rel=1e-12)


def test_spin_weights_antisymmetric():
    """A lower state that is antisymmetric to the exchange takes its own weights."""
    band = {"bands": [["100", "010", "a", 1e-22, 6, [], ""]], "coupled": []}
    usual = lines_of(**band, spin_weights=[1, 0, 0, 1])
    swapped = lines_of(
        **band, spin_weights=[1, 0, 0, 1], spin_weights_antisymmetric=[0, 1, 1, 0], antisymmetric_states=["010"]
    )
    strong = [lines.where(lines.intensity_cm > 0) for lines in (usual, swapped)]
    assert [set(columns(lines)[:, 4:].sum(axis=1) % 2) for lines in strong] == [{0}, {1}]


def test_boltzmann():
    """The same transition seen from a hotter ground state loses exp(-c2 E/T), stimulated emission aside."""
    states = small_part()["states"] | {
        "hot": [500.0, 10.4, 9.0, 4.7, "some", ""],
        "up": [1680.0, *small_part()["states"]["010"][1:]],
    }
    both = lines_of(
        states=states, bands=[["010", "000", "b", 1e-20, 6, [], ""], ["up", "hot", "b", 1e-20, 6, [], ""]], coupled=[]
    )
    cold, hot = (both.where(both.lower_global == name) for name in ("000", "hot"))
    np.testing.assert_allclose(cold.wavenumber_per_cm, hot.wavenumber_per_cm)
    np.testing.assert_allclose(cold.intensity_cm, hot.intensity_cm, rtol=1e-9)  # both scaled to one sum
    np.testing.assert_allclose(hot.lower_energy_per_cm - cold.lower_energy_per_cm, 500.0)


def test_intensity_ratio():
    """R(0) over P(1) of an a band: known strengths, weights, populations, wavenumbers and emission factors."""
    lines = lines_of(bands=[["100", "000", "a", 1e-20, 3, [], ""]], coupled=[], spin_weights=[1, 1, 1, 1])
    quantum = [tuple(row) for row in columns(lines)]
    up, down = (quantum.index(key) for key in ((1, 0, 1, 0, 0, 0), (0, 0, 0, 1, 0, 1)))
    nu, energy = lines.wavenumber_per_cm, lines.lower_energy_per_cm
    weight = nu * np.exp(-C2_CM_K * energy / 296) * -np.expm1(-C2_CM_K * nu / 296)
    assert lines.intensity_cm[up] / lines.intensity_cm[down] == pytest.approx(weight[up] / weight[down], rel=1e-9)


def test_factor_in_m():
    """m1 multiplies amplitudes by 1 + m1 m exactly, whatever the mixing of K."""
    plain, tilted = (
        lines_of(bands=[["010", "000", "b", 1e-20, 8, factors, ""]], coupled=[]) for factors in ([], [0.02])
    )
    quantum = columns(plain)
    j_up, j_low = quantum[:, 0], quantum[:, 3]
    m = np.where(j_up > j_low, j_low + 1, np.where(j_up < j_low, -j_low, 0))
    ratio = tilted.intensity_cm / plain.intensity_cm
    np.testing.assert_allclose(ratio / (1 + 0.02 * m) ** 2, ratio[m == 0][0])


def test_factor_in_k():
    """In the symmetric-top limit m2 multiplies a b line by 1 + m2 (K'^2 - K^2)."""
    states = {name: [g, 10.0, 2.0, 2.0 - 1e-9, "none", ""] for name, g in (("000", 0.0), ("010", 1000.0))}
    plain, tilted = (
        lines_of(states=states, bands=[["010", "000", "b", 1e-20, 6, factors, ""]], coupled=[])
        for factors in ([], [0, 0.03])
    )
    k = columns(plain)[:, [1, 4]]
    factor = (1 + 0.03 * (k[:, 0] ** 2 - k[:, 1] ** 2)) ** 2
    ratio = tilted.intensity_cm / plain.intensity_cm / factor
    np.testing.assert_allclose(ratio, ratio[0], rtol=1e-6)


def test_coupled_without_coupling():
    """A coupled set whose coupling vanishes is the sum of its bands."""
    coupled = small_part()["coupled"][0] | {"couplings": [["100", "001", "c", 1e-12]], "sum_cm": 1.0}
    lines = lines_of(bands=[], coupled=[coupled])
    for name, axis in (("100", "b"), ("001", "a")):
        alone = lines_of(bands=[[name, "000", axis, 1.0, 8, [], ""]], coupled=[])
        share = lines.where(lines.upper_global == name)
        np.testing.assert_allclose(share.wavenumber_per_cm, alone.wavenumber_per_cm, atol=1e-8)
        np.testing.assert_allclose(share.intensity_cm / share.intensity_cm.sum(), alone.intensity_cm, atol=1e-9)


def test_coupled_order():
    """Naming the states in the other order, with the transposed coupling, changes nothing."""
    table = small_part()["coupled"][0]
    swapped = table | {"states": ["001", "100"], "moments": dict(reversed(table["moments"].items()))}
    one, other = (lines_of(bands=[], coupled=[t]) for t in (table, swapped))
    np.testing.assert_allclose(one.wavenumber_per_cm, other.wavenumber_per_cm, atol=1e-9)
    np.testing.assert_allclose(one.intensity_cm, other.intensity_cm, rtol=1e-6, atol=1e-30)


def test_coupled_keep():
    """Limits on K_a and on intensity hold for the state they name."""
    table = small_part()["coupled"][0] | {"keep": {"100": [3, 1e-24]}}
    lines = lines_of(bands=[], coupled=[table])
    free = lines_of(bands=[])
    named = lines.upper_global == "100"
    assert columns(lines)[named, 1].max() == 3
    assert lines.intensity_cm[named].min() >= 1e-24
    assert (~named).sum() == (free.upper_global == "001").sum()


def test_pure_rotation():
    """A band of a state with itself holds each transition once, at positive wavenumbers, from the lower level."""
    lines = lines_of(bands=[["000", "000", "b", 1e-18, 8, [], ""]], coupled=[])
    quantum = columns(lines)
    pairs = {frozenset((tuple(row[:3]), tuple(row[3:]))) for row in quantum.tolist()}
    assert len(pairs) == len(lines)
    assert lines.wavenumber_per_cm.min() > 0


def test_cut():
    """The cut drops weak lines and nothing else: only so many that each band keeps 99 % of its sum."""
    full, cut = lines_of(), lines_of(cut_cm=1e-23)
    assert len(cut) < len(full)
    for band in np.unique(full.upper_global):
        all_of, left = (np.sort(x.intensity_cm[x.upper_global == band])[::-1] for x in (full, cut))
        np.testing.assert_allclose(left, all_of[: left.size])
        assert left.size >= np.sum(all_of >= 1e-23)


def test_merge():
    """Merging unresolved doublets keeps the sum and halves the lines of a near-symmetric top."""
    states = {name: [g, 10.37, 2.0, 2.0 - 1e-12, "none", ""] for name, g in (("000", 0.0), ("010", 1000.0))}
    changes = {"states": states, "bands": [["010", "000", "a", 1e-20, 9, [], ""]], "coupled": []}
    full, merged = lines_of(**changes), lines_of(**changes, merge_per_cm=1e-6)
    assert merged.intensity_cm.sum() == pytest.approx(full.intensity_cm.sum())
    k_zero = (columns(full)[:, 4] == 0).sum()
    assert len(merged) - k_zero == (len(full) - k_zero) / 2


def test_spin_doublets():
    """Each line becomes two that keep its intensity and its centre; they lie apart as the levels of N +- 1/2 do."""
    states = {name: [g, 8.0, 0.43, 0.43 - 1e-9, "none", ""] for name, g in (("000", 0.0), ("010", 1600.0))}
    changes = {"states": states, "bands": [["010", "000", "a", 1e-18, 9, [], ""]], "coupled": []}
    single = lines_of(**changes)
    double = lines_of(**changes, spin_rotation_per_cm=[0.18, -0.003, -0.003])
    assert double.intensity_cm.sum() == pytest.approx(single.intensity_cm.sum())
    quantum = columns(double)
    pick = np.all(quantum == [5, 2, 4, 4, 2, 3], axis=1)
    split = [0.5 * (0.18 * 4 - 0.003 * (n * (n + 1) - 4)) * (1 / (n + 1) + 1 / n) for n in (5, 4)]
    assert pick.sum() == 2
    assert np.ptp(double.wavenumber_per_cm[pick]) == pytest.approx(abs(split[0] - split[1]), rel=1e-6)
    assert np.ptp(double.lower_energy_per_cm[pick]) == pytest.approx(split[1], rel=1e-6)
    assert np.sort(double.intensity_cm[pick] / double.intensity_cm[pick].sum()) == pytest.approx([4 / 9, 5 / 9])


def test_widths():
    """Widths follow four numbers, J being the larger of both and K_a the upper one, or six with means of both."""
    lines = lines_of(coupled=[])
    quantum = columns(lines)
    decay = np.exp(-np.maximum(quantum[:, 0], quantum[:, 3]) / 6.0)
    k = quantum[:, 1] / 10
    np.testing.assert_allclose(lines.air_width_per_cm_atm, 0.07 + 0.02 * decay + 0.01 * k + 0.005 * decay * k)
    np.testing.assert_allclose(lines.self_width_per_cm_atm, 0.3 + 0.1 * decay)
    np.testing.assert_allclose(lines.temperature_exponent, 0.7)
    j, k = quantum[:, [0, 3]].mean(axis=1), quantum[:, [1, 4]].mean(axis=1)
    other = lines_of(coupled=[], air_width=[-2.1, -0.06, -0.008, -0.04, -0.04, 0.03])
    expected = np.exp(-2.1 - 0.06 * j - 0.008 * j**2 - 0.04 * k - 0.04 * k**2 + 0.03 * j * k)
    np.testing.assert_allclose(other.air_width_per_cm_atm, np.maximum(expected, 0.01))
    assert lines_of(air_width=[-1.0, 0, 0, 0]).air_width_per_cm_atm.max() == pytest.approx(0.01)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"colour": "blue"}, "unknown keys \\['colour'\\]"),
        ({"air_width": [0.1, 0.0]}, "air_width: expected 4 or 6 finite numbers, got \\[0.1, 0.0\\]"),
        ({"spin_weights": [1, 3, 3, float("nan")]}, "spin_weights: expected 4 finite numbers"),
        ({"antisymmetric_states": ["010"]}, "antisymmetric_states needs spin_weights_antisymmetric"),
        ({"states": {"000": [0.0, 1.0]}}, "state '000': expected \\[origin, A, B, C"),
        ({"states": {"000": [0.0, 3.0, 2.0, 1.0, "missing", ""]}}, "state '000': .*KeyError"),
        ({"distortion": {"none": [0.0] * 14, "some": []}}, "more than 13 numbers"),
        ({"bands": [["010", "000", "d", 1e-20, 5, [], ""]]}, "band: expected \\[upper, lower, axis"),
        ({"bands": [["010", "000", "b", 1e-20, 5, [0] * 6, ""]]}, "more than 6 factors"),
        ({"bands": [["020", "000", "b", 1e-20, 5, [], ""]]}, "020 <- 000: state '020' is not among the states"),
        ({"bands": [["000", "010", "b", 1e-20, 5, [], ""]]}, "no line has a positive wavenumber"),
    ],
)
def test_part_invalid(changes, message):
    """Messages name the molecule, the row, what was expected and what came."""
    with pytest.raises(LineDataError, match=message):
        lines_of(**changes)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"couplings": [["100", "002", "c", 0.1]]}, "KeyError\\('002'\\)"),
        ({"couplings": [["100", "001", "a", 0.1]]}, "axes of the moments contradict the couplings"),
        ({"keep": {"010": [3, 0.0]}}, "KeyError\\('010'\\)"),
        ({"colour": 1}, "coupled set: missing keys \\[\\], unknown keys \\['colour'\\]"),
    ],
)
def test_coupled_set_invalid(changes, message):
    """Mistakes in a coupled set are named."""
    with pytest.raises(LineDataError, match=message):
        lines_of(coupled=[small_part()["coupled"][0] | changes])


def test_part_missing_key():
    """A missing key is named."""
    part = small_part()
    del part["self_width"]
    with pytest.raises(LineDataError, match="molecule 31: missing keys \\['self_width'\\]"):
        asymmetric_lines(part, 31)


# ---- the lists that ship -------------------------------------------------------------------------------------------


def shipped_parts(formula):
    """Asymmetric parts of a shipped list."""
    table = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())
    return [part for part in table["part"] if part["kind"] == "asymmetric"], table


@pytest.mark.parametrize("formula", FORMULAS)
def test_shipped_sources(formula):
    """Every state, band and set of a shipped list names a source that the file explains, and every source is used."""
    parts, table = shipped_parts(formula)
    used = set()
    for part in parts:
        used |= {part["source"]} | {row[-1] for row in part["states"].values()}
        used |= {row[-1] for row in part.get("bands", [])} | {t["source"] for t in part.get("coupled", [])}
    other = {p.get("source") for p in table["part"] if p["kind"] != "asymmetric"}
    assert used <= set(table["sources"])
    assert set(table["sources"]) <= used | other
    assert table["covers_per_cm"] == sorted(table["covers_per_cm"])


@pytest.mark.parametrize("formula", FORMULAS)
def test_shipped_states_used(formula):
    """No state and no distortion row of a shipped list is left over."""
    for part in shipped_parts(formula)[0]:
        rotors, sets = parse_asymmetric_part(part, formula)
        assert set(rotors) == {name for band in sets for name in (*band.states, band.lower)}
        assert set(part["distortion"]) == {row[4] for row in part["states"].values()}


def test_shipped_ortho_para():
    """Water: ortho and para lines of a band stand 3:1, far above the rotational constants' temperature."""
    parts, _ = shipped_parts("H2O")
    part = parts[0] | {"coupled": [], "bands": [row for row in parts[0]["bands"] if row[:2] == ["010", "000"]]}
    part |= {"states": {name: parts[0]["states"][name] for name in ("000", "010")}}
    lines = asymmetric_lines(part, 1)
    odd = columns(lines)[:, 4:].sum(axis=1) % 2 == 1
    assert lines.intensity_cm[odd].sum() / lines.intensity_cm[~odd].sum() == pytest.approx(3.0, rel=0.02)
