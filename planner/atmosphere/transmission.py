"""Transit depth of a column of air, with every gas's share of it and its slope, in one pass over the chords."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.absorbers import GasOpacity, PairOpacity, check_opacities
from planner.atmosphere.chords import Chords, chords_through, row_weights
from planner.atmosphere.extent import bottom_e_folds, top_e_folds
from planner.atmosphere.layers import Air

__all__ = ["TransitDepth", "transit_depth"]

_BLOCK = 512
"""Most wavenumbers per block: its arrays fit a core's caches."""
_BLOCKS_PER_THREAD = 8
"""Fewer are done sooner than another thread is started."""
_LOG2_OF_10 = math.log2(10.0)


@dataclass(frozen=True, kw_only=True, eq=False)
class TransitDepth:
    """Transit depth as a fraction of the star's light; all arrays ``(wavenumber,)``.

    Attributes
    ----------
    depth
    depth_without : by formula
        Depth with that gas's own absorption, its Rayleigh scattering and its pairs set to zero, while pressure, mean
        molar mass and everything else stay. Of a pair with "every other gas" that gas's part goes.
    derivative : by formula
        d depth / d ln(mixing ratio) with pressure, molar mass and all other mixing ratios held.
    bottom_transmission
        Light left along the chord that touches the bottom of the clear column. Where it is not small the surface
        shows, or, without a surface, the answer depends on where the column was ended.
    """

    depth: NDArray[np.float64]
    depth_without: Mapping[str, NDArray[np.float64]]
    derivative: Mapping[str, NDArray[np.float64]]
    bottom_transmission: NDArray[np.float64]


def transit_depth(
    air: Air,
    gases: Sequence[GasOpacity],
    pairs: Sequence[PairOpacity],
    *,
    wavenumber_per_cm: NDArray[np.float64],
    star_radius_km: float,
    shares_of: Sequence[str] = (),
) -> TransitDepth:
    """Depth of a transit by a planet with this air.

    ``depth = (R_bottom^2 + 2 ∫ b (1 - exp(-tau(b))) db) / R_star^2``  (Brown 2001, ApJ 553, 1006, from memory).

    The layers reach from the bottom (surface, refraction boundary, or the deepest tabulated pressure) to where every
    wavenumber's chord optical depth is below 1e-3. Heights are accurate to about 1e-3 scale heights for given
    cross-sections, and to 5e-3 with three tabulated pressures per decade; see `planner.atmosphere.chords`.

    Parameters
    ----------
    air : Air
    gases : sequence of GasOpacity
        One per formula, each named in ``air.mixing_ratios``. Gases of the air that are not listed are transparent.
    pairs : sequence of PairOpacity
        Pairs with a gas that is not in the air contribute nothing.
    wavenumber_per_cm : (wavenumber,)
        In any order: samples do not see each other.
    star_radius_km : float
    shares_of : sequence of str
        Formulas for which `depth_without` and `derivative` are computed; the cost grows with their number.

    Raises
    ------
    RangeError
        If a table does not reach down to the bottom, or if the air is too extended to be bound.
    """
    wavenumber = np.asarray(wavenumber_per_cm, dtype=np.float64)
    shares = list(shares_of)
    check_opacities(air, gases, pairs, wavenumber, shares)
    smooth = _smooth_opacity(air, gases, shares, wavenumber)
    paired = _pair_opacity(air, pairs, shares, wavenumber)
    bottom = bottom_e_folds(air, gases)
    top = top_e_folds(
        air,
        gases,
        bottom=bottom,
        flat_cross_section_cm2=float(smooth.sum(axis=0).max()),
        pair_coefficient_cm5=float(paired[0].max()),
    )
    chords = chords_through(air, bottom=bottom, top=top)
    areas = _one_pass(air, gases, chords, smooth, paired, shares)
    depth = (chords.opaque_area_km2 + areas[0]) / star_radius_km**2
    lost = areas[2 : 2 + len(shares)] / star_radius_km**2
    slopes = areas[2 + len(shares) :] / star_radius_km**2
    return TransitDepth(
        depth=depth,
        depth_without={formula: depth - lost[i] for i, formula in enumerate(shares)},
        derivative={formula: slopes[i] for i, formula in enumerate(shares)},
        bottom_transmission=areas[1],
    )


def _smooth_opacity(
    air: Air, gases: Sequence[GasOpacity], shares: list[str], wavenumber: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Pressure-independent cross-section per molecule of air, ``(1 + S, wavenumber)``: of the rest, of each gas."""
    cross_section = np.zeros((1 + len(shares), wavenumber.size))
    cross_section[0] = air.haze_cross_section_cm2(wavenumber)
    for gas in gases:
        if gas.flat_cross_section_cm2 is not None:
            cross_section[_row(gas, shares)] += air.mixing_ratios[gas.formula] * gas.flat_cross_section_cm2
    return cross_section


def _pair_opacity(
    air: Air, pairs: Sequence[PairOpacity], shares: list[str], wavenumber: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Coefficient per squared density of air, ``(1 + 2 S, wavenumber)``: all pairs, without each gas, derivatives."""
    factors = np.zeros((1 + 2 * len(shares), len(pairs)))
    for j, pair in enumerate(pairs):
        factors[:, j] = _pair_factors(air.mixing_ratios, pair, shares)
    if not pairs:
        return np.zeros((factors.shape[0], wavenumber.size))
    return factors @ np.stack([pair.coefficient_cm5 for pair in pairs])


def _pair_factors(ratios: Mapping[str, float], pair: PairOpacity, shares: list[str]) -> list[float]:
    """Product of the mixing ratios; what is left of it without each gas; its derivative by each logarithm."""
    partners = [f for f in ratios if f != pair.first] if pair.second == "*" else [pair.second]
    products = {f: ratios.get(pair.first, 0.0) * ratios.get(f, 0.0) for f in partners}
    whole = math.fsum(products.values())
    left, slopes = [], []
    for formula in shares:
        if formula == pair.first:
            left.append(0.0)
            slopes.append(whole + products.get(formula, 0.0))
        else:
            left.append(math.fsum(product for f, product in products.items() if f != formula))
            slopes.append(products.get(formula, 0.0))
    return [whole, *left, *slopes]


def _row(gas: GasOpacity, shares: list[str]) -> int:
    """Where a gas is summed: with the rest (0), or by itself."""
    return 1 + shares.index(gas.formula) if gas.formula in shares else 0


def _one_pass(
    air: Air,
    gases: Sequence[GasOpacity],
    chords: Chords,
    smooth: NDArray[np.float64],
    paired: NDArray[np.float64],
    shares: list[str],
) -> NDArray[np.float64]:
    """Run the compiled loops block by block: ``(2 + 2 S, wavenumber)`` in km2, as `integrate_chords` says."""
    # imported here so that whoever only needs the records does not wait for the compiler
    from numba import config

    from planner.atmosphere.kernels import exp2_in_place, integrate_chords, slant_depths

    columns, squared = chords.columns_per_cm2(), chords.squared_columns_per_cm5()
    profile = np.stack([columns / columns[0], squared / squared[0], chords.area_weight_km2]).astype(np.float32)
    size = smooth.shape[1]
    blocks = math.ceil(size / _BLOCK)
    width = math.ceil(size / blocks)
    smooth_depth, pair_depth = _in_blocks(columns[0] * smooth, width), _in_blocks(squared[0] * paired, width)
    # gases mostly share their pressures, and the weights are the dearest part when the wavenumbers are few
    rows = {gas.pressures_bar.tobytes(): gas.pressures_bar for gas in gases if gas.log10_cross_section is not None}
    weights = {key: row_weights(chords, pressures) for key, pressures in rows.items()}
    tables = [
        (_row(gas, shares), gas.log10_cross_section, *_padded(ratio * weights[gas.pressures_bar.tobytes()]))
        for gas in gases
        if gas.log10_cross_section is not None and (ratio := air.mixing_ratios[gas.formula]) > 0
    ]
    result = np.zeros((blocks, 2 + 2 * len(shares), width), dtype=np.float32)

    def work(mine: range) -> None:
        depths = np.empty((1 + len(shares), columns.size, width), dtype=np.float32)
        light = np.empty((1 + len(shares), width), dtype=np.float32)
        most_rows = max((padded.shape[1] for _, _, padded, _ in tables), default=0)
        cross_section = np.zeros((most_rows, width), dtype=np.float32)
        for block in mine:
            depths[:] = 0
            for row, table, padded, rows_seen in tables:
                some = table[: rows_seen[0], block * width : (block + 1) * width]  # the first chord sees most
                cross_section[: some.shape[0], : some.shape[1]] = some
                exp2_in_place(cross_section[: some.shape[0]].reshape(-1), _LOG2_OF_10)
                slant_depths(cross_section, padded, rows_seen, depths[row])
            integrate_chords(depths, smooth_depth[block], pair_depth[block], profile, light, result[block])

    threads = min(config.NUMBA_NUM_THREADS, blocks // _BLOCKS_PER_THREAD)
    if threads <= 1:
        work(range(blocks))
    else:
        with ThreadPoolExecutor(threads) as pool:
            list(pool.map(work, (range(i, blocks, threads) for i in range(threads))))
    return result.swapaxes(0, 1).reshape(result.shape[1], -1)[:, :size].astype(np.float64)


def _in_blocks(values: NDArray[np.float64], width: int) -> NDArray[np.float32]:
    """Rows ``(row, wavenumber)`` cut into blocks ``(block, row, width)``, the last filled up with zeros."""
    blocks = math.ceil(values.shape[1] / width)
    filled = np.zeros((values.shape[0], blocks * width), dtype=np.float32)
    filled[:, : values.shape[1]] = values
    return np.ascontiguousarray(filled.reshape(values.shape[0], blocks, width).swapaxes(0, 1))


def _padded(weights: NDArray[np.float64]) -> tuple[NDArray[np.float32], NDArray[np.int64]]:
    """Row weights as `slant_depths` wants them: rows padded to a multiple of four, and how many each chord sees."""
    padded = np.zeros((weights.shape[0], -(-weights.shape[1] // 4) * 4), dtype=np.float32)
    padded[:, : weights.shape[1]] = weights
    seen = padded.shape[1] - np.argmax(padded[:, ::-1] != 0, axis=1)
    return padded, -(-seen // 4) * 4
