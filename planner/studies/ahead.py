"""What a first run needs and the store has not got yet, made on two cores: lists on one, compiled loops on the other.

A second interpreter builds missing line lists in the order in which they will be needed, while this one compiles. They
share nothing but the store: whatever the other has not begun, or could not do, this one does itself when it comes to
need it, and says what is wrong with it.
"""

from __future__ import annotations

import os
import subprocess
import sys
import weakref
from collections.abc import Iterable, Sequence
from importlib import import_module
from pathlib import Path

from planner.spectroscopy.lists.build import build_lines, embedded_formulas, lines_missing, read_constants
from planner.spectroscopy.store import Store

__all__ = ["build_ahead"]


def build_ahead(gases: Iterable[str], store: Store, *, owner: object) -> subprocess.Popen[bytes] | None:
    """Have the lists of some gases built by another process and compile meanwhile; None where that gains nothing.

    A single list is built sooner than another interpreter has come up, and with one core there is nothing to share.
    The other process may still be at work on the return.

    Parameters
    ----------
    gases : iterable of str
        Formulas in the order in which they will be needed, with embedded data or without.
    store : Store
        Where the lists belong.
    owner : object
        The process is stopped, if it still runs, when this is let go of and when the program ends.
    """
    known = embedded_formulas()
    missing = [gas for gas in gases if gas in known and lines_missing(read_constants(gas), store)]
    if len(missing) < 2 or _threads() < 2:
        return None
    try:
        process = subprocess.Popen(
            [sys.executable, "-m", __name__, *missing],
            cwd=Path(__file__).parents[2],  # there -m finds this very package
            env={**os.environ, "LIMBCAST_STORE": str(store.folder.absolute())},
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
    except OSError:  # where no other process may be started, the lists are built here
        return None
    weakref.finalize(owner, _stop, process)
    for kernels in ("planner.spectroscopy._kernels", "planner.atmosphere.kernels"):
        import_module(kernels)
    return process


def _threads() -> int:
    """As many as numba would use, which the user may have limited; to ask numba would take as long as to begin."""
    return int(os.environ.get("NUMBA_NUM_THREADS") or os.cpu_count() or 1)


def _stop(process: subprocess.Popen[bytes]) -> None:
    process.kill()
    process.wait()


def _main(gases: Sequence[str]) -> None:
    store = Store()
    for gas in gases:
        build_lines(read_constants(gas), store)


if __name__ == "__main__":
    _main(sys.argv[1:])
