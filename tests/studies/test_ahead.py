"""Lists built by another process ahead of their first use."""

from __future__ import annotations

import pytest

from planner.spectroscopy.lists.build import build_lines, lines_missing, read_constants
from planner.spectroscopy.store import Store
from planner.studies import ahead


class Owner:
    """Something that can be let go of."""


@pytest.fixture(autouse=True)
def two_threads(monkeypatch):
    """Whatever the machine has."""
    monkeypatch.setattr(ahead, "_threads", lambda: 2)


def test_missing_lists_are_built(tmp_path):
    """Those with embedded lines; gases without, and lists that are there, are left out."""
    store, owner = Store(tmp_path), Owner()
    build_lines(read_constants("CO"), store)
    process = ahead.build_ahead(["HCl", "CO", "N2", "CCl2F2", "HF"], store, owner=owner)
    assert process.args[-2:] == ["HCl", "HF"]
    assert process.wait(120) == 0
    assert not any(lines_missing(read_constants(gas), store) for gas in ("HCl", "CO", "HF"))
    assert ahead.build_ahead(["HCl", "CO", "HF"], store, owner=owner) is None


@pytest.mark.parametrize(("gases", "threads"), [(["HCl"], 2), (["HCl", "HF"], 1), ([], 2)])
def test_nothing_is_started_where_nothing_is_gained(tmp_path, monkeypatch, gases, threads):
    """For a single list, on a single core, for none."""
    monkeypatch.setattr(ahead, "_threads", lambda: threads)
    assert ahead.build_ahead(gases, Store(tmp_path), owner=Owner()) is None


def test_it_ends_with_its_owner(tmp_path):
    """A process in the middle of its work is stopped."""
    owner = Owner()
    process = ahead.build_ahead(["CH4", "O3"], Store(tmp_path), owner=owner)
    assert process.poll() is None
    del owner
    assert process.returncode is not None


def test_without_another_process(tmp_path, monkeypatch):
    """Where none can be started nothing is built ahead, and nothing fails."""
    monkeypatch.setattr(ahead.sys, "executable", str(tmp_path / "none"))
    assert ahead.build_ahead(["HCl", "HF"], Store(tmp_path), owner=Owner()) is None
