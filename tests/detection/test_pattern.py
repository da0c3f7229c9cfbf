"""Joint information of several gases: against single gases, brute force, and what theory says of it."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.pattern import pattern_bits
from planner.detection.worth import Channel, Occurrence, Response, entropy_bits, worth

LOG_X = np.log(np.logspace(-9, -2, 8))
PRIOR = 0.3


def channel(scale):
    return Channel.make(Response(ln_mixing_ratio=LOG_X, snr=scale * np.log1p(np.exp(LOG_X) / 1e-6)), 1e-9, 1e-2)


def occurrence(probability, low=3e-7, high=1e-2):
    return Occurrence(probability=probability, lowest=low, highest=high)


MODEST = (channel(1.0), occurrence(0.7), occurrence(0.3, 1e-8, 1e-4))
TELLING = (channel(0.8), occurrence(0.4), occurrence(0.02))
EITHER = (channel(2.0), occurrence(0.9), occurrence(0.9))


def single(member):
    return float(worth(*member, PRIOR, 5.0).amplitude_bits)


@pytest.mark.parametrize("member", [MODEST, TELLING])
def test_pattern_of_one_is_the_gas_by_itself(member):
    """Drawn observations give what the quadrature gives, within three standard errors; nothing is left without it."""
    found = pattern_bits([member], np.eye(1), PRIOR, np.random.default_rng(1), draws=20_000)
    assert found.bits == pytest.approx(single(member), abs=3 * found.error + 1e-3)
    assert found.without == (0.0,)


@pytest.mark.parametrize("correlation", [0.0, 0.6])
def test_pair_against_brute_force(correlation):
    """Two correlated amplitudes of simulated worlds, their information read off a two-dimensional histogram."""
    rng, draws, matrix = np.random.default_rng(5), 2_000_000, np.array([[1, correlation], [correlation, 1]])
    found = pattern_bits([MODEST, TELLING], matrix, PRIOR, rng, draws=8000)
    true = rng.random(draws) < PRIOR
    amplitudes = np.zeros((draws, 2))
    for column, (where, *kinds) in enumerate((MODEST, TELLING)):
        curve = Response(ln_mixing_ratio=LOG_X, snr=(1.0, 0.8)[column] * np.log1p(np.exp(LOG_X) / 1e-6))
        assert where.snr.max() == pytest.approx(curve(LOG_X[-1:])[0], rel=0.05)
        for kind, worlds in zip(kinds, (true, ~true), strict=True):
            count = int(worlds.sum())
            ln_x = rng.uniform(np.log(kind.lowest), np.log(kind.highest), count)
            amplitudes[worlds, column] = np.where(rng.random(count) < kind.probability, curve(ln_x), 0.0)
    v = amplitudes @ matrix + rng.standard_normal((draws, 2)) @ np.linalg.cholesky(matrix).T
    edges = np.arange(-6, 24, 0.7)
    joint = np.array([np.histogram2d(*v[worlds].T, bins=[edges, edges])[0] for worlds in (true, ~true)]) / draws
    kept = joint > 0
    product = joint.sum(axis=(1, 2), keepdims=True) * joint.sum(axis=0)
    brute = np.sum(joint[kept] * np.log2(joint[kept] / product[kept]))
    assert found.bits == pytest.approx(brute, abs=3 * found.error + 0.02 * brute)


def test_gas_that_is_alike_either_way_can_be_dropped():
    """Uncorrelated with the rest it adds nothing."""
    found = pattern_bits([MODEST, EITHER], np.eye(2), PRIOR, np.random.default_rng(1))
    assert found.without[1] == pytest.approx(found.bits, abs=1e-9)
    assert found.without[0] == pytest.approx(0, abs=1e-9)


def test_gas_that_is_alike_either_way_helps_where_it_confuses():
    """With the same bands as a telling gas, knowing its amplitude matters: left free it blurs the other."""
    blurred = np.array([[1, 0.95], [0.95, 1]])
    found = pattern_bits([MODEST, EITHER], blurred, PRIOR, np.random.default_rng(1))
    assert found.without[1] < 0.9 * found.bits


def test_modest_gases_together_beat_a_stronger_one():
    """Three gases exceed one that is worth more than any of them, and none exceeds what there is to learn."""
    modest = [MODEST, TELLING, (channel(0.6), occurrence(0.5), occurrence(0.1))]
    strong = (channel(8.0), occurrence(0.75, 1e-5), occurrence(0.15, 1e-5))
    found = pattern_bits(modest, np.eye(3), PRIOR, np.random.default_rng(1))
    assert max(map(single, modest)) < single(strong) < found.bits < entropy_bits(PRIOR)


def test_absence_is_evidence():
    """A gas that only lifeless worlds have (as CO beside methane) adds bits by not being seen."""
    lifeless = (channel(3.0), occurrence(0.1), occurrence(0.7))
    found = pattern_bits([MODEST, lifeless], np.eye(2), PRIOR, np.random.default_rng(1))
    assert found.bits > found.without[1] + 0.1


def test_four_alike_are_cut_at_the_weakest_link():
    """Groups larger than three are treated in parts, and the information stays finite and above its members'."""
    matrix = np.full((4, 4), 0.3) + 0.7 * np.eye(4)
    found = pattern_bits([MODEST, TELLING, EITHER, MODEST], matrix, PRIOR, np.random.default_rng(1), draws=500)
    assert single(MODEST) < found.bits < entropy_bits(PRIOR)
