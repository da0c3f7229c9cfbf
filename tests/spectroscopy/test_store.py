"""The store of computed tables: atomic, verified, bounded."""

from __future__ import annotations

import multiprocessing as mp
import os
import time
from concurrent.futures import ThreadPoolExecutor

import numpy as np
import pytest

from planner.spectroscopy.store import Store


@pytest.fixture
def store(tmp_path):
    return Store(tmp_path / "store")


def never():
    raise AssertionError("must come from the store")


def test_builds_once_then_reads(store):
    """The second fetch does not compute."""
    first = store.fetch("CO2", {"a": 1}, lambda: np.arange(10.0))
    second = store.fetch("CO2", {"a": 1}, never)
    np.testing.assert_array_equal(first, second)
    assert isinstance(second, np.memmap)


def test_key_decides(store):
    """Another key is another entry."""
    store.fetch("CO2", {"a": 1}, lambda: np.zeros(3))
    assert store.fetch("CO2", {"a": 2}, lambda: np.ones(3)).sum() == 3


@pytest.mark.parametrize("damage", ["flip", "truncate", "foreign"])
def test_damaged_entry_is_rebuilt_and_said(store, damage):
    """A flipped byte, a short file and a foreign file are noticed, removed and built again."""
    store.fetch("CO2", {"a": 1}, lambda: np.arange(1000.0))
    (path,) = store.entries()
    data = bytearray(path.read_bytes())
    if damage == "flip":
        data[500] ^= 1
    path.write_bytes({"flip": bytes(data), "truncate": bytes(data[:300]), "foreign": b"hello"}[damage])
    again = store.fetch("CO2", {"a": 1}, lambda: np.arange(1000.0))
    np.testing.assert_array_equal(again, np.arange(1000.0))
    assert "damaged" in store.notices[0]
    assert str(path) in store.notices[0]
    np.testing.assert_array_equal(store.fetch("CO2", {"a": 1}, never), np.arange(1000.0))


def test_unwritable_folder_falls_back_to_memory(tmp_path):
    """A folder that cannot be made is said once; results are still right."""
    (tmp_path / "file").write_text("in the way")
    store = Store(tmp_path / "file" / "store")
    for _ in range(2):
        assert store.fetch("CO2", {"a": 1}, lambda: np.ones(3)).sum() == 3
    assert len(store.notices) == 1
    assert "cannot be written" in store.notices[0]


def test_oldest_entries_go_when_it_grows(tmp_path):
    """The size limit holds and removes what was used longest ago."""
    store = Store(tmp_path, limit_bytes=20_000)
    for number in range(5):
        store.fetch("g", {"n": number}, lambda: np.zeros(1000))
        for age, path in enumerate(sorted(store.entries(), key=os.path.getmtime)):
            os.utime(path, (1000 + age, 1000 + age))
    assert store.size_bytes() <= 20_000
    store.fetch("g", {"n": 4}, never)


def test_clear_removes_everything(store):
    """The clear-out leaves nothing."""
    store.fetch("g", {"n": 1}, lambda: np.zeros(10))
    assert store.clear() == 1
    assert list(store.entries()) == []


def _build_in_process(folder, log):
    def build():
        with log.open("a") as file:
            file.write("built\n")
        time.sleep(1.0)
        return np.arange(200_000.0)

    Store(folder).fetch("g", {"n": 1}, build)


def test_two_processes_end_with_one_good_entry(tmp_path):
    """Of two runs at once on one store one builds and the other waits; they leave one entry that reads well."""
    context, log, tmp_path = mp.get_context("spawn"), tmp_path / "log.txt", tmp_path / "store"
    runs = [context.Process(target=_build_in_process, args=(tmp_path, log)) for _ in range(2)]
    for run in runs:
        run.start()
    for run in runs:
        run.join()
        assert run.exitcode == 0
    store = Store(tmp_path)
    assert log.read_text() == "built\n"
    assert len(list(store.entries())) == 1
    np.testing.assert_array_equal(store.fetch("g", {"n": 1}, never), np.arange(200_000.0))
    assert store.notices == []
    assert list(tmp_path.glob("g/*.lock")) == []


def test_a_holder_that_does_not_end_is_not_waited_for_long(store, monkeypatch):
    """Patience ends: the entry is built all the same."""
    monkeypatch.setattr("planner.spectroscopy.store._PATIENCE_S", 0.1)

    def build_again():
        return store.fetch("g", {"n": 1}, lambda: np.ones(3))

    with ThreadPoolExecutor(1) as pool:
        array = store.fetch("g", {"n": 1}, lambda: pool.submit(build_again).result())
    assert array.sum() == 3


def test_interrupted_build_leaves_no_entry(store):
    """An interrupt in the middle stores nothing and harms nothing that was stored."""
    store.fetch("g", {"n": 1}, lambda: np.zeros(10))

    def interrupted():
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        store.fetch("g", {"n": 2}, interrupted)
    assert len(list(store.entries())) == 1
