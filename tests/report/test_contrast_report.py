"""A contrast as table, JSON, bins and figure."""

from __future__ import annotations

import io
import json
import math

import numpy as np
import pytest
from astropy.table import Table
from rich.console import Console

from planner.report.contrastfigure import contrast_figure
from planner.report.contrastjson import contrast_json, write_contrast_json
from planner.report.contrasttable import bins_table, contrast_view, headline
from planner.report.ecsv import write_table
from planner.studies.contrasts import ContrastResult, ContrastRow, ContrastSpectrum
from planner.studies.results import BandShare, Counts, Verdict

EDGES_UM = np.geomspace(3.0, 5.0, 31)


def counts(required, limit):
    return Counts(
        snr_one_transit=1.2,
        snr_limit=limit,
        transits_required=required,
        transits_unrounded=None if required is None else required - 0.4,
        hours_required=None if required is None else 3.4 * required,
        in_transit_hours_required=None if required is None else 0.9 * required,
    )


def row(mode, required, limit):
    return ContrastRow(
        mode=mode,
        verdict=Verdict.WITHIN_REACH if required else Verdict.CONFUSION,
        transits_required=required,
        hours_required=None if required is None else 3.4 * required,
        b_excluded=counts(required and required - 3, 2 * limit),
        a_excluded=counts(required, limit),
        all_known=counts(4, math.inf),
        best_bands=(BandShare(from_um=3.1, to_um=3.5, share=0.6),),
        confusion=((f"offset of {mode}: 3 to 5 um", 3.2), ("temperature", 3.9)),
        confused_from=5.0,
        confused_to=3.1,
        uncovered_um=(("CH4", 4.6, 4.9),),
        saturated_um=((3.9, 4.0),),
    )


def spectrum(mode, transits):
    centre = np.sqrt(EDGES_UM[:-1] * EDGES_UM[1:])
    bump = 30 * np.exp(-0.5 * (np.log(centre / 3.3) / 0.04) ** 2)
    usable = (centre < 3.9) | (centre > 4.0)
    noise = np.where(usable, 60.0, np.inf)
    share = np.where(usable, bump - 1, 0.0)
    return ContrastSpectrum(
        mode=mode,
        detector=np.zeros(30, dtype=np.int64),
        from_um=EDGES_UM[:-1],
        to_um=EDGES_UM[1:],
        depth_a_ppm=5850 + bump,
        depth_b_ppm=np.full(30, 5850.0),
        left_ppm=np.where(usable, 0.7 * bump, 0.0),
        share=share / share.sum(),
        noise_one_transit_ppm=noise,
        floor_ppm=np.full(30, 10.0),
        usable=usable,
        transits=transits,
    )


@pytest.fixture(scope="module")
def result():
    """A made-up contrast with two modes, one of them hopeless."""
    return ContrastResult(
        title_a="Methane beside carbon dioxide",
        title_b="Carbon dioxide and monoxide",
        gases_a=(("N2", 0.9995), ("CO2", 4e-4), ("CH4", 1e-4)),
        gases_b=(("N2", 0.9995), ("CO2", 4e-4), ("CO", 1e-4)),
        held_a=("CO2", "CH4"),
        held_b=("CO2", "CO"),
        invented=True,
        threshold_sigma=5.0,
        power=0.5,
        transits_available=100,
        transit_duration_h=0.9,
        rows=(row("near-infrared-prism", 11, 17.4), row("mid-infrared-slitless", None, 2.5)),
        spectra=(spectrum("near-infrared-prism", 11), spectrum("mid-infrared-slitless", 100)),
        line_data=("CH4: embedded",),
        assumptions=("isothermal",),
        nuisances_a=(("temperature", "15 %"),),
        nuisances_b=(("temperature", "10 %"),),
        cautions=("An estimate.",),
        version="0.1.0",
    )


def shown(result, width):
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(contrast_view(result))
    return file.getvalue()


@pytest.mark.parametrize("width", [80, 120])
def test_table(result, width):
    """Both airs, both ways, where it is decided, and what costs most; nothing is cut."""
    text = shown(result, width)
    for word in ("Methane beside", "CH4 100 ppm", "held as stated: CO2, CO", "11", "37.4", "17.4", "34.8", "never"):
        assert word in text
    for word in ("3.10-3.50 (60 %)", "5.00 becomes 3.10", "The target is invented.", "whichever it is"):
        assert word in " ".join(text.split())
    assert "A: temperature 15 %" in text
    assert "…" not in text
    assert max(map(len, text.splitlines())) <= width


def test_headline(result):
    """A number where there is one, the best that can be had where there is none."""
    assert headline(result.rows[0]) == "within reach: 11 transits, 37.4 h"
    assert headline(result.rows[1]) == "unreachable (confusion): at most 2.50 sigma however many transits"


def test_json(result):
    """Strict JSON with every number; what is not bounded and what has no light is null."""
    tree = json.loads(contrast_json(result), parse_constant=pytest.fail)
    assert tree["format"] == "limbcast contrast 1"
    assert tree["a"]["air"][2] == {"gas": "CH4", "mixing_ratio": 1e-4}
    first, second = tree["rows"]
    assert first["transits_required"] == 11
    assert first["b_excluded"]["transits_required"] == 8
    assert first["all_known"]["snr_limit"] is None
    assert second["transits_required"] is None
    assert len(first["bins"]["share"]) == 30
    dark = int((~result.spectra[0].usable).sum())
    assert sum(value is None for value in first["bins"]["noise_ppm"]) == dark > 0
    assert first["bins"]["noise_ppm"][0] == pytest.approx(math.hypot(60 / math.sqrt(11), 10))


def test_files(result, tmp_path):
    """JSON and bins are written and can be read again."""
    write_contrast_json(result, tmp_path / "c.json")
    assert json.loads((tmp_path / "c.json").read_text()) == json.loads(contrast_json(result))
    write_table(bins_table(result), tmp_path / "c.ecsv")
    table = Table.read(tmp_path / "c.ecsv")
    assert len(table) == 60
    assert table.meta["title_b"] == "Carbon dioxide and monoxide"
    assert table["left_ppm"][:30].max() == pytest.approx(result.spectra[0].left_ppm.max())


def test_figure(result):
    """Two panels per mode on one wavelength axis, the titles of both airs, and bars where bins have a share."""
    figure = contrast_figure(result)
    assert len(figure.axes) == 4
    upper, lower = figure.axes[:2]
    assert upper.get_xlim() == lower.get_xlim()
    assert "11 transits, 37.4 h" in upper.get_title(loc="left")
    texts = [text.get_text() for text in figure.texts]
    assert "A: Methane beside carbon dioxide" in texts
    assert any("invented" in text for text in texts)
    heights = [patch.get_height() for patch in lower.patches]
    assert len(heights) == 30
    assert int(np.argmax(heights)) == int(np.argmax(result.spectra[0].share))


def test_figure_can_be_made_again(result):
    """The simulated points come from a seed."""
    a, b = (contrast_figure(result, seed=seed).axes[0].lines[2].get_ydata() for seed in (1, 1))
    assert np.array_equal(a, b)
