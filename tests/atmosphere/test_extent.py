"""Where the column begins and ends."""

from __future__ import annotations

import numpy as np
import pytest

from planner.atmosphere.absorbers import GasOpacity
from planner.atmosphere.chords import chords_through, row_weights
from planner.atmosphere.extent import bottom_e_folds, top_e_folds

ROWS = 10.0 ** np.linspace(-6, 1, 22)


def gas(peak, rows=ROWS):
    """A line core that is Doppler-limited below 0.01 bar, and next to nothing elsewhere."""
    core = peak / np.sqrt(1 + (rows / 0.01) ** 2)
    table = np.log10(np.stack([core, np.full(rows.size, 1e-35)], axis=1))
    return GasOpacity(formula="X", pressures_bar=rows, log10_cross_section=table, flat_cross_section_cm2=None)


def top(air, gases, flat=0.0, pair=0.0):
    return top_e_folds(air, gases, bottom=0.0, flat_cross_section_cm2=flat, pair_coefficient_cm5=pair)


@pytest.mark.parametrize("peak", [1e-24, 1e-20, 1e-15])
def test_thin_above_the_top(make_air, peak):
    """At the top, and not half an e-fold below it, the chord optical depth of the strongest sample is under 1e-3."""
    air = make_air(mixing_ratios={"X": 1.0})
    end = top(air, [gas(peak)])
    chords = chords_through(air, bottom=end - 0.5, top=end + 2)
    depth = row_weights(chords, ROWS) @ 10.0 ** gas(peak).log10_cross_section[:, 0]
    at_end = np.interp(end, chords.e_folds, np.log(depth))
    assert at_end < np.log(1e-3)
    assert depth[0] > 1e-3
    if peak == 1e-15:
        assert air.base_pressure_bar * np.exp(-end) < 1e-10


def test_every_kind_of_absorber_raises_the_top(make_air):
    """Tables, smooth cross-sections and pairs all count; a gas of mixing ratio zero does not."""
    air = make_air()
    assert top(air, []) == 0.0
    assert top(air, [gas(1e-20)]) > 10
    assert top(air, [], flat=1e-20) == pytest.approx(top(air, [], flat=1e-21) + np.log(10), abs=0.3)
    assert top(air, [], pair=1e-40) == pytest.approx(top(air, [], pair=1e-42) + np.log(10), abs=0.3)
    absent = make_air(mixing_ratios={"N2": 1.0, "X": 0.0})
    assert top(absent, [gas(1e-15)]) == 0.0


def test_top_within_a_wide_cell(make_air):
    """Between two rows the larger counts: thin at both ends, thick in between."""
    rows = np.array([1e-6, 1.0])
    table = np.array([[-24.5], [-32.0]])
    wide = GasOpacity(formula="X", pressures_bar=rows, log10_cross_section=table, flat_cross_section_cm2=None)
    air = make_air(mixing_ratios={"X": 1.0})
    column = chords_through(air, bottom=0.0, top=2.0).columns_per_cm2()[0]
    assert column * 10.0**-32 < 1e-3
    assert column * 10.0**-24.5 * 1e-6 < 1e-3
    assert top(air, [wide]) == pytest.approx(np.log(column * 10.0**-24.5 / 1e-3), abs=0.5)


def test_bottom(make_air):
    """Surface, refraction boundary, closed deck: the highest of them; patchy clouds do not close the column."""
    assert bottom_e_folds(make_air(), [gas(1e-20)]) == 0.0
    assert bottom_e_folds(make_air(critical_radius_km=5880.0), []) == pytest.approx(
        make_air().e_folds_at_radius(5880.0)
    )
    assert bottom_e_folds(make_air(critical_radius_km=5000.0), []) == 0.0
    assert bottom_e_folds(make_air(cloud_top_bar=0.01), []) == pytest.approx(np.log(100))
    assert bottom_e_folds(make_air(cloud_top_bar=0.01, cloud_fraction=0.99), []) == 0.0


def test_bottom_without_a_surface(make_air):
    """The column goes on to the end of the shortest table, or to 10 bar, and never ends above its base."""
    air = make_air(surface=False)
    assert bottom_e_folds(air, [gas(1e-20)]) == pytest.approx(-np.log(10))
    assert bottom_e_folds(air, [gas(1e-20, ROWS[:-1])]) == pytest.approx(-np.log(ROWS[-2]))
    assert bottom_e_folds(air, []) == pytest.approx(-np.log(10))
    assert bottom_e_folds(make_air(surface=False, base_pressure_bar=50.0), []) == 0.0
