"""How a text such as ``"250 K"`` becomes a quantity: one number, one unit, and nothing else."""

from __future__ import annotations

import re
from functools import lru_cache

import astropy.units as u

__all__ = ["quantity"]

# Spellings people use that astropy lacks. "ppt" is parts per trillion, as in atmospheric chemistry.
_MORE_UNITS = [
    u.def_unit("ppm", 1e-6 * u.one),
    u.def_unit("ppb", 1e-9 * u.one),
    u.def_unit("ppt", 1e-12 * u.one),
    u.def_unit("atm", 101325 * u.Pa),
    u.def_unit(["days", "day"], u.day),
    u.def_unit(["hours", "hour", "hrs"], u.hour),
    u.def_unit(["minutes", "mins"], u.minute),
    u.def_unit("sigma", u.one),
]
_NUMBER_THEN_UNIT = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?|[+-]?(?:nan|inf)) ?(.*)", re.ASCII)
_NUMBER_GOES_ON = re.compile(r"(?!1 ?/)[.,'_]?\d")  # "1/cm" is a unit


def quantity(text: str) -> u.Quantity:
    """One number and one unit, such as ``"250 K"``.

    The unit library multiplies whatever stands side by side, so ``"2 600 K"`` would be 1200 K and ``"4 % ppm"``
    4e-8: a unit with a number inside, or with more than one name for a plain number, is refused here.

    Raises
    ------
    ValueError
        In a few words, what is wrong; none where the text does not even begin with a number.
    """
    match = _NUMBER_THEN_UNIT.fullmatch(" ".join(text.replace("\N{MINUS SIGN}", "-").split()))
    if match is None:
        raise ValueError
    number, name = match.groups()
    if not name:
        raise ValueError("the unit is missing")
    if _NUMBER_GOES_ON.match(name):
        raise ValueError(f'"{name}" is not a unit; write the number without spaces, with a point for decimals')
    return float(number) * _unit(name)


@lru_cache(maxsize=256)
def _unit(name: str) -> u.UnitBase:
    try:
        with u.add_enabled_units(_MORE_UNITS):
            unit = u.Unit(name)
    except (ValueError, ArithmeticError):
        raise ValueError(f'"{name}" is not a unit') from None
    if not _is_one_unit(unit):
        raise ValueError(f'"{name}" multiplies numbers; write one number and one unit')
    return unit


def _is_one_unit(unit: u.UnitBase) -> bool:
    """Whether a unit is without factors: numbers, or names of numbers (%, ppm) beside other names."""
    if not isinstance(unit, u.CompositeUnit):
        return True
    return unit.scale == 1 and not any(base.is_equivalent(u.one) for base in unit.bases)
