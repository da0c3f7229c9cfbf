"""The record of a star as a source of light."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from difflib import get_close_matches
from types import MappingProxyType

from planner.errors import ScenarioError
from planner.star.photometry import BANDS
from planner.star.spectrumfile import StarSpectrum

__all__ = ["Star"]

_POSITIVE = ("temperature_k", "radius_rsun", "mass_msun", "distance_pc")
_SUN_LOG_G = 4.438  # cm s-2, IAU 2015 nominal solar mass parameter and radius


@dataclass(frozen=True, kw_only=True, eq=False)
class Star:
    """A star as a source of light.

    Attributes
    ----------
    temperature_k : float
        Effective temperature, > 0.
    radius_rsun : float
        Radius in nominal solar radii, > 0.
    mass_msun, log_g : float or None
        Mass in solar masses, or log10 of the surface gravity in cm s-2. They do not enter the flux; they tell
        whether the star is a dwarf, for which alone the built-in spectra hold.
    distance_pc : float or None
        Used for the flux only when ``magnitudes`` is empty.
    magnitudes : mapping of str to float
        Vega magnitudes by band: U, B, V, R, I (Bessell), J, H, Ks (2MASS), W1, W2 (WISE).
    spectrum : StarSpectrum or None
        The user's own spectrum; the built-in one when ``None``.

    Raises
    ------
    ScenarioError
        On a value that is not finite or not positive, or a band that is not known.
    """

    temperature_k: float
    radius_rsun: float
    mass_msun: float | None = None
    log_g: float | None = None
    distance_pc: float | None = None
    magnitudes: Mapping[str, float] = field(default_factory=dict)
    spectrum: StarSpectrum | None = None

    def __post_init__(self) -> None:
        for name in _POSITIVE:
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value > 0):
                raise ScenarioError(f"star.{name}: expected a finite number greater than zero, got {value}")
        for band, magnitude in self.magnitudes.items():
            _check_magnitude(band, magnitude)
        object.__setattr__(self, "magnitudes", MappingProxyType(dict(self.magnitudes)))

    @property
    def surface_log_g(self) -> float | None:
        """log10 of the surface gravity in cm s-2: as given, else from mass and radius, else ``None``."""
        if self.log_g is not None or self.mass_msun is None:
            return self.log_g
        return _SUN_LOG_G + math.log10(self.mass_msun) - 2 * math.log10(self.radius_rsun)


def _check_magnitude(band: str, magnitude: float) -> None:
    if band not in BANDS:
        close = get_close_matches(band.lower(), [known.lower() for known in BANDS], n=1, cutoff=0.5)
        hint = next((f'; did you mean "{known}"?' for known in BANDS if known.lower() in close), "")
        raise ScenarioError(f'star.magnitudes: expected bands out of {", ".join(BANDS)}, got "{band}"{hint}')
    if not math.isfinite(magnitude):
        raise ScenarioError(f"star.magnitudes.{band}: expected a finite magnitude, got {magnitude}")
