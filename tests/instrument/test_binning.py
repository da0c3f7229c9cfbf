"""Wavelength bins."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.instrument import Bins, Mode, Photometer, Spectrometer, list_modes, make_bins, read_mode
from planner.instrument.modes import interpolate

MODES = {name: read_mode(name) for name in list_modes()}


def element_ln(mode: Mode, bins: Bins) -> np.ndarray:
    """Width in ln(wavelength) of the resolution element at the centre of each bin; 0 for photometers."""
    widths = []
    for index, centre_um in zip(bins.detector, bins.centre_um, strict=True):
        detector = mode.detectors[index]
        power = np.inf if isinstance(detector, Photometer) else interpolate(detector.resolving_power, centre_um)
        widths.append(1 / power)
    return np.array(widths)


@settings(max_examples=60, derandomize=True, deadline=None)
@given(st.sampled_from(sorted(MODES)), st.floats(5.0, 2000.0))
def test_bins_tile_the_ranges(name: str, resolving_power: float) -> None:
    """Every range is covered once, without holes, overlaps or crossings; no bin is narrower than its element."""
    mode = MODES[name]
    bins = make_bins(mode, resolving_power)
    starts = {(i, low) for i, detector in enumerate(mode.detectors) for low, _ in detector.ranges_um}
    ends = {(i, high) for i, detector in enumerate(mode.detectors) for _, high in detector.ranges_um}
    joins = list(zip(bins.detector[:-1], bins.to_um[:-1], bins.detector[1:], bins.from_um[1:], strict=True))
    assert (bins.detector[0], bins.from_um[0]) in starts
    assert (bins.detector[-1], bins.to_um[-1]) in ends
    for before, to_um, after, from_um in joins:
        touching = before == after and to_um == from_um
        assert touching or ((before, to_um) in ends and (after, from_um) in starts)
    assert np.all(bins.width_ln >= element_ln(mode, bins) * (1 - 1e-8))


@settings(max_examples=60, derandomize=True, deadline=None)
@given(st.sampled_from(sorted(MODES)), st.floats(20.0, 400.0))
def test_bins_are_as_fine_as_asked_or_allowed(name: str, resolving_power: float) -> None:
    """No bin is wider than two and a half times the wider of asked width and element."""
    mode = MODES[name]
    bins = make_bins(mode, resolving_power)
    spectral = np.array([isinstance(mode.detectors[i], Spectrometer) for i in bins.detector])
    wanted = np.maximum(element_ln(mode, bins), 1 / resolving_power)
    assert np.all((bins.width_ln <= 2.5 * wanted)[spectral])


@pytest.mark.parametrize("name", ["grating-3-to-5-um", "cross-dispersed-near-infrared", "grism-2-to-4-um"])
def test_fine_bins_nest_in_coarse_ones(name: str) -> None:
    """Where the element permits, each edge of R = 100 is one of R = 400."""
    coarse, fine = make_bins(MODES[name], 100.0), make_bins(MODES[name], 400.0)
    for index in np.unique(coarse.detector):
        edges = np.log(fine.from_um[fine.detector == index])
        for edge in np.log(coarse.from_um[coarse.detector == index]):
            assert np.abs(edges - edge).min() < 1e-12


def test_whole_bins_have_the_asked_width(make_mode: Any) -> None:
    """Inner edges lie at whole multiples of 1/R in ln(wavelength), whatever the range."""
    bins = make_bins(make_mode({"ranges_um": [[1.003, 1.5]]}), 100.0)
    assert bins.width_ln[1:-1] == pytest.approx(0.01)
    assert np.log(bins.from_um[1:]) * 100 == pytest.approx(np.round(np.log(bins.from_um[1:]) * 100), abs=1e-9)
    assert bins.resolving_power[1:-1] == pytest.approx(100.0)


@pytest.mark.parametrize(("extra", "bins_expected"), [(0.004, 10), (0.006, 11)])
def test_remainder_is_merged_below_half(make_mode: Any, extra: float, bins_expected: int) -> None:
    """Less than half a bin at the end joins its neighbour; more stands alone."""
    mode = make_mode({"ranges_um": [[1.0, float(np.exp(0.1 + extra))]]})
    bins = make_bins(mode, 100.0)
    assert len(bins) == bins_expected
    assert bins.width_ln.sum() == pytest.approx(0.1 + extra)


def test_native_bins_follow_the_element(make_mode: Any) -> None:
    """Where the element is the coarser, each bin is one element wide at its centre."""
    mode = make_mode({"resolving_power": [[1.0, 30.0], [2.0, 60.0]]})
    bins = make_bins(mode, 100.0)
    assert (bins.width_ln / element_ln(mode, bins))[:-1] == pytest.approx(1.0, rel=1e-6)


def test_a_range_narrower_than_an_element_is_one_bin(make_mode: Any) -> None:
    """There is nothing to cut."""
    bins = make_bins(make_mode({"ranges_um": [[1.0, 1.01]], "resolving_power": [[1.0, 20.0]]}))
    assert (bins.from_um.tolist(), bins.to_um.tolist()) == ([1.0], [1.01])


def test_photometers_are_single_bins() -> None:
    """Three channels, three bins, at any resolving power."""
    mode = MODES["survey-telescope-1m"]
    for resolving_power in (10.0, 1000.0):
        bins = make_bins(mode, resolving_power)
        assert bins.detector[:4].tolist() == [0, 1, 2, 3]
        assert bins.from_um[:3].tolist() == [0.5, 0.6, 0.8]


def test_centre_and_width() -> None:
    """The centre is the geometric mean, so that both halves are equal in ln(wavelength)."""
    bins = Bins(detector=[0], from_um=[1.0], to_um=[4.0])
    assert bins.centre_um == pytest.approx([2.0])
    assert bins.width_ln == pytest.approx([np.log(4.0)])


@pytest.mark.parametrize("power", [0.5, float("nan"), float("inf"), -100.0])
def test_make_bins_invalid(power: float) -> None:
    """Resolving powers below one are no bins."""
    with pytest.raises(ValueError, match="expected a finite number from 1"):
        make_bins(MODES["near-infrared-prism"], power)


@pytest.mark.parametrize(
    ("detector", "low", "high"), [([0], [2.0], [1.0]), ([0], [0.0], [1.0]), ([0, 0], [1.0], [2.0])]
)
def test_bins_invalid(detector: list[int], low: list[float], high: list[float]) -> None:
    """Edges ascend and arrays match."""
    with pytest.raises(ValueError, match="Bins: expected"):
        Bins(detector=detector, from_um=low, to_um=high)
