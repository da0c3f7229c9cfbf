"""Absorption that two molecules cause while they collide.

The absorption coefficient in 1/cm is k n_a n_b for a pair of two gases and k n^2 within one gas (n per cm3). The
coefficients k are knot tables of published measurements and theory in ``linelists/collisions.toml``; log10 k is
linear in wavenumber between knots and linear in ln T between temperatures.
"""

from __future__ import annotations

import math
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from planner.errors import LineDataError
from planner.resources import data_folder

__all__ = [
    "CollisionBand",
    "collision_bands",
    "collision_coefficient",
    "collision_pairs",
    "parse_collisions",
    "read_collisions",
]

Pair = tuple[str, str]


@dataclass(frozen=True, kw_only=True, eq=False)
class CollisionBand:
    """One band of one pair of gases.

    Attributes
    ----------
    pair : (str, str)
        Formulas, in alphabetical order.
    name : str
        What the band is called, such as ``"1.27 um"``.
    source, flag : str
        Where the numbers come from, and whether they are fitted, published, from memory or guessed.
    temperature_k : (temperature,) ndarray
        Ascending; outside them the nearest one holds.
    wavenumber_per_cm : (knot,) ndarray
        Ascending.
    log10_cm5 : (temperature, knot) ndarray
        log10 of k in cm5 per molecule squared.
    square_law_below : bool
        Whether k falls as the square of the wavenumber below the first knot; otherwise it is 0 there.
    """

    pair: Pair
    name: str
    source: str
    flag: str
    temperature_k: NDArray[np.float64]
    wavenumber_per_cm: NDArray[np.float64]
    log10_cm5: NDArray[np.float64]
    square_law_below: bool

    def __post_init__(self) -> None:
        shape = (self.temperature_k.size, self.wavenumber_per_cm.size)
        if self.log10_cm5.shape != shape or 0 in shape:
            raise LineDataError(f"{self}: expected a table of shape {shape}, got {self.log10_cm5.shape}")
        for values in (self.temperature_k, self.wavenumber_per_cm):
            if not np.all(np.diff(values, prepend=0.0) > 0.0):
                raise LineDataError(f"{self}: temperatures and wavenumbers must be positive and ascend")
        if not np.all(np.isfinite(self.log10_cm5)):
            raise LineDataError(f"{self}: every coefficient must be finite")

    def __str__(self) -> str:
        return f"collision band {self.pair[0]}-{self.pair[1]} {self.name}"

    def coefficient(self, wavenumber_per_cm: NDArray[np.float64], temperature_k: float) -> NDArray[np.float64]:
        """k in cm5 per molecule squared, shape ``(wavenumber,)``."""
        first, last = self.wavenumber_per_cm[[0, -1]]
        inside = (wavenumber_per_cm <= last) & (self.square_law_below | (wavenumber_per_cm >= first))
        log10 = self._column(temperature_k)
        total = np.zeros_like(wavenumber_per_cm)
        nu = wavenumber_per_cm[inside]
        total[inside] = 10.0 ** np.interp(nu, self.wavenumber_per_cm, log10) * np.minimum(nu / first, 1.0) ** 2
        return total

    def _column(self, temperature_k: float) -> NDArray[np.float64]:
        """log10 k at the knots at one temperature."""
        log_t = math.log(temperature_k)
        position = np.interp(log_t, np.log(self.temperature_k), np.arange(self.temperature_k.size))
        below = min(int(position), self.temperature_k.size - 1)
        above = min(below + 1, self.temperature_k.size - 1)
        share = position - below
        return (1.0 - share) * self.log10_cm5[below] + share * self.log10_cm5[above]


def collision_pairs() -> list[Pair]:
    """All pairs with shipped coefficients, each in alphabetical order, sorted."""
    return sorted(_shipped())


def collision_bands(pair: Pair) -> tuple[CollisionBand, ...]:
    """The shipped bands of a pair, in either order of its names.

    Raises
    ------
    LineDataError
        If the pair is not known.
    """
    first, second = sorted(pair)
    bands = _shipped().get((first, second))
    if bands is None:
        known = ", ".join("-".join(known_pair) for known_pair in collision_pairs())
        raise LineDataError(f"collision pair: expected one of {known}, got {pair[0]}-{pair[1]}")
    return bands


def collision_coefficient(pair: Pair, wavenumber_per_cm: ArrayLike, temperature_k: float) -> NDArray[np.float64]:
    """Collision-induced absorption coefficient of a pair of gases.

    Parameters
    ----------
    pair : (str, str)
        Formulas in any order, such as ``("N2", "O2")``.
    wavenumber_per_cm : (wavenumber,) array_like
    temperature_k : float
        Beyond the temperatures of a band its nearest column holds.

    Returns
    -------
    (wavenumber,) ndarray
        cm5 per molecule squared; 0 where no band is known.

    Raises
    ------
    LineDataError
        If the pair is not known.
    """
    wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))
    total = np.zeros_like(wavenumber)
    for band in collision_bands(pair):
        total += band.coefficient(wavenumber, temperature_k)
    return total


def read_collisions(path: Path) -> tuple[CollisionBand, ...]:
    """Bands from a file in this program's own layout; see `parse_collisions`."""
    return parse_collisions(path.read_text(encoding="utf-8"), str(path))


def parse_collisions(text: str, where: str) -> tuple[CollisionBand, ...]:
    """Bands from TOML text; a band that is lent to another pair comes out once for each.

    Raises
    ------
    LineDataError
        If the text breaks the layout; `where` is named in the message.
    """
    try:
        data = tomllib.loads(text)
        bands = [band for table in data["band"] for band in _bands_of(table, data["sources"])]
    except (tomllib.TOMLDecodeError, KeyError, TypeError, ValueError, LineDataError) as error:
        raise LineDataError(f"{where}: not a file of collision bands as this program writes them: {error}") from error
    return tuple(bands)


def _bands_of(table: Mapping[str, Any], sources: Mapping[str, str]) -> list[CollisionBand]:
    """The band of one TOML table and its loans to other pairs."""
    knots = np.array(table["knots"], dtype=np.float64)
    temperature = np.array(table["temperature_k"], dtype=np.float64)
    loans = [{"pair": table["pair"], "factor": np.ones(temperature.size), **_origin(table)}, *table.get("also", [])]
    bands = []
    for loan in loans:
        first, second = sorted(loan["pair"])
        factor = np.array(loan["factor"], dtype=np.float64)
        bands.append(
            CollisionBand(
                pair=(first, second),
                name=table["name"],
                source=sources[loan["source"]],
                flag=loan["flag"],
                temperature_k=temperature,
                wavenumber_per_cm=knots[:, 0],
                log10_cm5=knots[:, 1:].T + np.log10(factor)[:, np.newaxis],
                square_law_below=bool(table.get("square_law_below", False)),
            )
        )
    return bands


def _origin(table: Mapping[str, Any]) -> dict[str, Any]:
    return {"source": table["source"], "flag": table["flag"]}


@lru_cache(maxsize=1)
def _shipped() -> dict[Pair, tuple[CollisionBand, ...]]:
    by_pair: dict[Pair, list[CollisionBand]] = {}
    for band in read_collisions(data_folder("linelists") / "collisions.toml"):
        by_pair.setdefault(band.pair, []).append(band)
    return {pair: tuple(bands) for pair, bands in by_pair.items()}
