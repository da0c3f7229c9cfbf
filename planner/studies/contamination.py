"""Spots and faculae of the star in a spectrum: the bias they make, and how it could be taken for a gas.

The planet hides a part of the star that is not like the rest; the depth is multiplied by a factor that depends on
wavelength (`planner.star.heterogeneity`). A factor for each bin, taken at its middle, is enough: contrasts are known in
bands wider than that.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.detection.significance import Measurement
from planner.detection.simulate import matched_filter
from planner.scenario.target import Star
from planner.star.heterogeneity import Region, disc_factor, usual_faculae, usual_spots
from planner.studies.forward import BinnedDepth
from planner.studies.nuisances import Direction, region_words
from planner.studies.observe import ModeView
from planner.studies.results import StarMimic

__all__ = [
    "REGION_NAMES",
    "bin_factors",
    "contaminated",
    "mimic_cautions",
    "mimicry",
    "region_directions",
    "region_names",
    "surface_factor",
]

Array = NDArray[np.float64]

REGION_NAMES = ("spots", "spot temperature", "faculae", "facula temperature")
_STEP = 0.05
"""Of one prior width, for derivatives."""
_WORTH_A_WORD = 1.0
"""Feigned or hidden significance from which a caution is due, if it is also a part of the gas's own:"""
_PART_OF_THE_GAS = 0.2
_FAR_MORE = 10.0


@dataclass(frozen=True, kw_only=True)
class _Surface:
    """A photosphere with spots and faculae."""

    photosphere_k: float
    spots: Region | None
    faculae: Region | None

    def factor(self, wavelength_um: Array) -> Array:
        return disc_factor(self.photosphere_k, self.spots, self.faculae, wavelength_um)

    def moved(self, name: str, widths: float) -> _Surface:
        """With one of its numbers moved by some prior widths."""
        which = "spots" if name.startswith("spot") else "faculae"
        region: Region = getattr(self, which)
        if name.endswith("temperature"):
            region = replace(region, temperature_k=region.temperature_k + widths * region.temperature_error_k)
        else:
            region = replace(region, fraction=region.fraction + widths * region.fraction_error)
        return replace(self, spots=region) if which == "spots" else replace(self, faculae=region)

    def on_the_disc(self) -> _Surface:
        """With its shares cut to what a disc has: none is negative, and together they are at most 1."""
        whole = max(1.0, sum(max(0.0, region.fraction) for region in (self.spots, self.faculae) if region is not None))

        def cut(region: Region | None) -> Region | None:
            return replace(region, fraction=max(0.0, region.fraction) / whole) if region is not None else None

        return replace(self, spots=cut(self.spots), faculae=cut(self.faculae))

    def has_room(self, name: str, widths: float) -> bool:
        """Whether the shares of the disc stay shares when one of its numbers is moved."""
        moved = self.moved(name, widths)
        shares = [region.fraction for region in (moved.spots, moved.faculae) if region is not None]
        return min(shares) >= 0 and sum(shares) <= 1

    @property
    def names(self) -> tuple[str, ...]:
        """Those of its numbers that are not known exactly."""
        return tuple(name for name in REGION_NAMES if self._width(name) > 0)

    def _width(self, name: str) -> float:
        region = self.spots if name.startswith("spot") else self.faculae
        if region is None:
            return 0.0
        return region.temperature_error_k if name.endswith("temperature") else region.fraction_error


def bin_factors(star: Star, views: Sequence[ModeView]) -> tuple[Array, ...]:
    """What spots and faculae multiply the depth with, per mode ``(bin,)``; ones for a quiet star."""
    return tuple(_stated(star).factor(view.bins.centre_um) for view in views)


def region_names(star: Star) -> tuple[str, ...]:
    """What is not known exactly of the spots and faculae that a scenario states."""
    return _stated(star).names


def surface_factor(star: Star, widths: Mapping[str, float], wavelength_um: Array) -> Array:
    """What spots and faculae multiply the depth with once they are moved by some prior widths.

    Parameters
    ----------
    star : Star
    widths : mapping of name to float
        Names as in `REGION_NAMES`. Shares of the disc stay between none and all of it.
    wavelength_um : array
    """
    surface = _stated(star)
    for name, width in widths.items():
        surface = surface.moved(name, width)
    return surface.on_the_disc().factor(wavelength_um)


def contaminated(spectrum: BinnedDepth, factor: Array) -> BinnedDepth:
    """A spectrum as it looks with spots and faculae on the star."""
    return BinnedDepth(
        depth_ppm=spectrum.depth_ppm * factor,
        shares_ppm={gas: share * factor for gas, share in spectrum.shares_ppm.items()},
        slopes_ppm={gas: slope * factor for gas, slope in spectrum.slopes_ppm.items()},
    )


def region_directions(star: Star, seen: Sequence[BinnedDepth], views: Sequence[ModeView]) -> list[Direction]:
    """Depth changes for one prior width of what is not known of spots and faculae.

    Parameters
    ----------
    star : Star
    seen : sequence of BinnedDepth
        Per mode, contaminated, without the searched gas.
    """
    surface = _stated(star)
    return [
        Direction(
            name=name,
            per_mode_ppm=tuple(
                part.depth_ppm * _log_slope(surface, name, view.bins.centre_um)
                for part, view in zip(seen, views, strict=True)
            ),
        )
        for name in surface.names
    ]


def mimicry(measurement: Measurement, depth_ppm: Array, star: Star, wavelength_um: Array, transits: float) -> StarMimic:
    """How spots and faculae would pass for the gas, were they not thought of.

    The filter marginalises over everything but them. Where the scenario states none, those usual for such a star are
    tried.

    Parameters
    ----------
    measurement : Measurement
    depth_ppm : (bin,)
        Transit depth in the bins of the measurement.
    star : Star
    wavelength_um : (bin,)
        Their middles.
    transits : float
        Transits that the significance is for.
    """
    stated = bool(star.spots or star.faculae)
    surface = _stated(star) if stated else _usual(star)
    factor = surface.factor(wavelength_um)
    bias = depth_ppm * ((1.0 - 1.0 / factor) if stated else (factor - 1.0))
    blind = measurement.known(*REGION_NAMES)
    sigma = float(matched_filter(blind, transits) @ bias)
    gas, itself = blind.snr(transits), replace(blind, template_ppm=bias).snr(transits)
    part = sigma / gas if gas > 0 else 0.0
    return StarMimic(
        stated=stated,
        serious=abs(sigma) >= _WORTH_A_WORD and abs(part) >= _PART_OF_THE_GAS,
        transits=round(transits),
        sigma=sigma,
        of_the_gas=part,
        alike=sigma / itself if itself > 0 else 0.0,
    )


def mimic_cautions(mimic: StarMimic) -> tuple[str, ...]:
    """A sentence where spots and faculae would feign the gas or hide it."""
    if not mimic.serious:
        return ()
    who = "the star's spots and faculae, were they not thought of,"
    if not mimic.stated:
        who = "spots and faculae such as the star usually has, which the scenario does not state,"
    effect = "feign" if mimic.sigma > 0 else "hide"
    part = abs(mimic.of_the_gas)
    amount = f"{part:.2g} of the gas's own" if part < _FAR_MORE else "far more than the gas's own"
    return (
        f"{who} would {effect} {abs(mimic.sigma):.1f} sigma after {mimic.transits} transits, {amount} "
        f"(shapes alike to {abs(mimic.alike):.2f})",
    )


def usual_caution(star: Star) -> str:
    """What was tried where the scenario is silent, and what to do."""
    usual = _usual(star)
    regions = ", ".join(f"{name} {words}" for name, words in region_words(usual.spots, usual.faculae))
    return (
        f"The scenario states neither spots nor faculae; usual ones ({regions}) would matter to some of the searches: "
        "state [star.spots] and [star.faculae] to allow for them."
    )


def _stated(star: Star) -> _Surface:
    return _Surface(photosphere_k=star.temperature_k, spots=star.spots, faculae=star.faculae)


def _usual(star: Star) -> _Surface:
    kelvin = star.temperature_k
    return _Surface(photosphere_k=kelvin, spots=usual_spots(kelvin), faculae=usual_faculae(kelvin))


def _log_slope(surface: _Surface, name: str, wavelength_um: Array) -> Array:
    """Change of ln(factor) for one prior width; from one side only where the disc has no room on the other."""
    low, high = (step if surface.has_room(name, step) else 0.0 for step in (-_STEP, _STEP))
    if low == high:
        return np.zeros_like(wavelength_um)
    up, down = (surface.moved(name, step).factor(wavelength_um) for step in (high, low))
    return np.asarray(np.log(up / down) / (high - low))
