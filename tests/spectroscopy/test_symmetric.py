"""Symmetric tops: rigid lines by hand, intensity factors, spin weights, the coupled pair."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.lists.angular import clebsch_gordan
from planner.spectroscopy.lists.intensities import C2_CM_K, relative_intensity
from planner.spectroscopy.lists.symmetric import symmetric_lines
from planner.spectroscopy.lists.symmetric_levels import CoupledPair, TopLevel, pair_blocks

PHOSPHINE = 28
B, C = 4.5, 3.9


def part(**changes):
    """A rigid XY3 top with one parallel and one perpendicular band."""
    return {
        "isotopologue": 1,
        "largest": [12, 12],
        "weakest_cm": 0.0,
        "width_j_scale": 8.0,
        "air_width": [0.05, 0.03, 0.01, 0.0],
        "self_width": [0.1, 0.0, 0.0, 0.0],
        "air_exponent": [0.6, 0.0, 0.0, 0.0],
        "weights": {"w": [4, 4, 8, 4]},
        "levels": [
            ["0", "w", [0.0, B, C - B], [], "x"],
            ["v1", "w", [1000.0, B, C - B], [], "x"],
            ["v4", "w", [1500.0, B, C - B], [-1.5], "x"],
        ],
        "bands": [
            ["v1", "0", "parallel", 1e-18, [], False, "x"],
            ["v4", "0", "perpendicular", 2e-18, [], False, "x"],
        ],
    } | changes


def band(lines, name):
    """Lines of one upper level, with J and K of the lower one."""
    here = lines.where(np.char.strip(lines.upper_global) == name)
    j, k = np.array([[int(x[:3]), int(x[3:6])] for x in here.lower_local]).T
    return here, j, k


def test_sum_over_upper_levels():
    """From any J, k the squared coefficients to all J' add to one, for each step of k."""
    for k_step in (-1, 0, 1):
        for j in range(1, 8):
            for k in range(-j, j + 1):
                total = sum(clebsch_gordan(j, k, j_step, k_step) ** 2 for j_step in (-1, 0, 1))
                assert total == pytest.approx(1.0)


def test_honl_london_factors():
    """Against the factors of Hoenl and London (e.g. Herzberg 1945), written for absorption."""
    j, k = 7, 3
    r_parallel = ((j + 1) ** 2 - k**2) / ((j + 1) * (2 * j + 1))
    q_parallel = k**2 / (j * (j + 1))
    p_parallel = (j**2 - k**2) / (j * (2 * j + 1))
    assert [clebsch_gordan(j, k, s, 0) ** 2 for s in (1, 0, -1)] == pytest.approx([r_parallel, q_parallel, p_parallel])
    for up in (1, -1):
        r = (j + 2 + up * k) * (j + 1 + up * k) / ((j + 1) * (2 * j + 1)) / 2
        q = (j + 1 + up * k) * (j - up * k) / (j * (j + 1)) / 2
        p = (j - 1 - up * k) * (j - up * k) / (j * (2 * j + 1)) / 2
        assert [clebsch_gordan(j, k, s, up) ** 2 for s in (1, 0, -1)] == pytest.approx([r, q, p])


def test_parallel_band_by_hand():
    """With equal constants Q lines pile up at the origin and R and P lines are 2B(J+1) and -2BJ away, for any K."""
    lines, j, _ = band(symmetric_lines(part(), PHOSPHINE), "v1")
    step = lines.wavenumber_per_cm - 1000.0
    expected = np.where(np.abs(step) < 1e-6, 0.0, np.where(step > 0, 2 * B * (j + 1), -2 * B * j))
    assert step == pytest.approx(expected, abs=1e-9)


def test_perpendicular_band_by_hand():
    """Q branches of the sub-bands lie at C - B - 2 C zeta +- 2 K (C - C zeta - B) from the origin."""
    lines, j, k = band(symmetric_lines(part(), PHOSPHINE), "v4")
    c_zeta = -1.5
    for j_low, k_low in ((5, 0), (5, 2), (5, 4)):
        here = lines.wavenumber_per_cm[(j == j_low) & (k == k_low)] - 1500.0
        start = C - B - 2 * c_zeta
        for sign in (1, -1):
            centre = start + sign * 2 * k_low * (C - B - c_zeta)
            for shift in (0.0, 2 * B * (j_low + 1), -2 * B * j_low):
                if abs(k_low + sign) <= j_low - 1 or shift >= 0:
                    assert np.abs(here - centre - shift).min() < 1e-9


def test_sums():
    """Each band has its stated sum, with and without a cut."""
    for weakest in (0.0, 3e-21):
        lines = symmetric_lines(part(weakest_cm=weakest), PHOSPHINE)
        assert band(lines, "v1")[0].intensity_cm.sum() == pytest.approx(1e-18, rel=1e-9)
        assert band(lines, "v4")[0].intensity_cm.sum() == pytest.approx(2e-18, rel=1e-9)
    assert lines.intensity_cm.min() > 1e-22


def test_spin_weights_of_threes():
    """Freed of everything else, lines from K = 3, 6, ... are twice as strong as all others, K = 0 included."""
    lines, j, k = band(symmetric_lines(part(), PHOSPHINE), "v1")
    j_step = np.sign(np.round(lines.wavenumber_per_cm - 1000.0, 6)).astype(int)
    factor = np.array([clebsch_gordan(a, b, s, 0) ** 2 for a, b, s in zip(j, k, j_step, strict=True)])
    rest = factor * (2 * j + 1) * relative_intensity(lines.wavenumber_per_cm, lines.lower_energy_per_cm)
    weight = lines.intensity_cm / rest
    weight /= weight[(k == 1)][0]
    assert weight == pytest.approx(np.where(k == 0, 1.0, np.where(k % 3 == 0, 2.0, 1.0)))


def test_inversion_drops_half_of_k_zero():
    """Where only odd J exist in K = 0 no line starts from an even one."""
    _, j, k = band(symmetric_lines(part(weights={"w": [0, 4, 4, 2]}), PHOSPHINE), "v1")
    assert set(j[k == 0] % 2) == {1}
    assert set(j[k == 3] % 2) == {0, 1}


def test_herman_wallis():
    """h1 multiplies amplitudes by 1 + h1 m, m = J+1 in R and -J in P branches."""
    plain, bent = (
        band(symmetric_lines(part(bands=[["v1", "0", "parallel", 1e-18, h, False, "x"]]), PHOSPHINE), "v1")[0]
        for h in ([], [0.01, 0.0])
    )
    m = np.round((plain.wavenumber_per_cm - 1000.0) / (2 * B))
    ratio = bent.intensity_cm / plain.intensity_cm / (1 + 0.01 * m) ** 2
    assert ratio == pytest.approx(ratio[0])


def test_hot_copies():
    """A hot copy is the band displaced, weaker by degeneracy and Boltzmann factor, doubled for 2v - v."""
    rows = [["v1", 1000.0, 1, -7.0, 1.0], ["v4", 1500.0, 2, -3.0, 0.5]]
    lines = symmetric_lines(part(hot=rows, bands=[["v1", "0", "parallel", 1e-18, [], True, "x"]]), PHOSPHINE)
    cold, first, second = (band(lines, name)[0] for name in ("v1", "v1+v1", "v1+v4"))
    assert first.wavenumber_per_cm == pytest.approx(cold.wavenumber_per_cm - 7.0)
    assert first.lower_energy_per_cm == pytest.approx(cold.lower_energy_per_cm + 1000.0)
    assert first.intensity_cm.sum() == pytest.approx(2e-18 * np.exp(-C2_CM_K * 1000.0 / 296.0))
    assert second.intensity_cm.sum() == pytest.approx(1e-18 * np.exp(-C2_CM_K * 1500.0 / 296.0))


def test_distortion():
    """Quartic constants of the first level serve levels that give none; sextic ones are zero there."""
    level = TopLevel(
        name="x",
        weights="w",
        constants=np.array([0, 4, -0.5, 1e-4, -2e-4, 3e-4, 1e-8, 2e-8, 3e-8, 4e-8]),
        l_terms=np.zeros(3),
    )
    x, k2 = 5 * 6.0, 4.0
    by_hand = 4 * x - 0.5 * k2 - 1e-4 * x**2 + 2e-4 * x * k2 - 3e-4 * k2**2
    by_hand += 1e-8 * x**3 + 2e-8 * x**2 * k2 + 3e-8 * x * k2**2 + 4e-8 * k2**3
    assert level.energy_per_cm(5, 2) == pytest.approx(by_hand)
    rows = [
        ["0", "w", [0.0, B, C - B, 1e-4, 0.0, 0.0, 1e-9], [], "x"],
    ]
    with pytest.raises(LineDataError, match="expected 3, 6 or 10 constants, got 7"):
        symmetric_lines(part(levels=rows), PHOSPHINE)


def pair(**changes):
    """A coupled pair with every constant in use."""
    constants = [990.0, 4.45, -0.51, 1e-4, -1.6e-4, 1.4e-4, 0, 0, 0, 0]
    numbers = {
        "a1": TopLevel(name="a", weights="w", constants=np.array(constants), l_terms=np.zeros(3)),
        "e": TopLevel(
            name="e", weights="w", constants=np.array([1118.0, *constants[1:]]), l_terms=np.array([-1.75, -1e-4, 2e-4])
        ),
        "coupling": np.array([-3.3, -0.013]),
        "doubling": 0.02,
    } | changes
    return CoupledPair(**numbers)


def dense_pair(p: CoupledPair, j: int) -> np.ndarray:
    """All 3(2J+1) functions A, E+, E- of one J in a single matrix, element by element."""
    size = 2 * j + 1
    matrix = np.zeros((3 * size, 3 * size))
    c, c_k = p.coupling

    def at(kind: int, k: int) -> int:
        return kind * size + k + j

    def ladder(k: int) -> float:
        return np.sqrt(j * (j + 1) - k * (k + 1))

    for k in range(-j, j + 1):
        matrix[at(0, k), at(0, k)] = p.a1.energy_per_cm(j, k)
        matrix[at(1, k), at(1, k)] = p.e.energy_per_cm(j, k, 1)
        matrix[at(2, k), at(2, k)] = p.e.energy_per_cm(j, k, -1)
        if k < j:
            matrix[at(1, k + 1), at(0, k)] = matrix[at(0, k), at(1, k + 1)] = (c + c_k * (2 * k + 1)) * ladder(k)
        if k > -j:
            value = -(c - c_k * (2 * k - 1)) * ladder(k - 1)
            matrix[at(2, k - 1), at(0, k)] = matrix[at(0, k), at(2, k - 1)] = value
        if -j < k < j:
            value = p.doubling / 2 * ladder(k) * ladder(k - 1)
            matrix[at(1, k + 1), at(2, k - 1)] = matrix[at(2, k - 1), at(1, k + 1)] = value
    return matrix


@pytest.mark.parametrize("j", [0, 1, 2, 7])
def test_pair_blocks_against_dense_matrix(j):
    """The blocks of three hold all levels of the full matrix, which has no other elements."""
    p = pair()
    g = np.arange(-j - 1, j + 2)
    energies, _ = pair_blocks(p, np.full(g.size, j), g)
    # functions with |k| > J do not exist; in the blocks they stand uncoupled
    ghosts = [p.a1.energy_per_cm(j, s * (j + 1)) for s in (1, -1)]
    ghosts += [p.e.energy_per_cm(j, s * (j + beyond), s) for s in (1, -1) for beyond in (1, 2)]
    expected = np.sort(np.concatenate([np.linalg.eigvalsh(dense_pair(p, j)), ghosts]))
    assert np.sort(energies.ravel()) == pytest.approx(expected, abs=1e-9)


def test_uncoupled_pair_is_two_bands():
    """Without coupling the pair gives the lines of a parallel and a perpendicular band."""
    table = {
        "source": "x",
        "a1": "v1",
        "e": "v4",
        "lower": "0",
        "sum_cm": 3e-18,
        "coupling": [0.0, 0.0],
        "doubling": 0.0,
        "moment_ratio": 0.7,
        "herman_wallis": [],
        "hot": [],
    }
    coupled = symmetric_lines(part(bands=[], coupled=[table]), PHOSPHINE)
    plain = symmetric_lines(part(), PHOSPHINE)
    assert coupled.intensity_cm.sum() == pytest.approx(3e-18)
    for lines in (coupled, plain):
        assert np.all(lines.intensity_cm > 0)
    assert np.unique(np.round(coupled.wavenumber_per_cm, 6)) == pytest.approx(
        np.unique(np.round(plain.wavenumber_per_cm, 6))
    )


def test_only_the_sign_of_coupling_over_moments_counts():
    """Turning the phase of the A1 state, that is both the coupling and its moment, changes nothing measurable."""
    p = pair()
    turned = pair(coupling=-p.coupling)
    j, g = np.full(9, 4), np.arange(-4, 5)
    energies, vectors = pair_blocks(p, j, g)
    again, mirrored = pair_blocks(turned, j, g)
    moment = np.array([0.9, 0.4, -0.5])
    strength = np.einsum("i,bis->bs", moment, vectors) ** 2
    same = np.einsum("i,bis->bs", moment * [-1, 1, 1], mirrored) ** 2
    assert again == pytest.approx(energies)
    assert same == pytest.approx(strength)


def test_coupling_moves_intensity_between_the_states():
    """The two signs of the Coriolis force act oppositely on the lines between the two origins."""

    def inner_share(coupling: float) -> float:
        table = {
            "source": "x", "a1": "v1", "e": "v4", "lower": "0", "sum_cm": 1e-18, "coupling": [coupling, 0.0],
            "doubling": 0.0, "moment_ratio": 1.0, "herman_wallis": [], "hot": [],
        }  # fmt: skip
        lines = symmetric_lines(part(bands=[], coupled=[table]), PHOSPHINE)
        inner = (lines.wavenumber_per_cm > 1001.0) & (lines.wavenumber_per_cm < 1500.0)
        return float(lines.intensity_cm[inner].sum() / lines.intensity_cm.sum())

    assert inner_share(-4.0) > inner_share(0.0) + 0.01
    assert inner_share(4.0) < inner_share(0.0) - 0.01


def test_satellites_are_part_of_the_sum():
    """Companions are made before the cut, and the band keeps its sum."""
    tables = [{"fraction": 0.1, "count": 2, "spread_per_cm": 3.0, "seed": 4}]
    lines = symmetric_lines(part(satellites=tables, weakest_cm=1e-23), PHOSPHINE)
    assert lines.intensity_cm.sum() == pytest.approx(3e-18, rel=1e-9)


def test_widths_follow_j_and_k():
    """a + b exp(-J/scale) + c K/10."""
    lines, j, k = band(symmetric_lines(part(), PHOSPHINE), "v1")
    assert lines.air_width_per_cm_atm == pytest.approx(0.05 + 0.03 * np.exp(-j / 8.0) + 0.001 * k)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"levels": [["0", "w", [0.0, B, C - B], []]]}, "expected five columns"),
        ({"bands": [["v9", "0", "parallel", 1e-18, [], False, "x"]]}, "no level 'v9'"),
        ({"bands": [["v1", "0", "sideways", 1e-18, [], False, "x"]]}, "parallel or perpendicular"),
        ({"bands": [["v1", "0", "parallel", 1e-18]]}, "expected upper, lower"),
    ],
)
def test_bad_rows(changes, message):
    """Rows that do not fit are named."""
    with pytest.raises(LineDataError, match=message):
        symmetric_lines(part(**changes), PHOSPHINE)
