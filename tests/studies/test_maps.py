"""Maps of the transits over two numbers of a scenario."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import RangeError, ScenarioError
from planner.scenario.surface import SurfaceRegion
from planner.studies.maps import Axis, map_transits
from planner.studies.vary import vary
from planner.studies.workshop import Workshop, see

RATIOS = Axis(name="mixing_ratio", low=1e-7, high=1e-3, steps=5)
CLOUDS = Axis(name="cloud_top", low=1e-3, high=1.0, steps=4)


@pytest.fixture(scope="module")
def mapped(narrow):
    return map_transits(narrow, x=RATIOS, y=CLOUDS)


def test_shapes_and_axes(mapped, narrow):
    """A cell for each pair, x along the last axis; the scenario's own values where they lie on the axes."""
    assert mapped.transits_unrounded.shape == mapped.snr_limit.shape == (4, 5)
    assert mapped.snr_after.shape == (len(mapped.levels), 4, 5)
    np.testing.assert_allclose(mapped.x.values, np.geomspace(1e-7, 1e-3, 5))
    np.testing.assert_allclose(mapped.y.values, np.geomspace(1e-3, 1, 4))
    assert mapped.x.stated == 1e-5
    assert mapped.y.stated == narrow.atmosphere.pressure_bar
    assert mapped.transits_on_offer in mapped.levels


def test_more_gas_and_lower_clouds_need_fewer_transits(mapped):
    """Along both axes, wherever the transits are finite; and beyond the last finite one none comes again."""
    transits = mapped.transits_unrounded
    for along in (transits, transits.T):
        for line in along:
            finite = np.isfinite(line)
            assert np.all(np.diff(line[finite]) < 0)
            assert np.all(np.diff(finite.astype(int)) >= 0)
    assert np.isinf(transits[0, 0])
    assert np.isfinite(transits[-1, -1])


def test_cells_agree_with_the_full_model(mapped, narrow):
    """Transits of two cells, worked out on the full grid, within 2 %."""
    for row, column in ((3, 2), (2, 4)):
        values = {"mixing_ratio": mapped.x.values[column], "cloud_top": mapped.y.values[row]}
        scenario, case = vary(narrow, narrow.cases[0], values)
        full = see(Workshop(scenario), case).measurements[0].transits_for(mapped.snr_wanted)
        assert mapped.transits_unrounded[row, column] == pytest.approx(full, rel=0.02)


def test_contours_and_transits_agree(mapped):
    """A cell's significance after a level's transits is enough exactly where it needs no more of them."""
    for level, snr in zip(mapped.levels, mapped.snr_after, strict=True):
        np.testing.assert_array_equal(snr >= mapped.snr_wanted, mapped.transits_unrounded <= level)
    np.testing.assert_array_equal(np.isinf(mapped.transits_unrounded), mapped.snr_limit <= mapped.snr_wanted)


def test_hotter_and_lighter_need_fewer(narrow):
    """Other parameters go by their names; temperature and mass act through the scale height."""
    mapped = map_transits(
        narrow,
        x=Axis(name="temperature", low=230, high=270, steps=3),
        y=Axis(name="mass", low=0.6, high=1.0, steps=3),
    )
    assert np.all(np.diff(mapped.transits_unrounded, axis=1) < 0)
    assert np.all(np.diff(mapped.transits_unrounded, axis=0) > 0)
    np.testing.assert_allclose(mapped.x.values, [230, 250, 270])
    assert (mapped.x.stated, mapped.y.stated) == (250.0, 0.85)


def test_spots_by_faculae(narrow):
    """Where the star is said to have them, their shares can be axes; cells agree with the full model."""
    star = narrow.star.model_copy(update={"given_spots": SurfaceRegion(), "given_faculae": SurfaceRegion()})
    spotted = narrow.model_copy(update={"star": star})
    spots, faculae = (Axis(name=name, low=0.05, high=0.45, steps=3) for name in ("spots", "faculae"))
    mapped = map_transits(spotted, x=spots, y=faculae)
    assert (mapped.x.stated, mapped.y.stated) == (star.spots.fraction, None)
    scenario, case = vary(spotted, spotted.cases[0], {"spots": 0.45, "faculae": 0.05})
    full = see(Workshop(scenario), case).measurements[0]
    assert mapped.snr_one_transit[0, 2] == pytest.approx(full.snr(1), rel=0.02)
    assert mapped.nuisances[-2][0] == "spots"


def test_levels_keep_apart_from_those_on_offer(narrow):
    """A contour next to that of the transits on offer is left out."""
    few = narrow.model_copy(update={"goal": narrow.goal.model_copy(update={"transits_available": 28})})
    small = Axis(name="mixing_ratio", low=1e-6, high=1e-5, steps=2)
    levels = map_transits(few, x=small, y=Axis(name="CO", low=1e-6, high=1e-5, steps=2)).levels
    assert 28 in levels
    assert 30 not in levels
    assert {10, 100} < set(levels)


@pytest.mark.parametrize(
    ("arguments", "error", "message"),
    [
        ({"gas": "CH4"}, ScenarioError, "expected one of N2O for the gas of a map, got CH4"),
        ({"mode": "none"}, ScenarioError, "expected one of the scenario's modes grism-4-to-5-um, got none"),
        ({"x": Axis(name="colour", low=1, high=2)}, ScenarioError, "expected one of mixing_ratio, .* CO, got colour"),
        ({"x": Axis(name="CO", low=1e-6, high=1e-7)}, RangeError, "axis CO: expected 0 < from < to"),
        ({"x": Axis(name="mass", low=1, high=2, steps=1)}, RangeError, "at least 2 steps"),
        ({"x": Axis(name="mixing_ratio", low=0.1, high=1.0)}, RangeError, "mixing ratios up to 0.9"),
        ({"x": Axis(name="spots", low=0.1, high=0.2)}, ScenarioError, "star_radius, CO, got spots"),
        ({"x": CLOUDS, "y": CLOUDS}, ScenarioError, "got cloud_top twice"),
    ],
)
def test_maps_that_cannot_be(narrow, arguments, error, message):
    """Refused before anything is computed, with what would do."""
    with pytest.raises(error, match=message):
        map_transits(narrow, **arguments)
