"""Transit durations, equilibrium temperatures, gravities and scale heights of published systems.

Flags beside the numbers: "published" was read in the paper or its table; "closed form" was worked out apart from this
project from the formula named, with CODATA 2018 and IAU 2015 constants; "from memory" is recalled, and used only as
a band. Inputs are those of the papers named; most are from memory, which does not matter to a check of arithmetic.
"""

from __future__ import annotations

import pytest

from planner.atmosphere.layers import gravity_m_per_s2, scale_height_km
from planner.scenario import Planet, Scenario, Star, geometry

EARTH_RADIUS_M, EARTH_MASS_KG = 6.3781e6, 5.9722e24
SUN_RADIUS_M, AU_M = 6.957e8, 1.495978707e11

# TRAPPIST-1: star of Agol et al. 2021 (PSJ 2, 1; secondary source), planets of the same paper (from memory).
# P d, R/Re, M/Me, b, a au | closed form: k, g m/s2, Teq K at albedo 0, T14 min, T23 min
TRAPPIST = {
    "b": (1.510826, 1.116, 1.374, 0.095, 0.01154, 0.08583, 10.81, 397.7, 36.00, 30.26),
    "c": (2.421937, 1.097, 1.308, 0.109, 0.01580, 0.08437, 10.65, 339.9, 42.03, 35.42),
    "d": (4.049219, 0.788, 0.388, 0.063, 0.02227, 0.06061, 6.12, 286.3, 48.92, 43.31),
    "e": (6.101013, 0.920, 0.692, 0.191, 0.02925, 0.07076, 8.01, 249.8, 55.84, 48.20),
    "f": (9.207540, 1.045, 1.039, 0.312, 0.03849, 0.08037, 9.32, 217.7, 62.87, 52.58),
    "g": (12.352446, 1.129, 1.321, 0.379, 0.04683, 0.08683, 10.15, 197.4, 68.27, 55.68),
    "h": (18.772866, 0.755, 0.326, 0.378, 0.06189, 0.05807, 5.60, 171.7, 76.17, 66.50),
}
# Published T14 in minutes: Ducrot et al. 2020 (A&A 640, A112), from memory.
TRAPPIST_T14_MIN = {"b": 36.2, "c": 42.3, "d": 49.3, "e": 55.9, "f": 63.1, "g": 68.5, "h": 76.9}
# Closed form: scale height km and its depth ppm, for N2 (28.0134), CO2 (43.99) and H2/He (2.3 g/mol), T = Teq.
TRAPPIST_SCALE_HEIGHTS = {
    "b": ((10.92, 22.60), (6.95, 14.39), (133.0, 275.3)),
    "c": ((9.47, 19.27), (6.03, 12.27), (115.4, 234.7)),
    "d": ((13.88, 20.28), (8.84, 12.92), (169.0, 247.1)),
    "e": ((9.25, 15.79), (5.89, 10.06), (112.7, 192.4)),
    "f": ((6.93, 13.44), (4.41, 8.56), (84.4, 163.7)),
    "g": ((5.77, 12.08), (3.67, 7.69), (70.3, 147.2)),
    "h": ((9.10, 12.74), (5.79, 8.11), (110.8, 155.1)),
}

# R*, Teff, P d, radius, mass, a au, b | closed form: g, Teq, T14 min, H at 2.3 g/mol km and ppm
OTHERS = {
    # Xue et al. 2024 (ApJL 973, L8)
    "GJ 1132 b": (
        0.2211,
        3229,
        1.62893,
        "1.192 R_earth",
        "1.837 M_earth",
        0.0157,
        0.38,
        12.67,
        584.3,
        47.88,
        166.7,
        107.2,
    ),
    # Cadieux et al. 2024 (ApJL 970, L2)
    "LHS 1140 b": (
        0.2159,
        3096,
        24.73723,
        "1.730 R_earth",
        "5.60 M_earth",
        0.0946,
        0.226,
        18.33,
        225.5,
        126.3,
        44.5,
        43.5,
    ),
    # Vanderspek et al. 2019 (ApJL 871, L24); the mass is assumed
    "LHS 3844 b": (
        0.189,
        3036,
        0.46292913,
        "1.303 R_earth",
        "2.2 M_earth",
        0.00622,
        0.186,
        12.70,
        807.0,
        31.51,
        229.8,
        220.9,
    ),
    # Benneke et al. 2019 (ApJL 887, L14)
    "K2-18 b": (
        0.4445,
        3457,
        32.940045,
        "2.610 R_earth",
        "8.63 M_earth",
        0.1591,
        0.601,
        12.41,
        278.6,
        169.8,
        81.1,
        28.3,
    ),
    # Cloutier et al. 2021 (AJ 162, 174)
    "GJ 1214 b": (
        0.215,
        3250,
        1.58040433,
        "2.742 R_earth",
        "8.17 M_earth",
        0.01490,
        0.325,
        10.65,
        595.3,
        52.00,
        202.1,
        316.0,
    ),
    # Mancini et al. 2018 (A&A 613, A41)
    "WASP-39 b": (
        0.939,
        5485,
        4.0552941,
        "1.279 R_jup",
        "0.281 M_jup",
        0.04828,
        0.45,
        4.26,
        1166.4,
        176.5,
        990.3,
        424.4,
    ),
    # Torres, Winn & Holman 2008 (ApJ 677, 1324)
    "HD 209458 b": (
        1.155,
        6065,
        3.52474859,
        "1.359 R_jup",
        "0.685 M_jup",
        0.04707,
        0.507,
        9.19,
        1448.7,
        185.0,
        569.7,
        171.4,
    ),
    # Yee et al. 2018 (AJ 155, 255); the closed form takes the orbit as circular
    "HAT-P-11 b": (
        0.683,
        4780,
        4.887802,
        "4.36 R_earth",
        "23.4 M_earth",
        0.05254,
        0.209,
        12.06,
        831.0,
        140.7,
        249.1,
        61.4,
    ),
}
# Published T14 in minutes and Teq in K. "published" ones are hard, the others bands.
PUBLISHED_TEQ_K = {"GJ 1132 b": 584, "WASP-39 b": 1170}  # Xue et al. 2024; JTEC ERS Team 2023 (Nature 614, 649)
MEMORY_T14_MIN = {"LHS 3844 b": 31.3, "K2-18 b": 161, "GJ 1214 b": 52.7, "HD 209458 b": 184.2, "HAT-P-11 b": 141.4}
MEMORY_TEQ_K = {"LHS 1140 b": 226, "LHS 3844 b": 805, "GJ 1214 b": 596, "HD 209458 b": 1449}


def _scenario(radius_rsun, temperature_k, period_d, radius, mass, distance_au, impact, star_mass):
    return Scenario(
        title="published system",
        star=Star(
            name="star",
            temperature=f"{temperature_k} K",
            radius=f"{radius_rsun} R_sun",
            mass=star_mass,
            distance="10 pc",
        ),
        planet=Planet(
            name="planet",
            mass=mass,
            radius=radius,
            period=f"{period_d} d",
            impact_parameter=impact,
            distance=f"{distance_au} au",
        ),
        atmosphere={"temperature": "300 K", "pressure": "1 bar", "surface": True, "background": {"N2": 1}},
        candidates=[{"gas": "CO2", "mixing_ratio": "400 ppm"}],
        modes=["any"],
        goal={"threshold": 5},
    )


def _trappist(letter):
    period, radius, mass, impact, distance, *expected = TRAPPIST[letter]
    scenario = _scenario(
        0.1192, 2566, period, f"{radius} R_earth", f"{mass} M_earth", distance, impact, star_mass="0.0898 M_sun"
    )
    return scenario, expected


def _other(name):
    radius_sun, temperature, period, radius, mass, distance, impact, *expected = OTHERS[name]
    # the stellar masses of the same papers, in solar masses; they only pass the check against Kepler's third law
    star_mass = dict(zip(OTHERS, (0.1945, 0.1844, 0.151, 0.4951, 0.178, 0.913, 1.119, 0.802), strict=True))[name]
    scenario = _scenario(
        radius_sun, temperature, period, radius, mass, distance, impact, star_mass=f"{star_mass} M_sun"
    )
    return scenario, expected


def _heights(scenario, molar_mass_g):
    """Scale height in km and its depth in ppm at the equilibrium temperature."""
    height = scale_height_km(scenario.equilibrium_temperature_k(), molar_mass_g, scenario.planet.gravity_m_per_s2)
    depth = geometry.scale_height_ppm(
        scale_height_km=height, radius_m=scenario.planet.radius_m, star_radius_m=scenario.star.radius_m
    )
    return height, depth


@pytest.mark.parametrize("letter", TRAPPIST)
def test_trappist_geometry(letter):
    """Radius ratio, gravity, temperature and both durations, closed form, to the digits shown."""
    scenario, (ratio, gravity, temperature, whole, full) = _trappist(letter)
    assert scenario.radius_ratio == pytest.approx(ratio, abs=6e-6)
    assert scenario.planet.gravity_m_per_s2 == pytest.approx(gravity, abs=6e-3)
    assert scenario.equilibrium_temperature_k() == pytest.approx(temperature, abs=0.06)
    assert scenario.transit_duration_h * 60 == pytest.approx(whole, abs=6e-3)
    assert scenario.full_transit_duration_h * 60 == pytest.approx(full, abs=6e-3)


@pytest.mark.parametrize("letter", TRAPPIST)
def test_trappist_published_durations(letter):
    """Observed durations (from memory) are the circular ones within 1.5 %."""
    assert _trappist(letter)[0].transit_duration_h * 60 == pytest.approx(TRAPPIST_T14_MIN[letter], rel=0.015)


@pytest.mark.parametrize("letter", TRAPPIST)
def test_trappist_scale_heights(letter):
    """Scale heights in three kinds of air, closed form, to the three or four digits shown."""
    scenario, _ = _trappist(letter)
    for molar_mass_g, (height_km, depth_ppm) in zip((28.0134, 43.99, 2.3), TRAPPIST_SCALE_HEIGHTS[letter], strict=True):
        height, depth = _heights(scenario, molar_mass_g)
        assert height == pytest.approx(height_km, rel=1.5e-3)
        assert depth == pytest.approx(depth_ppm, rel=1.5e-3)


def test_trappist_gravity_published():
    """Gravities of Turbet et al. 2018 (A&A 612, A86, table 1; published) from the masses and radii of Gillon 2017.

    The table prints radii rounded to 0.01; the unrounded ones are used, so that 0.02 m/s2 is the rounding of both.
    """
    radii = (1.086, 1.056, 0.772, 0.918, 1.045, 1.127)
    masses = (0.85, 1.38, 0.41, 0.62, 0.68, 1.34)
    published = (7.07, 12.14, 6.75, 7.22, 6.11, 10.34)
    for radius, mass, gravity in zip(radii, masses, published, strict=True):
        computed = gravity_m_per_s2(mass * EARTH_MASS_KG, radius * EARTH_RADIUS_M * 1e-3)
        assert computed == pytest.approx(gravity, abs=0.02)


def test_trappist_equilibrium_temperatures_published():
    """Teq at zero albedo of Gillon et al. 2017 (Nature 542, 456; secondary source) from its star.

    R 0.117 Rsun, Teff 2559 K; semi-major axes of that paper in 1e-3 au, from memory. Within 0.3 %.
    """
    axes = (11.11, 15.21, 21.44, 28.17, 37.1, 45.1)
    published = (400.1, 341.9, 288.0, 251.3, 219.0, 198.6)
    for axis, temperature in zip(axes, published, strict=True):
        computed = geometry.equilibrium_temperature_k(
            star_temperature_k=2559, star_radius_m=0.117 * SUN_RADIUS_M, distance_m=axis * 1e-3 * AU_M
        )
        assert computed == pytest.approx(temperature, rel=3e-3)


@pytest.mark.parametrize("name", OTHERS)
def test_other_systems(name):
    """Gravity, temperature, duration and the scale height of hydrogen-rich air, closed form."""
    scenario, (gravity, temperature, whole, height_km, depth_ppm) = _other(name)
    assert scenario.planet.gravity_m_per_s2 == pytest.approx(gravity, rel=1.5e-3)
    assert scenario.equilibrium_temperature_k() == pytest.approx(temperature, rel=5e-4)
    assert scenario.transit_duration_h * 60 == pytest.approx(whole, rel=5e-4)
    height, depth = _heights(scenario, 2.3)
    assert height == pytest.approx(height_km, rel=2e-3)
    assert depth == pytest.approx(depth_ppm, rel=2e-3)


def test_other_systems_published():
    """Published temperatures to half a per cent; recalled temperatures to 1 % and durations to 6 %.

    K2-18 b is the widest: its recalled duration goes with another impact parameter.
    """
    for name, temperature in PUBLISHED_TEQ_K.items():
        assert _other(name)[0].equilibrium_temperature_k() == pytest.approx(temperature, rel=5e-3)
    for name, temperature in MEMORY_TEQ_K.items():
        assert _other(name)[0].equilibrium_temperature_k() == pytest.approx(temperature, rel=1e-2)
    for name, minutes in MEMORY_T14_MIN.items():
        assert _other(name)[0].transit_duration_h * 60 == pytest.approx(minutes, rel=0.06)


def test_k2_18_equilibrium_temperature_published():
    """254.9 +/- 3.9 K at an albedo of 0.3: Benneke et al. 2019 (ApJL 887, L14; published)."""
    assert _other("K2-18 b")[0].equilibrium_temperature_k(albedo=0.3) == pytest.approx(254.9, abs=3.9)


def test_earth():
    """The Earth: 278.33 K without albedo, 254.59 K with 0.3; H = 7.460 km at 255 K and 8.433 km at 288.15 K.

    Closed forms with 28.97 g/mol and g = 9.81 m/s2, the last one with 9.80665 m/s2; one
    scale height of 8 km is 0.2108 ppm of the Sun's disc.
    """
    sun = {"star_temperature_k": 5772.0, "star_radius_m": SUN_RADIUS_M, "distance_m": AU_M}
    assert geometry.equilibrium_temperature_k(**sun) == pytest.approx(278.33, abs=0.03)
    assert geometry.equilibrium_temperature_k(**sun, albedo=0.3) == pytest.approx(254.59, abs=0.03)
    assert scale_height_km(255, 28.97, 9.81) == pytest.approx(7.460, abs=1e-3)
    assert scale_height_km(288.15, 28.97, 9.80665) == pytest.approx(8.433, abs=1e-3)
    depth = geometry.scale_height_ppm(scale_height_km=8, radius_m=EARTH_RADIUS_M, star_radius_m=SUN_RADIUS_M)
    assert depth == pytest.approx(0.2108, abs=6e-5)
