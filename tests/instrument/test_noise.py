"""The random error of a transit depth."""

from __future__ import annotations

import itertools
import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import RangeError
from planner.instrument import Bins, Mode, list_modes, make_bins, photon_weights, read_mode, transit_noise
from planner.instrument.background import background_e_per_s
from planner.instrument.modes import interpolate
from planner.instrument.ramps import choose_groups, slope_variance_e2

GRID_UM = np.exp(np.arange(math.log(0.45), math.log(13.0), 1e-4))
HOUR_S = 3600.0
NO_EXTRAS = {
    "read_noise": "1e-9 electron",
    "dark_current": "0 electron/s",
    "background": "0 electron/s",
    "reset_frames": 0,
    "groups_at_most": 2,
}


def noise(mode: Mode, photons: Any, in_s: float = HOUR_S, out_s: float = HOUR_S, bins: Bins | None = None) -> Any:
    """Noise with the same photons everywhere, or with given ones."""
    photons = np.broadcast_to(np.asarray(photons, dtype=float), GRID_UM.shape)
    return transit_noise(mode, bins or make_bins(mode), GRID_UM, photons, in_s, out_s)


def slow_noise_ppm(mode: Mode, bins: Bins, photons: float, in_s: float, out_s: float, groups: int) -> np.ndarray:
    """Depth errors of a one-detector mode pixel by pixel: half the light in one row, the rest spread evenly."""
    detector = mode.detectors[0]
    errors = []
    for low, high in zip(bins.from_um, bins.to_um, strict=True):
        edges = np.linspace(low, high, round((high - low) * 1e3 / detector.nm_per_pixel[0][1]) + 1)
        rows = int(detector.extraction_height_pixels)
        variance = light = 0.0
        for start, end in itertools.pairwise(edges):
            column = photons * mode.telescope.collecting_area_m2 * detector.throughput[0][1] * (end - start)
            shares = [0.5] + [0.5 / (rows - 1)] * (rows - 1)
            light += column
            for share in shares:
                rate = share * column + detector.background_e_per_s + detector.dark_current_e_per_s
                variance += slope_variance_e2(
                    groups=groups,
                    frames_per_group=detector.frames_per_group,
                    frame_time_s=detector.frame_time_s,
                    rate_e_per_s=rate,
                    read_noise_e=detector.read_noise_e,
                )
        group_s = detector.frames_per_group * detector.frame_time_s
        cycle_s = groups * group_s + detector.reset_frames * detector.frame_time_s
        slope_variance = variance / ((groups - 1) * group_s) ** 2
        errors.append(1e6 * math.sqrt(slope_variance * (cycle_s / in_s + cycle_s / out_s)) / light)
    return np.array(errors)


@pytest.mark.parametrize("frames", [1, 4])
def test_against_adding_pixel_by_pixel(make_mode: Any, frames: int) -> None:
    """The slow sum over pixels and the shipped one agree but for columns cut by bin edges."""
    mode = make_mode({"frames_per_group": frames})
    bins = make_bins(mode)
    found = noise(mode, 1e5, 3000.0, 5000.0, bins)
    expected = slow_noise_ppm(mode, bins, 1e5, 3000.0, 5000.0, int(found.groups[0]))
    assert found.groups[0] > 2
    assert found.depth_error_ppm == pytest.approx(expected, rel=0.02)


@pytest.mark.parametrize("name", list_modes())
def test_every_shipped_mode_gives_noise(name: str) -> None:
    """Finite where there is light, with shares that add to one and the groups it says."""
    mode = read_mode(name)
    found = noise(mode, 1e5)
    assert np.all(np.isfinite(found.depth_error_ppm))
    assert np.all(found.depth_error_ppm > 0)
    assert found.star_share + found.background_share + found.read_share == pytest.approx(1.0)
    assert not found.saturated.any()
    assert found.saturated_um == ()
    assert len(found.groups) == len(found.duty) == len(mode.detectors)
    assert np.all((found.duty > 0) & (found.duty < 1))


def test_photon_limit(make_mode: Any) -> None:
    """With two groups and nothing but star light the error is that of counting electrons half the time."""
    mode = make_mode(NO_EXTRAS)
    found = noise(mode, 1e4, 2000.0, 6000.0)
    counts = found.electrons_per_s * 0.5
    expected = 1e6 * np.sqrt(1 / (counts * 2000.0) + 1 / (counts * 6000.0))
    assert found.duty[0] == 0.5
    assert found.depth_error_ppm == pytest.approx(expected, rel=1e-9)


@settings(max_examples=25, derandomize=True, deadline=None)
@given(factor=st.floats(1.01, 100.0))
def test_photon_limited_error_falls_with_the_root_of_the_light(make_mode: Any, factor: float) -> None:
    """At a fixed number of groups, without other noise."""
    mode = make_mode(NO_EXTRAS)
    faint, bright = noise(mode, 1e3), noise(mode, 1e3 * factor)
    assert bright.depth_error_ppm * math.sqrt(factor) == pytest.approx(faint.depth_error_ppm, rel=1e-9)


@settings(max_examples=25, derandomize=True, deadline=None)
@given(photons=st.floats(1.0, 1e5), factor=st.floats(1.01, 10.0))
def test_brighter_stars_have_smaller_errors(make_mode: Any, photons: float, factor: float) -> None:
    """At a fixed number of groups, with all other noise in place."""
    mode = make_mode({"groups_at_most": 2})
    assert np.all(noise(mode, photons * factor).depth_error_ppm < noise(mode, photons).depth_error_ppm)


@settings(max_examples=25, derandomize=True, deadline=None)
@given(photons=st.floats(1.0, 1e7), factor=st.floats(3.0, 10.0))
def test_much_brighter_stars_have_smaller_errors(make_mode: Any, photons: float, factor: float) -> None:
    """Fewer groups cost at most half of the time per step, so that three times the light always pays."""
    mode = make_mode({"full_well": "1e9 electron"})
    assert np.all(noise(mode, photons * factor).depth_error_ppm < noise(mode, photons).depth_error_ppm)


@pytest.mark.parametrize("factor", [2.0, 5.0])
def test_time_averages_white_noise_down(make_mode: Any, factor: float) -> None:
    """Both stretches longer by a factor: the error falls with its root. More out-of-transit time alone helps less."""
    mode = make_mode({"groups_at_most": 4})
    once, longer = noise(mode, 1e4), noise(mode, 1e4, factor * HOUR_S, factor * HOUR_S)
    assert longer.depth_error_ppm * math.sqrt(factor) == pytest.approx(once.depth_error_ppm)
    baseline = noise(mode, 1e4, HOUR_S, factor * HOUR_S)
    assert baseline.depth_error_ppm == pytest.approx(once.depth_error_ppm * math.sqrt((1 + 1 / factor) / 2))


def test_splitting_a_bin_splits_its_electrons(make_mode: Any) -> None:
    """Two halves collect what the whole does, and weigh as much together when averaged by their light."""
    mode = make_mode(NO_EXTRAS)
    whole = Bins(detector=[0], from_um=[1.2], to_um=[1.3])
    halves = Bins(detector=[0, 0], from_um=[1.2, 1.24], to_um=[1.24, 1.3])
    one, two = noise(mode, 1e5, bins=whole), noise(mode, 1e5, bins=halves)
    assert two.electrons_per_s.sum() == pytest.approx(one.electrons_per_s[0])
    assert (two.depth_error_ppm**-2).sum() == pytest.approx(one.depth_error_ppm[0] ** -2)


def test_grid_does_not_matter(make_mode: Any) -> None:
    """Ascending, descending, coarse and fine samplings of one smooth spectrum agree."""
    mode = make_mode()
    bins = make_bins(mode)

    def errors(grid_um: np.ndarray) -> np.ndarray:
        return transit_noise(mode, bins, grid_um, 1e5 * grid_um**-3, HOUR_S, HOUR_S).depth_error_ppm

    fine = errors(GRID_UM)
    assert np.array_equal(errors(GRID_UM[::-1]), fine)
    assert errors(np.geomspace(0.9, 2.1, 300)) == pytest.approx(fine, rel=1e-4)


def test_weights_integrate_to_the_electrons(make_mode: Any) -> None:
    """The weights of the fine grid, summed over the detector, are the electrons of its bins."""
    mode = make_mode({}, {"ranges_um": [[1.5, 1.7], [1.8, 2.2]], "throughput": [[1.5, 0.2], [2.2, 0.6]]})
    photons = 1e5 / GRID_UM
    found = noise(mode, photons)
    bins = make_bins(mode)
    for index in range(2):
        weights = photon_weights(mode, index, GRID_UM, photons)
        total = found.electrons_per_s[bins.detector == index].sum()
        assert np.trapezoid(weights, GRID_UM) == pytest.approx(total, rel=1e-3)
        low_um, high_um = mode.detectors[index].ranges_um[0][0], mode.detectors[index].ranges_um[-1][1]
        assert np.all(weights[(low_um > GRID_UM) | (high_um < GRID_UM)] == 0)
    assert np.all(photon_weights(mode, 1, np.array([1.75]), np.array([1.0])) == 0)


def test_excess_noise_multiplies_the_error(make_mode: Any) -> None:
    """And nothing else."""
    plain, noisy = noise(make_mode(), 1e5), noise(make_mode({"excess_noise": 1.3}), 1e5)
    assert noisy.depth_error_ppm == pytest.approx(1.3 * plain.depth_error_ppm)
    assert noisy.read_share == pytest.approx(plain.read_share)


def test_occultations_cost_time(make_mode: Any) -> None:
    """A target that is seen half of the time has the error of half the time."""
    mode, hidden = make_mode({"groups_at_most": 3}), make_mode({"groups_at_most": 3}, visible_share=0.5)
    assert noise(hidden, 1e5).depth_error_ppm == pytest.approx(math.sqrt(2) * noise(mode, 1e5).depth_error_ppm)


def test_saturated_bins_are_left_out_and_named(make_mode: Any) -> None:
    """A bright line overflows its own bin, in two groups; the rest of the detector goes on."""
    mode = make_mode()
    photons = np.where(np.abs(GRID_UM - 1.405) < 0.002, 2e8, 1e6)
    found = noise(mode, photons)
    bins = make_bins(mode)
    hit = (bins.from_um < 1.407) & (bins.to_um > 1.403)
    assert found.groups[0] == 2
    assert np.array_equal(found.saturated, hit)
    assert np.all(np.isinf(found.depth_error_ppm[hit]))
    assert np.all(np.isfinite(found.depth_error_ppm[~hit]))
    assert found.saturated_um == ((bins.from_um[hit].min(), bins.to_um[hit].max()),)


def test_two_groups_are_used_up_to_the_full_well(make_mode: Any) -> None:
    """Between 0.8 and 1 of the well in two groups the bins are kept, above they are not."""
    # electrons s-1 in the brightest pixel: photons x 10 m2 x 0.4 x 0.5e-3 um x 0.5
    for share, saturated in ((0.79, False), (0.95, False), (1.01, True)):
        found = noise(make_mode(), share * 40000.0 / 1e-3)
        assert found.groups[0] == 2
        assert found.saturated.all() == found.saturated.any() == saturated


def test_groups_fill_the_well(make_mode: Any) -> None:
    """One group more would pass 0.8 of the well."""
    # 990 electrons s-1 with background and dark current: 64 groups of 1 s hold 63360, 65 would hold 64350
    found = noise(make_mode(), (990.0 - 0.52) / 1e-3)
    assert found.groups[0] == 64
    assert found.duty[0] == pytest.approx(63 / 65)


def test_each_detector_has_its_own_groups(make_mode: Any) -> None:
    """The fainter part of the spectrum is read longer."""
    mode = make_mode({"ranges_um": [[1.0, 1.4]]}, {"ranges_um": [[1.5, 2.0]]})
    found = noise(mode, np.where(GRID_UM < 1.45, 1e7, 1e6))
    assert found.groups[0] < found.groups[1]


def test_ramps_sample_the_light_curve(make_mode: Any) -> None:
    """However faint the star, ten ramps fit into the shorter stretch."""
    found = noise(make_mode(), 1e-3, 1000.0, 3600.0)
    assert found.groups[0] == 99
    assert noise(make_mode({"groups_at_most": 15}), 1e-3).groups[0] == 15
    assert noise(make_mode({"frame_time": "900 s"}), 1e-3).groups[0] == 2


def test_choose_groups() -> None:
    """From two up to the most allowed; no light at all gives the most."""
    for rate, expected in ((0.0, 50), (1.0, 50), (320.0, 25), (321.0, 24), (1e9, 2)):
        found = choose_groups(brightest_e_per_s=rate, full_well_e=10000.0, group_time_s=1.0, at_most=50)
        assert found == expected


def test_photometer(make_mode: Any) -> None:
    """One bin, all light in it, a fixed number of pixels."""
    channel = {
        **NO_EXTRAS,
        "kind": "photometer",
        "resolving_power": None,
        "nm_per_pixel": None,
        "extraction_height_pixels": None,
        "extraction_pixels": 25,
        "brightest_pixel_share": 0.1,
    }
    found = noise(make_mode(channel), 1e3)
    assert found.electrons_per_s == pytest.approx([1e3 * 10 * 0.4 * 1.0])
    assert found.depth_error_ppm == pytest.approx([1e6 * math.sqrt(2 / (4000 * 0.5 * HOUR_S))])
    assert not found.saturated[0]
    assert noise(make_mode(channel), 4e5).saturated[0]
    noisy = noise(make_mode({**channel, "read_noise": "30 electron"}), 1e3)
    assert noisy.read_share[0] == pytest.approx(25 * 2 * 900 / (25 * 2 * 900 + 4000))


def test_background_fills_the_well_too(make_mode: Any) -> None:
    """A bright sky shortens the ramp and adds noise."""
    dark, bright = noise(make_mode(), 1e3), noise(make_mode({"background": "2000 electron/s"}), 1e3)
    assert bright.groups[0] == 31 < dark.groups[0]
    assert np.all(bright.background_share > 0.9)
    assert np.all(bright.depth_error_ppm > 3 * dark.depth_error_ppm)


def test_a_slit_keeps_the_sky_out(make_mode: Any) -> None:
    """Behind a slit as long as the whole dispersed range a pixel sees as much sky as without a slit."""
    sky = {"background": None, "background_mjy_per_sr": [[1.0, 0.3]], "pixel_scale": "0.1 arcsec"}
    flat = {"throughput": [[1.0, 0.4], [2.0, 0.4]]}
    at_um = np.array([1.5])
    slitless = background_e_per_s(make_mode({**sky, **flat}).detectors[0], 10.0, at_um)
    pixels_over_range = 2000
    slit = {"slit_width": f"{0.1 * pixels_over_range} arcsec"}
    wide = background_e_per_s(make_mode({**sky, **flat, **slit}).detectors[0], 10.0, at_um)
    narrow = background_e_per_s(make_mode({**sky, **flat, "slit_width": "0.2 arcsec"}).detectors[0], 10.0, at_um)
    assert wide == pytest.approx(pixels_over_range / 2 * narrow)
    # the sky's photons go as 1/wavelength: mean over the range against the middle
    assert slitless == pytest.approx(wide * 1.5 * math.log(2), rel=1e-4)


def test_dark_star_has_infinite_error(make_mode: Any) -> None:
    """No light, no depth; and no warning on the way."""
    found = noise(make_mode(), 0.0)
    assert np.all(np.isinf(found.depth_error_ppm))
    assert not found.saturated.any()


def test_transit_noise_invalid(make_mode: Any) -> None:
    """Spectra that end within a bin, times that are not positive, bins of another mode."""
    mode = make_mode()
    bins = make_bins(mode)
    short = np.linspace(1.1, 2.0, 100)
    with pytest.raises(RangeError, match=r"from 1 to 2 um for the bins of the mode, got 1\.1 to 2 um"):
        transit_noise(mode, bins, short, short, HOUR_S, HOUR_S)
    with pytest.raises(ValueError, match="greater than zero, got 0"):
        noise(mode, 1.0, 0.0)
    with pytest.raises(ValueError, match="each of the 2 detectors"):
        noise(make_mode({}, {}), 1.0, bins=bins)


def test_tables_are_linear_and_held() -> None:
    """Between rows a straight line, beyond them the last value."""
    table = ((1.0, 10.0), (2.0, 30.0))
    assert interpolate(table, np.array([0.5, 1.5, 3.0])) == pytest.approx([10.0, 20.0, 30.0])
