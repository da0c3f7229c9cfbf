"""What an observation is worth: against brute force, and what theory says of it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import special

from planner.detection.worth import (
    Channel,
    Occurrence,
    Response,
    entropy_bits,
    mutual_information_bits,
    worth,
)

LOW, HIGH = 1e-9, 1e-2
LOG_X = np.log(np.logspace(-9, -2, 8))


def response(scale=1.0):
    """Thin below 1 ppm, a logarithm above."""
    return Response(ln_mixing_ratio=LOG_X, snr=scale * np.log1p(np.exp(LOG_X) / 1e-6))


def channel(scale=1.0):
    return Channel.make(response(scale), LOW, HIGH)


def occurrence(probability, low, high):
    return Occurrence(probability=probability, lowest=low, highest=high)


LIFE, NO_LIFE = occurrence(0.7, 3e-7, 1e-2), occurrence(0.3, 1e-8, 1e-4)
probabilities = st.floats(0.02, 0.98)
exponents = st.floats(-8.9, -2.1)


@st.composite
def occurrences(draw):
    ends = sorted([draw(exponents), draw(exponents)])
    return occurrence(draw(probabilities), 10 ** ends[0], 10 ** (ends[1] + 0.1))


def brute_force_bits(curve, if_true, if_false, prior, rng, threshold=None, draws=1_000_000):
    """Worlds drawn one by one, amplitudes measured, and the information read off two histograms."""
    true = rng.random(draws) < prior
    z = np.empty(draws)
    for kind, where in ((if_true, true), (if_false, ~true)):
        count = int(where.sum())
        there = rng.random(count) < kind.probability
        ln_x = rng.uniform(np.log(kind.lowest), np.log(kind.highest), count)
        z[where] = np.where(there, curve(ln_x), 0.0) + rng.standard_normal(count)
    edges = np.arange(-6, z.max() + 0.4, 0.4) if threshold is None else np.array([-np.inf, threshold, np.inf])
    counts = np.array([np.histogram(z[where], edges)[0] for where in (true, ~true)])
    joint = counts / draws
    product = joint.sum(axis=1, keepdims=True) * joint.sum(axis=0, keepdims=True)
    kept = joint > 0
    return float(np.sum(joint[kept] * np.log2(joint[kept] / product[kept])))


@pytest.mark.parametrize(("scale", "prior"), [(1.0, 0.5), (2.0, 0.1), (8.0, 0.3)])
def test_information_against_brute_force(scale, prior):
    """Quadrature and a simulation of worlds agree within 2 %, for the amplitude and for the bare detection."""
    rng = np.random.default_rng(7)
    ours = worth(channel(scale), LIFE, NO_LIFE, prior, 3.0)
    assert ours.amplitude_bits == pytest.approx(brute_force_bits(response(scale), LIFE, NO_LIFE, prior, rng), rel=0.02)
    bare = brute_force_bits(response(scale), LIFE, NO_LIFE, prior, rng, threshold=3.0)
    assert ours.detection_bits == pytest.approx(bare, rel=0.02)


def test_chance_of_detection_is_the_formula_of_the_plan():
    """q <Phi(s(x) - T)> + (1 - q) alpha, the mean taken over a million points."""
    ln_x = np.linspace(np.log(LIFE.lowest), np.log(LIFE.highest), 1_000_001)
    expected = 0.7 * special.ndtr(response(2.0)(ln_x) - 5).mean() + 0.3 * special.ndtr(-5.0)
    assert channel(2.0).chance_of_detection(LIFE, 5.0) == pytest.approx(expected, rel=1e-3)


@settings(derandomize=True, deadline=None, max_examples=30)
@given(occurrences(), occurrences(), probabilities, st.floats(0.05, 3), st.floats(1.0, 3.0))
def test_amplitude_information_never_falls_with_more_hours(if_true, if_false, prior, scale, more):
    """More light scales every expected significance up: noise could always be added back."""
    less = worth(channel(scale), if_true, if_false, prior, 5.0).amplitude_bits
    assert worth(channel(scale * more), if_true, if_false, prior, 5.0).amplitude_bits >= less - 1e-5


@settings(derandomize=True, deadline=None, max_examples=30)
@given(occurrences(), probabilities, st.floats(0.1, 20))
def test_gas_that_is_alike_either_way_is_worth_nothing(either_way, prior, scale):
    """Equal presence and range under both hypotheses: no bits, and odds that stay."""
    nothing = worth(channel(scale), either_way, either_way, prior, 5.0)
    assert nothing.amplitude_bits == pytest.approx(0, abs=1e-12)
    assert nothing.detection_bits == pytest.approx(0, abs=1e-12)
    assert nothing.after_detection == pytest.approx(prior)
    assert nothing.after_null == pytest.approx(prior)


@settings(derandomize=True, deadline=None, max_examples=30)
@given(occurrences(), occurrences(), probabilities, st.floats(0.1, 20), st.floats(0.5, 6))
def test_bare_detection_never_tells_more_than_the_amplitude(if_true, if_false, prior, scale, threshold):
    """A detection is read off the amplitude, and neither tells more than there is to learn."""
    found = worth(channel(scale), if_true, if_false, prior, threshold)
    assert found.detection_bits <= found.amplitude_bits + 1e-3 * entropy_bits(prior)
    assert found.amplitude_bits <= entropy_bits(prior) + 1e-9


def test_bare_detection_may_lose_with_more_hours():
    """Enough light detects the traces of lifeless worlds too: the amplitude still tells them apart, a bare yes less."""
    much, traces = occurrence(0.9, 3e-5, 1e-2), occurrence(0.9, 3e-7, 2e-6)
    few, many = (worth(channel(scale), much, traces, 0.5, 5.0) for scale in (3.0, 40.0))
    assert many.detection_bits < few.detection_bits
    assert many.amplitude_bits > few.amplitude_bits


def test_draws_at_once_are_the_same_as_one_by_one():
    """Arrays of opinions give what a loop gives."""
    rng = np.random.default_rng(1)
    q, low = rng.uniform(0.1, 0.9, 5), 10 ** rng.uniform(-8, -6, 5)
    prior = rng.uniform(0.1, 0.9, 5)
    together = worth(channel(2.0), Occurrence(probability=q, lowest=low, highest=100 * low), NO_LIFE_DRAWS, prior, 5.0)
    for i in range(5):
        one = worth(channel(2.0), occurrence(q[i], low[i], 100 * low[i]), NO_LIFE, float(prior[i]), 5.0)
        assert together.amplitude_bits[i] == pytest.approx(one.amplitude_bits, rel=1e-9)
        assert together.after_null[i] == pytest.approx(one.after_null, rel=1e-9)


NO_LIFE_DRAWS = Occurrence(probability=np.full(5, 0.3), lowest=np.full(5, 1e-8), highest=np.full(5, 1e-4))


def test_finer_cells_and_grid_change_nothing():
    """The default cells give a strong channel's information to 1e-3 of what a sixteen times finer sum gives."""
    strong = response(40.0)
    ln_x = {k: np.linspace(np.log(k.lowest), np.log(k.highest), 40_001) for k in (LIFE, NO_LIFE)}
    z = np.arange(-7, strong(np.array([np.log(HIGH)]))[0] + 7, 0.1)
    densities = []
    for kind, values in ln_x.items():
        counts, edges = np.histogram(strong(values), bins=20_000, density=False)
        middle = (edges[1:] + edges[:-1]) / 2
        kept = counts > 0
        kernel = np.exp(-0.5 * (z[:, None] - middle[kept]) ** 2) / np.sqrt(2 * np.pi)
        absent = np.exp(-0.5 * z**2) / np.sqrt(2 * np.pi)
        densities.append(kind.probability * kernel @ (counts[kept] / counts.sum()) + (1 - kind.probability) * absent)
    fine = mutual_information_bits(np.array(densities), np.array([0.5, 0.5]), 0.1)
    assert worth(channel(40.0), LIFE, NO_LIFE, 0.5, 5.0).amplitude_bits == pytest.approx(fine, rel=1e-3)


def test_response_goes_through_its_points_and_is_thin_below():
    """Points are met, half the lowest ratio gives half its significance, and the curve is inverted."""
    curve = response(3.0)
    assert curve(LOG_X) == pytest.approx(curve.snr)
    assert curve(LOG_X[:1] - np.log(2))[0] == pytest.approx(curve.snr[0] / 2)
    assert curve(np.log([curve.mixing_ratio_for(5.0)]))[0] == pytest.approx(5.0, rel=1e-3)
    assert curve.mixing_ratio_for(1e3) is None
    assert curve.mixing_ratio_for(curve.snr[0] / 10) == pytest.approx(LOW / 10)


def test_response_without_any_signal():
    """A gas with no band tells nothing, and no amount of it is excluded."""
    none = Response(ln_mixing_ratio=LOG_X, snr=np.zeros(8))
    assert none.mixing_ratio_for(5.0) is None
    assert worth(Channel.make(none, LOW, HIGH), LIFE, NO_LIFE, 0.5, 5.0).amplitude_bits == pytest.approx(0, abs=1e-12)


def test_range_beyond_the_channel_is_refused():
    """A channel made for less cannot answer for more."""
    narrow = Channel.make(response(), 1e-6, 1e-3)
    with pytest.raises(ValueError, match="beyond the channel"):
        narrow.density(LIFE)
