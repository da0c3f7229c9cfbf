"""Check 1: is the feature of a size that this gas in this air can make?"""

from __future__ import annotations

from scipy import special

from planner.catalogue.read import find_gas, has_gas
from planner.report.words import gas_text, ratio_text
from planner.scenario.records import Scenario
from planner.studies.checks.bench import MOST_RATIO, Bench
from planner.studies.checks.findings import NEEDED_SIGMA, Check, Finding, Outcome

__all__ = ["HEAVIEST_G", "LIGHTEST_G", "MOST_HEIGHTS", "check_size", "heights_of"]

MOST_HEIGHTS = 10.0
"""Clear bands of strong gases span 5 to 10 scale heights at low resolution (common practice; 0.9 to 2.9 were seen by
Iyer et al. 2016, ApJ 823, 109)."""
LIGHTEST_G, HEAVIEST_G = 2.3, 43.99
"""Mean molar masses of hydrogen with helium, and of carbon dioxide."""
_REACH = 1.25
"""Tolerance on what the gas can make: opacities, temperature and sampling are not better known."""
_POOR = 1e-3
"""Chance below which a chi-squared counts as a poor fit."""
_WHY = "A feature larger than the air is tall, or than any amount of the gas can make, is not that gas."


def heights_of(amplitude_ppm: float, scenario: Scenario) -> tuple[float, float, float]:
    """An amplitude in scale heights of the stated air, of hydrogen with helium, and of carbon dioxide."""
    one = scenario.scale_height_ppm()
    own_g = scenario.molar_mass_g()
    return amplitude_ppm / one, amplitude_ppm / one * LIGHTEST_G / own_g, amplitude_ppm / one * HEAVIEST_G / own_g


def check_size(bench: Bench | None) -> Finding:
    """Size in scale heights, and the mixing ratio that it takes."""
    tested = "size in scale heights of the stated, the lightest and the heaviest air; mixing ratio that makes it"
    if bench is None:
        return _untested(tested, "star, planet or air are not given")
    amplitude = _amplitude(bench)
    if amplitude is None:
        return _untested(tested, _said_by_ratio(bench))
    own, light, heavy = heights_of(amplitude, bench.scenario)
    most = max(height for _, height in bench.growth)
    needed = bench.ratio_for(amplitude)
    figures = {
        "amplitude_ppm": amplitude,
        "scale_heights": own,
        "scale_heights_lightest_air": light,
        "scale_heights_heaviest_air": heavy,
        "most_from_a_trace_ppm": most,
        "mixing_ratio_needed": needed,
        "mixing_ratio_claimed": bench.claim.claim.mixing_ratio,
    }
    others = f"{light:.2g} of H2 and He, {heavy:.2g} of CO2"
    says = f"{amplitude:.3g} ppm are {own:.2g} scale heights of the stated air ({others})"
    name, failed = gas_text(bench.gas), ""
    left = 0.0
    if bench.on_data:
        figures |= _on_data(bench)
        says = f"the data give {_measured(bench)}: {says}"
    if bench.on_data and (bench.sigma or 0.0) < NEEDED_SIGMA:
        failed, left = "too little to be called a feature", bench.sigma or 0.0
    elif own > MOST_HEIGHTS:
        lighter = "even of the lightest air" if light > MOST_HEIGHTS else "unless the air is lighter than stated"
        failed = f"more than the {MOST_HEIGHTS:g} that bands span, {lighter}"
    elif amplitude > _REACH * most:
        failed = f"{name} up to {ratio_text(MOST_RATIO)} makes at most {most:.3g} ppm in this range"
    says += (
        f"; {failed}" if failed else f"; it takes {_ratio(needed)} of {name} under a clear sky{_beyond(bench, needed)}"
    )
    return Finding(
        check=Check.SIZE,
        outcome=Outcome.FAILED if failed else Outcome.PASSED,
        tested=tested,
        says=says,
        why=_WHY,
        figures=figures,
        left_sigma=left if failed else None,
        on_data=bench.on_data,
    )


def _amplitude(bench: Bench) -> float | None:
    """Measured on the data where there are any; else as claimed."""
    if bench.on_data and bench.fits is not None:
        return max(0.0, bench.fits.amplitude(bench.template_ppm)[0]) * bench.height_ppm
    return bench.claim.claim.amplitude_ppm


def _on_data(bench: Bench) -> dict[str, float]:
    """How well the air describes the data with the gas in it, and without."""
    assert bench.fits is not None
    count = len(bench.bins)
    return {
        "measured_sigma": bench.sigma or 0.0,
        "chi2_per_bin_with_gas": bench.fits.chi2([bench.template_ppm]) / count,
        "chi2_per_bin_without_gas": bench.fits.empty_chi2 / count,
    }


def _measured(bench: Bench) -> str:
    """The measured amplitude with its error, and a warning where the air does not describe the data at all."""
    assert bench.fits is not None
    amount, error = bench.fits.amplitude(bench.template_ppm)
    chi2 = bench.fits.chi2([bench.template_ppm])
    poor = float(special.chdtrc(max(1, len(bench.bins) - 1), chi2)) < _POOR
    words = f"{amount * bench.height_ppm:.3g} +/- {error * bench.height_ppm:.2g} ppm"
    return f"{words}, chi-squared {chi2 / len(bench.bins):.2g} a bin{' (a poor fit)' * poor}"


def _said_by_ratio(bench: Bench) -> str:
    """What a stated mixing ratio would make, where no amplitude is stated."""
    ratio = bench.claim.claim.mixing_ratio
    if ratio is None:
        return "no amplitude is given"
    own = heights_of(bench.height_ppm, bench.scenario)[0]
    made = f"{ratio_text(ratio)} would make {bench.height_ppm:.3g} ppm, {own:.2g} scale heights, under a clear sky"
    return f"no amplitude is given; {made}"


def _ratio(ratio: float | None) -> str:
    return "more than a trace" if ratio is None else ratio_text(ratio)


def _beyond(bench: Bench, needed: float | None) -> str:
    """A word where that is beyond what the catalogue expects anywhere temperate, with or without life."""
    if needed is None or not has_gas(bench.gas) or bench.scenario.atmosphere.temperature_k > 400:
        return ""
    record = find_gas(bench.gas)
    ways = [h.presence(true) for h in (record.life, record.industry) for true in (True, False)]
    most = max(way.mixing_ratio_range[1] for way in ways)
    return f", beyond the {ratio_text(most)} that the catalogue expects at most (judgement)" if needed > most else ""


def _untested(tested: str, reason: str) -> Finding:
    return Finding(check=Check.SIZE, outcome=Outcome.UNTESTED, tested=tested, says=reason, why=_WHY)
