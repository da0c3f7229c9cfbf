"""Information and odds against closed forms, published worked examples and a textbook limit of communication."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.worth import Channel, Occurrence, Response, mutual_information_bits, posterior, worth


@pytest.mark.parametrize(
    ("ratio", "nats"), [(0.1, 0.00498), (1, 0.346574), (2, 0.804719), (3, 1.151293), (10, 2.307560)]
)
def test_gaussian_information_gain(ratio, nats):
    """y = theta + noise: 0.5 ln(1 + (prior width / noise)^2) (Lindley 1956, Ann. Math. Stat. 27, 986, from memory)."""
    place = np.linspace(-8 * ratio, 8 * ratio, 1601)
    weights = np.exp(-0.5 * (place / ratio) ** 2)
    z = np.arange(-8 * ratio - 7, 8 * ratio + 7, 0.05)
    densities = np.exp(-0.5 * (z - place[:, None]) ** 2) / np.sqrt(2 * np.pi)
    bits = mutual_information_bits(densities, weights / weights.sum(), 0.05)
    assert bits * np.log(2) == pytest.approx(nats, abs=1e-5)


def test_two_signals_in_white_noise():
    """Binary signals carry half a bit each at Eb/N0 = 0.187 dB (the rate-1/2 limit, Proakis, from memory).

    Half a bit per symbol means Es/N0 of half that; the distance of antipodal signals in noise widths is
    sqrt(8 Es/N0), here 2.043. The limit is quoted to 0.001 dB, which is 1e-4 bits.
    """
    distance = np.sqrt(8 * 0.5 * 10**0.0187)
    flat = Response(ln_mixing_ratio=np.log([1e-6, 1e-5]), snr=np.full(2, distance))
    certain, never = (Occurrence(probability=q, lowest=2e-6, highest=5e-6) for q in (1.0, 0.0))
    found = worth(Channel.make(flat, 1e-6, 1e-5), certain, never, 0.5, 5.0)
    assert found.amplitude_bits == pytest.approx(0.5, abs=2e-4)


@pytest.mark.parametrize(
    ("prior", "true", "false", "expected"),
    [
        (0.01, 0.9, 0.01, 0.47619),
        (0.1, 0.8, 0.05, 0.64000),
        (0.01, 0.8, 0.05, 0.13913),
        (0.001, 0.99, 0.00135, 0.42332),
        (0.1, 0.9, 0.0027, 0.97371),
    ],
)
def test_positive_predictive_value(prior, true, false, expected):
    """pi t / (pi t + (1 - pi) f), worked out by hand."""
    assert posterior(prior, true, false) == pytest.approx(expected, abs=5e-6)


def test_published_odds_of_life():
    """Likelihoods 0.80 and 0.25 at a prior of one half give 76 % (Catling et al. 2018, Astrobiology 18, 709)."""
    assert round(100 * posterior(0.5, 0.80, 0.25)) == 76
