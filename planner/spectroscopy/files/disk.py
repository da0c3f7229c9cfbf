"""Whole files in, whole files out."""

from __future__ import annotations

import gzip
import os
import zlib
from pathlib import Path
from uuid import uuid4

from planner.errors import LineDataError, OutputError

__all__ = ["make_folder", "read_whole", "write_whole"]


def read_whole(path: Path) -> bytes:
    """The bytes of a file, unpacked if its first bytes say gzip.

    Raises
    ------
    LineDataError
        If it cannot be read or unpacked.
    """
    try:
        data = path.read_bytes()
        return gzip.decompress(data) if data.startswith(b"\x1f\x8b") else data
    except (OSError, EOFError, zlib.error) as error:
        raise LineDataError(f"{path}: expected a readable file, plain or gzip, got: {error}") from error


def write_whole(path: Path, data: bytes) -> None:
    """Write a file, packed if its name ends in ``.gz``; it appears whole or not at all.

    Raises
    ------
    OutputError
        If it cannot be written.
    """
    packed = gzip.compress(data, mtime=0) if path.suffix == ".gz" else data
    part = path.with_name(f".{path.name}.{uuid4().hex}")
    try:
        part.write_bytes(packed)
        os.replace(part, path)
    except OSError as error:
        raise OutputError(f"{path}: cannot be written: {error.strerror}; choose a folder that can") from error
    finally:
        part.unlink(missing_ok=True)


def make_folder(path: Path) -> Path:
    """The folder, made if need be.

    Raises
    ------
    OutputError
        If it cannot be made or written to.
    """
    try:
        path.mkdir(parents=True, exist_ok=True)
    except OSError as error:
        raise OutputError(f"{path}: the folder cannot be made: {error.strerror}") from error
    if not os.access(path, os.W_OK | os.X_OK):
        raise OutputError(f"{path}: the folder cannot be written to; choose another")
    return path
