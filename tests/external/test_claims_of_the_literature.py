"""Published claims judged from their published numbers, beside what the literature came to.

The claim files hold nothing but published numbers, each with its source (those from memory say so). The literature's
word was read in abstracts and introductions except where it says from memory. `later` results are those that others
published afterwards; the table shows the verdict with and without them.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.claims.read import read_claim
from planner.studies.audit import audit
from planner.studies.checks.bench import make_bench
from planner.studies.checks.findings import Check, Standing
from planner.studies.checks.size import MOST_HEIGHTS, check_size, heights_of

FOLDER = Path(__file__).parent / "claims"

STANDS, OPEN, FALLS, UNTOLD = Standing.STANDS, Standing.OPEN, Standing.FALLS, Standing.UNTESTED

SECURE = {
    "b1_wasp39b_co2": "secure: JTEC ERS Team 2023",
    "b2_wasp39b_co2_prism": "secure: Rustamkulov et al. 2023",
    "b2_wasp39b_h2o_prism": "secure: Rustamkulov et al. 2023",
    "b2_wasp39b_co_prism": "secure: Rustamkulov et al. 2023",
    "b3_wasp39b_co2_grating": "secure: Alderson et al. 2023",
    "b3_wasp39b_h2o_grating": "secure: Alderson et al. 2023",
    "b3_wasp39b_so2_grating": "secure: Alderson et al. 2023",
    "b4_wasp39b_so2": "secure: Tsai et al. 2023",
    "b6_hatp11b_h2o": "secure: Fraine et al. 2014",
    "b7_hd209458b_h2o": "secure: Deming et al. 2013; Tsiaras et al. 2016",
    "b10_k218b_ch4": "secure: about 4 sigma in Schmidt et al. 2025 (from memory)",
    "b10_k218b_co2": "3 sigma, not significant in Schmidt et al. 2025 (from memory)",
}
DISPUTED = {
    # name: (from the claim alone, weakest link, with later results, the literature)
    "b2_wasp39b_so2_prism": (OPEN, Check.TRIALS, OPEN, "a hint then; confirmed by the grating, Alderson et al. 2023"),
    "b12_k218b_dms_near": (FALLS, Check.EVIDENCE, FALLS, "not significant: Schmidt et al. 2025, arXiv:2501.18477"),
    "b13_k218b_dms_mid": (OPEN, Check.RIVALS, OPEN, "flat line as good: Taylor 2025; others fit: Luque et al. 2025"),
    "b14_k218b_dms_species": (FALLS, Check.TRIALS, FALLS, "depends on the set of models: Welbanks et al. 2025"),
    "b15_venus_ph3": (
        UNTOLD,
        Check.OFFSETS,
        OPEN,
        "2 sigma: Snellen et al. 2020; 5 sigma: Greaves et al., reply",
    ),
    "b16_gj1132b_hcn": (UNTOLD, None, FALLS, "no molecular absorption: Mugnai et al. 2021; nothing: Palle et al. 2025"),
    "b17_trappist1b_h2o": (FALLS, Check.STAR, FALLS, "spots and faculae: Lim et al. 2023"),
    "b18_trappist1c_h2o": (FALLS, Check.STAR, FALLS, "100 to 500 ppm by the star: Radica et al. 2025"),
}


def judged(name, *, later):
    """A claim file audited, with or without what others published later."""
    claim = read_claim(FOLDER / f"{name}.toml")
    if not later:
        claim = claim.model_copy(update={"reductions": tuple(r for r in claim.reductions if not r.later)})
    return audit(claim, follow_up=False)


@pytest.mark.slow
@pytest.mark.parametrize("name", SECURE)
def test_secure_detections_are_not_thrown_out(name):
    """No check that can be made fails."""
    result = judged(name, later=True)
    assert result.standing is STANDS, result.verdict
    print(row(name, result, result, SECURE[name]))


@pytest.mark.slow
@pytest.mark.parametrize("name", DISPUTED)
def test_disputed_claims(name):
    """The verdict from the claim alone, the check that exposes it, and the verdict after what others published."""
    alone, weakest, after, literature = DISPUTED[name]
    first, second = judged(name, later=False), judged(name, later=True)
    assert first.standing is alone, first.verdict
    assert first.weakest is weakest, first.verdict
    assert second.standing is after, second.verdict
    print(row(name, first, second, literature))


def row(name, alone, after, literature):
    """One line of the table: claim, our verdict, weakest link, literature."""
    sigma = "-" if alone.claimed_sigma is None else f"{alone.claimed_sigma:.3g}"
    verdict = alone.standing.value
    if after.standing is not alone.standing:
        verdict += f" (with later results: {after.standing.value}, {after.weakest.value if after.weakest else '-'})"
    weakest = alone.weakest.value if alone.weakest else "-"
    return f"| {name.split('_')[0].upper()} {alone.title} | {sigma} | {verdict} | {weakest} | {literature} |"


def test_every_claim_file_is_judged():
    """No file without a verdict from the literature, no verdict without a file."""
    assert {path.stem for path in FOLDER.glob("*.toml")} == {*SECURE, *DISPUTED}


@pytest.mark.parametrize(
    ("name", "heights", "tolerance"),
    [("b6_hatp11b_h2o", 4.1, 0.05), ("b7_hd209458b_h2o", 1.2, 0.05), ("b1_wasp39b_co2", 3.5, 0.15)],
)
def test_published_amplitudes_in_scale_heights(name, heights, tolerance):
    """Amplitude over 61, 171 and 424 ppm, one scale height at a mean molar mass of 2.3 (worked from published data)."""
    claim = read_claim(FOLDER / f"{name}.toml")
    scenario = claim.scenario(("near-infrared-prism",))
    assert heights_of(claim.claim.amplitude_ppm, scenario)[1] == pytest.approx(heights, abs=tolerance)


def test_usual_water_features_are_far_from_the_limit():
    """0.9 to 2.9 scale heights in 10 of 19 planets (Iyer et al. 2016, ApJ 823, 109): well under the flag at 10."""
    assert MOST_HEIGHTS > 2 * 2.9


def test_too_tall_for_its_air_falls():
    """500 ppm on TRAPPIST-1 c are 26 scale heights of nitrogen (19.3 ppm each, worked from published masses)."""
    claim = read_claim(FOLDER / "b18_trappist1c_h2o.toml")
    nitrogen = claim.atmosphere.model_copy(update={"background": {"N2": 1.0}})
    bench = make_bench(claim.model_copy(update={"atmosphere": nitrogen}))
    object.__setattr__(bench, "growth", ((1e-10, 1.0), (1e-2, 1e6)))  # what water makes plays no part here
    found = check_size(bench)
    assert found.outcome.value == "failed"
    assert found.figures["scale_heights"] == pytest.approx(500 / 19.27, rel=0.02)
