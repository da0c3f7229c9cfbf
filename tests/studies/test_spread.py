"""Spread of the answer over the priors."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.significance import Measurement
from planner.scenario.surface import SurfaceRegion
from planner.studies.spread import draw_searches, priors_of, summary, variance_shares

DRAWS = 64


@pytest.fixture(scope="module")
def searches(narrow, narrow_reduced):
    return draw_searches(narrow_reduced, narrow.cases[0], draws=DRAWS, seed=1)


def summed(narrow, searches, **changed):
    quantiles, measurements = searches
    names = [prior.name for prior in priors_of(narrow, narrow.cases[0])]
    arguments = {"required": 20, "on_offer": 200, "seed": 1} | changed
    return summary(narrow, names, quantiles, [one[0] for one in measurements], **arguments)


def with_widths(scenario, **widths):
    nuisances = scenario.nuisances.model_copy(update={k: v for k, v in widths.items() if k in NUISANCES})
    spread = scenario.spread.model_copy(update={k: v for k, v in widths.items() if k not in NUISANCES})
    return scenario.model_copy(update={"nuisances": nuisances, "spread": spread})


NUISANCES = (
    "radius_fraction",
    "temperature_fraction",
    "given_gravity_fraction",
    "molar_mass_fraction",
    "cloud_top_dex",
    "haze_dex",
    "absorbers_dex",
)
EXACT = {
    "radius_fraction": 0.0,
    "temperature_fraction": 0.0,
    "given_gravity_fraction": 0.0,
    "molar_mass_fraction": 0.0,
    "cloud_top_dex": 0.0,
    "haze_dex": 0.0,
    "absorbers_dex": 0.0,
    "mixing_ratio_dex": 0.0,
    "star_radius_fraction": 0.0,
}


def test_everything_not_known_is_drawn(narrow):
    """One prior for each width that is not zero, in the words of the output."""
    priors = priors_of(narrow, narrow.cases[0])
    assert [prior.name for prior in priors] == [
        "radius", "temperature", "gravity", "molar mass", "radius of the star", "N2O", "CO", "cloud top", "haze",
    ]  # fmt: skip
    assert priors[1].words == "15 %"
    assert "clear" in priors[7].words
    assert priors_of(with_widths(narrow, **EXACT), narrow.cases[0]) == []
    assert [p.name for p in priors_of(with_widths(narrow, **EXACT | {"absorbers_dex": 1.0}), narrow.cases[0])] == ["CO"]


def spotted(scenario):
    star = scenario.star.model_copy(update={"given_spots": SurfaceRegion(), "given_faculae": SurfaceRegion()})
    return scenario.model_copy(update={"star": star})


REGIONS = ["spots", "spot temperature", "faculae", "facula temperature"]


def test_spots_and_faculae_are_drawn_where_they_are_stated(narrow):
    """Shares about their middle and never below none, temperatures about theirs; known ones are not drawn."""
    scenario = spotted(narrow)
    priors = {prior.name: prior for prior in priors_of(scenario, narrow.cases[0])}
    assert list(priors)[-4:] == REGIONS
    spots = scenario.star.spots
    assert priors["spots"].at(0.5) == pytest.approx(spots.fraction)
    assert priors["spots"].at(0.8413447) == pytest.approx(spots.fraction + spots.fraction_error)
    assert priors["spots"].at(0.001) == 0.0
    low = spots.temperature_k - spots.temperature_error_k
    assert priors["spot temperature"].at(0.1586553) == pytest.approx(low, rel=1e-6)
    known = SurfaceRegion(temperature_error="0 K", covered_fraction_error=0)
    star = narrow.star.model_copy(update={"given_spots": known})
    assert priors_of(with_widths(narrow.model_copy(update={"star": star}), **EXACT), narrow.cases[0]) == []


def test_spots_and_faculae_have_their_part_in_the_spread(narrow, narrow_reduced):
    """Where nothing else is uncertain they are all that drives the answer, as far as its variance is explained."""
    scenario = with_widths(spotted(narrow), **EXACT)
    variant = type(narrow_reduced)(
        views=narrow_reduced.views, model=narrow_reduced.model.of(scenario), error=narrow_reduced.error
    )
    quantiles, measurements = draw_searches(variant, narrow.cases[0], draws=DRAWS, seed=1)
    ones = [one[0] for one in measurements]
    assert np.ptp([one.snr(20) for one in ones]) > 0
    spread = summary(scenario, REGIONS, quantiles, ones, required=20, on_offer=200, seed=1)
    assert {driver.name for driver in spread.drivers} <= set(REGIONS)
    assert sum(driver.share for driver in spread.drivers) > 0.5


def test_priors_at_their_quantiles(narrow):
    """The median is the scenario, one width either way stands at 16 and 84 %; one-sided ones start at the scenario."""
    priors = {prior.name: prior for prior in priors_of(narrow, narrow.cases[0])}
    assert priors["temperature"].at(0.5) == pytest.approx(1)
    assert priors["temperature"].at(0.8413447) == pytest.approx(np.exp(0.15), rel=1e-6)
    assert priors["CO"].at(0.1586553) == pytest.approx(1e-6, rel=1e-4)
    assert priors["cloud top"].at(0.0) == pytest.approx(1.0)
    assert priors["cloud top"].at(0.6826895) == pytest.approx(0.1, rel=1e-5)
    assert priors["haze"].at(0.0) == pytest.approx(0.0, abs=1e-12)
    assert priors["haze"].at(0.6826895) == pytest.approx(9.0, rel=1e-5)


def test_draws_can_be_repeated(narrow, narrow_reduced, searches):
    """A seed gives the same draws and the same significances; another one others."""
    quantiles, measurements = draw_searches(narrow_reduced, narrow.cases[0], draws=DRAWS, seed=1)
    np.testing.assert_array_equal(quantiles, searches[0])
    assert [m[0].snr(20) for m in measurements] == [m[0].snr(20) for m in searches[1]]
    others, _ = draw_searches(narrow_reduced, narrow.cases[0], draws=2, seed=2)
    assert not np.isclose(others[0], quantiles[0]).any()


def test_draws_are_a_power_of_two(narrow, narrow_reduced):
    """Three are asked for, four are made."""
    quantiles, measurements = draw_searches(narrow_reduced, narrow.cases[0], draws=3, seed=1)
    assert quantiles.shape == (4, 9)
    assert len(measurements) == 4


def test_hotter_lighter_and_clearer_draws_see_more(narrow, searches):
    """Among the draws the significance rises with temperature and amount, and falls with gravity, mass and clouds."""
    quantiles, measurements = searches
    names = [prior.name for prior in priors_of(narrow, narrow.cases[0])]
    snr = np.log([one[0].snr(20) for one in measurements])
    design = np.column_stack([np.ones(len(snr)), quantiles - 0.5])
    slopes = dict(zip(names, np.linalg.lstsq(design, snr, rcond=None)[0][1:], strict=True))
    assert min(slopes["temperature"], slopes["N2O"]) > 0
    assert max(slopes["gravity"], slopes["molar mass"], slopes["cloud top"], slopes["CO"]) < 0


def test_summary_of_the_draws(narrow, searches):
    """Quantiles in order, chances growing with transits, shares that add to less than one, largest first."""
    spread = summed(narrow, searches)
    assert spread.draws == DRAWS
    counts = [np.inf if n is None else n for n in (spread.transits_16, spread.transits_50, spread.transits_84)]
    assert 1 <= counts[0] < counts[1] <= counts[2]
    assert 0 < spread.chance_asked < spread.chance_on_offer < 1
    drawn = [np.inf if n is None else n for n in spread.transits_drawn]
    assert (len(drawn), drawn) == (DRAWS, sorted(drawn))
    np.testing.assert_array_equal(np.quantile(drawn, [0.16, 0.5, 0.84], method="inverted_cdf"), counts)
    numbers, chances = zip(*spread.chances, strict=True)
    assert (numbers[0], list(chances)) == (1, sorted(chances))
    assert np.interp(20, numbers, chances) == pytest.approx(spread.chance_asked, abs=0.01)
    assert dict(spread.chances).get(200, spread.chance_on_offer) == pytest.approx(spread.chance_on_offer)
    shares = [driver.share for driver in spread.drivers]
    assert shares == sorted(shares, reverse=True)
    assert 0.5 < sum(shares) <= 1
    assert spread.drivers[0].name == "cloud top"


def test_chance_is_power_averaged(narrow, searches):
    """The chance of success is what simulated observations of the drawn worlds give."""
    _, measurements = searches
    rng = np.random.default_rng(3)
    significances = np.array([one[0].snr(20) for one in measurements])
    seen = rng.normal(significances, 1.0, (4000, DRAWS)) > narrow.goal.threshold_sigma
    error = np.sqrt(seen.mean(axis=1).var() / 4000)
    assert summed(narrow, searches).chance_asked == pytest.approx(seen.mean(), abs=4 * error)


def test_no_more_transits_than_there_are(narrow, searches):
    """A plan that asks for more than are on offer, or for no number, is judged with all there are."""
    for required in (None, 10_000):
        spread = summed(narrow, searches, required=required, on_offer=30)
        assert spread.transits_asked == 30
        assert spread.chance_asked == spread.chance_on_offer


def test_draws_out_of_reach_have_no_number(narrow, searches):
    """Where more than 16 % of the draws never arrive, neither does the upper end of the range."""
    quantiles, measurements = searches
    hopeless = [m[0] for m in measurements[: DRAWS // 2]]
    never = Measurement(
        template_ppm=np.zeros(2), white_ppm=np.ones(2), floor_ppm2=np.zeros((2, 2)), directions_ppm=np.zeros((0, 2))
    )
    spread = summary(
        narrow, ["x"] * 9, quantiles, [*hopeless, *[never] * (DRAWS // 2)], required=20, on_offer=200, seed=1
    )
    assert spread.unreachable_share >= 0.5
    assert spread.transits_84 is None


def test_nothing_unknown_means_no_spread(narrow, narrow_reduced):
    """With narrow priors all draws agree with the scenario as it stands."""
    sure = with_widths(narrow, **EXACT | {"star_radius_fraction": 1e-6})
    variant = type(narrow_reduced)(
        views=narrow_reduced.views, model=narrow_reduced.model.of(sure), error=narrow_reduced.error
    )
    _, measurements = draw_searches(variant, sure.cases[0], draws=4, seed=1)
    snr = [one[0].snr(20) for one in measurements]
    assert np.ptp(snr) < 1e-3 * snr[0]


def test_variance_shares_of_a_known_function():
    """y = 3 u + 4 v^2 with an idle third input: shares follow from the variances of u and v^2 (1/12 and 4/45)."""
    rng = np.random.default_rng(4)
    u = (np.argsort(np.argsort(rng.random((2048, 3)), axis=0), axis=0) + 0.5) / 2048
    y = 3 * u[:, 0] + 4 * u[:, 1] ** 2
    expected = np.array([9 / 12, 16 * 4 / 45, 0.0])
    # of ranks, which bend the function a little
    np.testing.assert_allclose(variance_shares(u, y), expected / expected.sum(), atol=0.03)


def test_variance_shares_of_noise_alone():
    """What no input drives gets next to nothing; a constant nothing at all, and so do fewer draws than coefficients."""
    rng = np.random.default_rng(5)
    u = rng.random((256, 8))
    assert variance_shares(u, rng.normal(size=256)).sum() < 0.06
    np.testing.assert_array_equal(variance_shares(u, np.ones(256)), np.zeros(8))
    np.testing.assert_array_equal(variance_shares(u[:17], u[:17, 0]), np.zeros(8))
