"""Checks on a bench: carbon monoxide claimed for an invented planet, with and without a spectrum."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest

from planner.claims.read import parse_claim
from planner.claims.spectrum import ObservedSpectrum
from planner.errors import RangeError
from planner.report.audit import audit_text
from planner.report.auditjson import audit_json
from planner.studies import audit as study
from planner.studies.checks import rivalry
from planner.studies.checks.bench import height_ppm, make_bench
from planner.studies.checks.chance import check_evidence, check_trials
from planner.studies.checks.companions import bands_in_range, check_companions
from planner.studies.checks.findings import Check, Outcome, Standing
from planner.studies.checks.level import check_offsets
from planner.studies.checks.precision import check_noise
from planner.studies.checks.rivalry import check_rivals, try_all
from planner.studies.checks.size import check_size
from planner.studies.checks.starlight import check_star, star_shapes_ppm, usual_coverage

TEXT = """\
title = "CO on an invented planet"
invented = true
[claim]
gas = "CO"
from = "4.2 um"
to = "5.1 um"
amplitude = "80 ppm"
significance = 5
{claim}
[search]
{search}
[star]
name = "Nowhere 2"
temperature = "3400 K"
radius = "0.44 R_sun"
mass = "0.45 M_sun"
distance = "30 pc"
magnitudes = {{ J = "9.5 mag", Ks = "8.6 mag" }}
[planet]
name = "Nowhere 2 b"
mass = "8 M_earth"
radius = "2.5 R_earth"
period = "20 d"
impact_parameter = 0.3
[atmosphere]
temperature = "300 K"
pressure = "1 bar"
surface = false
background = {{ H2 = 0.85, He = 0.15 }}
"""
MODE = 'mode = "medium-grating-3-to-5-um"\ntransits = 4'


def claim_of(claim="", search=MODE):
    return parse_claim(TEXT.format(claim=claim, search=search))


@pytest.fixture(scope="module", autouse=True)
def few_rivals():
    """Two cheap ones: one with a band in the same place, one elsewhere."""
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(rivalry, "_candidates", lambda bench: ["OCS", "HBr"])
        yield


@pytest.fixture(scope="module")
def bench():
    return make_bench(claim_of())


def observed(bench, *, amount=1.0, extra=0.0, seed=5):
    """A noisy spectrum in the bins of a bench with so much of the template in it, and something on top."""
    error = bench.error_ppm
    noise = np.random.default_rng(seed).standard_normal(error.size) * error
    return ObservedSpectrum(
        from_um=bench.bins.from_um,
        to_um=bench.bins.to_um,
        depth_ppm=bench.null.depth_ppm + amount * bench.template_ppm + extra + noise,
        error_ppm=error,
        detector=bench.bins.detector,
        detectors=("one",),
    )


def test_bench_is_what_was_claimed(bench):
    """The template has the claimed height, and its fit the claimed significance."""
    assert bench.height_ppm == pytest.approx(80)
    assert height_ppm(bench.template_at(bench.mixing_ratio)) == pytest.approx(80, rel=0.1)
    assert bench.fits.sigma([bench.template_ppm]) == pytest.approx(5, rel=1e-4)


def test_growth_rises_and_is_inverted(bench):
    """More gas, taller band, up to where it is thick; the ratio for a height is between its neighbours."""
    heights = [height for _, height in bench.growth]
    assert heights[:6] == sorted(heights[:6])
    (low, below), (high, above) = bench.growth[3], bench.growth[4]
    assert low < bench.ratio_for((below + above) / 2) < high
    assert bench.ratio_for(1e5) is None


def test_size_passes_and_fails():
    """80 ppm are a few scale heights; 2000 ppm are more than any air or amount makes."""
    good, bad = claim_of(), claim_of()
    bad = bad.model_copy(update={"claim": bad.claim.model_copy(update={"amplitude_ppm": 2000.0})})
    assert check_size(make_bench(good)).outcome is Outcome.PASSED
    found = check_size(make_bench(bad))
    assert (found.outcome, found.left_sigma) == (Outcome.FAILED, 0.0)
    assert found.figures["scale_heights"] > 10


def test_more_than_the_gas_can_make(bench):
    """Within the height of the air, yet taller than the gas at its most."""
    tall = replace(bench, claim=bench.claim.model_copy(update={"claim": bench.claim.claim.model_copy()}))
    object.__setattr__(tall, "growth", ((1e-10, 1.0), (1e-2, 40.0)))
    found = check_size(tall)
    assert found.outcome is Outcome.FAILED
    assert "makes at most 40 ppm" in found.says


@pytest.mark.parametrize(("sigma", "outcome"), [(5, Outcome.PASSED), (500, Outcome.FAILED)])
def test_noise(sigma, outcome):
    """500 sigma in four transits are more than the photons allow."""
    claim = claim_of()
    claim = claim.model_copy(update={"claim": claim.claim.model_copy(update={"quoted_sigma": float(sigma)})})
    found = check_noise(make_bench(claim))
    assert found.outcome is outcome
    assert found.figures["snr_photons"] >= found.figures["snr_with_floor"]


@pytest.mark.parametrize(("error", "outcome"), [("2 ppm", Outcome.FAILED), ("500 ppm", Outcome.PASSED)])
def test_error_of_a_bin(error, outcome):
    """A quoted error of a bin is held against photons of a bin of that width."""
    found = check_noise(make_bench(claim_of(search=f'{MODE}\nerror_per_bin = "{error}"\nbin_resolving_power = 100')))
    assert found.outcome is outcome


def test_noise_needs_mode_and_transits():
    """And says which is missing."""
    found = check_noise(make_bench(claim_of(search="transits = 4")))
    assert (found.outcome, found.says) == (Outcome.UNTESTED, "not given: mode or number of transits")


@pytest.mark.parametrize(
    ("word", "outcome"), [("seen", Outcome.PASSED), ("not seen", Outcome.FAILED), ("not told", Outcome.UNTESTED)]
)
def test_companions(word, outcome):
    """A claim on the far half of the band: the near half must show, and the claim must say so."""
    lines = f'feature_from = "4.8 um"\nfeature_to = "5.1 um"\nother_bands = "{word}"'
    found = make_bench(claim_of(lines))
    visible = [replace(band, from_um=band.from_um - 5, to_um=band.to_um - 5) for band in bands_in_range(found)]
    with pytest.MonkeyPatch.context() as patch:  # the catalogue joins both halves; here they are apart
        patch.setattr("planner.studies.checks.companions.bands_in_range", lambda bench: tuple(visible))
        result = check_companions(found, ())
    assert result.outcome is outcome
    assert (result.left_sigma is not None) == (word == "not seen")


def test_single_band_is_not_tested(bench):
    """One band in the range proves nothing either way."""
    found = check_companions(bench, ())
    assert found.outcome is Outcome.UNTESTED
    assert "rests on one band" in found.says


def test_rivals(bench):
    """Both are told apart at 5 sigma; at 0.5 sigma nothing can be."""
    strong = try_all(bench)
    assert set(strong.beyond) == {"OCS", "HBr"}
    assert check_rivals(bench, strong).outcome is Outcome.PASSED
    claim = claim_of()
    faint = make_bench(claim.model_copy(update={"claim": claim.claim.model_copy(update={"quoted_sigma": 0.5})}))
    found = check_rivals(faint, try_all(faint))
    assert (found.outcome, found.figures["rivals_as_good"], found.decides) == (Outcome.FAILED, 2, False)


def test_star_takes_more_from_cooler_stars(bench):
    """Late M dwarfs are spotted more than late K, those more than F; unknown spots never add to a significance."""
    covered = [usual_coverage(kelvin) for kelvin in (2600, 3500, 4800, 5700, 6500)]
    assert [c.spots for c in covered] == sorted((c.spots for c in covered), reverse=True)
    found = check_star(bench)
    assert found.left_sigma <= 5.0
    assert found.figures["swing_by_spots_ppm"] > 0


def test_offsets_take_a_step():
    """What looks like a step between detectors is gone once their levels are free; a band inside one is not."""
    wide = claim_of(search='mode = "grating-3-to-5-um"\ntransits = 4')
    wide = wide.model_copy(update={"claim": wide.claim.model_copy(update={"from_um": 3.0})})
    both = make_bench(wide)
    assert len(both.offsets) == 1
    step = replace(both)
    object.__setattr__(step, "template_ppm", np.where(both.bins.detector == 1, 80.0, 0.0))
    assert check_offsets(wide, step).outcome is Outcome.FAILED
    assert check_offsets(wide, both).left_sigma > 3


def test_free_baseline_cannot_be_tested(bench):
    """Twelve terms taken out leave a doubt that nothing in a claim can lift."""
    found = check_offsets(claim_of(search=f"{MODE}\nbaseline_terms = 12"), bench)
    assert (found.outcome, found.doubt) == (Outcome.UNTESTED, True)


def test_spectrum_with_the_feature(bench):
    """What is in the data is found again within its error; the checks say that they ran on it."""
    seen = make_bench(claim_of(), observed(bench))
    assert seen.sigma == pytest.approx(5, abs=3)
    found = check_size(seen)
    assert found.on_data
    assert found.figures["amplitude_ppm"] == pytest.approx(80, abs=3 * 80 / 5)
    assert check_star(seen).on_data
    assert check_offsets(claim_of(), seen).on_data
    assert check_rivals(seen, try_all(seen)).on_data


def test_spectrum_without_the_feature(bench):
    """Noise alone: whatever the claim says, nothing is left of it, and the verdict is that it does not stand."""
    result = study.audit(claim_of(), observed(bench, amount=0.0), follow_up=False)
    assert result.finding(Check.STAR).left_sigma < 3
    assert result.standing is Standing.FALLS


def test_chance_and_evidence_go_by_the_spectrum_where_it_gives_less(bench):
    """Five sigma are claimed: data that give less are believed, data that give more are not; no claim is needed."""
    for amount in (0.3, 3.0):
        seen = make_bench(claim_of(), observed(bench, amount=amount))
        expected = min(5.0, seen.sigma)
        assert check_evidence(seen.claim, seen).left_sigma == pytest.approx(expected)
        assert check_evidence(seen.claim, seen).on_data is (seen.sigma < 5)
        told = claim_of(search=f"{MODE}\ngases_searched = 9")
        assert check_trials(told, seen).left_sigma < expected
    silent = parse_claim(TEXT.format(claim="", search=MODE).replace("significance = 5\n", ""))
    result = study.audit(silent, observed(bench), follow_up=False)
    assert result.finding(Check.EVIDENCE).left_sigma > 2
    assert result.standing is not Standing.UNTESTED


@pytest.mark.parametrize(("factor", "outcome"), [(1.0, Outcome.PASSED), (0.5, Outcome.FAILED)])
def test_errors_of_a_spectrum_against_photons(bench, factor, outcome):
    """Half of what photons allow is too small; without a mode nobody can tell."""
    photons = factor * bench.one_transit_ppm / np.sqrt(4)
    seen = make_bench(claim_of(), replace(observed(bench), error_ppm=photons))
    found = check_noise(seen)
    assert (found.outcome, found.on_data) == (outcome, True)
    assert found.figures["error_per_bin_ppm"] == pytest.approx(factor * found.figures["photon_error_per_bin_ppm"])
    other = make_bench(claim_of(search="transits = 4"), observed(bench))
    assert check_noise(other).outcome is Outcome.UNTESTED


def test_spectrum_made_by_spots(bench):
    """A spectrum bent by spots and nothing else: left unknown, they take what looked like the gas."""
    spots, _ = star_shapes_ppm(bench)
    factor = 80 / height_ppm(spots)
    seen = make_bench(claim_of(), observed(bench, amount=0.0, extra=factor * spots))
    without = seen.fits.sigma([seen.template_ppm])
    left = seen.fits_with([spots * factor]).sigma([seen.template_ppm])
    assert left <= without + 1e-6  # roots of differences that rounding leaves at 1e-15
    assert left < 3


def test_spectrum_needs_a_planet(bench):
    """A spectrum for a claim without star, planet or air is refused."""
    bare = parse_claim('title = "x"\n[claim]\ngas = "CO"\nfrom = "4.2 um"\nto = "5 um"\n')
    with pytest.raises(RangeError, match=r"the claim lacks \[star\], \[planet\], \[atmosphere\]"):
        study.audit(bare, observed(bench))


def test_gas_without_data_there():
    """It says so, and what can be done."""
    far = claim_of(search="transits = 1")
    far = far.model_copy(update={"claim": far.claim.model_copy(update={"gas": "CF4", "from_um": 0.7, "to_um": 0.8})})
    with pytest.raises(RangeError, match=r"CF4: no data from 0.7 to 0.8 um; bring some with --lines"):
        make_bench(far)


def test_shape_that_the_air_makes_by_itself(bench):
    """Half of what one prior width of haze or the like does: no error makes it 5 sigma, and the checks say why."""
    bent = max(bench.unknowns_ppm, key=np.ptp)
    same = replace(bench)
    object.__setattr__(same, "template_ppm", 0.5 * bent)
    found = check_rivals(same, None if same.fits is None else try_all(same))
    assert found.outcome is Outcome.UNTESTED
    assert "makes such a shape" in found.says


def test_report_and_json():
    """Every check, its words and its reason are shown; JSON is valid and says the same."""
    result = study.audit(claim_of(search=f"{MODE}\ngases_searched = 3"), follow_up=False)
    text = " ".join(audit_text(result, 100).split())
    tree = json.loads(audit_json(result))
    assert tree["format"] == "limbcast audit 1"
    assert tree["standing"] == result.standing.value
    assert result.verdict in text
    assert "The claim is invented." in text
    for finding, check in zip(result.findings, tree["checks"], strict=True):
        assert finding.check.value in text
        assert check["left_sigma"] == finding.left_sigma
        assert check["says"] == finding.says


@pytest.mark.slow
def test_follow_up_finds_the_soonest():
    """Modes stand in the order of their hours, each number of transits reaches 5 sigma, and the band is the gas's."""
    from planner.studies.checks.elsewhere import SETTLED_SIGMA, check_follow_up, look_elsewhere

    bench = make_bench(claim_of())
    prospects = look_elsewhere(bench, try_all(bench))
    hours = [p.hours_required for p in prospects if p.hours_required is not None]
    assert hours == sorted(hours)
    first = prospects[0]
    assert first.band_um[0] > 2.2
    assert first.snr_one_transit * first.transits_required**0.5 >= SETTLED_SIGMA * 0.9
    assert first.mode in check_follow_up(bench, prospects).says


def test_trouble_elsewhere_leaves_the_claim_judged(monkeypatch):
    """Where other modes cannot be looked at, the follow-up says why and all else is as it was."""

    def refuse(*args, **more):
        raise RangeError("star.spectrum: ends at 2 um")

    monkeypatch.setattr(study, "look_elsewhere", refuse)
    result = study.audit(claim_of())
    found = result.finding(Check.FOLLOW_UP)
    assert (found.outcome, found.says) == (Outcome.UNTESTED, "star.spectrum: ends at 2 um")
    assert result.finding(Check.SIZE).outcome is Outcome.PASSED
