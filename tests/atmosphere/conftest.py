"""Airs that the tests of this room share."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from planner.atmosphere.absorbers import GasOpacity
from planner.atmosphere.layers import Air

_TEMPERATE = {
    "temperature_k": 250.0,
    "base_pressure_bar": 1.0,
    "base_radius_km": 5868.0,
    "base_gravity_m_per_s2": 8.0,
    "mixing_ratios": {"N2": 0.9, "X": 0.1},
    "molar_mass_g": 28.0134,
    "surface": True,
}


@pytest.fixture(scope="session")
def make_air() -> Callable[..., Air]:
    """A temperate rocky planet's air of N2 and an invented gas X; any field can be changed."""
    return lambda **changes: Air(**(_TEMPERATE | changes))


@pytest.fixture(scope="session")
def flat_gas() -> Callable[[str, Any], GasOpacity]:
    """A gas whose cross-section does not depend on pressure."""

    def make(formula: str, cross_section_cm2: Any) -> GasOpacity:
        flat = np.atleast_1d(np.asarray(cross_section_cm2, dtype=np.float64))
        return GasOpacity(
            formula=formula, pressures_bar=np.array([]), log10_cross_section=None, flat_cross_section_cm2=flat
        )

    return make
