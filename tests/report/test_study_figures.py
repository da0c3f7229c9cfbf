"""Figures of spreads, of simulated observations and of remedies."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.text import Text
from scipy import special

from planner.report.remedyfigure import remedy_figure
from planner.report.simulationfigure import simulation_figure
from planner.report.spreadfigure import spread_figure
from planner.report.table import plan_text
from planner.studies.outcomes import Driver, TransitSpread
from planner.studies.results import Remedy, RemedyKind, Simulation

DRIVERS = {"cloud top": 0.48, "temperature": 0.17, "CH4": 0.09, "CO2": 0.05, "facula temperature": 0.02}


def made_up_spread(middle, width, never, on_offer=100):
    """Draws about a middle, some of them out of reach."""
    reached = np.exp(np.log(middle) + width * special.ndtri((np.arange(128) + 0.5) / 128))
    drawn = [max(1, math.ceil(n)) for n in reached[: 128 - never]] + [None] * never
    quantiles = [drawn[round(128 * q)] for q in (0.16, 0.5, 0.84)]
    numbers = sorted({round(n) for n in np.geomspace(1, on_offer, 20)})
    chances = [(n, sum(float(special.ndtr(5 * np.sqrt(n / d) - 5)) for d in drawn if d) / 128) for n in numbers]
    return TransitSpread(
        draws=128,
        seed=1,
        transits_16=quantiles[0],
        transits_50=quantiles[1],
        transits_84=quantiles[2],
        unreachable_share=never / 128,
        transits_asked=min(middle, on_offer),
        chance_asked=dict(chances).get(min(middle, on_offer), 0.4),
        transits_on_offer=on_offer,
        chance_on_offer=chances[-1][1],
        transits_drawn=tuple(drawn),
        chances=tuple(chances),
        drivers=tuple(Driver(name=name, share=share) for name, share in DRIVERS.items()),
    )


def made_up_simulation(snr=5.08):
    edges = np.arange(-4, math.ceil(snr) + 4.1, 0.25)

    def counts(mean):
        return tuple(np.rint(2000 * np.diff(special.ndtr(edges - mean))).astype(int).tolist())

    return Simulation(
        transits=18,
        draws=2000,
        power_stated=0.532,
        power_found=0.5275,
        power_error=0.0112,
        false_alarm_sigma=2.0,
        false_alarms_stated=0.02275,
        false_alarms_found=0.0245,
        false_alarms_error=0.0035,
        sigma_anywhere=5.81,
        snr_stated=snr,
        sigma_edges=tuple(edges.tolist()),
        counts_there=counts(snr),
        counts_absent=counts(0.0),
    )


@pytest.fixture
def spread_plan(fake_plan):
    """The made-up plan with a spread in each row: within reach, half of it out of reach, and all of it."""
    shapes = [(14, 0.9, 4), (300, 1.5, 60), (40, 0.0, 128)]
    rows = [replace(row, spread=made_up_spread(*shapes[i % 3])) for i, row in enumerate(fake_plan.rows)]
    return replace(fake_plan, rows=tuple(rows))


@pytest.fixture
def tried_plan(fake_plan):
    rows = [replace(row, simulation=made_up_simulation(5.08 if i else 1.2)) for i, row in enumerate(fake_plan.rows)]
    return replace(fake_plan, rows=tuple(rows))


def all_texts(figure):
    """What is written anywhere in a figure, as drawn."""
    FigureCanvasAgg(figure).draw()
    return [text for text in figure.findobj(Text) if text.get_visible() and text.get_text()]


def inside_the_page(figure):
    page = figure.bbox
    renderer = FigureCanvasAgg(figure).get_renderer()
    boxes = [text.get_window_extent(renderer) for text in all_texts(figure)]
    return all(b.x0 >= 0 and b.y0 >= 0 and b.x1 <= page.x1 + 1 and b.y1 <= page.y1 + 1 for b in boxes)


def test_a_row_of_panels_for_each_gas(spread_plan):
    """Distribution, chance and drivers; nothing leaves the page, and what is never enough is said."""
    figure = spread_figure(spread_plan)
    gases = {row.gas for row in spread_plan.rows}
    assert len(figure.axes) == 3 * len(gases)
    texts = [text.get_text() for text in all_texts(figure)]
    assert any("never" in text for text in texts)
    assert "cloud top" in texts
    assert inside_the_page(figure)


def test_gases_go_by_the_names_that_people_use(spread_plan):
    """CFC-12 and not its formula, in the table as in the figure."""
    drivers = (Driver(name="CCl2F2", share=0.6), Driver(name="cloud top", share=0.2))
    rows = [replace(row, spread=replace(row.spread, drivers=drivers)) for row in spread_plan.rows]
    plan = replace(spread_plan, rows=tuple(rows), spread_priors=(("CCl2F2", "0.3 dex in mixing ratio"),))
    text = plan_text(plan, 120)
    block = text[text.index("Spread over") : text.index("Held unknown")]
    assert "CFC-12 60 %" in block
    assert "CFC-12 0.3 dex" in block
    assert "CFC-12" in [text.get_text() for text in all_texts(spread_figure(plan))]


def test_bars_hold_every_draw(spread_plan):
    """Shares of the draws add up to all of them, those out of reach with them."""
    for axes in spread_figure(spread_plan).axes[::3]:
        assert sum(bar.get_height() for bar in axes.patches) == pytest.approx(100)


def test_variance_is_shared_out_in_full(spread_plan):
    """Bars of the drivers and of what they leave add up to the whole."""
    for axes in spread_figure(spread_plan).axes[2::3]:
        assert sum(bar.get_width() for bar in axes.patches) == pytest.approx(100)


def test_found_and_stated_stand_side_by_side(tried_plan):
    """A panel for each gas; the curve that is stated runs through the bars that were found."""
    figure = simulation_figure(tried_plan)
    assert len(figure.axes) == len({row.gas for row in tried_plan.rows})
    assert inside_the_page(figure)
    axes = figure.axes[0]
    curve = axes.lines[1].get_xydata()
    middles = [bar.get_x() + bar.get_width() / 2 for bar in axes.patches]
    heights = [bar.get_height() for bar in axes.patches]
    half = len(middles) // 2  # first those without the gas
    np.testing.assert_allclose(np.interp(middles[half:], *curve.T), heights[half:], atol=0.02 * max(heights))


@pytest.fixture
def helped_plan(fake_plan):
    """CFC-12 that a floor stops, and O3 without any bound, with remedies."""
    floor = Remedy(kind=RemedyKind.FLOOR, enough=True, transits=100, snr=5.0, floor_factor=0.43, floor_ppm=21.5)
    sky = Remedy(kind=RemedyKind.SKY, enough=False, transits=100, snr=3.3, cloud_top_bar=math.inf)
    rows = list(fake_plan.rows)
    rows[3] = replace(rows[3], remedies=(floor, sky))
    rows[6] = replace(rows[6], remedies=(sky,), marginalised=replace(rows[6].marginalised, snr_limit=math.inf))
    return replace(fake_plan, rows=tuple(rows))


def test_remedies_stand_beside_what_there_is(helped_plan):
    """A block for each search that has remedies, a bar for each of them and one for the search as it stands."""
    figure = remedy_figure(helped_plan)
    assert [len(axes.patches) for axes in figure.axes] == [3, 2]
    assert [bar.get_width() for bar in figure.axes[0].patches] == [helped_plan.rows[3].marginalised.snr_limit, 5.0, 3.3]
    texts = [text.get_text() for text in all_texts(figure)]
    for words in ("a floor of 22 ppm, 0.43 of the present one", "5.00, 100 transits", "no bound, for ever"):
        assert words in texts
    assert inside_the_page(figure)


def test_figures_can_be_made_again(spread_plan, tried_plan, helped_plan, tmp_path):
    """The same plan gives the same file."""
    from planner.report.figure import write_figure

    for make, plan in (
        (spread_figure, spread_plan),
        (simulation_figure, tried_plan),
        (remedy_figure, helped_plan),
    ):
        for name in ("a.png", "b.png"):
            write_figure(make(plan), tmp_path / name)
        assert (tmp_path / "a.png").read_bytes() == (tmp_path / "b.png").read_bytes()
