"""Limits as tables, JSON, text and figure."""

from __future__ import annotations

import io
import json
import math

import numpy as np
import pytest
from matplotlib.figure import Figure
from rich.console import Console

from planner.report import limits as module
from planner.report.limitfigure import limit_figure
from planner.report.limits import growth_table, limit_json, limit_table
from planner.report.limitview import limit_view
from planner.studies.outcomes import LimitCurve, LimitPoint, LimitResult, Obstacle


def curve(gas, mode, *, detectable=(None, 2e-6, 4e-7), obstacle=None):
    ratios = np.geomspace(1e-9, 1e-2, 15)
    snr = 1e4 * ratios**0.5
    points = tuple(
        LimitPoint(transits=n, hours=3.5 * n, detectable_ratio=ratio, upper_limit_ratio=ratio and ratio / 10)
        for n, ratio in zip((1, 10, 100), detectable, strict=True)
    )
    return LimitCurve(
        gas=gas,
        mode=mode,
        stated_ratios=(1e-6,),
        points=points,
        at_best=points[-1],
        detectable_at_all=None if obstacle else 1e-7,
        obstacle=obstacle,
        obstacle_words="at most 3.1 sigma, however many transits" if obstacle else "",
        ratios=ratios,
        feature_ppm=80 * ratios**0.2,
        snr_one_transit=snr,
        snr_on_offer=10 * snr,
        scale_height_ppm=16.0,
    )


@pytest.fixture
def result():
    """Two gases with two modes; one of the searches is hopeless."""
    return LimitResult(
        title="Made up",
        invented=True,
        threshold_sigma=5.0,
        power=0.5,
        confidence=0.95,
        curves=(
            curve("CH4", "prism"),
            curve("CH4", "slitless"),
            curve("CCl2F2", "prism", detectable=(None, None, None), obstacle=Obstacle.FLOOR),
            curve("CCl2F2", "slitless"),
        ),
        line_data=("CH4: embedded",),
        assumptions=("isothermal",),
        nuisances=(("radius", "5 %"),),
        cautions=("Estimates.",),
        version="0.1.0",
    )


def text_of(result, width=80):
    file = io.StringIO()
    Console(file=file, width=width, color_system=None).print(limit_view(result))
    return file.getvalue()


def test_table_has_a_row_per_search_and_number(result):
    """Ratios that are not reached are masked, hours carry their unit."""
    table = limit_table(result)
    assert len(table) == 12
    assert table["detectable_ratio"].mask.sum() == 3 + 3
    assert str(table["hours"].unit) == "h"
    assert table["obstacle"][6] == "floor"
    assert table.meta["confidence"] == 0.95


def test_growth_table(result):
    """A row per mixing ratio of every curve."""
    table = growth_table(result)
    assert len(table) == 4 * 15
    np.testing.assert_array_equal(table["snr_on_offer"][:15], result.curves[0].snr_on_offer)


def test_json_round_trip_and_documentation(result):
    """Numbers come back as they went, what is not reached is null, every key is in the docstring."""
    tree = json.loads(limit_json(result))
    assert tree["curves"][2]["points"][1]["detectable_ratio"] is None
    assert tree["curves"][2]["obstacle"] == "floor"
    assert tree["curves"][0]["ratios"] == result.curves[0].ratios.tolist()
    for key in {*tree, *tree["curves"][0], *tree["curves"][0]["points"][0]}:
        assert f"``{key}``" in module.__doc__, key


def test_text_says_what_is_reached_and_why_not(result):
    """Both kinds of limit, the modes by name, the reason where there is none; no line runs over."""
    text = text_of(result)
    for words in ("The target is invented.", "prism", "slitless", "2 ppm", "400 ppb", "no limit", "CFC-12"):
        assert words in text
    assert "prism: no limit, floor: at most 3.1 sigma, however many transits" in text
    assert max(map(len, text.splitlines())) <= 80


def test_figure_has_two_panels_per_gas(result):
    """Limits on the left, growth on the right, logarithmic; lines for every mode that reaches anything."""
    figure = limit_figure(result)
    assert isinstance(figure, Figure)
    assert len(figure.axes) == 4
    assert all(axes.get_xscale() == axes.get_yscale() == "log" for axes in figure.axes)
    titles = [axes.get_title(loc="left") for axes in figure.axes]
    assert titles == ["CH₄: limits", "CH₄: curve of growth", "CFC-12: limits", "CFC-12: curve of growth"]
    assert len(figure.axes[0].lines) == 4 + 1
    assert len(figure.axes[2].lines) == 2 + 1


def test_figure_says_no_limit(result):
    """An empty panel is told from a mistake."""
    from dataclasses import replace

    figure = limit_figure(replace(result, curves=(result.curves[2],)))
    assert [text.get_text() for text in figure.axes[0].texts] == ["no limit"]


def test_limits_stand_where_the_numbers_say(result):
    """The points of a line are transits and ratios of the curve."""
    line = limit_figure(result).axes[0].lines[0]
    assert line.get_xdata().tolist() == [10, 100]
    assert line.get_ydata().tolist() == [2e-6, 4e-7]
    assert not math.isnan(line.get_ydata()[0])
