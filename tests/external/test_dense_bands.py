"""Contours of heavy molecules against measured cross-sections.

The tables are those of the reference folder: Massie et al. 1991 (NCAR TN-358) for CFC-11, CFC-12 and CF4,
HITRAN for HCFC-22, PNNL (Sharpe et al. 2004) for SF6, NF3, C2F6, HFC-23 and isoprene. The contours were fitted
to these same tables, so this is a check of the fit and of its transcription, not an independent proof.
"""

from __future__ import annotations

import gzip
import tomllib
from pathlib import Path

import numpy as np
import pytest
from scipy.integrate import trapezoid
from scipy.special import exp1

from planner.resources import data_folder
from planner.spectroscopy.lists.contours import contour_cross_section

# file stem, formula, noise of the table in cm2 (where the scatter of its points levels off), temperatures
TABLES = [
    ("CCl3F_CFC11_830-860_{}K_0Torr", "CCl3F", 1e-20, (203, 213, 233, 253, 273, 293)),
    ("CCl3F_CFC11_1060-1107_{}K_0Torr", "CCl3F", 1e-20, (203, 213, 233, 253, 273, 293)),
    ("CCl2F2_CFC12_867-937_{}K_0Torr", "CCl2F2", 2e-20, (203, 213, 233, 253, 273, 293)),
    ("CCl2F2_CFC12_1080-1177_{}K_0Torr", "CCl2F2", 2e-20, (203, 213, 273, 293)),
    ("CF4_CFC14_1255-1290_{}K_0Torr", "CF4", 2e-19, (203, 233, 253, 273, 293)),
    ("CHClF2_HCFC22_765-855_{}K_0Torr", "CHClF2", 2e-20, (253, 270, 287)),
    ("CHClF2_HCFC22_1060-1200_{}K_0Torr", "CHClF2", 1e-20, (253, 270, 287)),
    ("CHClF2_HCFC22_1275-1380_{}K_0Torr", "CHClF2", 1e-20, (253, 270, 287)),
    ("SF6_560-6500_{}K_760Torr", "SF6", 4e-23, (298,)),
    ("NF3_600-6500_{}K_760Torr", "NF3", 6e-23, (298,)),
    ("C2F6_500-6500_{}K_760Torr", "C2F6", 6e-23, (298,)),
    ("CHF3_HFC23_600-6500_{}K_6Torr", "CHF3", 6e-23, (298,)),
    ("C5H8_isoprene_600-6500_{}K_6Torr", "C5H8", 2e-22, (298,)),
]
CASES = [(stem.format(t), formula, noise, t) for stem, formula, noise, kelvin in TABLES for t in kelvin]
# The table of CF4 at 213 K has 8 % more band sum than its neighbour at 203 K: no smooth law follows both.
MISSES = [
    pytest.param("CF4_CFC14_1255-1290_213K_0Torr", "CF4", 2e-19, 213, marks=pytest.mark.xfail(reason="tables scatter"))
]
# How far the height of an R = 100 bin may be off, in scale heights, for nine bins of ten: what planning needs.
MARKS = {1e-9: 0.15, 1e-6: 0.20, 1e-4: 0.25}

SCALE_HEIGHT_CM = 9e5
CHORD_CM = np.sqrt(2.0 * np.pi * 5.87e8 * SCALE_HEIGHT_CM)


def read_table(path: Path) -> tuple[np.ndarray, np.ndarray]:
    """Wavenumbers and cross-sections: a header of fixed columns, then evenly spaced values and padding."""
    header, _, body = gzip.decompress(path.read_bytes()).decode("ascii").partition("\n")
    first, last, count = float(header[10:20]), float(header[20:30]), int(header[30:40])
    values = np.array(body.split()[:count], dtype=float)
    return np.linspace(first, last, count), values


def smoothed(wavenumber, cross_section, noise):
    """The table, averaged over 1 cm-1 where it is within five times its noise."""
    points = max(1, round(1.0 / (wavenumber[1] - wavenumber[0])))
    mean = np.convolve(cross_section, np.full(points, 1.0 / points), mode="same")
    return np.where(mean < 5.0 * noise, np.maximum(mean, 0.0), cross_section)


def bin_means(wavenumber, values):
    """Means over complete bins of R = 100, counted from the first wavenumber."""
    which = np.floor(np.log(wavenumber / wavenumber[0]) / 0.01 + 1e-9).astype(int)
    complete = which < which[-1]
    return np.bincount(which[complete], values[complete]) / np.bincount(which[complete])


def heights(cross_section, mixing_ratio, temperature_k):
    """Height in scale heights that an isothermal limb at 1 bar of N2 adds (closed form)."""
    density = 1e6 / (1.380649e-16 * temperature_k)
    tau = mixing_ratio * density * CHORD_CM * np.maximum(cross_section, 1e-40)
    tall = np.euler_gamma + np.log(tau) + exp1(np.minimum(tau, 700.0))
    return np.where(tau < 1e-6, tau, tall)


def model(formula, wavenumber, temperature_k):
    """All contour parts of one molecule."""
    parts = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())["part"]
    parts = [part for part in parts if part["kind"] == "contours"]
    return sum(contour_cross_section(part, wavenumber, temperature_k) for part in parts)


def within_fit(formula, wavenumber):
    """The stretch that the main parts were fitted over."""
    parts = tomllib.loads((data_folder("linelists") / f"{formula}.toml").read_text())["part"]
    parts = [part for part in parts if part["kind"] == "contours"]
    spans = [p["span_per_cm"] for p in parts if p["flag"] == "fitted"]
    return np.any([(wavenumber >= low) & (wavenumber <= high) for low, high in spans], axis=0)


@pytest.mark.parametrize(("name", "formula", "noise", "temperature_k"), CASES + MISSES)
def test_heights_and_band_sum(reference_folder, name, formula, noise, temperature_k):
    """Nine bins of ten stand within the marks at three mixing ratios; the integral is right to 5 %."""
    wavenumber, table = read_table(reference_folder / "xsc" / f"{name}.aerxs.gz")
    inside = within_fit(formula, wavenumber)
    wavenumber, table = wavenumber[inside], table[inside]
    ours = model(formula, wavenumber, temperature_k)
    ratio = trapezoid(ours, wavenumber) / trapezoid(table, wavenumber)
    assert abs(ratio - 1.0) < 0.05

    table = smoothed(wavenumber, table, noise)
    loud = bin_means(wavenumber, table) > 2.0 * noise
    worst = {}
    for mixing_ratio, mark in MARKS.items():
        theirs = bin_means(wavenumber, heights(table, mixing_ratio, temperature_k))
        mine = bin_means(wavenumber, heights(ours, mixing_ratio, temperature_k))
        seen = loud & (theirs > 0.5)
        if seen.any():
            worst[mixing_ratio] = float(np.percentile(np.abs(mine - theirs)[seen], 90))
            print(name, f"{mixing_ratio:g}: {worst[mixing_ratio]:.3f} of {mark} ({seen.sum()} bins), sum {ratio:.3f}")
    assert worst, "no bin of this table rises above half a scale height"
    assert all(worst[x] < MARKS[x] for x in worst), worst


# Band sums near 296 K in cm per molecule, from memory (strong bands within 10 %); the tables scatter by as much.
REMEMBERED_SUMS = [
    ("CCl3F", 800.0, 890.0, 6.9e-17),
    ("CCl3F", 1040.0, 1130.0, 2.6e-17),
    ("CCl2F2", 850.0, 950.0, 5.2e-17),
    ("CCl2F2", 1070.0, 1190.0, 8.1e-17),
    ("CF4", 1230.0, 1310.0, 1.95e-16),
    ("SF6", 900.0, 1000.0, 2.0e-16),
    ("SF6", 580.0, 650.0, 1.5e-17),
    ("NF3", 850.0, 970.0, 6.5e-17),
    ("C2F6", 1200.0, 1300.0, 1.7e-16),
    ("C2F6", 1090.0, 1150.0, 4.5e-17),
    ("C3F8", 650.0, 1500.0, 2.7e-16),
    ("CCl4", 700.0, 860.0, 6.6e-17),
    ("C2H2F4", 941.0, 1484.0, 1.24e-16),
]


@pytest.mark.parametrize(("formula", "low", "high", "band_sum_cm"), REMEMBERED_SUMS)
def test_sums_near_remembered_ones(formula, low, high, band_sum_cm):
    """Integrals of the strong bands agree with recalled literature values to 20 % (10 % memory, 10 % tables)."""
    wavenumber = np.arange(low, high, 0.02)
    ratio = trapezoid(model(formula, wavenumber, 296.0), wavenumber) / band_sum_cm
    assert 0.8 < ratio < 1.2
