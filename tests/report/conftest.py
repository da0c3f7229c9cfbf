"""A made-up plan that looks like a real one: two modes, four searches, every kind of verdict."""

from __future__ import annotations

import math

import numpy as np
import pytest

from planner.studies.results import BandShare, BinnedSpectrum, Counts, PlanResult, PlanRow, Verdict

PRISM, SLITLESS = "near-infrared-prism", "mid-infrared-slitless"
HOURS = 3.92
# gas: (centre um, width in ln, strength in scale heights)
BANDS = {
    "CO2": [
        (1.6, 0.02, 1.5),
        (2.0, 0.025, 3.5),
        (2.7, 0.03, 5.0),
        (4.27, 0.035, 8.5),
        (9.4, 0.05, 0.8),
        (15.0, 0.12, 8),
    ],
    "H2O": [(1.4, 0.04, 0.6), (1.87, 0.04, 0.8), (2.65, 0.06, 1.6), (6.3, 0.12, 2.8)],
    "N2": [(0.55, 0.15, 1.8), (4.3, 0.06, 0.9)],
    "CH4": [(1.66, 0.03, 1.6), (2.3, 0.05, 3.0), (3.32, 0.06, 5.5), (7.66, 0.07, 4.5)],
    "CCl2F2": [(8.65, 0.02, 1.5), (9.1, 0.02, 1.7), (10.9, 0.03, 1.4)],
    "O3": [(4.75, 0.015, 1.0), (9.6, 0.03, 4.2)],
}


def _edges(low, high, resolving_power):
    edges = [low]
    while edges[-1] < high:
        edges.append(edges[-1] * (1 + 1 / np.interp(edges[-1], *resolving_power)))
    return np.array(edges)


def _bump(gas, wavelength_um, factor=1.0):
    height = np.zeros_like(wavelength_um)
    for centre, width, strength in BANDS[gas]:
        height += factor * strength * np.exp(-0.5 * (np.log(wavelength_um / centre) / width) ** 2)
    return height


def _spectrum(gas, ratio, mode, factor):
    edges = (
        _edges(0.6, 5.3, ([0.6, 1.2, 3.0, 5.3], [64, 30, 100, 100]))
        if mode == PRISM
        else _edges(5.0, 12.0, ([5, 7.5, 12], [40, 100, 100]))
    )
    low, high = edges[:-1], edges[1:]
    centre = np.sqrt(low * high)
    ripple = 1 + 0.25 * np.sin(90 * np.log(centre))
    heights = {g: _bump(g, centre, factor if g == gas else 1.0) * ripple for g in (gas, "CO2", "H2O", "N2")}
    total = np.log(sum(np.exp(h) for h in heights.values()))
    without = {g: np.log(sum(np.exp(h) for other, h in heights.items() if other != g)) for g in heights}
    noise = 90 * (1 + 0.8 * np.abs(np.log(centre / 1.6))) if mode == PRISM else 140 * (centre / 7) ** 1.2
    return BinnedSpectrum(
        gas=gas,
        mixing_ratio=ratio,
        mode=mode,
        detector=np.zeros(low.size, dtype=np.int64),
        from_um=low,
        to_um=high,
        depth_ppm=5870 + 16.3 * total,
        shares_ppm={g: 16.3 * (total - without[g]) for g in heights},
        noise_one_transit_ppm=noise,
        floor_ppm=np.full(low.size, 10.0 if mode == PRISM else 20.0)
        * np.sqrt(0.01 / np.maximum(np.log(high / low), 0.01)),
        usable=(centre > 1.2) | (centre < 1.02) if mode == PRISM else np.ones(low.size, dtype=bool),
        scale_height_ppm=16.3,
    )


def counts(snr, limit, threshold=5.0):
    """Counts of a white noise with a floor: S/N(N)^-2 = snr^-2 / N + limit^-2."""
    room = threshold**-2 - limit**-2
    unrounded = snr**-2 / room if room > 0 else None
    whole = None if unrounded is None else max(1, math.ceil(unrounded))
    return Counts(
        snr_one_transit=snr,
        snr_limit=limit,
        transits_required=whole,
        transits_unrounded=unrounded,
        hours_required=None if whole is None else whole * HOURS,
        in_transit_hours_required=None if whole is None else whole * 0.891,
    )


def _row(gas, ratio, mode, verdict, marginalised, known, bands=(), confusion=(), **more):
    return PlanRow(
        gas=gas,
        mixing_ratio=ratio,
        mode=mode,
        verdict=verdict,
        marginalised=counts(*marginalised),
        all_known=counts(*known),
        best_bands=tuple(BandShare(from_um=a, to_um=b, share=s) for a, b, s in bands),
        confusion=confusion,
        confused_from=5.0,
        confused_to=min((snr for _, snr in confusion), default=0.0),
        uncovered_um=more.get("uncovered", ()),
        saturated_um=more.get("saturated", ()),
        cautions=more.get("cautions", ()),
    )


def make_plan():
    """The plan; rows and spectra are in step."""
    methane = ((3.15, 3.55, 0.61), (2.20, 2.45, 0.22), (1.62, 1.72, 0.05))
    cases = [
        (1.0, _row("CH4", 1e-4, PRISM, Verdict.WITHIN_REACH, (1.21, 38.0), (1.84, math.inf), methane,
                   (("temperature", 3.43), ("offset of near-infrared-prism: 0.6 to 5.3 um", 3.96), ("H2O", 4.55)),
                   saturated=((1.02, 1.20),))),
        (1.0, _row("CH4", 1e-4, SLITLESS, Verdict.TOO_MANY, (0.42, 6.1), (0.75, 22.0), ((7.3, 8.1, 0.9),),
                   (("offset of mid-infrared-slitless: 5 to 12 um", 2.66), ("H2O", 4.51)))),
        (0.5, _row("CCl2F2", 5e-10, PRISM, Verdict.NO_BAND, (0.0001, 0.01), (0.0001, 0.01))),
        (0.5, _row("CCl2F2", 5e-10, SLITLESS, Verdict.FLOOR, (0.16, 2.2), (0.23, 3.4),
                   ((10.7, 11.1, 0.48), (8.9, 9.3, 0.31)), (("CO2", 1.19), ("radius", 1.98)))),
        (1.0, _row("CCl2F2", 2.5e-9, PRISM, Verdict.NO_BAND, (0.0004, 0.03), (0.0004, 0.03))),
        (1.0, _row("CCl2F2", 2.5e-9, SLITLESS, Verdict.WITHIN_REACH, (0.61, 9.4), (0.88, 14.0),
                   ((10.7, 11.1, 0.46), (8.9, 9.3, 0.33)), (("CO2", 3.74), ("radius", 4.70)),
                   cautions=("rests on one tabulated temperature, 296 K",))),
        (1.0, _row("O3", 1e-6, PRISM, Verdict.CONFUSION, (0.21, 3.1), (0.49, 17.0), ((4.6, 4.9, 0.93),),
                   (("CO2", 1.45), ("temperature", 4.24)), uncovered=(("O3", 3.03, 3.04), ("O3", 0.6, 1.9)))),
        (1.0, _row("O3", 1e-6, SLITLESS, Verdict.WITHIN_REACH, (1.02, 15.5), (1.38, 25.0), ((9.3, 10.0, 0.97),),
                   (("CO2", 4.22), ("radius", 4.85)))),
    ]  # fmt: skip
    return PlanResult(
        title="Temperate rocky planet of a cool star (invented)",
        invented=True,
        threshold_sigma=5.0,
        power=0.5,
        transits_available=100,
        transit_duration_h=0.891,
        charged_hours_per_transit=HOURS,
        scale_height_km=8.91,
        scale_height_ppm=16.3,
        rows=tuple(row for _, row in cases),
        spectra=tuple(_spectrum(row.gas, row.mixing_ratio, row.mode, factor) for factor, row in cases),
        line_data=(
            "CH4: embedded list, 0.9-10 um, edition 1 (4f2a91c0), band sums within 3 %",
            "CCl2F2: embedded contours, 8.4-11.2 um, edition 1 (77b01c3e), band sums within 10 %",
            "O3: embedded list, 1.9-15 um, edition 1 (0c11d2aa), band sums within 5 %",
        ),
        assumptions=(
            "isothermal air in hydrostatic balance at 250 K, each gas mixed evenly",
            "in-transit time 0.89 h, baseline 1.00 h, settling 0.50 h, overhead 1.50 h per transit",
            "floor 10 ppm (near-infrared-prism) and 20 ppm (mid-infrared-slitless) per element of R = 100",
        ),
        nuisances=(
            ("offset of each detector", "1000 ppm"),
            ("reference radius", "5 %"),
            ("temperature", "15 %"),
            ("gravity", "5.9 %"),
            ("mean molar mass", "10 %"),
            ("cloud top", "one-sided step to 0.1 bar"),
            ("mixing ratio of each other gas", "1 dex"),
        ),
        cautions=(
            "These are estimates: confirm exposure settings with the observatory's own tools and staff.",
            "A detected gas is not detected life or industry.",
        ),
        version="0.1.0",
    )


@pytest.fixture(scope="session")
def fake_plan():
    """A plan with two modes, four searches and every verdict but "saturated"."""
    return make_plan()
