"""Stated rates of whole searches, scenario to filter, against simulated observations."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from scipy import special

from planner.detection.significance import one_sided_probability, target_snr
from planner.detection.simulate import matched_filter, rate_above, simulated_significances
from planner.resources import data_folder
from planner.scenario import parse_scenario
from planner.studies.forward import Change
from planner.studies.vary import vary
from planner.studies.workshop import Workshop, see

PLANET = """
[planet]
name = "p"
mass = "{mass}"
radius = "{radius}"
period = "{period}"
impact_parameter = 0.25
"""
COOL = """
[star]
name = "s"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "12.8 pc"
magnitudes = { J = "11.28 mag", Ks = "10.28 mag" }
"""
WARM = """
[star]
name = "s"
temperature = "4800 K"
radius = "0.75 R_sun"
mass = "0.78 M_sun"
distance = "40 pc"
magnitudes = { J = "8.6 mag", Ks = "8.0 mag" }
"""
EARTH = PLANET.format(mass="0.85 M_earth", radius="1 R_earth", period="5.49 d")
NEPTUNE = PLANET.format(mass="17 M_earth", radius="4 R_earth", period="6 d")
THIN_AIR = """
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = { N2 = 1.0 }
absorbers = { CO = "10 ppm" }
"""
HYDROGEN = """
[atmosphere]
temperature = "700 K"
pressure = "10 bar"
surface = false
background = { H2 = 0.85, He = 0.15 }
absorbers = { CO = "100 ppm" }
"""
CLOUD = 'cloud = { top = "0.05 bar" }\nhaze = { factor = 5 }\n'
SPOTS = "[star.spots]\n[star.faculae]\n"
GOAL = '[[candidates]]\ngas = "N2O"\nmixing_ratio = "{ratio}"\n[goal]\nthreshold = 3\n'


def text(modes, *parts, ratio="300 ppm"):
    listed = ", ".join(f'"{mode}"' for mode in modes)
    return "".join([f'title = "t"\ninvented = true\nmodes = [{listed}]\n', *parts, GOAL.format(ratio=ratio)])


def correlated_mode(folder: Path) -> Path:
    """A shipped mode with a floor that is correlated over a tenth of its range."""
    shipped = (data_folder("configs") / "instruments" / "grism-4-to-5-um.toml").read_text()
    path = folder / "correlated.toml"
    path.write_text(shipped.replace("[floor]", "[floor]\ncorrelation_length = 0.03"))
    return path


SEARCHES = {
    "white noise of one grism": text(["grism-4-to-5-um"], COOL, EARTH, THIN_AIR, '[noise]\nfloor = "0 ppm"\n'),
    "a floor that dominates, clouds and haze": text(
        ["grism-4-to-5-um"], COOL, EARTH, THIN_AIR, CLOUD, '[noise]\nfloor = "12 ppm"\n', ratio="5000 ppm"
    ),
    "a correlated floor": text(["correlated.toml"], COOL, EARTH, THIN_AIR),
    "two modes joined, spots and faculae, a rival": text(
        ["grism-2-to-4-um", "grism-4-to-5-um", "combined"], COOL, SPOTS, EARTH, THIN_AIR,
        '[nuisances]\nrivals = { OCS = "1 ppm" }\n',
    ),
    "a warm sub-Neptune of a brighter star": text(["grism-4-to-5-um"], WARM, NEPTUNE, HYDROGEN, ratio="300 ppb"),
    "narrow priors": text(
        ["grism-4-to-5-um"], COOL, EARTH, THIN_AIR,
        '[nuisances]\noffset = "0 ppm"\ncloud_top = "0 dex"\nhaze = "0 dex"\nabsorbers = "0.1 dex"\n',
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", SEARCHES)
def test_stated_rates(name, tmp_path):
    """At the transits said to give a power the gas is found as often, and never there as seldom, as stated.

    Within three standard errors of 20,000 observations each: powers of 0.2, 0.5 and 0.9 at 3 sigma, false alarms at
    1.5, 2 and 2.5 sigma.
    """
    correlated_mode(tmp_path)
    scenario = parse_scenario(SEARCHES[name], tmp_path / "s.toml")
    measurement = see(Workshop(scenario), scenario.cases[0]).measurements[-1]
    covariance = measurement.floor_ppm2
    assert (name == "a correlated floor") == bool(np.any(covariance - np.diag(np.diag(covariance))))
    rng = np.random.default_rng(8)
    for power in (0.2, 0.5, 0.9):
        transits = measurement.transits_for(target_snr(3.0, power))
        found = rate_above(simulated_significances(measurement, transits, 20_000, rng), 3.0)
        print(f"{name}: power {power:g} found {found.share:.4f}, {found.errors_from(power):+.1f} standard errors")
        assert abs(found.errors_from(power)) < 3, (power, found)
    absent = simulated_significances(measurement, transits, 20_000, rng, amplitude=0.0)
    for sigma in (1.5, 2.0, 2.5):
        stated, seen = one_sided_probability(sigma), rate_above(absent, sigma)
        errors = seen.errors_from(stated)
        print(f"{name}: alarms at {sigma:g} sigma {stated:.4f} found {seen.share:.4f}, {errors:+.1f} standard errors")
        assert abs(errors) < 3, sigma


# -- where the forward model is not linear --------------------------------------------------------------------------

DRAWN = 2000


def drawn_imitations(scenario, seed):
    """Measurement of the search, and depth changes of air without the gas, all unknowns drawn from their priors."""
    workshop, case = Workshop(scenario), scenario.cases[0]
    sight, priors = see(workshop, case), scenario.nuisances
    base = workshop.thin.binned(case, transparent=case.gases)[0].depth_ppm
    rng = np.random.default_rng(seed)
    imitations = np.empty((DRAWN, base.size))
    for row in imitations:
        z = rng.standard_normal(8)
        change = Change(
            temperature=max(0.45, 1 + priors.temperature_fraction * z[0]),
            radius=1 + priors.radius_fraction * z[1],
            gravity=max(0.3, 1 + scenario.gravity_fraction * z[2]),
            molar_mass=1 + priors.molar_mass_fraction * z[3],
            cloud_top=min(10 ** (priors.cloud_top_dex * z[4]), 19.0),
            haze_factor=5 * 10 ** (priors.haze_dex * z[5]),
        )
        moved, _ = vary(scenario, case, {"CO": 1e-5 * 10 ** (priors.absorbers_dex * z[6])})
        depth = workshop.thin.of(moved).binned(case, change, transparent=case.gases)[0].depth_ppm
        row[:] = depth - base + priors.offset_ppm * z[7]
    return sight.measurements[0], imitations[:, sight.usable[0]]


def alarms(measurement, imitations, transits, sigma):
    """Rate of false alarms over the imitations, noise averaged exactly, and its standard error."""
    weights = matched_filter(measurement, transits)
    noise2 = weights**2 @ measurement.white_ppm**2 / transits + weights @ measurement.floor_ppm2 @ weights
    rates = special.ndtr((imitations @ weights - sigma) / np.sqrt(noise2))
    return rates.mean(), rates.std() / np.sqrt(len(rates))


@pytest.mark.slow
@pytest.mark.parametrize(("shrunk", "tolerance"), [(0.3, 0.03), (1.0, 0.3)])
def test_false_alarms_with_the_full_forward_model(shrunk, tolerance):
    """Unknowns drawn from their priors through the forward model itself, where the filter takes it as linear.

    1e5 observations. With a third of the default priors the rates are those stated, to 3 % and the sampling error;
    with the default ones (15 % in temperature, a decade in cloud top, haze and CO) the model bends, and the rates
    measured here at 10 and 100 transits are 3 to 21 % above what is stated.
    """
    scenario = parse_scenario(text(["grism-4-to-5-um"], COOL, EARTH, THIN_AIR, CLOUD, ratio="1 ppm"))
    usual = scenario.nuisances
    widths = ("temperature_fraction", "radius_fraction", "molar_mass_fraction")
    widths += ("cloud_top_dex", "haze_dex", "absorbers_dex")
    update = {name: shrunk * getattr(usual, name) for name in widths} | {"given_gravity_fraction": 0.1 * shrunk}
    scenario = scenario.model_copy(update={"nuisances": usual.model_copy(update=update)})
    measurement, imitations = drawn_imitations(scenario, seed=5)
    for transits in (10, 100):
        found = simulated_significances(
            measurement, transits, 100_000, np.random.default_rng(6), amplitude=0.0, imitations_ppm=imitations
        )
        for sigma in (1.5, 2.0, 2.5):
            stated = one_sided_probability(sigma)
            rate, error = alarms(measurement, imitations, transits, sigma)
            assert abs(rate_above(found, sigma).errors_from(rate)) < 3
            assert abs(rate - stated) < tolerance * stated + 3 * error
