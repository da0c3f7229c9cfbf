"""Whole files onto the disk, or none."""

from __future__ import annotations

import gzip
import os
from pathlib import Path
from uuid import uuid4

from planner.errors import OutputError

__all__ = ["make_folder", "write_whole"]


def write_whole(path: Path, data: bytes) -> None:
    """Write a file so that nobody ever sees half of it: a temporary file beside it takes its name when complete.

    It is packed if its name ends in ``.gz``.

    Raises
    ------
    OutputError
        If it cannot be written.
    """
    packed = gzip.compress(data, mtime=0) if path.suffix == ".gz" else data
    temporary = path.with_name(f".{path.name}.{uuid4().hex}")
    try:
        temporary.write_bytes(packed)
        os.replace(temporary, path)
    except OSError as error:
        raise OutputError(f"{path}: cannot be written: {error.strerror}") from None
    finally:
        temporary.unlink(missing_ok=True)


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
        raise OutputError(f"{path}: the folder cannot be written to; choose another")
    return path
