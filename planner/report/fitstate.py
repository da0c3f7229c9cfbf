"""Where the state of a fit is kept between legs: one file of plain arrays per run, with the key of what it belongs to.

A file is written whole or not at all, holds no objects of the language, and is read only if its key is that of the
fit that asks for it.
"""

from __future__ import annotations

import io
import zipfile
from dataclasses import fields
from pathlib import Path
from typing import Any

import numpy as np

from planner.detection.nested import NestedState
from planner.errors import StoreError
from planner.report.files import write_bytes

__all__ = ["FitFolder"]

_ENDING = ".state.npz"


class FitFolder:
    """Keeps states in a folder.

    Parameters
    ----------
    folder : Path
        There already.
    """

    def __init__(self, folder: Path) -> None:
        self._folder = folder

    def fetch(self, name: str, key: str) -> NestedState | None:
        """The state of a run; None if none is kept.

        Raises
        ------
        StoreError
            If what is there is damaged or belongs to another fit.
        """
        path = self._path(name)
        if not path.exists():
            return None
        try:
            with np.load(io.BytesIO(path.read_bytes()), allow_pickle=False) as held:
                state = _state(held) if str(held["key"]) == key else None
        except (OSError, ValueError, KeyError, TypeError, EOFError, zipfile.BadZipFile):
            raise StoreError(f"{path}: damaged, or not the saved state of a fit; remove it to begin anew") from None
        if state is None:
            raise StoreError(
                f"{path}: saved by another fit (another spectrum, scenario, setting or version); remove it, or choose "
                "another folder"
            )
        return state

    def keep(self, name: str, key: str, state: NestedState) -> None:
        """Write the state of a run over the one before.

        Raises
        ------
        OutputError
            If it cannot be written.
        """
        data = io.BytesIO()
        np.savez(data, key=np.array(key), **{field.name: getattr(state, field.name) for field in fields(state)})
        write_bytes(self._path(name), data.getvalue())

    @property
    def kept(self) -> list[Path]:
        """The files that are there."""
        return sorted(self._folder.glob(f"*{_ENDING}"))

    def clear(self) -> None:
        """Remove them: the fit is done."""
        for path in self.kept:
            path.unlink(missing_ok=True)

    def _path(self, name: str) -> Path:
        return self._folder / f"{name}{_ENDING}"


def _state(held: Any) -> NestedState:
    """The arrays of a file as a state."""
    return NestedState(
        dead=held["dead"],
        dead_ln_likelihood=held["dead_ln_likelihood"],
        live=held["live"],
        live_ln_likelihood=held["live_ln_likelihood"],
        legs=int(held["legs"]),
        evaluations=int(held["evaluations"]),
    )
