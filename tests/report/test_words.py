"""Single numbers in words."""

from __future__ import annotations

import math

import pytest

from planner.report.words import band_text, bands_text, count_text, gas_text, hours_text, ratio_text, snr_text
from planner.studies.results import BandShare


@pytest.mark.parametrize(
    ("ratio", "text"),
    [
        (0.21, "21 %"),
        (0.01, "1 %"),
        (9.99e-3, "9990 ppm"),
        (3.5e-4, "350 ppm"),
        (1e-6, "1 ppm"),
        (2.5e-9, "2.5 ppb"),
        (5.03e-10, "503 ppt"),
        (2e-15, "0.002 ppt"),
    ],
)
def test_ratio_text(ratio, text):
    """The unit suits the size."""
    assert ratio_text(ratio) == text


def test_counts_and_hours():
    """Thousands are set apart; what is never reached says so, and so does what nobody would grant."""
    assert [count_text(n) for n in (1, 1234, 12345, None)] == ["1", "1 234", ">9999", "never"]
    hours = (3.92, 99.9, 99.96, 1234.5, 9999.4, 9999.6, None)
    assert [hours_text(h) for h in hours] == ["3.9", "99.9", "100", "1 234", "9 999", ">9999", "never"]


def test_snr_text():
    """Three digits at most, and a word for no bound."""
    assert [snr_text(s) for s in (0.004, 9.994, 9.996, 99.96, math.inf)] == ["0.00", "9.99", "10.0", "100", "none"]


def test_bands():
    """Ends keep apart; shares are per cent."""
    assert band_text(3.2, 3.45) == "3.20-3.45"
    assert band_text(5.0, 12.0) == "5.0-12.0"
    assert bands_text([BandShare(from_um=3.2, to_um=3.45, share=0.615)]) == "3.20-3.45 (62 %)"
    assert bands_text([]) == ""


def test_gas_text():
    """Abbreviations in capitals take the place of long formulas; the rest stay formulas."""
    assert [gas_text(g) for g in ("CCl2F2", "CH4", "CCl3F + CCl2F2", "no gas")] == [
        "CFC-12",
        "CH4",
        "CFC-11 + CFC-12",
        "no gas",
    ]
