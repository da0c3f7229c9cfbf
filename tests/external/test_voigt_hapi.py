"""The Voigt function against HITRAN's own library."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.molecules import quiet_hapi
from planner.spectroscopy.voigt import voigt


@pytest.mark.parametrize("lorentz_per_cm", [0.0005, 0.005, 0.07, 1.0])
def test_profile(lorentz_per_cm):
    """Our profile equals hapi's PROFILE_VOIGT to 2e-4: each is a rational approximation good to about 1e-4.

    hapi takes the Doppler half width at half maximum, sqrt(ln 2) times ours at 1/e. Compared down to 1e-6 of the peak:
    below, hapi's approximation of order 24 has an absolute error that shows at small Lorentz widths.
    """
    centre, doppler = 3000.0, 0.0055
    grid = np.linspace(centre - 2.0, centre + 2.0, 40001)
    half_maximum = doppler * np.sqrt(np.log(2.0))
    theirs = np.asarray(quiet_hapi().PROFILE_VOIGT(centre, half_maximum, lorentz_per_cm, 0.0, grid), dtype=float)
    ours = voigt((grid - centre) / doppler, lorentz_per_cm / doppler) / (np.sqrt(np.pi) * doppler)
    counts = theirs > 1e-6 * theirs.max()
    np.testing.assert_allclose(ours[counts], theirs[counts], rtol=2e-4)
