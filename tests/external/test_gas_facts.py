"""Facts of the gas catalogue against the tables they come from, against each other and against closed forms.

Sources
-------
AR6: IPCC AR6 WG1 (2021), table of lifetimes and emission metrics in the supplement of chapter 7; read.
Hodnebrog et al. 2020, Rev. Geophys. 58, e2019RG000691, table of radiative efficiencies and metrics; read.
Mixing ratios: IPCC AR6 WG1 (2021), table 2.2 and annex III; from memory, within 1 %.
"""

from __future__ import annotations

from math import exp

import pytest

from planner.catalogue.conversions import surface_flux_per_cm2_s
from planner.catalogue.read import find_gas, read_catalogue
from planner.catalogue.records import GasRecord
from planner.catalogue.sharing import sharing_bands
from planner.spectroscopy.molecules import find_molecule

# gas: lifetime in yr (None where AR6 gives none), W m-2 ppb-1, GWP-100. AR6 as above, read.
AR6 = {
    "CO2": (None, 1.33e-5, 1),
    "CH4": (11.8, 3.88e-4, 27.9),
    "N2O": (109, 3.20e-3, 273),
    "CFC-11": (52.0, 0.291, 6230),
    "CFC-12": (102, 0.358, 12500),
    "CF4": (50000, 0.099, 7380),
    "C2F6": (10000, 0.261, 12400),
    "C3F8": (2600, 0.270, 9290),
    "SF6": (3200, 0.567, 25200),
    "NF3": (569, 0.204, 17400),
    "CCl4": (32.0, 0.166, 2200),
    "CH3Cl": (0.9, 0.005, 5.54),
    "CH3Br": (0.8, 0.004, 2.43),
    "HFC-134a": (14.0, 0.167, 1530),
}

# gas: W m-2 ppb-1, AGWP over 100 yr in W m-2 yr kg-1. Hodnebrog et al. 2020, read.
HODNEBROG = {
    "SF6": (0.56657, 2.15436e-9),
    "CF4": (0.09859, 6.31355e-10),
    "CFC-11": (0.25941, 4.73036e-10),
    "NF3": (0.20448, 1.48975e-9),
}

# gas: mole fraction in 1750, in 2019. AR6 table 2.2 and annex III, from memory, within 1 %.
MIXING_RATIOS = {
    "CO2": (278.3e-6, 409.9e-6),
    "CH4": (729e-9, 1866e-9),
    "N2O": (270e-9, 332.1e-9),
    "CFC-11": (0, 226e-12),
    "CFC-12": (0, 503e-12),
    "CF4": (34e-12, 85.5e-12),
    "C2F6": (0, 4.85e-12),
    "C3F8": (0, 0.68e-12),
    "NF3": (0, 2.05e-12),
    "CH3Cl": (457e-12, 540e-12),
    "CH3Br": (5.3e-12, 6.5e-12),
    "O2": (0.2095, 0.2095),
}

AIR_MOLAR_MASS_G = 28.97
AIR_MASS_KG = 5.1352e18
"""Trenberth & Smith 2005, J. Climate 18, 864, total mass of the dry air 5.1352e18 kg."""
AIR_MOL = AIR_MASS_KG * 1e3 / AIR_MOLAR_MASS_G


def agwp_100(gas: GasRecord, efficiency_w_per_m2_ppb: float) -> float:
    """Closed form of a pulse that decays: efficiency per kg times tau (1 - exp(-100 yr / tau)), W m-2 yr kg-1."""
    assert gas.lifetime_yr is not None
    lifetime_yr = gas.lifetime_yr[0]
    ppb_per_kg = 1e9 * AIR_MOLAR_MASS_G / find_molecule(gas.formula).molar_mass_g / AIR_MASS_KG
    return efficiency_w_per_m2_ppb * ppb_per_kg * lifetime_yr * (1 - exp(-100 / lifetime_yr))


@pytest.mark.parametrize("name", AR6)
def test_lifetimes_and_warming_of_ar6(name: str) -> None:
    """The records hold AR6's figures, and say that they were read there."""
    lifetime_yr, efficiency, gwp = AR6[name]
    gas = find_gas(name)
    if lifetime_yr is not None:
        assert gas.lifetime_yr == (lifetime_yr, lifetime_yr)
    assert gas.greenhouse is not None
    assert gas.greenhouse.radiative_efficiency_w_per_m2_ppb == efficiency
    assert gas.greenhouse.gwp_100 == gwp
    assert gas.greenhouse.flag == "read"


@pytest.mark.parametrize("name", HODNEBROG)
def test_agwp_of_hodnebrog(name: str) -> None:
    """Their efficiency with our lifetime and molar mass gives their AGWP within 0.1 % (five digits, rounded inputs)."""
    efficiency, published = HODNEBROG[name]
    assert agwp_100(find_gas(name), efficiency) == pytest.approx(published, rel=1e-3)


def test_warming_potentials_agree_with_lifetimes_and_efficiencies() -> None:
    """GWP-100 over the closed form is one and the same factor for all stable halocarbons.

    The factor is 1 / AGWP-100 of CO2 (8.95e-14 W m-2 yr kg-1 in AR6, from memory) times about 1.05 for the response
    of the carbon cycle, which AR6 adds for every gas but CO2. A wrong digit in any lifetime, efficiency or potential
    breaks it. 1 % either side: three digits in the efficiencies, and the response differs a little with lifetime.
    """
    factors = {}
    for formula, gas in read_catalogue().items():
        if gas.gas_class == "industrial" and gas.greenhouse is not None and gas.greenhouse.gwp_100 is not None:
            closed_form = agwp_100(gas, gas.greenhouse.radiative_efficiency_w_per_m2_ppb)
            factors[formula] = gas.greenhouse.gwp_100 / closed_form * 8.95e-14
    assert len(factors) >= 11
    assert all(factor == pytest.approx(1.05, rel=0.01) for factor in factors.values()), factors


@pytest.mark.parametrize("name", MIXING_RATIOS)
def test_mixing_ratios(name: str) -> None:
    """1750 and 2019 within 1 %; gases without a natural source have none before."""
    before, now = MIXING_RATIOS[name]
    gas = find_gas(name)
    for epoch, expected in (("pre-industrial", before), ("present", now)):
        abundance = gas.abundance(epoch)
        assert abundance is not None
        assert abundance.mixing_ratio == pytest.approx((expected, expected), rel=0.01)


def test_traces_of_sf6_from_rock() -> None:
    """0.006 to 0.01 ppt before industry (fluorite; AR6 annex III and Harnisch & Eisenhauer 1998, from memory)."""
    abundance = find_gas("SF6").abundance("pre-industrial")
    assert abundance is not None
    assert abundance.mixing_ratio == pytest.approx((6e-15, 1e-14))


@pytest.mark.parametrize("name", ["CH4", "N2O", "CH3Cl", "CH3Br", "HCFC-22", "CO", "C2H6", "OCS"])
def test_sources_and_lifetimes_balance_the_burden(name: str) -> None:
    """Source times lifetime over the moles of air is the mixing ratio (box model in balance), within a factor 1.5.

    Only gases near balance; the factor allows for the spread of published sources and for growth since.
    """
    gas = find_gas(name)
    amounts = [origin.amount_tg_per_yr for origin in gas.origins if origin.amount_tg_per_yr is not None]
    lifetime_yr = next(loss.lifetime_yr for loss in reversed(gas.losses) if loss.lifetime_yr is not None)
    low, high = (
        sum(amount[end] for amount in amounts) * 1e12 / find_molecule(name).molar_mass_g * lifetime_yr[end] / AIR_MOL
        for end in (0, 1)
    )
    present = gas.abundance("present")
    assert present is not None
    assert low / 1.5 <= present.mixing_ratio[1]
    assert present.mixing_ratio[0] <= high * 1.5


def test_fluxes_that_studies_quote() -> None:
    """1 Tmol/yr over the Earth is 3.741e9 molecules per cm2 and s (closed form, 6371 km, Julian year).

    4.5e6 Tg of NH3 a year is "of order 1e15" (abstract of a study of NH3 as a biosignature, read); 500 Tg of CH4 a
    year is 1.166e11, published as 1e11 (read).
    """
    assert surface_flux_per_cm2_s(44.0, 44.0) == pytest.approx(3.741e9, rel=2e-4)
    ammonia = surface_flux_per_cm2_s(4.5e6, find_molecule("NH3").molar_mass_g)
    assert ammonia == pytest.approx(9.89e14, rel=1e-3)
    methane = surface_flux_per_cm2_s(500, find_molecule("CH4").molar_mass_g)
    assert methane == pytest.approx(1.166e11, rel=1e-3)


@pytest.mark.parametrize(
    ("gas", "rivals"),
    [
        # overlaps named in reviews of infrared bands, from memory
        ("CF4", {"CH4", "N2O"}),
        ("CFC-12", {"O3"}),
        ("CFC-11", {"O3"}),
        ("SF6", {"NH3", "CCl2F2", "PH3"}),
        ("NF3", {"NH3", "CCl2F2", "PH3", "SF6"}),
        ("PH3", {"CO2"}),
        # the C-H stretch of small organic gases: Luque et al. 2025, arXiv:2505.13407, read
        ("DMS", {"CH4", "C2H6", "CH3Cl", "CH3Br", "C5H8"}),
        ("C2H6", {"CH4", "C2H6S", "CH3Cl", "CH3Br", "C5H8"}),
        ("CH4", {"C2H6", "C2H6S", "CH3Cl", "CH3Br", "C5H8"}),
    ],
)
def test_known_overlaps_are_found(gas: str, rivals: set[str]) -> None:
    """The rivals worked out from the bands hold those that the literature warns of."""
    assert rivals <= set(sharing_bands(gas))


def test_gases_far_apart_share_nothing() -> None:
    """O2 has no infrared band (textbook: homonuclear, no dipole); OCS at 4.85 um and SF6 at 10.5 um do not meet."""
    assert not {"CO2", "CH4", "H2O", "O3"} & set(sharing_bands("O2"))
    assert "OCS" not in sharing_bands("SF6")
