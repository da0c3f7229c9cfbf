"""Many small pieces of work side by side, in threads: compiled loops let go of the interpreter while they run."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from concurrent.futures import ThreadPoolExecutor
from typing import TypeVar

__all__ = ["Progress", "in_threads"]

Progress = Callable[[str, float], None]

Item = TypeVar("Item")
Result = TypeVar("Result")


def in_threads(
    work: Callable[[Item], Result], items: Sequence[Item], *, text: str = "", progress: Progress | None = None
) -> list[Result]:
    """Results of a function for every item, in their order, on as many threads as numba would use.

    Parameters
    ----------
    text : str
        What the progress is called.
    progress : callable, optional
        Called with the text and the share done.
    """
    from numba import config

    results = []
    with ThreadPoolExecutor(config.NUMBA_NUM_THREADS) as pool:
        for number, result in enumerate(pool.map(work, items), 1):
            results.append(result)
            if progress is not None:
                progress(text, number / len(items))
    return results
