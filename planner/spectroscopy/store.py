"""The store of computed tables: arrays on disk, named by what they were computed from.

An entry is one ``.npy`` file ``<key>-<checksum>.npy``: the key is a hash of everything the array depends on, the
checksum is that of the file's bytes. A file appears by one atomic rename, so a build that is killed leaves no
half-written entry. Of two processes that want the same entry the second waits for the first; the lock goes with the
process that holds it. A file whose bytes do not give its checksum is removed, rebuilt, and said.
"""

from __future__ import annotations

import hashlib
import json
import os
import tempfile
import zlib
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager, suppress
from pathlib import Path
from threading import Lock
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["Store", "digest"]

DEFAULT_LIMIT_BYTES = 6_000_000_000
_PATIENCE_S = 60.0
"""No single entry takes as long to build: whoever holds the lock then is stopped, or the file system forgot it."""


def digest(*parts: bytes | str) -> str:
    """Short hash of a sequence of texts and byte strings."""
    total = hashlib.sha256()
    for part in parts:
        data = part.encode() if isinstance(part, str) else part
        total.update(len(data).to_bytes(8, "little"))
        total.update(data)
    return total.hexdigest()[:24]


_LOADING = Lock()
"""Headers are read one at a time: CPython 3.11 fails where two threads parse texts at once."""


class Store:
    """Arrays on disk, keyed by content.

    Parameters
    ----------
    folder : Path, optional
        Where to keep them; by default ``$LIMBCAST_STORE`` or the user's cache folder.
    limit_bytes : int
        When the store grows beyond this, the entries that were used longest ago are removed.

    Attributes
    ----------
    notices : list of str
        What the user should hear: damaged entries that were rebuilt, a folder that cannot be written.
    """

    def __init__(self, folder: Path | None = None, limit_bytes: int = DEFAULT_LIMIT_BYTES) -> None:
        if folder is None:
            import platformdirs

            named = os.environ.get("LIMBCAST_STORE")
            folder = Path(named) if named else Path(platformdirs.user_cache_dir("limbcast")) / "tables"
        self.folder = folder
        self.limit_bytes = limit_bytes
        self.notices: list[str] = []
        self._writable = True
        self._size_bytes: int | None = None

    def fetch(self, group: str, key: Mapping[str, Any], build: Callable[[], NDArray[Any]]) -> NDArray[Any]:
        """The array for a key: memory-mapped if it is stored, else built, stored and returned.

        Parameters
        ----------
        group : str
            Sub-folder, for instance the gas.
        key : mapping
            Everything the array depends on; must be JSON-serialisable.
        build : callable
            Computes the array when it is not there.
        """
        name = _name(key)
        found = self._read(group, name)
        if found is not None:
            return found
        with self._alone(group, name):
            found = self._read(group, name)  # another process may have built it while we waited
            if found is not None:
                return found
            array = np.ascontiguousarray(build())
            self._write(group, name, array)
        return array

    def has(self, group: str, key: Mapping[str, Any]) -> bool:
        """Whether there is an entry for a key; that it is whole is seen when it is fetched."""
        return any((self.folder / group).glob(f"{_name(key)}-*.npy"))

    def entries(self) -> Iterator[Path]:
        """All stored files."""
        return (path for path in self.folder.glob("*/*.npy") if path.is_file())

    def size_bytes(self) -> int:
        """Bytes that the store takes on disk."""
        return sum(path.stat().st_size for path in self.entries())

    def clear(self) -> int:
        """Remove every entry; returns the number removed."""
        removed = 0
        for path in list(self.entries()):
            path.unlink(missing_ok=True)
            removed += 1
        return removed

    def _read(self, group: str, name: str) -> NDArray[Any] | None:
        for path in (self.folder / group).glob(f"{name}-*.npy"):
            try:
                if f"{_checksum(path):08x}" == path.stem.rpartition("-")[2]:
                    with _LOADING:
                        array: NDArray[Any] = np.load(path, mmap_mode="r", allow_pickle=False)
                    os.utime(path)
                    return array
            except FileNotFoundError:
                continue  # another process has just removed it
            except (OSError, ValueError):
                pass
            self.notices.append(f"store: {path} was damaged and is built again")
            path.unlink(missing_ok=True)
        return None

    @contextmanager
    def _alone(self, group: str, name: str) -> Iterator[None]:
        """Keeps other processes off an entry; where that cannot be, two may build the same, which does no harm."""
        from filelock import FileLock

        file = self.folder / group / f"{name}.lock"
        lock = FileLock(file, timeout=_PATIENCE_S)
        with suppress(OSError, NotImplementedError):  # a folder that cannot be written, no locks, out of patience
            file.parent.mkdir(parents=True, exist_ok=True)
            lock.acquire()
        try:
            yield
        finally:
            if lock.is_locked:
                lock.release()
                with suppress(OSError):
                    file.unlink(missing_ok=True)

    def _write(self, group: str, name: str, array: NDArray[Any]) -> None:
        if not self._writable:
            return
        folder = self.folder / group
        try:
            folder.mkdir(parents=True, exist_ok=True)
            with tempfile.NamedTemporaryFile(dir=folder, suffix=".part", delete=False) as file:
                np.save(file, array, allow_pickle=False)
            path = Path(file.name)
            os.replace(path, folder / f"{name}-{_checksum(path):08x}.npy")
        except OSError as error:
            self._writable = False
            self.notices.append(
                f"store: {self.folder} cannot be written ({error.strerror or error}); tables are kept in memory only. "
                "Set LIMBCAST_STORE to a folder you can write to"
            )
            return
        self._prune(array.nbytes)

    def _prune(self, added_bytes: int) -> None:
        """Keep the store within its limit; the folder is read only when it may have been passed."""
        if self._size_bytes is not None and self._size_bytes + added_bytes <= self.limit_bytes:
            self._size_bytes += added_bytes
            return
        files = sorted(((p.stat().st_mtime, p.stat().st_size, p) for p in self.entries()), reverse=True)
        self._size_bytes = 0
        for _, size, path in files:
            if self._size_bytes + size > self.limit_bytes:
                path.unlink(missing_ok=True)
            else:
                self._size_bytes += size


def _name(key: Mapping[str, Any]) -> str:
    return digest(json.dumps(key, sort_keys=True))


def _checksum(path: Path) -> int:
    total = 0
    with path.open("rb") as file:
        while chunk := file.read(1 << 22):
            total = zlib.crc32(chunk, total)
    return total
