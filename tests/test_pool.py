"""Work spread over threads."""

from __future__ import annotations

import threading

import pytest
from numba import config

from planner.pool import in_threads


def test_results_keep_their_order():
    """Whatever ends first."""
    gates = [threading.Event() for _ in range(2)]

    def work(item):
        if item == 0 and config.NUMBA_NUM_THREADS > 1:
            assert gates[1].wait(5)
        gates[item].set()
        return 10 * item

    assert in_threads(work, [0, 1]) == [0, 10]


def test_progress_reaches_the_end():
    """One report for each item, the share growing to one."""
    told = []
    in_threads(str, range(4), text="counting", progress=lambda text, share: told.append((text, share)))
    assert told == [("counting", share) for share in (0.25, 0.5, 0.75, 1.0)]


def test_errors_come_through():
    """What one item raises is raised."""
    with pytest.raises(ZeroDivisionError):
        in_threads(lambda item: 1 / item, [2, 1, 0])
