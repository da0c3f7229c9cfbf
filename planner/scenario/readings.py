"""How one TOML value becomes one number, name or path: readings with units, and what they expected when they fail.

A reading is called with the value as it stands in the file (or an astropy quantity, from Python) and returns plain
data, or raises ``ValueError`` with ``expected ..., got ...``. Its ``expected`` is also what the message about a
missing key says.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from pathlib import Path
from typing import Any, Protocol

import astropy.units as u
from pydantic import ValidationInfo

from planner.errors import LineDataError
from planner.scenario.quantities import quantity

__all__ = [
    "COMBINED",
    "Choice",
    "Ends",
    "FieldProblem",
    "FilePath",
    "Flag",
    "Gas",
    "GasAmounts",
    "Measure",
    "MixingRatio",
    "MixingRatios",
    "ModeNames",
    "Number",
    "Reading",
    "Sets",
    "Tables",
    "Text",
    "Whole",
    "closest",
    "nearest",
    "shown",
]

COMBINED = "combined"
"""Stands among the modes for all of them together."""


class Reading(Protocol):
    """What turns one value of the file into data, and names what it wants."""

    @property
    def expected(self) -> str:
        """What should stand in the file, with an example."""


def shown(value: Any) -> str:
    """The value as the file would write it, for messages; long ones are cut."""
    if isinstance(value, str):
        text = f'"{value}"'
    elif isinstance(value, bool):
        text = str(value).lower()
    elif isinstance(value, Mapping):
        text = "a table"
    elif isinstance(value, list | tuple) and any(isinstance(item, Mapping) for item in value):
        text = "a list of tables"
    else:
        text = str(value)
    return text if len(text) <= 60 else text[:57] + "..."


def closest(name: str, known: Iterable[str]) -> str | None:
    """The known name that is most like this one, if one is much like it."""
    lowered = {str(k).lower(): str(k) for k in known}
    match = get_close_matches(name.lower(), lowered, n=1, cutoff=0.6)
    return lowered[match[0]] if match else None


def nearest(name: str, known: Iterable[str]) -> str:
    """``; did you mean "..."?`` for the known name closest to this one, or nothing when none is close."""
    match = closest(name, known)
    return f'; did you mean "{match}"?' if match else ""


def _refuse(expected: str, value: Any, note: str = "") -> ValueError:
    return ValueError(f"expected {expected}, got {shown(value)}{note}")


@dataclass(frozen=True, kw_only=True)
class Measure:
    """A physical value with a unit, such as ``"0.7 M_earth"``, read into one fixed unit.

    Attributes
    ----------
    kind : str
        What it is, with its article: ``"a mass"``.
    unit : astropy unit
        The unit of the float that comes out.
    example : str
        A good value.
    zero_allowed, any_sign : bool
        Values must be positive unless told otherwise.
    """

    kind: str
    unit: u.UnitBase
    example: str
    zero_allowed: bool = False
    any_sign: bool = False

    @property
    def expected(self) -> str:
        return f'{self.kind} such as "{self.example}"'

    def __call__(self, value: Any) -> float:
        measured = value if isinstance(value, u.Quantity) else self._parsed(value)
        try:
            number = float(measured.to_value(self.unit))
        except u.UnitConversionError:
            raise _refuse(self.expected, str(value) if isinstance(value, u.Quantity) else value) from None
        except TypeError:
            raise _refuse(f"one value, {self.expected}", value) from None
        self._check(number, value)
        return float(f"{number:.15g}")  # 400 ppm is 0.0004, not 0.00039999999999999996

    def _parsed(self, value: Any) -> u.Quantity:
        if not isinstance(value, str):
            number = isinstance(value, int | float) and not isinstance(value, bool)
            raise _refuse(self.expected, value, " (the unit is missing)" if number else "")
        try:
            return quantity(value)
        except ValueError as error:
            raise _refuse(self.expected, value, f" ({error})" if error.args else "") from None

    def _check(self, number: float, value: Any) -> None:
        if not math.isfinite(number):
            raise _refuse(f"a finite value, {self.expected}", value)
        if not self.any_sign and (number < 0 or (number == 0 and not self.zero_allowed)):
            sign = "not negative" if self.zero_allowed else "greater than zero"
            raise _refuse(f'{self.kind} {sign}, such as "{self.example}"', value)


@dataclass(frozen=True, kw_only=True)
class Number:
    """A plain number; both ends belong to the range unless they are ``open_low`` or ``open_high``."""

    kind: str = "a number"
    low: float = -math.inf
    high: float = math.inf
    open_low: bool = False
    open_high: bool = False

    @property
    def expected(self) -> str:
        ends = []
        if self.low > -math.inf:
            ends.append(f"{'above' if self.open_low else 'from'} {self.low:g}")
        if self.high < math.inf:
            ends.append(f"{'below' if self.open_high else 'up to'} {self.high:g}")
        return " ".join([self.kind, *ends])

    def __call__(self, value: Any) -> float:
        if isinstance(value, bool) or not isinstance(value, int | float) or not math.isfinite(value):
            raise _refuse(self.expected, value)
        above = value > self.low if self.open_low else value >= self.low
        below = value < self.high if self.open_high else value <= self.high
        if not (above and below):
            raise _refuse(self.expected, value)
        return float(value)


@dataclass(frozen=True, kw_only=True)
class Whole:
    """A whole number of at least ``low``."""

    kind: str
    low: int

    @property
    def expected(self) -> str:
        return f"{self.kind}, a whole number from {self.low} up"

    def __call__(self, value: Any) -> int:
        if isinstance(value, bool) or not isinstance(value, int) or value < self.low:
            raise _refuse(self.expected, value)
        return value


@dataclass(frozen=True, kw_only=True)
class Flag:
    """``true`` or ``false``."""

    expected: str = "true or false"

    def __call__(self, value: Any) -> bool:
        if not isinstance(value, bool):
            raise _refuse(self.expected, value)
        return value


@dataclass(frozen=True, kw_only=True)
class Text:
    """A string that is not blank."""

    expected: str = "a string in quotes"

    def __call__(self, value: Any) -> str:
        if not isinstance(value, str) or not value.strip():
            raise _refuse(self.expected, value)
        return value.strip()


@dataclass(frozen=True, kw_only=True)
class Choice:
    """A table of numbers whose keys come from a fixed set, read value by value with another reading."""

    keys: tuple[str, ...]
    value: Measure
    kind: str

    @property
    def expected(self) -> str:
        return f'{self.kind} such as {{ {self.keys[0]} = "{self.value.example}" }}'

    def __call__(self, value: Any) -> dict[str, float]:
        if not isinstance(value, Mapping) or not value:
            raise _refuse(self.expected, value)
        for key in value:
            if key not in self.keys:
                known = ", ".join(self.keys)
                raise ValueError(f'expected keys out of {known}, got "{key}"{nearest(key, self.keys)}')
        return {key: _inside(key, self.value, item) for key, item in value.items()}


@dataclass(frozen=True, kw_only=True)
class MixingRatio:
    """A mole fraction above 0 and up to 1: a number, or a string in ppm, ppb, ppt (per trillion) or %."""

    expected: str = 'a mixing ratio above 0 and up to 1 such as "350 ppm" or 1e-6'

    def __call__(self, value: Any) -> float:
        if isinstance(value, str | u.Quantity):
            kind = "a mixing ratio above 0 and up to 1"
            number = Measure(kind=kind, unit=u.one, example="350 ppm", any_sign=True)(value)
        elif isinstance(value, int | float) and not isinstance(value, bool):
            number = float(value)
        else:
            raise _refuse(self.expected, value)
        if not 0.0 < number <= 1.0:
            raise _refuse(self.expected, value)
        return number


@dataclass(frozen=True, kw_only=True)
class MixingRatios:
    """One mixing ratio or a list of different ones."""

    expected: str = 'a mixing ratio such as "350 ppm" or 1e-6, or a list of them'

    def __call__(self, value: Any) -> tuple[float, ...]:
        items = value if isinstance(value, list | tuple) else [value]
        if not items:
            raise _refuse(self.expected, value)
        ratios = tuple(MixingRatio()(item) for item in items)
        if len(set(ratios)) != len(ratios):
            raise _refuse("different mixing ratios", value)
        return ratios


@dataclass(frozen=True, kw_only=True)
class Ends:
    """A pair, lower and higher, each read by another reading."""

    value: Callable[[Any], float]
    expected: str

    def __call__(self, value: Any) -> tuple[float, float]:
        if not isinstance(value, list | tuple) or len(value) != 2:
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        low, high = (self.value(end) for end in value)
        if low >= high:
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        return low, high


@dataclass(frozen=True, kw_only=True)
class Gas:
    """The formula of a gas that was named by its formula or a common name, in any case of letters."""

    expected: str = 'a gas such as "CO2" or "CFC-11"'

    def __call__(self, value: Any) -> str:
        from planner.spectroscopy.molecules import find_molecule

        if not isinstance(value, str) or not value.strip():
            raise _refuse(self.expected, value)
        try:
            return find_molecule(value.strip()).formula
        except LineDataError as error:
            raise ValueError(str(error)) from None


@dataclass(frozen=True, kw_only=True)
class GasAmounts:
    """A table of gases, each with an amount that another reading reads; keys come out as formulas."""

    expected: str
    amount: Number | MixingRatio
    empty_allowed: bool = False

    def __call__(self, value: Any) -> dict[str, float]:
        if not isinstance(value, Mapping) or not (value or self.empty_allowed):
            raise _refuse(self.expected, value)
        amounts: dict[str, float] = {}
        for name, item in value.items():
            formula = _inside(name, Gas(), name)
            if formula in amounts:
                raise FieldProblem(f"{formula} is given twice", (name,))
            amounts[formula] = _inside(name, self.amount, item)
        return amounts


@dataclass(frozen=True, kw_only=True)
class FilePath:
    """A path, relative to the scenario's folder when it is not absolute."""

    expected: str = 'the path of a file such as "star.ecsv"'

    def __call__(self, value: Any, info: ValidationInfo) -> Path:
        if isinstance(value, Path):
            return value
        if not isinstance(value, str) or not value.strip():
            raise _refuse(self.expected, value)
        return Path((info.context or {}).get("folder", ".")) / Path(value).expanduser()


@dataclass(frozen=True, kw_only=True)
class ModeNames:
    """Instrument modes: short names of shipped ones as they are, paths of own files (``.toml``) made absolute-ready."""

    expected: str = 'a list of instrument modes such as ["..."], short names or paths of .toml files'

    def __call__(self, value: Any, info: ValidationInfo) -> tuple[str | Path, ...]:
        if not isinstance(value, list | tuple) or not value:
            raise _refuse(self.expected, value)
        modes: list[str | Path] = []
        for item in value:
            path = isinstance(item, Path) or (isinstance(item, str) and item.endswith(".toml"))
            modes.append(FilePath()(item, info) if path else Text(expected=self.expected)(item))
        if len(set(modes)) != len(modes):
            raise _refuse("different modes", value)
        if COMBINED in modes and len(modes) < 3:
            raise _refuse(f'at least two modes beside "{COMBINED}"', value)
        return tuple(modes)


@dataclass(frozen=True, kw_only=True)
class Tables:
    """A list of at least one table."""

    expected: str

    def __call__(self, value: Any) -> tuple[Any, ...]:
        if not isinstance(value, list | tuple) or not value:
            raise _refuse(self.expected, value)
        return tuple(value)


@dataclass(frozen=True, kw_only=True)
class Sets:
    """A list of sets of at least two gases each; names come out as formulas."""

    expected: str = 'a list of sets of gases such as [["CFC-11", "CFC-12"]]'

    def __call__(self, value: Any) -> tuple[tuple[str, ...], ...]:
        if not isinstance(value, list | tuple):
            raise _refuse(self.expected, value)
        return tuple(self._one(index, item) for index, item in enumerate(value))

    def _one(self, index: int, value: Any) -> tuple[str, ...]:
        if not isinstance(value, list | tuple) or len(value) < 2:
            raise FieldProblem(str(_refuse(self.expected, value)), (index,))
        formulas = tuple(_inside(index, Gas(), item) for item in value)
        if len(set(formulas)) != len(formulas):
            raise FieldProblem(str(_refuse("different gases", value)), (index,))
        return formulas


class FieldProblem(ValueError):
    """A problem whose place is further inside than the value pydantic was looking at."""

    def __init__(self, message: str, at: tuple[str | int, ...]) -> None:
        super().__init__(message)
        self.at = at


def _inside(key: str | int, reading: Any, value: Any) -> Any:
    """Read a value that stands under a key of a table; a problem names the key."""
    try:
        return reading(value)
    except ValueError as error:
        raise FieldProblem(str(error), (key, *getattr(error, "at", ()))) from None
