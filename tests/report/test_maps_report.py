"""A map as figure and table."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.colors import to_rgb

from planner.report.maps import _shade, map_figure, map_table
from planner.studies.outcomes import MapAxis, MapResult

LEVELS = (1, 3, 10, 30, 100, 300, 1000)


@pytest.fixture
def result():
    """Significance as a power of the mixing ratio that clouds press down, over a floor."""
    ratios, tops = np.geomspace(1e-8, 1e-2, 9), np.geomspace(1e-4, 1, 7)
    one = 3e3 * (ratios * tops[:, np.newaxis]) ** 0.6
    limit = 12 * one
    after = np.array([1 / np.sqrt(1 / (n * one**2) + 1 / limit**2) for n in LEVELS])
    with np.errstate(divide="ignore", invalid="ignore"):
        transits = np.where(limit > 5, 1 / (one**2 * (1 / 25 - 1 / limit**2)), np.inf)
    return MapResult(
        title="Made up",
        invented=True,
        gas="CH4",
        mode="prism",
        x=MapAxis(
            name="mixing_ratio", label="mixing ratio of CH4", unit="", logarithmic=True, values=ratios, stated=1e-5
        ),
        y=MapAxis(name="cloud_top", label="cloud-top pressure", unit="bar", logarithmic=True, values=tops, stated=1.0),
        threshold_sigma=5.0,
        power=0.5,
        transits_on_offer=100,
        charged_hours_per_transit=3.4,
        transits_unrounded=transits,
        snr_limit=limit,
        snr_one_transit=one,
        levels=LEVELS,
        snr_wanted=5.0,
        snr_after=after,
        line_data=(),
        assumptions=(),
        nuisances=(("radius", "5 %"),),
        cautions=(),
        version="0.1.0",
    )


def texts_of(axes):
    return [text.get_text() for text in axes.texts]


def test_table(result):
    """A row per cell, x fastest, whole transits never below one, infinite where none suffices."""
    table = map_table(result)
    assert len(table) == 63
    np.testing.assert_allclose(table["mixing_ratio"][:9], result.x.values)
    assert np.all(table["cloud_top"][:9] == result.y.values[0])
    assert table["transits_required"].min() >= 1
    np.testing.assert_array_equal(np.isinf(table["transits_required"]), np.isinf(result.transits_unrounded.ravel()))
    assert table.meta["mode"] == "prism"


def test_axes_of_the_figure(result):
    """Logarithmic; pressure falls upwards; names with units."""
    (axes,) = map_figure(result).axes
    assert axes.get_xscale() == axes.get_yscale() == "log"
    assert axes.get_ylim() == pytest.approx((1.0, 1e-4))
    assert axes.get_xlim() == pytest.approx((1e-8, 1e-2))
    assert axes.get_xlabel() == "Mixing ratio of CH₄"
    assert axes.get_ylabel() == "Cloud-top pressure (bar)"


def test_contours_carry_their_numbers(result):
    """At least the wider spaced ones, that of the transits on offer among them, and bold; the rest is in the key."""
    figure = map_figure(result)
    labels = {text.get_text(): text for text in figure.axes[0].texts}
    assert {"10", "100"} <= set(labels)
    assert labels["100"].get_fontweight() == "bold"
    assert labels["10"].get_fontweight() == "normal"


def test_contours_stand_where_the_transits_say(result):
    """The label of 10 lies where the map needs ten transits, as the model that the cells were made from says."""
    (axes,) = map_figure(result).axes
    (label,) = [text for text in axes.texts if text.get_text() == "10"]
    ratio, top = label.get_position()
    one = 3e3 * (ratio * top) ** 0.6
    assert 1 / np.sqrt(1 / (10 * one**2) + 1 / (12 * one) ** 2) == pytest.approx(5.0, rel=0.03)


def test_unreachable_is_hatched_and_labelled(result):
    """The region says what it is; a map without one does not."""
    (axes,) = map_figure(result).axes
    assert "out of reach" in texts_of(axes)
    assert any(patch.get_hatch() for patch in axes.patches)
    (label,) = [text for text in axes.texts if text.get_text() == "out of reach"]
    assert 12 * 3e3 * np.prod(label.get_position()) ** 0.6 < 5
    easy = replace(result, snr_limit=np.full_like(result.snr_limit, 50.0), snr_after=result.snr_after + 20)
    assert "out of reach" not in texts_of(map_figure(easy).axes[0])


def test_star_only_where_the_scenario_lies_on_the_map(result):
    """One marker at the scenario's values; none when one of them is off the axes."""
    (axes,) = map_figure(result).axes
    assert [line.get_xydata().tolist() for line in axes.lines] == [[[1e-5, 1.0]]]
    away = replace(result, x=replace(result.x, stated=None))
    assert not map_figure(away).axes[0].lines


def test_shades_darken_with_the_transits(result):
    """In grey as well: luminance falls by a visible step from each class to the next."""
    luminance = [np.dot([0.299, 0.587, 0.114], to_rgb(_shade(k, result))) for k in range(len(LEVELS) + 1)]
    assert np.all(np.diff(luminance) < -0.03)


@pytest.mark.parametrize("steps", [2, 3])
def test_small_maps(result, steps):
    """Two steps make a map as well."""
    small = replace(
        result,
        x=replace(result.x, values=result.x.values[:: 8 // (steps - 1)]),
        snr_limit=result.snr_limit[:, :: 8 // (steps - 1)],
        snr_after=result.snr_after[:, :, :: 8 // (steps - 1)],
    )
    assert len(map_figure(small).axes) == 1
