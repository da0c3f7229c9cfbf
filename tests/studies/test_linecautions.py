"""What a plan says of the line data it leans on."""

from __future__ import annotations

from dataclasses import replace
from types import SimpleNamespace

import pytest

from planner.errors import LineDataError
from planner.spectroscopy.accuracyfile import AccuracyTable, Judgement, UnseenWindow
from planner.studies.linecautions import embedded_quality, line_cautions
from planner.studies.results import BandShare

UNSEEN = UnseenWindow(
    gas="CO2", from_per_cm=2000.0, to_per_cm=2300.0, sum_cm=1e-17, strength_factor=2.0, rests_on="memory", published=""
)
BAND = BandShare(from_um=1e4 / 2250.0, to_um=1e4 / 2050.0, share=0.5)


def library(*imported: tuple[float, float]):
    """A library in which files stand for CO2 over some intervals and nothing is known of N2."""

    def gas(name):
        if name == "N2":
            raise LineDataError("N2: no lines")
        return SimpleNamespace(imported_per_cm=imported)

    return SimpleNamespace(gas=gas)


def table(**changes) -> AccuracyTable:
    return AccuracyTable(unseen=(replace(UNSEEN, **changes),))


def test_stretch_never_compared_is_said():
    """Where, on what it rests, and what that means in scale heights."""
    (sentence,) = line_cautions(library(), ["CO2"], [BAND], table())
    assert sentence.startswith("the embedded CO2 at 4.44-4.88 um was never compared with real spectra")
    assert "rests on: memory; good to a factor 2, 0.35 scale heights" in sentence


def test_small_errors_and_small_shares_are_not_said():
    """A strength good to 10 % does no harm, nor does a band with little information."""
    assert line_cautions(library(), ["CO2"], [BAND], table(strength_factor=1.1)) == ()
    assert line_cautions(library(), ["CO2"], [replace(BAND, share=0.05)], table()) == ()


def test_files_of_the_user_silence_it():
    """Where real files stand for the gas the embedded list does not matter; beside them it does."""
    assert line_cautions(library((1900.0, 2400.0)), ["CO2"], [BAND], table()) == ()
    (sentence,) = line_cautions(library((1900.0, 2150.0)), ["CO2"], [BAND], table())
    assert "at 4.44-4.65 um" in sentence


def test_gases_without_lines_have_no_quality():
    """Such as N2 in a background."""
    assert embedded_quality(library(), "N2", 4.0, 5.0, table()) == []


def test_windows_on_one_source_make_one_sentence():
    """Two stretches that rest on the same are named together."""
    both = AccuracyTable(unseen=(UNSEEN, replace(UNSEEN, from_per_cm=3000.0, to_per_cm=3300.0)))
    bands = [BAND, BandShare(from_um=1e4 / 3250.0, to_um=1e4 / 3050.0, share=0.3)]
    (sentence,) = line_cautions(library(), ["CO2"], bands, both)
    assert "4.44-4.88, 3.08-3.28 um" in sentence


@pytest.mark.parametrize(("verdict", "count"), [(Judgement.MISSES, 1), (Judgement.MEETS, 0)])
def test_a_miss_is_said_and_a_hit_is_not(verdict, count):
    """Windows that were compared count by their verdict, however large the factor."""
    from planner.spectroscopy.accuracyfile import JudgedWindow

    row = JudgedWindow(
        gas="CO2", from_per_cm=2000.0, to_per_cm=2300.0, verdict=verdict, missed="", compared_with="HITRAN2012",
        in_sample=True, temperatures_k=(250.0,), mixing_ratios=(1e-6,), bins=(1,), percentile_90=(0.1,),
        median=(0.1,), mean=(0.1,), percentile_90_at_1000=(0.1,), real_sum_cm=1.0, sum_ratio=1.0,
        strength_factor=1.1, embedded_lines=1, real_lines=1,
    )  # fmt: skip
    found = line_cautions(library(), ["CO2"], [BAND], AccuracyTable(judged=(row,)))
    assert len(found) == count
    assert all("misses its marks against real data (HITRAN2012)" in sentence for sentence in found)
