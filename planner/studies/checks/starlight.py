"""Check 7: could spots and faculae that the transit does not cross make the same shape?"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.star.heterogeneity import contamination_factor, region_contrast, usual_spot_temperature_k
from planner.studies.checks.bench import Bench, height_ppm
from planner.studies.checks.findings import NEEDED_SIGMA, Check, Finding, Outcome, takes_too_much

__all__ = ["Coverage", "check_star", "star_shapes_ppm", "usual_coverage"]

Array = NDArray[np.float64]

_FACULA_EXCESS_K = 100.0
"""Faculae are taken to be this much hotter (common practice)."""
_WHY = "Spots and faculae outside the transit chord imprint the star's own bands, water above all, on the depth."


@dataclass(frozen=True, kw_only=True)
class Coverage:
    """Upper ends of what spots and faculae cover of the disc, and where the figures come from."""

    spots: float
    faculae: float
    source: str


_LATE_M = "upper ends for TRAPPIST-1, Rackham et al. 2018, ApJ 853, 122"
_FGK = "Rackham et al. 2019, AJ 157, 96"
_COVERAGES = (
    (3000.0, Coverage(spots=0.26, faculae=0.70, source=_LATE_M)),
    (3900.0, Coverage(spots=0.10, faculae=0.30, source="judgement, between late M and late K dwarfs")),
    (5300.0, Coverage(spots=0.04, faculae=0.10, source=f"spots of late K, {_FGK}; faculae judgement")),
    (6000.0, Coverage(spots=0.01, faculae=0.03, source=f"judgement, between F and K of {_FGK}")),
    (np.inf, Coverage(spots=0.001, faculae=0.01, source=f"spots of F, {_FGK}; faculae judgement")),
)
"""By the photosphere's temperature below which they hold."""


def usual_coverage(photosphere_k: float) -> Coverage:
    """The upper ends for a dwarf of a temperature."""
    return next(coverage for below, coverage in _COVERAGES if photosphere_k < below)


def star_shapes_ppm(bench: Bench) -> tuple[Array, Array]:
    """Change of depth by spots alone and by faculae alone at the upper ends of their ranges, ppm ``(bin,)``."""
    star_k, depth, where = bench.scenario.star.temperature_k, bench.null.depth_ppm, bench.bins.centre_um
    most = usual_coverage(star_k)
    spot = region_contrast(star_k, usual_spot_temperature_k(star_k), where)
    facula = region_contrast(star_k, star_k + _FACULA_EXCESS_K, where)
    by_spots = depth * (contamination_factor(most.spots, 0.0, spot, np.ones_like(spot)) - 1)
    by_faculae = depth * (contamination_factor(0.0, most.faculae, np.ones_like(facula), facula) - 1)
    return by_spots, by_faculae


def check_star(bench: Bench | None) -> Finding:
    """What is left of the significance when spots and faculae are unknown within the range of such stars."""
    tested = "significance left when spots and faculae are unknown within the range stated for such stars"
    if bench is None:
        says = "star, planet or air are not given"
        return Finding(check=Check.STAR, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY)
    spots, faculae = star_shapes_ppm(bench)
    most = usual_coverage(bench.scenario.star.temperature_k)
    swing = max(height_ppm(spots), height_ppm(faculae))
    figures: dict[str, float | str | None] = {
        "spots_most": most.spots,
        "faculae_most": most.faculae,
        "coverage_source": most.source,
        "swing_by_spots_ppm": height_ppm(spots),
        "swing_by_faculae_ppm": height_ppm(faculae),
        "error_per_bin_ppm": bench.claim.search.error_per_bin_ppm,
    }
    covers = f"spots up to {100 * most.spots:g} % and faculae up to {100 * most.faculae:g} %"
    says = f"{covers} swing the depth by up to {swing:.3g} ppm"
    fits = bench.fits_with([spots / 2, faculae / 2])
    if fits is None:
        return _without_significance(bench, tested, says, swing, figures)
    left = min(fits.sigma([bench.template_ppm]), bench.sigma or 0.0)
    says += f" over this range; left unknown they leave {left:.2g} of {bench.sigma:.2g} sigma"
    return Finding(
        check=Check.STAR,
        outcome=Outcome.FAILED if takes_too_much(left, bench.sigma or 0.0) else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY,
        figures=figures,
        left_sigma=left,
        on_data=bench.on_data,
    )


def _without_significance(
    bench: Bench, tested: str, says: str, swing: float, figures: dict[str, float | str | None]
) -> Finding:
    """Without a significance: the swing against the claimed amplitude, else against the error of a bin."""
    amplitude, error = bench.claim.claim.amplitude_ppm, bench.claim.search.error_per_bin_ppm
    if amplitude is not None:
        failed, beside = swing > amplitude, f"{swing / amplitude:.2g} times the claimed amplitude"
    elif error is not None:
        failed, beside = swing > NEEDED_SIGMA * error, f"{swing / error:.2g} times the error of a bin"
    else:
        says += "; the claim gives nothing to hold this against"
        return Finding(check=Check.STAR, outcome=Outcome.UNTESTED, tested=tested, says=says, why=_WHY, figures=figures)
    return Finding(
        check=Check.STAR,
        outcome=Outcome.FAILED if failed else Outcome.PASSED,
        tested=tested,
        says=f"{says}, {beside}",
        why=_WHY,
        figures=figures,
        left_sigma=0.0 if failed else None,
    )
