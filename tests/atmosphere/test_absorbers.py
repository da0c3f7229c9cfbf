"""Records of opacities and what they refuse."""

from __future__ import annotations

import numpy as np
import pytest

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.transmission import transit_depth

WAVENUMBER = np.array([1000.0, 1001.0])


def gas(**changes):
    fields = {
        "formula": "X",
        "pressures_bar": [0.1, 1.0],
        "log10_cross_section": np.full((2, 2), -22.0),
        "flat_cross_section_cm2": None,
    }
    return GasOpacity(**(fields | changes))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"pressures_bar": [1.0, 0.1]}, "positive and ascending"),
        ({"pressures_bar": [0.0, 0.1]}, "positive and ascending"),
        ({"pressures_bar": [1.0]}, r"expected a table of shape \(1, wavenumber\)"),
        ({"pressures_bar": [], "log10_cross_section": np.empty((0, 2))}, "at least one pressure"),
        ({"flat_cross_section_cm2": np.array([-1.0, 0.0])}, "finite numbers >= 0"),
        ({"flat_cross_section_cm2": np.array([np.nan, 0.0])}, "finite numbers >= 0"),
    ],
)
def test_gas_refuses(changes, message):
    """Pressures, shapes and signs are checked where the record is made."""
    with pytest.raises(ValueError, match=message):
        gas(**changes)


def test_pair_refuses():
    """Coefficients are finite and not negative."""
    with pytest.raises(ValueError, match="PairOpacity X-N2"):
        PairOpacity(first="X", second="N2", coefficient_cm5=np.array([np.inf]))


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"gases": [gas(), gas()]}, "each formula once"),
        ({"gases": [gas(formula="Q")]}, r"gases: \['Q'\] not among the gases of the air"),
        ({"shares_of": ["Q"]}, "shares_of"),
        ({"wavenumber_per_cm": np.array([1.0, 2.0, 3.0])}, "expected 3 wavenumbers, got 2"),
        (
            {"pairs": [PairOpacity(first="X", second="N2", coefficient_cm5=np.zeros(3))]},
            "expected 2 wavenumbers, got shape",
        ),
        ({"gases": [gas(log10_cross_section=np.full((2, 2), np.nan))]}, "values that are none"),
    ],
)
def test_transit_depth_refuses(make_air, changes, message):
    """What does not fit the air or the wavenumbers is named."""
    arguments = {
        "gases": [gas()],
        "pairs": [],
        "wavenumber_per_cm": WAVENUMBER,
        "star_radius_km": 8e4,
    } | changes
    gases, pairs = arguments.pop("gases"), arguments.pop("pairs")
    with pytest.raises(ValueError, match=message):
        transit_depth(make_air(), gases, pairs, **arguments)
