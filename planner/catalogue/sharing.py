"""Which gases absorb where another does: the default rivals of a search.

Sharing is worked out from the bands in the records, so it holds both ways. Each band is a box in ln(wavelength) whose
height is its weight; two bands are alike as the cosine of their boxes, which is what a matched filter sees of one in
the other. What a rival really costs is for a study to compute.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import lru_cache
from math import log, log10, sqrt

from planner.catalogue.read import find_gas, has_gas, read_catalogue
from planner.catalogue.records import Band, BandGroup, GasRecord

__all__ = ["SharedBand", "likeness", "rivals_among", "shared_bands", "sharing_bands"]

_DECADES = 3.0
"""A band this many decades weaker than the gas's strongest weighs nothing. Depths grow with the logarithm of the
cross-section, so weights fall evenly with it. Judgement."""
_SHORT_UM = 0.5
"""Bands that begin below do not count as the strongest: no mode of this tool sees them."""
_LEAST_OVERLAP = 0.01
"""In ln(wavelength): one element of R = 100, the narrowest that the default bins can see."""
_LEAST_ALIKE = 0.3
"""Bands less alike than this do not count as shared. Judgement."""


@dataclass(frozen=True, kw_only=True)
class SharedBand:
    """A stretch where two gases absorb alike.

    Attributes
    ----------
    gas : str
        Formula of the other gas.
    from_um, to_um : float
    own, other : str
        Names of the bands.
    alike : float
        Cosine of the weighted boxes, 0 to 1.
    """

    gas: str
    from_um: float
    to_um: float
    own: str
    other: str
    alike: float


def sharing_bands(name: str) -> tuple[str, ...]:
    """Formulas of the catalogue's gases that share a band with this one, the most alike over all bands first.

    Gases of industry count as rivals of gases of industry only: nobody expects one where something else is searched.
    Empty for a gas that the catalogue does not hold.

    Parameters
    ----------
    name : str
        Formula or common name.

    Raises
    ------
    LineDataError
        If no molecule goes by this name.
    """
    return rivals_among(find_gas(name), read_catalogue()) if has_gas(name) else ()


def rivals_among(gas: GasRecord, catalogue: Mapping[str, GasRecord]) -> tuple[str, ...]:
    """As `sharing_bands`, for a record and the gases of a catalogue by formula."""
    others = [o for o in catalogue.values() if o.gas_class != "industrial" or gas.gas_class == "industrial"]
    sharing = {shared.gas for shared in shared_bands(gas, others)}
    return tuple(sorted(sharing, key=lambda other: (-likeness(gas, catalogue[other]), other)))


def shared_bands(gas: GasRecord, others: Iterable[GasRecord]) -> tuple[SharedBand, ...]:
    """Every stretch of at least one element of R = 100 where a band of ``gas`` is like one of another gas.

    In the order of ``others``, then by wavelength.
    """
    own = _weights(gas)
    return tuple(
        SharedBand(
            gas=other.formula,
            from_um=max(a.from_um, b.from_um),
            to_um=min(a.to_um, b.to_um),
            own=a.name,
            other=b.name,
            alike=alike,
        )
        for other in others
        if other.formula != gas.formula
        for a, weight in own.items()
        for b, other_weight in _weights(other).items()
        if (alike := weight * other_weight * _overlap(a, b) / sqrt(_length(a) * _length(b))) >= _LEAST_ALIKE
    )


def likeness(gas: GasRecord, other: GasRecord) -> float:
    """Cosine of the weighted boxes of two gases over all their bands, 0 (nothing shared) to 1.

    A band weighs ``1 - log10(strongest mean cross-section of its gas / its own) / 3``, from 0 to 1.
    """
    own, theirs = _weights(gas), _weights(other)
    common = sum(v * w * _overlap(a, b) for a, v in own.items() for b, w in theirs.items())
    return common / sqrt(_power(own) * _power(theirs))


def _weights(gas: GasRecord) -> Mapping[Band, float]:
    return _weights_of(gas.band_groups)


@lru_cache(maxsize=256)
def _weights_of(groups: tuple[BandGroup, ...]) -> Mapping[Band, float]:
    bands = sorted((band for group in groups for band in group.bands), key=lambda band: band.from_um)
    mean = {band: band.mean_cross_section_cm2 for band in bands}
    seen = [mean[band] for band in bands if band.from_um >= _SHORT_UM] or list(mean.values())
    weights = {band: 1 - log10(max(seen) / mean[band]) / _DECADES for band in bands}
    return {band: min(weight, 1.0) for band, weight in weights.items() if weight > 0}


def _power(weights: Mapping[Band, float]) -> float:
    return sum(weight**2 * _length(band) for band, weight in weights.items())


def _length(band: Band) -> float:
    return log(band.to_um / band.from_um)


def _overlap(a: Band, b: Band) -> float:
    """Length of the common stretch in ln(wavelength); 0 when it is narrower than one element of R = 100."""
    low, high = max(a.from_um, b.from_um), min(a.to_um, b.to_um)
    length = log(high / low) if high > low else 0.0
    return length if length >= _LEAST_OVERLAP else 0.0
