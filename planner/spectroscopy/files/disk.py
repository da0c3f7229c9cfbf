"""Whole files in."""

from __future__ import annotations

import gzip
import zlib
from pathlib import Path

from planner.errors import LineDataError

__all__ = ["read_whole"]


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
