"""Nested sampling as a list of dead points and a set of live ones."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.nested import advance, begin, draws, outcome, remaining

LIVE = 60


def hill(point):
    """A narrow hill in two dimensions, off the middle, with a ridge."""
    x, y = point
    return float(-0.5 * (((x - 0.3) / 0.05) ** 2 + ((y - 0.6 - 0.3 * (x - 0.3)) / 0.1) ** 2))


def whole(*, seed=1):
    state = begin(hill, 2, live=LIVE, seed=seed)
    while remaining(state) > 0.1:
        state = advance(state, hill, seed=seed)
    return state


@pytest.fixture(scope="module")
def state():
    return whole()


def test_the_dead_rise(state):
    """Each leg takes as many as live, in ascending order, and every one is where its likelihood says."""
    assert len(state.dead) == state.legs * LIVE
    assert np.all(np.diff(state.dead_ln_likelihood) >= 0)
    assert state.live_ln_likelihood.min() >= state.dead_ln_likelihood.max()
    assert [hill(p) for p in state.dead[::37]] == pytest.approx(state.dead_ln_likelihood[::37].tolist())
    assert state.evaluations > len(state.dead)


def test_evidence_of_the_hill(state):
    """Integral of a normal density that lies well inside the square."""
    run = outcome(state)
    assert run.ln_evidence == pytest.approx(np.log(2 * np.pi * 0.05 * 0.1), abs=3 * run.error)
    assert run.weights.sum() == pytest.approx(1)
    assert run.weights @ run.points == pytest.approx([0.3, 0.6], abs=0.02)
    assert 1 < run.effective_size < len(run.points)


def test_information_of_a_flat_likelihood_is_none():
    """All weights then follow the prior, whose shares add up to 1."""

    def flat(point):
        return 1e-9 * float(point[0])

    run = outcome(advance(begin(flat, 2, live=LIVE, seed=1), flat, seed=1))
    assert run.ln_evidence == pytest.approx(0, abs=1e-6)
    assert run.information == pytest.approx(0, abs=1e-6)


def test_a_constant_likelihood_is_done_at_once():
    """Its mean over the prior is itself, and nothing more can be learnt."""
    state = begin(lambda point: -3.0, 2, live=LIVE, seed=1)
    assert remaining(state) == 0
    run = outcome(state)
    assert run.ln_evidence == pytest.approx(-3)
    assert run.information == pytest.approx(0, abs=1e-12)


def test_taken_up_again(state):
    """From a kept state a run goes on as if it had never stopped."""
    kept = begin(hill, 2, live=LIVE, seed=1)
    kept = advance(advance(kept, hill, seed=1), hill, seed=1)
    again = kept
    while remaining(again) > 0.1:
        again = advance(again, hill, seed=1)
    for name in ("dead", "dead_ln_likelihood", "live", "live_ln_likelihood"):
        np.testing.assert_array_equal(getattr(again, name), getattr(state, name))
    assert again.evaluations == state.evaluations


def test_seed_changes_the_result(state):
    """Another seed is another run."""
    assert not np.array_equal(whole(seed=2).live, state.live)


def test_draws_follow_the_weights(state):
    """Systematic draws: each point as often as its weight asks, give or take one."""
    run = outcome(state)
    chosen = draws(run, 5000, np.random.default_rng(3))
    counts = np.bincount(chosen, minlength=len(run.weights))
    assert np.abs(counts - 5000 * run.weights).max() < 1
