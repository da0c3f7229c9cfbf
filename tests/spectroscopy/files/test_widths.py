"""Widths beside a file of line records."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.widths import format_widths, parse_widths, widths_path

TEXT = "of the records abc\ngamma_H2,n_H2,gamma_He,n_He\n0.1,0.6,0.05,nan\nnan,nan,0.06,0.7\n"


@pytest.mark.parametrize(
    ("records", "widths"), [("a.par", "a.widths.csv"), ("b.PAR.gz", "b.widths.csv.gz"), ("c.d.par", "c.d.widths.csv")]
)
def test_they_lie_beside_the_records(records, widths):
    """The name follows that of the records."""
    assert widths_path(Path("x") / records) == Path("x") / widths


def test_what_is_written_is_read():
    """Numbers to six digits, the unknown included."""
    by_gas = {"H2": np.array([[0.1, np.nan], [0.6, np.nan]]), "He": np.array([[0.05, 0.06], [np.nan, 0.7]])}
    text = format_widths(by_gas, "abc")
    assert text == TEXT
    widths = parse_widths(text.encode(), "here", 2, "abc")
    for gas, values in by_gas.items():
        np.testing.assert_array_equal(widths.by_gas[gas], values)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("abc", "abd", "here:1: these widths belong to other line records"),
        ("n_H2", "m_H2", "here:2: expected columns such as gamma_H2,n_H2"),
        ("0.1,", "x,", "here:3: expected numbers or nan"),
        ("0.1,", "0.1,0.2,", "here:3: expected numbers or nan"),
        ("0.06,0.7", "-0.06,0.7", "here:4: expected 4 finite numbers or nan, widths of 0 or more"),
        ("0.06,0.7", "0.06,inf", "here:4: expected 4 finite numbers"),
        ("nan,nan,0.06,0.7\n", "", "here: expected 2 rows, one per line record, got 1"),
        ("gamma_H2,n_H2", "gamma_Xx,n_Xx", "Xx"),
    ],
)
def test_broken_widths_are_refused(old, new, message):
    """The first fault is named with file and line."""
    with pytest.raises(LineDataError, match=message):
        parse_widths(TEXT.replace(old, new).encode(), "here", 2, "abc")
