"""Writing results: whole files or none."""

from __future__ import annotations

import os
from pathlib import Path
from uuid import uuid4

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
    """Write a file so that nobody ever sees half of it: a temporary file beside it takes its name when complete.

    Raises
    ------
    OutputError
        If the folder is missing or cannot be written, or ``path`` is a folder.
    """
    path = Path(path)
    check_writable(path)
    temporary = path.with_name(f".{path.name}.{uuid4().hex}")
    try:
        with temporary.open("xb") as file:
            file.write(data)
        os.replace(temporary, path)
    except OSError as error:
        raise OutputError(f"{path}: cannot be written: {error.strerror}") from None
    finally:
        temporary.unlink(missing_ok=True)


def write_text(path: str | Path, text: str) -> None:
    """Write UTF-8 text as `write_bytes` does."""
    write_bytes(path, text.encode("utf-8"))


def make_folder(path: str | Path) -> Path:
    """The folder, made when it is not there yet, with the folders above it.

    Raises
    ------
    OutputError
        If it cannot be made or cannot be written to.
    """
    path = Path(path)
    try:
        path.mkdir(parents=True, exist_ok=True)
    except FileExistsError:
        raise OutputError(f"{path}: expected a folder, got a file") from None
    except OSError as error:
        raise OutputError(f"{path}: the folder cannot be made: {error.strerror}") from None
    if not os.access(path, os.W_OK | os.X_OK):
        raise OutputError(f"{path}: the folder cannot be written to")
    return path
