"""Photon budgets, background and frame times against worked and published figures."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from planner.instrument import Bins, Mode, list_modes, parse_mode, read_mode, transit_noise
from planner.instrument.background import background_e_per_s, sky_photons
from planner.instrument.modes import Spectrometer
from planner.star.model import blackbody_photons, solid_angle_factor

PLAIN = """
name = "plain"
summary = "a perfect detector behind 25.4 m2 at a throughput of 0.4, two groups, no resets"
[telescope]
collecting_area = "25.4 m2"
settling = "0 min"
overhead = "0 min"
[[detector]]
name = "all"
kind = "spectrometer"
ranges_um = [[1, 12]]
resolving_power = [[1, 1000]]
nm_per_pixel = [[1, 1]]
throughput = [[1, 0.4]]
extraction_height_pixels = 1
brightest_pixel_share = 1
read_noise = "1e-9 electron"
dark_current = "0 electron/s"
full_well = "1e9 electron"
frame_time = "1 s"
reset_frames = 0
groups_at_most = 2
background = "0 electron/s"
[floor]
depth = "0 ppm"
"""


@pytest.mark.parametrize(
    ("wavelength_um", "electrons_per_s", "electrons_per_transit", "depth_ppm"),
    [
        (1.4, 60128.0, 2.0145e8, 99.64),
        (3.3, 55346.0, 1.8543e8, 103.85),
        (4.3, 41656.0, 1.3956e8, 119.71),
        (9.6, 12664.0, 4.2431e7, 217.11),
    ],
)
def test_blackbody_budget(
    wavelength_um: float, electrons_per_s: float, electrons_per_transit: float, depth_ppm: float
) -> None:
    """TRAPPIST-1 as a blackbody (2566 K, 0.1192 Rsun, 12.47 pc), R = 100, 55.84 min in and as long out of transit.

    Worked from Planck's law at the centre of the bin; ours is integrated over it, hence 1e-3. Two groups without
    resets integrate half of the time, which costs sqrt(2) over the perfect detector of the worked figure.
    """
    grid_um = np.geomspace(0.9, 13.0, 20001)
    photons = blackbody_photons(grid_um, 2566.0) * solid_angle_factor(0.1192, 12.47)
    half = wavelength_um / 200
    bins = Bins(detector=[0], from_um=[wavelength_um - half], to_um=[wavelength_um + half])
    transit_s = 55.84 * 60
    found = transit_noise(parse_mode(PLAIN, "plain"), bins, grid_um, photons, transit_s, transit_s)
    assert found.electrons_per_s[0] == pytest.approx(electrons_per_s, rel=1e-3)
    assert found.electrons_per_s[0] * transit_s == pytest.approx(electrons_per_transit, rel=1e-3)
    assert found.depth_error_ppm[0] / np.sqrt(2) == pytest.approx(depth_ppm, rel=1e-3)


def test_sky_in_one_pixel() -> None:
    """0.1 MJy/sr at 2 um: 7.55e11 photons m-2 s-1 sr-1 um-1; with 0.1" pixels, 25.4 m2, T = 0.5: 2.25 e-/s/um."""
    photons = sky_photons(0.1, 2.0)
    assert photons == pytest.approx(7.55e11, rel=1e-3)
    pixel_sr = (0.1 / 206264.806) ** 2
    assert photons * 25.4 * pixel_sr * 0.5 == pytest.approx(2.25, rel=2e-3)


# Sky of the benchmark pointing of a cold space telescope at 1.2 times minimum zodiacal light, MJy/sr: public
# background file with the thermal part as fitted in flight.
SKY = [[2.0, 0.20], [2.5, 0.17], [3.0, 0.13], [3.5, 0.13], [4.0, 0.18], [4.5, 0.30], [5.0, 0.56], [5.5, 1.06]]
SKY += [[6.1, 2.07], [7.1, 4.42], [8.1, 7.7], [9.1, 11.1], [10.1, 14.9], [11.1, 19.1], [12.1, 23.5], [13.1, 29.3]]
SKY += [[15.1, 46.9]]


def with_sky(mode: Mode, pixel_scale: str, sky: list[list[float]], **change: Any) -> Spectrometer:
    """The first detector of a mode with its fixed background exchanged for a sky."""
    detector = mode.detectors[0]
    assert isinstance(detector, Spectrometer)
    data = detector.model_dump(by_alias=True)
    fixed = {"background": None, "background_mjy_per_sr": sky, "pixel_scale": pixel_scale, **change}
    strings = {
        "read_noise": f"{detector.read_noise_e} electron",
        "dark_current": f"{detector.dark_current_e_per_s} electron/s",
        "full_well": f"{detector.full_well_e} electron",
        "frame_time": f"{detector.frame_time_s} s",
    }
    merged = {key: value for key, value in {**data, **strings, **fixed}.items() if value is not None}
    return Spectrometer.model_validate(merged)


@pytest.mark.parametrize(
    ("name", "pixel_scale", "throughput_ends", "tolerance"),
    [
        # figures of the shipped modes were worked apart from this project; +/- 35 % for the mid infrared,
        # one digit for the grisms, the rest of whose filters' wings is not in our tables
        ("mid-infrared-slitless", "0.11 arcsec", ([4.5, 0.10], [14.0, 0.05]), 0.2),
        ("grism-2-to-4-um", "0.063 arcsec", ([2.4, 0.08], [4.0, 0.36]), 0.2),
        ("grism-4-to-5-um", "0.063 arcsec", (None, [5.0, 0.18]), 0.2),
    ],
)
def test_slitless_sky(name: str, pixel_scale: str, throughput_ends: Any, tolerance: float) -> None:
    """The sky of the whole band on every pixel gives the fixed background that the mode carries."""
    mode = read_mode(name)
    rows = [list(row) for row in mode.detectors[0].throughput]
    first, last = throughput_ends
    rows = ([first] if first else []) + rows + ([last] if last else [])
    detector = with_sky(mode, pixel_scale, SKY, throughput=rows)
    found = background_e_per_s(detector, mode.telescope.collecting_area_m2, np.array([4.0]))[0]
    assert found == pytest.approx(mode.detectors[0].background_e_per_s, rel=tolerance)


@pytest.mark.parametrize(
    ("short_side", "long_side", "published_s"),
    [(32, 2048, 0.902), (32, 1024, 0.451), (32, 512, 0.226), (16, 512, 0.144)],
)
def test_frame_times(short_side: int, long_side: int, published_s: float) -> None:
    """Published frame times (from memory) follow (short + 12)(long + 1) 10 us; shipped modes use two of them."""
    computed_s = (short_side + 12) * (long_side + 1) * 10e-6
    assert computed_s == pytest.approx(published_s, abs=6e-4)
    shipped = {read_mode(name).detectors[0].frame_time_s for name in list_modes()}
    if published_s in (0.902, 0.144):
        assert any(computed_s == pytest.approx(frame_s, rel=1e-4) for frame_s in shipped)


def test_strip_frame_time() -> None:
    """(256 + 12)(2048 + 2) 10 us = 5.494 s for the strips of the cross-dispersed spectrograph."""
    assert read_mode("cross-dispersed-near-infrared").detectors[0].frame_time_s == pytest.approx(
        268 * 2050 * 1e-5, abs=1e-3
    )
