"""Values of options: one number and one unit, as in the files."""

from __future__ import annotations

import click
import pytest

from planner.commands.options import Measured, Stretch


@pytest.mark.parametrize(
    ("text", "ends"),
    [
        ("2000:2300 1/cm", (2000, 2300)),
        ("4:5 um", (2000, 2500)),
        ("5:4 \u00b5m", (2000, 2500)),
        ("2000:2300cm-1", (2000, 2300)),
    ],
)
def test_stretch(text, ends):
    """Any spectral unit, either way round, comes out as ascending wavenumbers."""
    assert Stretch().convert(text, None, None) == pytest.approx(ends)


@pytest.mark.parametrize("text", ["2000:2 300 1/cm", "2 000:2300 1/cm", "2000-2300 1/cm", "4:5", "4:5 K", "4:5 um um"])
def test_stretch_invalid(text):
    """A space inside a number, no unit, or the unit of something else is refused with an example."""
    with pytest.raises(click.BadParameter, match='expected a range such as "2000:2300 1/cm"'):
        Stretch().convert(text, None, None)


def test_measured_says_what_is_wrong():
    """Options read values as files do, and say the same of bad ones."""
    hours = Measured("a time", "h", "60 h")
    assert hours.convert("90 min", None, None) == 1.5
    with pytest.raises(click.BadParameter, match='expected a time such as "60 h", got "1 000 h"'):
        hours.convert("1 000 h", None, None)
