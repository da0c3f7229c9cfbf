"""Writing whole files or none."""

from __future__ import annotations

import os

import pytest

from planner.errors import OutputError
from planner.report.files import check_writable, make_folder, write_bytes, write_text


def test_write_and_overwrite(tmp_path):
    """The file holds what was written last, and nothing else is left in the folder."""
    write_text(tmp_path / "a.txt", "first")
    write_bytes(tmp_path / "a.txt", "zweite µ".encode())
    assert (tmp_path / "a.txt").read_text(encoding="utf-8") == "zweite µ"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_failure_leaves_the_old_file(tmp_path, monkeypatch):
    """When the last step fails the old file stays and the temporary one goes."""
    write_text(tmp_path / "a.txt", "old")

    def full(*args):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(os, "replace", full)
    with pytest.raises(OutputError, match="No space left on device"):
        write_text(tmp_path / "a.txt", "new")
    assert (tmp_path / "a.txt").read_text() == "old"
    assert os.listdir(tmp_path) == ["a.txt"]


def test_write_invalid(tmp_path):
    """Folders that are missing and names that are folders are refused."""
    with pytest.raises(OutputError, match="does not exist; make it first"):
        write_text(tmp_path / "none" / "a.txt", "x")
    with pytest.raises(OutputError, match="got a folder"):
        write_text(tmp_path, "x")
    with pytest.raises(OutputError, match="does not exist; make it first"):
        check_writable(tmp_path / "none" / "a.txt")
    check_writable(tmp_path / "a.txt")
    assert os.listdir(tmp_path) == []


def test_make_folder(tmp_path):
    """A folder is made with those above it; a file in its place is refused."""
    assert make_folder(tmp_path / "a" / "b").is_dir()
    assert make_folder(tmp_path / "a" / "b").is_dir()
    (tmp_path / "file").touch()
    with pytest.raises(OutputError, match="expected a folder, got a file"):
        make_folder(tmp_path / "file")
    with pytest.raises(OutputError, match="cannot be made: Not a directory"):
        make_folder(tmp_path / "file" / "below")


def test_unwritable_folder(tmp_path, monkeypatch):
    """A folder without the right to write is refused before anything is computed, and when writing."""
    monkeypatch.setattr(os, "access", lambda path, mode: False)  # the tests may run as root, who has every right
    with pytest.raises(OutputError, match="the folder cannot be written to"):
        make_folder(tmp_path)
    with pytest.raises(OutputError, match=f"{tmp_path} cannot be written to"):
        write_text(tmp_path / "a.txt", "x")
    assert os.listdir(tmp_path) == []
