"""Writing results: whole files or none."""

from __future__ import annotations

import os
from pathlib import Path

from planner.disk import make_folder, write_whole
from planner.errors import OutputError

__all__ = ["check_writable", "make_folder", "write_bytes", "write_text"]


def check_writable(path: str | Path) -> None:
    """Refuse a file that could not be written, before the work that fills it.

    Raises
    ------
    OutputError
        As `write_bytes`.
    """
    path = Path(path)
    if path.is_dir():
        raise OutputError(f"{path}: expected the name of a file, got a folder")
    if not path.parent.is_dir():
        raise OutputError(f"{path}: the folder {path.parent} does not exist; make it first")
    if not os.access(path.parent, os.W_OK | os.X_OK):
        raise OutputError(f"{path}: the folder {path.parent} cannot be written to")


def write_bytes(path: str | Path, data: bytes) -> None:
    """Write a file whole or not at all; packed if its name ends in ``.gz``.

    Raises
    ------
    OutputError
        If the folder is missing or cannot be written, or ``path`` is a folder.
    """
    path = Path(path)
    check_writable(path)
    write_whole(path, data)


def write_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text as `write_bytes` does."""
    write_bytes(path, text.encode("utf-8"))
