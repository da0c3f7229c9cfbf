"""Predicted precision and bright limits against what observatories and observers published."""

from __future__ import annotations

import numpy as np
import pytest

from planner.instrument import Mode, Noise, make_bins, read_mode, transit_noise
from planner.star import Star, photon_flux

SUNLIKE = {"temperature_k": 5800.0, "radius_rsun": 1.0}


def predicted(mode: Mode, star: Star, hours: float, resolving_power: float = 100.0) -> tuple[np.ndarray, Noise]:
    """Bin centres and noise with a baseline as long as the transit."""
    low_um, high_um = mode.span_um
    grid_um = np.exp(np.arange(np.log(low_um) - 1e-4, np.log(high_um) + 1e-4, 2e-5))
    bins = make_bins(mode, resolving_power)
    seconds = hours * 3600
    return bins.centre_um, transit_noise(mode, bins, grid_um, photon_flux(star, grid_um), seconds, seconds)


def test_grating_precision() -> None:
    """Median 50 to 60 ppm at R = 100, 3 to 5 um, one transit of an F star: Espinoza et al. 2023, arXiv:2211.01459.

    Ks 8.85, 6600 K and a transit of 2.2 h are from memory; so is a colour Ks - W2 of zero within 0.05 mag, without
    which a blackbody would be 15 % too bright at 4.6 um. The throughput is good to 15 %, the true baseline is not
    known to us: 12 % on the noise.
    """
    star = Star(temperature_k=6600.0, radius_rsun=1.5, magnitudes={"Ks": 8.85, "W2": 8.85})
    centre_um, noise = predicted(read_mode("grating-3-to-5-um"), star, 2.2)
    median_ppm = float(np.median(noise.depth_error_ppm[(centre_um > 3) & (centre_um < 5)]))
    assert 50 / 1.12 < median_ppm < 60 * 1.12


def test_grating_photons() -> None:
    """The same star at 4 um in a bin of R = 100 at a throughput of 0.55, worked by hand from WISE zero magnitudes.

    309.5 Jy at 3.353 um and 171.8 Jy at 4.603 um (Jarrett et al. 2011, ApJ 735, 112, from memory) make 223 Jy at
    4 um by a power law: 223e-26 / (h 4) x 10^(-0.4 x 8.85) x 25.4 x 0.55 x 0.04 = 1.36e5 e-/s. A pure Rayleigh-Jeans
    slope from Ks would give 1.18e5, which is a lower limit.
    """
    star = Star(temperature_k=6600.0, radius_rsun=1.5, magnitudes={"Ks": 8.85, "W1": 8.85, "W2": 8.85})
    centre_um, noise = predicted(read_mode("grating-3-to-5-um"), star, 2.2)
    at = np.argmin(np.abs(centre_um - 4.0))
    assert noise.electrons_per_s[at] == pytest.approx(1.36e5, rel=0.05)


def test_prism_bright_limit() -> None:
    """Two groups of the strip of 32 rows, 0.226 s a frame, saturate at J of about 10.5 (published limit, from memory).

    Worked by hand for J = 10.5 at 1.2 to 1.4 um: 1.9e5 e-/s in the brightest pixel, 8.6e4 electrons in two groups.
    """
    shipped = read_mode("near-infrared-prism")
    wide = {"frame_time_s": 0.22572}
    mode = shipped.model_copy(update={"detectors": tuple(d.model_copy(update=wide) for d in shipped.detectors)})
    kept = {j: predicted(mode, Star(**SUNLIKE, magnitudes={"J": j}), 2.0)[1] for j in (10.2, 10.5, 10.8)}
    assert all(noise.groups[0] == 2 for noise in kept.values())
    assert kept[10.2].saturated.any()
    assert not kept[10.8].saturated.any()
    low_um, high_um = kept[10.5].saturated_um[0]
    assert 0.9 < low_um < high_um < 1.5


def test_cross_dispersed_bright_limit() -> None:
    """J = 6.7 for the short strip: Albert et al. 2023, arXiv:2306.04572.

    The shipped mode reads the long strip of 256 rows; with the 96 rows of the short one, 2.214 s a frame, and the upper
    end of the published well depths, 100,000 electrons, the limit is met to 0.3 mag.
    """
    mode = read_mode("cross-dispersed-near-infrared")
    change = {"frame_time_s": 2.214, "full_well_e": 100000.0}
    short = mode.model_copy(update={"detectors": tuple(d.model_copy(update=change) for d in mode.detectors)})
    assert predicted(short, Star(**SUNLIKE, magnitudes={"J": 6.4}), 2.0)[1].saturated.any()
    assert not predicted(short, Star(**SUNLIKE, magnitudes={"J": 7.0}), 2.0)[1].saturated.any()


def test_mid_infrared_eclipse_depth() -> None:
    """GJ 1132 b, one eclipse from 5 to 12 um: 140 +/- 17 ppm, Xue et al. 2024, ApJL 973, L8.

    3229 K and 0.2211 Rsun from memory, 2MASS J and Ks from the catalogue, 48 min in eclipse. The baseline is not
    known to us (twice as long gives 15 % less) and the throughput is good to 30 %: 25 % on the error.
    """
    star = Star(temperature_k=3229.0, radius_rsun=0.2211, magnitudes={"J": 9.245, "Ks": 8.322})
    noise = predicted(read_mode("mid-infrared-slitless"), star, 0.8)[1]
    light = noise.electrons_per_s
    whole_band_ppm = np.sqrt(np.sum((light * noise.depth_error_ppm) ** 2)) / light.sum()
    assert whole_band_ppm == pytest.approx(17.0, rel=0.25)


def test_low_orbit_grism_precision() -> None:
    """HD 209458 b, one transit, channels of four pixels: mean error 40 ppm, Tsiaras et al. 2016, ApJ 832, 202.

    About 36 ppm in Deming et al. 2013, ApJ 774, 95 (from memory). Four pixels are 18.8 nm, R = 74 at 1.4 um. Time lost
    per exposure is a guess in our mode: 25 % on the error.
    """
    star = Star(temperature_k=6065.0, radius_rsun=1.155, magnitudes={"J": 6.591, "Ks": 6.308})
    noise = predicted(read_mode("low-orbit-grism"), star, 3.08, resolving_power=74.0)[1]
    assert not noise.saturated.any()
    assert float(np.median(noise.depth_error_ppm)) == pytest.approx(38.0, rel=0.25)
