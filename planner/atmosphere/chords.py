"""Straight rays through the column: where they pass, what they gather, and how their dimming adds up.

Two integrals make a transit depth. Along a chord that touches the radius b, the optical depth of one gas is

    tau(b) = 2 ∫ n(r) sigma(r) dx,        x = sqrt(r^2 - b^2),

and over the chords the effective area is  R_bottom^2 + 2 ∫ b (1 - exp(-tau(b))) db.  Both become sums here: the
first over the pressures at which cross-sections are tabulated, with weights that do not depend on wavenumber.

**Along the chord.** With u the e-folds of pressure and u = u_b + s^2, the path x is smooth in s even at the
tangent point, because 1/b - 1/r = (u - u_b) H0 / R0^2 holds exactly:

    dx/ds = 2 r^3 sqrt(H0) / (R0 sqrt(r b (r + b))),

and the integrand is a Gaussian in s, for which equal steps converge exponentially.

**Between tabulated pressures** cross-sections are interpolated through the four rows around by the combination of
1, P, 1/P and ln P: exact for a Doppler core (constant), for a Lorentz wing (grows as P), for the core of a
pressure-broadened line (falls as 1/P), and for any sum of such lines, which a straight line in the logarithm is
not. The interpolation is linear in the cross-section, so the chord integral contracts onto the rows.

**Across the chords** Gauss-Legendre panels in u, cut at the bottom and at the cloud top so that no panel spans a
jump; above the top the optical depth is small and falls as the pressure, and its rest is added in closed form.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.layers import Air

__all__ = ["Chords", "chords_through", "height_rule", "row_weights"]

_PANEL_E_FOLDS = 2.0
_GAUSS = np.polynomial.legendre.leggauss(6)
# 16 e-folds above the tangent point the density is 1e-7 of that below
_REACH_E_FOLDS = 16.0
_STEPS_ALONG_CHORD = 80
# Beyond this part of the way to infinity, in e-folds, the column is cut off; the radius is then tenfold.
_CUT_OF_INFINITY = 0.9
# Rows further apart than this (in ln P) are joined by a straight line in P: four-row weights would overshoot.
_WIDE_GAP = 1.3


@dataclass(frozen=True, kw_only=True, eq=False)
class Chords:
    """Rays through one column.

    Attributes
    ----------
    e_folds : (chord,)
        Where each ray touches, ascending; the first touches the bottom of the clear column.
    area_weight_km2 : (chord,)
        ``effective area / pi = opaque_area_km2 + sum(area_weight_km2 * (1 - exp(-tau)))``; 0 for the first.
    opaque_area_km2 : float
        Square of the bottom radius, averaged over the clear and the covered part.
    ln_pressure_bar : (chord, point)
        Points along each half chord, from the tangent point outwards.
    column_per_cm2 : (chord, point)
        Molecules per cm2 that each point stands for, both halves of the chord together.
    density_per_cm3 : (chord, point)
        Number density at each point.
    """

    e_folds: NDArray[np.float64]
    area_weight_km2: NDArray[np.float64]
    opaque_area_km2: float
    ln_pressure_bar: NDArray[np.float64]
    column_per_cm2: NDArray[np.float64]
    density_per_cm3: NDArray[np.float64]

    def columns_per_cm2(self) -> NDArray[np.float64]:
        """Column along each chord, ``(chord,)``: the weight of a cross-section that does not vary."""
        return self.column_per_cm2.sum(axis=1)

    def squared_columns_per_cm5(self) -> NDArray[np.float64]:
        """Integral of the squared density along each chord, ``(chord,)``: the weight of a pair coefficient."""
        return (self.column_per_cm2 * self.density_per_cm3).sum(axis=1)


def height_rule(bottom: float, top: float) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Nodes and weights for an integral over e-folds from `bottom` to `top`, each ``(node,)``.

    Panels of at most two e-folds with six Gauss-Legendre nodes: 1 - exp(-exp(-n u)) is then integrated to
    1e-5 (n = 1) and 3e-4 (n = 2, absorption that grows with density), in e-folds, wherever the bottom cuts it.
    """
    panels = max(1, math.ceil((top - bottom) / _PANEL_E_FOLDS - 1e-9))
    edges = np.linspace(bottom, top, panels + 1)
    x, weight = _GAUSS
    half = np.diff(edges)[:, None] / 2
    return (edges[:-1, None] + half * (1 + x)).ravel(), (half * weight).ravel()


def chords_through(air: Air, *, bottom: float, top: float) -> Chords:
    """Rays that touch the column between two heights, given in e-folds above the base.

    The part of the limb under a cloud deck starts at the cloud top; the two parts share the rays above it.
    `top` is moved up to a whole number of panels above the cloud top.

    Raises
    ------
    RangeError
        If that is too high for air that a planet could hold.
    """
    covered = air.cloud_fraction if air.cloud_top_bar is not None else 0.0
    deck = max(bottom, air.e_folds_at_pressure(air.cloud_top_bar)) if air.cloud_top_bar is not None else bottom
    if covered == 1.0:
        bottom = deck
    # whole panels, so that the rays, and with them the errors, stay where they are when only an amount changes
    top = deck + _PANEL_E_FOLDS * max(1, math.ceil((top - deck) / _PANEL_E_FOLDS))
    air.check_held(top)
    pieces = [(np.array([bottom]), np.array([0.0]))]
    if bottom < deck:
        nodes, weights = height_rule(bottom, deck)
        pieces.append((nodes, (1 - covered) * weights))
    nodes, weights = height_rule(deck, top)
    weights[-1] += _all_above(air, nodes[-1], top)
    pieces.append((nodes, weights))
    e_folds = np.concatenate([piece[0] for piece in pieces])
    radius = air.radius_km(e_folds)
    # 2 b db = 2 b (db/du) du, with dr/du the local scale height
    area = 2 * radius**3 * air.scale_height_km / air.base_radius_km**2
    below, above = air.radius_km(np.array([bottom, deck])) ** 2
    return Chords(
        e_folds=e_folds,
        area_weight_km2=area * np.concatenate([piece[1] for piece in pieces]),
        opaque_area_km2=float((1 - covered) * below + covered * above),
        **_points_along(air, e_folds),
    )


def _all_above(air: Air, last: float, top: float) -> float:
    """Weight, on the last ray, of everything above `top`, where the optical depth is small.

    There tau times the area of a ring goes as density times r^(3/2) times r^3, which falls by
    ``1 - 4.5 H(r)/r`` per e-fold. Bound from below: where that matters no planet would hold its air.
    """
    rate = max(0.25, 1 - 4.5 * float(air.radius_km(top)) / (air.base_radius_km * air.e_folds_to_infinity))
    return math.exp(rate * (last - top)) / rate


def _points_along(air: Air, tangent: NDArray[np.float64]) -> dict[str, NDArray[np.float64]]:
    """The point arrays of `Chords`, by equal steps of s = sqrt(e-folds above the tangent point)."""
    reach = np.minimum(_REACH_E_FOLDS, _CUT_OF_INFINITY * air.e_folds_to_infinity - tangent)[:, None]
    fraction = np.linspace(0.0, 1.0, _STEPS_ALONG_CHORD + 1)
    u = tangent[:, None] + reach * fraction**2
    weight = np.sqrt(reach) / _STEPS_ALONG_CHORD * np.where((fraction == 0) | (fraction == 1), 0.5, 1.0)
    r, b = air.radius_km(u), air.radius_km(tangent)[:, None]
    path_km = 2 * r**3 * math.sqrt(air.scale_height_km) / (air.base_radius_km * np.sqrt(r * b * (r + b)))
    density = air.base_density_per_cm3 * np.exp(-u)
    return {
        "ln_pressure_bar": math.log(air.base_pressure_bar) - u,
        "column_per_cm2": 2 * density * path_km * 1e5 * weight,
        "density_per_cm3": density,
    }


def row_weights(chords: Chords, pressures_bar: NDArray[np.float64]) -> NDArray[np.float64]:
    """Weights ``(chord, pressure)`` in cm-2 such that ``tau = weights @ cross_section`` per molecule of air.

    Below the lowest tabulated pressure its row holds. `pressures_bar` ascends; pressures above the highest are
    the caller's to refuse.
    """
    ln_rows = np.log(pressures_bar)
    shares = _row_shares(tuple(ln_rows))
    chord_count, cells, width = chords.ln_pressure_bar.shape[0], *shares.shape[:2]
    ln_p = np.clip(chords.ln_pressure_bar, ln_rows[0], ln_rows[-1])
    cell = np.clip(np.searchsorted(ln_rows, ln_p, side="right") - 1, 0, cells - 1)
    # columns are summed within the cells first, one sum for each function of the basis: far fewer numbers to spread
    place = (np.arange(chord_count)[:, None] * cells + cell).ravel()
    sums = np.empty((chord_count * cells, width))
    for b, function in enumerate(_basis(ln_p - ln_rows[cell], width)):
        sums[:, b] = np.bincount(place, (chords.column_per_cm2 * function).ravel(), minlength=len(sums))
    return sums.reshape(chord_count, -1) @ shares.reshape(cells * width, -1)


@lru_cache(maxsize=8)
def _row_shares(ln_rows: tuple[float, ...]) -> NDArray[np.float64]:
    """Share of each row in the interpolation, per cell between rows and function of the basis, (cell, basis, row)."""
    at = np.array(ln_rows)
    rows, width = at.size, min(4, at.size)
    cells = np.arange(max(rows - 1, 1))
    starts = np.clip(cells - 1, 0, rows - width)
    offsets = at[starts[:, None] + np.arange(width)] - at[cells, None]
    four = np.linalg.inv(np.stack(_basis(offsets, width), axis=-1))
    shares = np.zeros((cells.size, width, rows))
    for k, start in enumerate(starts):
        if width > 2 and at[k + 1] - at[k] > _WIDE_GAP:
            two = slice(k - start, k - start + 2)
            shares[k, :2, k : k + 2] = np.linalg.inv(np.stack(_basis(offsets[k, two], 2), axis=-1))
        else:
            shares[k, :, start : start + width] = four[k]
    return shares


def _basis(offset: NDArray[np.float64], width: int) -> tuple[NDArray[np.float64], ...]:
    """1, P, 1/P and ln P, the first `width` of them, relative to the pressure where `offset` is 0."""
    pressure = np.exp(offset)
    return (np.ones_like(offset), pressure, 1 / pressure, offset)[:width]
