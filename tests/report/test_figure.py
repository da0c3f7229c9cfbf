"""The figure: what it shows, that it fits its page, that letters are large enough and nothing overlaps."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.axis import Axis
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Text

from planner.errors import OutputError
from planner.report.figure import choose_rows, plan_figure, spectra_figure, write_figure


@pytest.fixture(scope="module")
def figure(fake_plan):
    """The drawn figure with its renderer."""
    drawn = plan_figure(fake_plan)
    drawn.set_dpi(300)
    FigureCanvasAgg(drawn).draw()
    return drawn


def _letters(figure):
    """Every piece of text that is drawn, with its box."""
    renderer = FigureCanvasAgg(figure).get_renderer()
    texts = [text for text in figure.findobj(Text) if text.get_text().strip() and text.get_visible()]
    spare = set()  # matplotlib keeps tick labels beyond the limits, which it does not draw
    for axis in figure.findobj(Axis):
        low, high = sorted(axis.get_view_interval())
        outside = [tick for tick in axis.get_major_ticks() if not low <= tick.get_loc() <= high]
        spare.update(label for tick in outside for label in (tick.label1, tick.label2))
    return [(text, text.get_window_extent(renderer)) for text in texts if text not in spare]


def test_rows_shown(fake_plan):
    """Each gas once: at its largest ratio, with the mode that needs fewest hours, the hopeless modes last."""
    shown = [
        (fake_plan.rows[i].gas, fake_plan.rows[i].mixing_ratio, fake_plan.rows[i].mode) for i in choose_rows(fake_plan)
    ]
    assert shown == [
        ("CH4", 1e-4, "near-infrared-prism"),
        ("CCl2F2", 2.5e-9, "mid-infrared-slitless"),
        ("O3", 1e-6, "mid-infrared-slitless"),
    ]


def test_print_size(figure):
    """180 mm wide and no taller than a page."""
    width, height = figure.get_size_inches() * 25.4
    assert width == pytest.approx(180)
    assert height < 250


def test_letters_are_large_enough(figure):
    """Nothing below 7 points; lowered numbers of formulas are smaller, as in print."""
    assert min(text.get_fontsize() for text, _ in _letters(figure)) >= 7.0


def test_letters_do_not_overlap(figure):
    """No two pieces of text touch, and none leaves the page."""
    letters = _letters(figure)
    assert len(letters) > 40
    for i, (first, a) in enumerate(letters):
        assert a.x0 >= -1, first.get_text()
        assert a.x1 <= figure.bbox.x1 + 1, first.get_text()
        assert a.y0 >= -1, first.get_text()
        assert a.y1 <= figure.bbox.y1 + 1, first.get_text()
        for second, b in letters[i + 1 :]:
            overlap = min(a.x1, b.x1) > max(a.x0, b.x0) and min(a.y1, b.y1) > max(a.y0, b.y0)
            assert not overlap, (first.get_text(), second.get_text())


def test_axes(figure, fake_plan):
    """Wavelength in um with plain numbers; scale heights on the right agree with ppm on the left."""
    axes = figure.axes[0]
    labels = [label.get_text() for label in axes.get_xticklabels()]
    assert labels[:3] == ["0.6", "0.8", "1"]
    right = axes.child_axes[0]
    low, high = axes.get_ylim()
    span = np.diff(right.get_ylim())[0]
    assert span == pytest.approx((high - low) / fake_plan.scale_height_ppm)


def test_searched_gas_is_what_it_adds(figure, fake_plan):
    """The filled stretch lies between the depths without and with the gas."""
    spectrum = fake_plan.spectra[0]
    filled = figure.axes[0].collections[0].get_paths()[0]
    share = spectrum.shares_ppm["CH4"]
    for bin_ in (int(np.argmax(share)), int(np.argmax(spectrum.depth_ppm))):
        middle = np.sqrt(spectrum.from_um[bin_] * spectrum.to_um[bin_])
        top, bottom = spectrum.depth_ppm[bin_], spectrum.depth_ppm[bin_] - share[bin_]
        inside = [filled.contains_point((middle, y)) for y in (bottom - 0.1, (top + bottom) / 2, top + 0.1)]
        assert inside == [False, True, False]


def test_sets_are_filled_with_all_their_gases(fake_plan):
    """The gases of a set are all searched: none of them has a line of its own."""
    spectrum = replace(fake_plan.spectra[0], gas="CH4 + CO2")
    figure = spectra_figure([spectrum], title="t", version="0", invented=False)
    axes = figure.axes[0]
    bin_ = int(np.argmax(spectrum.shares_ppm["CO2"]))
    middle = np.sqrt(spectrum.from_um[bin_] * spectrum.to_um[bin_])
    inside = spectrum.depth_ppm[bin_] - 0.9 * spectrum.shares_ppm["CO2"][bin_]
    assert axes.collections[0].get_paths()[0].contains_point((middle, inside))
    assert axes.get_title(loc="left").startswith("CH₄ + CO₂, 100 ppm")
    assert "share of CO₂" not in [text.get_text() for text in figure.legends[0].get_texts()]


def test_lines_differ_without_colour(figure):
    """Every gas has its own dashes."""
    handles = figure.legends[0].get_lines()
    dashes = [line._dash_pattern for line in handles if line.get_label().startswith("share of")]
    assert len(dashes) >= 3
    assert len({str(pattern) for pattern in dashes}) == len(dashes)


def test_titles_tell_the_verdict(figure):
    """Each panel says gas, ratio, mode, verdict and the transits its points are for."""
    assert figure.axes[0].get_title(loc="left") == (
        "CH₄, 100 ppm, near-infrared-prism: within reach; points for 18 transits, 70.6 h"
    )


def test_rows_out_of_reach_have_points_for_what_is_available(fake_plan):
    """Where too many transits are needed, or no number is enough, the panel says so."""
    title = plan_figure(fake_plan, [1]).axes[0].get_title(loc="left")
    assert title.endswith("more than the transits available (432); points for 100 transits")
    title = plan_figure(fake_plan, [3]).axes[0].get_title(loc="left")
    assert title == "CFC-12, 500 ppt, mid-infrared-slitless: unreachable (floor); points for 100 transits"


def test_invented_targets_are_marked(fake_plan):
    """The figure itself says that the target is made up, whatever its title."""
    texts = [text.get_text() for text in plan_figure(replace(fake_plan, title="x")).texts]
    assert "limbcast 0.1.0; the target is invented" in texts
    texts = [text.get_text() for text in plan_figure(replace(fake_plan, invented=False)).texts]
    assert "limbcast 0.1.0" in texts


def test_spectra_figure(fake_plan):
    """A panel per gas and mode, at the largest ratio."""
    figure = spectra_figure(fake_plan.spectra, title="t", version="0", invented=False, transits=1)
    titles = [axes.get_title(loc="left") for axes in figure.axes]
    assert len(titles) == 6
    assert titles[2] == "CFC-12, 2.5 ppb, near-infrared-prism; points for 1 transit"


def test_files(tmp_path):
    """PNG, PDF and SVG; the same figure is the same file; other endings are refused."""
    for suffix, start in ((".png", b"\x89PNG"), (".pdf", b"%PDF"), (".svg", b"<?xml")):
        path = tmp_path / f"plan{suffix}"
        write_figure(Figure(figsize=(1, 1)), path)
        once = path.read_bytes()
        assert once.startswith(start)
        write_figure(Figure(figsize=(1, 1)), path)
        assert path.read_bytes() == once
    with pytest.raises(OutputError, match=r"ends in .png, .pdf, .svg, got \".jpg\""):
        write_figure(Figure(), tmp_path / "plan.jpg")
