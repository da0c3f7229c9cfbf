"""Check 2: is the quoted error one that photons, and detectors in practice, allow?"""

from __future__ import annotations

from math import sqrt

import numpy as np
from numpy.typing import NDArray

from planner.detection.significance import Measurement
from planner.studies.checks.bench import Bench, floor_of
from planner.studies.checks.findings import Check, Finding, Outcome, takes_too_much

__all__ = ["check_noise"]

Array = NDArray[np.float64]

_TOLERANCE = 1.3
"""Throughputs from memory are good to 30 %."""
_WHY = "An error smaller than the photons allow means that part of the noise was not counted."


def check_noise(bench: Bench | None) -> Finding:
    """The claimed significance against the largest that the observation can have, and the error of a bin."""
    tested = "quoted error against that of photons, with and without the mode's floor, everything else known"
    if bench is None or bench.one_transit_ppm is None or bench.claim.search.transits is None:
        missing = "not given: " + ("star, planet or air" if bench is None else "mode or number of transits")
        if bench is not None and bench.on_data and bench.claim.search.transits is not None:
            missing = "no mode is given that sees all of the spectrum"
        return Finding(check=Check.NOISE, outcome=Outcome.UNTESTED, tested=tested, says=missing, why=_WHY)
    transits, sigma = bench.claim.search.transits, bench.claim.claim.sigma
    if bench.observed is not None:
        return _on_data(bench, bench.observed.error_ppm, bench.one_transit_ppm / sqrt(transits))
    bin_ratio, figures = _bin_ratio(bench, transits)
    if sigma is None or not _size_known(bench):
        return _on_bins(tested, bin_ratio, figures)
    photons, practice = _best(bench, transits)
    figures |= {"snr_photons": photons, "snr_with_floor": practice, "claimed_sigma": sigma}
    left = min(sigma, practice)
    impossible = sigma > _TOLERANCE * photons or bin_ratio < 1 / _TOLERANCE
    failed = impossible or takes_too_much(left, sigma)
    says = (
        f"{sigma:.3g} sigma are claimed; on {bench.height_ppm:.3g} ppm, were all else known, "
        f"{transits} transit{'s' * (transits > 1)} could give "
        f"{photons:.3g} by photons and {practice:.3g} with the floor"
    )
    if impossible and bin_ratio < 1 / _TOLERANCE:
        says += f"; the error of a bin is {bin_ratio:.2g} of what photons allow"
    return Finding(
        check=Check.NOISE,
        outcome=Outcome.FAILED if failed else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY,
        figures=figures,
        left_sigma=left * min(1.0, bin_ratio),
    )


def _on_data(bench: Bench, error_ppm: Array, photons_ppm: Array) -> Finding:
    """The errors of the spectrum against those of photons in the same bins."""
    ratio = float(np.median(error_ppm / photons_ppm))
    quoted, predicted = float(np.median(error_ppm)), float(np.median(photons_ppm))
    return Finding(
        check=Check.NOISE,
        outcome=Outcome.FAILED if ratio < 1 / _TOLERANCE else Outcome.PASSED,
        tested="errors of the spectrum against those of photons",
        says=f"the errors, {quoted:.3g} ppm in the middle bin, are {ratio:.2g} of what photons allow",
        why=_WHY,
        figures={"error_per_bin_ppm": quoted, "photon_error_per_bin_ppm": predicted},
        left_sigma=(bench.sigma or 0.0) * min(1.0, ratio),
        on_data=True,
    )


def _size_known(bench: Bench) -> bool:
    return bench.claim.claim.amplitude_ppm is not None or bench.claim.claim.mixing_ratio is not None


def _best(bench: Bench, transits: int) -> tuple[float, float]:
    """Significance of the template over a free level alone, by photons and with the floor."""
    assert bench.one_transit_ppm is not None
    floor = floor_of(bench)
    count = len(bench.bins)
    measured = Measurement(
        template_ppm=bench.template_ppm,
        white_ppm=bench.one_transit_ppm,
        floor_ppm2=np.zeros((count, count)) if floor is None else floor,
        nuisances=("level",),
        directions_ppm=np.full((1, count), 1e4),
    )
    photons = Measurement(
        template_ppm=measured.template_ppm,
        white_ppm=measured.white_ppm,
        floor_ppm2=np.zeros((count, count)),
        nuisances=measured.nuisances,
        directions_ppm=measured.directions_ppm,
    )
    return photons.snr(transits), measured.snr(transits)


def _bin_ratio(bench: Bench, transits: int) -> tuple[float, dict[str, float | str | None]]:
    """Quoted error of a bin over the one predicted for a bin of that width; 1 where none is quoted."""
    search = bench.claim.search
    assert bench.one_transit_ppm is not None
    power = search.bin_resolving_power
    typical = float(np.median(bench.one_transit_ppm * np.sqrt(bench.bins.width_ln))) / sqrt(transits)
    predicted = typical * sqrt(power) if power is not None else None
    figures: dict[str, float | str | None] = {
        "error_per_bin_ppm": search.error_per_bin_ppm,
        "photon_error_per_bin_ppm": predicted,
    }
    if predicted is None or search.error_per_bin_ppm is None:
        return 1.0, figures
    return search.error_per_bin_ppm / predicted, figures


def _on_bins(tested: str, ratio: float, figures: dict[str, float | str | None]) -> Finding:
    if figures["photon_error_per_bin_ppm"] is None or figures["error_per_bin_ppm"] is None:
        says, outcome = "neither a size with its significance nor an error of known bins is given", Outcome.UNTESTED
    else:
        outcome = Outcome.FAILED if ratio < 1 / _TOLERANCE else Outcome.PASSED
        says = (
            f"{figures['error_per_bin_ppm']:.3g} ppm in a bin are {ratio:.2g} of the "
            f"{figures['photon_error_per_bin_ppm']:.3g} ppm that photons allow"
        )
    failed = outcome is Outcome.FAILED
    return Finding(
        check=Check.NOISE, outcome=outcome, tested=tested, says=says, why=_WHY, figures=figures,
        left_sigma=0.0 if failed else None,
    )  # fmt: skip
