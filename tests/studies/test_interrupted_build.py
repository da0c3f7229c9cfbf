"""A build that is killed loses nothing that was finished; two builds at once end with one good store."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time

import numpy as np
import pytest

from planner.resources import data_folder
from planner.spectroscopy.store import Store

PLAN = [sys.executable, "-m", "planner", "plan", str(data_folder("configs") / "scenarios" / "demo.toml"), "--json", "-"]


def start(store):
    environment = {**os.environ, "LIMBCAST_STORE": str(store)}
    return subprocess.Popen(PLAN, env=environment, stdout=subprocess.PIPE, stderr=subprocess.PIPE)


@pytest.mark.slow
def test_a_killed_build_keeps_what_was_finished(tmp_path):
    """After SIGKILL every stored entry reads well, and the next run uses it and ends as if nothing had happened."""
    run = start(tmp_path)
    deadline = time.monotonic() + 400
    while len(list(Store(tmp_path).entries())) < 6 and time.monotonic() < deadline:
        time.sleep(0.02)
    run.send_signal(signal.SIGKILL)
    run.communicate()
    finished = {path: path.read_bytes() for path in Store(tmp_path).entries()}
    assert len(finished) >= 6
    for path in finished:
        np.load(path, allow_pickle=False)
    again = start(tmp_path)
    output, errors = again.communicate(timeout=300)
    assert again.returncode == 0, errors
    assert b'"rows"' in output
    assert b"damaged" not in output
    for path, content in finished.items():
        assert path.read_bytes() == content


@pytest.mark.slow
def test_two_plans_at_once_share_one_store(tmp_path):
    """Both end well with the same numbers, and each table is stored once."""
    runs = [start(tmp_path), start(tmp_path)]
    outputs = [run.communicate(timeout=600) for run in runs]
    assert [run.returncode for run in runs] == [0, 0], outputs
    assert outputs[0][0] == outputs[1][0]
    keys = [path.stem.rpartition("-")[0] for path in Store(tmp_path).entries()]
    assert len(keys) == len(set(keys))
