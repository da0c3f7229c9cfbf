"""How far an embedded list can be trusted in a stretch."""

from __future__ import annotations

from dataclasses import replace
from math import log

import pytest

from planner.errors import LineDataError
from planner.spectroscopy.accuracyfile import AccuracyTable, JudgedWindow, Judgement, UnseenWindow
from planner.spectroscopy.quality import quality_summary, window_quality

JUDGED = JudgedWindow(
    gas="CO2",
    from_per_cm=2000.0,
    to_per_cm=2500.0,
    verdict=Judgement.MEETS,
    missed="",
    compared_with="HITRAN2012",
    in_sample=False,
    temperatures_k=(250.0,),
    mixing_ratios=(1e-6, 1e-4, 1e-2),
    bins=(1, 2, 9),
    percentile_90=(0.01, 0.02, 0.13),
    median=(0.01, 0.01, 0.04),
    mean=(0.0, 0.0, 0.0),
    percentile_90_at_1000=(0.02, 0.07, 0.21),
    real_sum_cm=1e-17,
    sum_ratio=1.0,
    strength_factor=1.2,
    embedded_lines=10,
    real_lines=10,
)
MISSED = replace(
    JUDGED, from_per_cm=2500.0, to_per_cm=3000.0, verdict=Judgement.MISSES, missed="90 %", strength_factor=2
)
NARROW = replace(JUDGED, from_per_cm=3300.0, to_per_cm=3303.0, verdict=Judgement.NARROW)
UNSEEN = UnseenWindow(
    gas="CO2", from_per_cm=3000.0, to_per_cm=4000.0, sum_cm=1e-20, strength_factor=1.5, rests_on="memory", published=""
)
TABLE = AccuracyTable(judged=(JUDGED, MISSED, NARROW), unseen=(UNSEEN,))


def test_windows_of_a_stretch_by_wavelength():
    """Each window as far as it lies in the stretch, the shortest wavelength first."""
    found = window_quality("CO2", 1e4 / 3500.0, 1e4 / 2200.0, TABLE)
    assert [(window.compared, window.meets) for window in found] == [(False, False), (True, False), (True, True)]
    assert found[0].from_um == pytest.approx(1e4 / 3500.0)
    assert found[-1].to_um == pytest.approx(1e4 / 2200.0)
    assert [window.basis for window in found] == ["memory", "HITRAN2012", "HITRAN2012"]


def test_uncertainty_is_half_the_logarithm():
    """Of the strength error, in scale heights."""
    (window,) = window_quality("carbon dioxide", 1e4 / 2900.0, 1e4 / 2600.0, TABLE)
    assert window.uncertainty_scale_heights == pytest.approx(0.5 * log(2.0))


def test_slivers_and_fragments_do_not_count():
    """A window that holds less than a twentieth of the stretch, or is too narrow to judge, is left out."""
    assert [w.basis for w in window_quality("CO2", 1e4 / 3010.0, 1e4 / 2600.0, TABLE)] == ["HITRAN2012"]
    assert [w.compared for w in window_quality("CO2", 1e4 / 3303.0, 1e4 / 3300.0, TABLE)] == [False]


def test_widest_of_several_comparisons_counts():
    """Where a stretch was judged twice, and only once."""
    wider = replace(JUDGED, from_per_cm=1900.0, to_per_cm=2600.0, compared_with="HITRAN2020")
    table = AccuracyTable(judged=(JUDGED, wider))
    assert [w.basis for w in window_quality("CO2", 1e4 / 2400.0, 1e4 / 2100.0, table)] == ["HITRAN2020"]


def test_nothing_where_nothing_shows():
    """Another gas, another stretch."""
    assert window_quality("CO2", 0.5, 0.6, TABLE) == []
    assert window_quality("CH4", 3.0, 5.0, TABLE) == []
    with pytest.raises(LineDataError, match="CO3"):
        window_quality("CO3", 3.0, 5.0, TABLE)


def test_summary_of_a_gas():
    """Windows that meet the marks of those that can be judged, and those never compared."""
    assert quality_summary("CO2", TABLE) == "1 of 2 windows meet the marks, 1 never compared"
    assert quality_summary("CH4", TABLE) == "no accuracy stored"


def test_shipped_table_knows_the_main_bands():
    """CO2 at 4.3 um, CH4 at 3.3 um and SF6 at 10.5 um each have an entry."""
    for gas, from_um, to_um in (("CO2", 4.2, 4.3), ("CH4", 3.2, 3.4), ("SF6", 10.4, 10.7)):
        assert window_quality(gas, from_um, to_um)
