"""What was never compared with real spectra, and published band intensities."""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.errors import LineDataError
from planner.spectroscopy.accuracyfile import stored_accuracy
from planner.spectroscopy.lists.build import embedded_formulas, read_constants
from planner.spectroscopy.store import Store
from planner.studies.unseen import PublishedBand, parse_published, published_bands, unseen_windows

BAND = PublishedBand(
    gas="CCl4", from_per_cm=700.0, to_per_cm=860.0, sum_cm=6.6e-17, within_factor=1.1, source="a paper"
)
TEXT = """
[sources]
a = "a paper"
[[band]]
gas = "CCl4"
range_per_cm = [700, 860]
sum_cm = 6.6e-17
within_factor = 1.1
"""


def test_published_bands_are_read():
    """With their source spelled out."""
    assert parse_published(TEXT + 'source = "a"\n', Path("p.toml")) == (BAND,)


@pytest.mark.parametrize("text", [TEXT, TEXT + 'source = "b"\n', "[[band", TEXT.replace("[700, 860]", "[700]")])
def test_broken_tables_are_refused(text):
    """With the name of the file."""
    with pytest.raises(LineDataError, match=r"p\.toml: not a table of published band intensities"):
        parse_published(text, Path("p.toml"))


def test_words_on_a_sum():
    """Ratio, stretch, and whether it lies within what the figure is worth."""
    assert BAND.words(6.6e-17).startswith("1.00 of the published 6.6e-17 at 700-860 per cm, within its factor 1.1")
    assert "0.50 of" in BAND.words(3.3e-17)
    assert "not within its factor 1.1 (a paper)" in BAND.words(3.3e-17)


def test_regions_never_compared(tmp_path):
    """The band of CCl4 at 12.7 um, and how its published sum narrows what its source claims."""
    store = Store(tmp_path)
    bare = unseen_windows(["CCl4"], [], [], store)
    (before,) = [row for row in bare if row.from_per_cm < 794.0 < row.to_per_cm]
    assert before.strength_factor == 2.0
    assert before.published == ""
    (after,) = [row for row in unseen_windows(["CCl4"], [], [BAND], store) if row.published]
    assert after.strength_factor == 1.1
    low, high = read_constants("CCl4").covers_per_cm[0]
    assert all(low <= row.from_per_cm < row.to_per_cm <= high for row in bare)


def test_a_wrong_sum_narrows_nothing(tmp_path):
    """Nor does a band that is a small part of the region."""
    wrong = PublishedBand(**{**BAND.__dict__, "sum_cm": 1e-17})
    small = PublishedBand(**{**BAND.__dict__, "from_per_cm": 790.0, "to_per_cm": 790.5, "within_factor": 1e9})
    for band in (wrong, small):
        rows = unseen_windows(["CCl4"], [], [band], Store(tmp_path))
        assert {row.strength_factor for row in rows if row.published} == {2.0}


def test_shipped_figures_belong_to_shipped_lists():
    """Every published band lies inside the coverage of its list, and most sums agree."""
    bands = published_bands()
    assert {band.gas for band in bands} <= set(embedded_formulas())
    for band in bands:
        assert any(a < band.to_per_cm and b > band.from_per_cm for a, b in read_constants(band.gas).covers_per_cm)
    words = [part for row in stored_accuracy().unseen for part in row.published.split("; ") if part]
    assert sum("not within" in part for part in words) <= len(words) // 5
