"""Readings that the gas catalogue needs beside those of scenarios: choices, spans of values, rows of bands."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from planner.scenario.readings import Measure, MixingRatio, nearest, shown

__all__ = ["AmountSpan", "BandRows", "OneOf", "PerPpb", "Span"]

Pair = tuple[float, float]


@dataclass(frozen=True, kw_only=True)
class OneOf:
    """One word out of a few."""

    words: tuple[str, ...]

    @property
    def expected(self) -> str:
        quoted = [f'"{word}"' for word in self.words]
        return f"one of {', '.join(quoted)}" if len(quoted) > 1 else quoted[0]

    def __call__(self, value: Any) -> str:
        if value not in self.words:
            hint = nearest(value, self.words) if isinstance(value, str) else ""
            raise ValueError(f"expected {self.expected}, got {shown(value)}{hint}")
        return str(value)


@dataclass(frozen=True, kw_only=True)
class Span:
    """Two values, lower and higher, each read by another reading; one value alone stands for both ends if allowed."""

    value: Callable[[Any], float]
    kind: str
    example: str
    single_allowed: bool = False

    @property
    def expected(self) -> str:
        single = f'one value such as "{self.example}" or ' if self.single_allowed else ""
        return f"{self.kind}: {single}a pair [lower, higher] of such values"

    def __call__(self, value: Any) -> Pair:
        if not isinstance(value, list | tuple):
            if not self.single_allowed:
                raise ValueError(f"expected {self.expected}, got {shown(value)}")
            value = (value, value)
        if len(value) != 2:
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        low, high = (self.value(end) for end in value)
        if low > high or (low == high and not self.single_allowed):
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        return low, high


@dataclass(frozen=True, kw_only=True)
class AmountSpan:
    """A mixing ratio or a pair of them; 0 stands for a gas that was not there at all."""

    expected: str = 'a mixing ratio such as "226 ppt", a pair [lower, higher], or 0 for none'

    def __call__(self, value: Any) -> Pair:
        if value == 0 and isinstance(value, int | float) and not isinstance(value, bool):
            return 0.0, 0.0
        return Span(value=MixingRatio(), kind="a mixing ratio", example="226 ppt", single_allowed=True)(value)


@dataclass(frozen=True, kw_only=True)
class PerPpb:
    """A value per ppb. The ppb must be written out: to the unit library it is a plain number that may be left off."""

    value: Measure

    @property
    def expected(self) -> str:
        return f'{self.value.kind} such as "{self.value.example} ppb-1"'

    def __call__(self, value: Any) -> float:
        number, mark, rest = str(value).partition("ppb-1")
        if not isinstance(value, str) or not mark or rest.strip():
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        return self.value(number)


@dataclass(frozen=True, kw_only=True)
class BandRows:
    """Rows ``[from um, to um, integrated intensity in cm per molecule, name]``."""

    expected: str = 'a list of rows [from um, to um, intensity in cm per molecule, "name"], each with from < to'

    def __call__(self, value: Any) -> tuple[tuple[float, float, float, str], ...]:
        if not isinstance(value, list | tuple) or not value:
            raise ValueError(f"expected {self.expected}, got {shown(value)}")
        return tuple(self._row(row) for row in value)

    def _row(self, row: Any) -> tuple[float, float, float, str]:
        if isinstance(row, list | tuple) and len(row) == 4 and isinstance(row[3], str) and row[3].strip():
            numbers = [x for x in row[:3] if isinstance(x, int | float) and not isinstance(x, bool)]
            if len(numbers) == 3 and all(math.isfinite(x) for x in numbers):
                low, high, intensity = (float(x) for x in numbers)
                if 0 < low < high and intensity > 0:
                    return low, high, intensity, row[3].strip()
        raise ValueError(f"expected {self.expected}, got the row {shown(row)}")
