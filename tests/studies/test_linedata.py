"""Listing, building and checking the embedded lists."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.accuracyfile import Judgement, stored_accuracy
from planner.spectroscopy.faults import list_faults
from planner.spectroscopy.files.xsc import CrossSectionTable, format_xsc
from planner.spectroscopy.hitran import write_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import (
    Constants,
    embedded_formulas,
    parse_constants,
    part_lines,
    read_constants,
    smooth_cross_section,
)
from planner.studies import comparison, linedata
from planner.studies.judging import averaged, cut_off_cm, noise_cm2


@pytest.fixture(autouse=True)
def few_gases(monkeypatch, tmp_path):
    """Three lists, of lines, of contours and of both, and a store of their own."""
    for module in (comparison, linedata):
        monkeypatch.setattr(module, "embedded_formulas", lambda: ["CO", "HBr", "SF6"])
    monkeypatch.setenv("LIMBCAST_STORE", str(tmp_path / "store"))


def carbon_monoxide(low: float = 2140.0, high: float = 2180.0) -> Lines:
    """Embedded lines of CO in a stretch, all isotopologues."""
    constants = read_constants("CO")
    lines = Lines.join([part_lines(constants, part) for part in constants.line_parts])
    return lines.where((lines.wavenumber_per_cm > low) & (lines.wavenumber_per_cm < high))


def scaled(lines: Lines, factor: float) -> Lines:
    return replace(lines, intensity_cm=lines.intensity_cm * factor)


def check_against(folder: Path, lines: Lines, name: str):
    folder.mkdir(exist_ok=True)
    write_par(folder / name, lines)
    return linedata.check(folder)


def test_list_says_how_good():
    """Every gas with its extent and a word on its quality."""
    listing = {row.gas: row for row in linedata.list_gases()}
    assert listing["CO"].covers_per_cm == "400-12800"
    assert "windows meet the marks" in listing["CO"].quality


def test_build_says_what_and_how_long():
    """One sentence per gas, common names allowed."""
    (sentence,) = linedata.build(["carbon monoxide"])
    assert sentence.startswith("CO: ")
    assert sentence.endswith(" s")
    assert linedata.build(["SF6"]) == ["SF6: smooth bands only"]


# ---------------------------------------------------------------- faults


def test_check_without_outside_data():
    """The lists are built and sound; the stored table is shown."""
    said = []
    report = linedata.check(progress=lambda message, fraction: said.append(message))
    assert [row.gas for row in report.lists] == said == ["CO", "HBr", "SF6"]
    assert report.sound
    assert report.lists[0].lines > 1000
    assert report.accuracy == stored_accuracy()


def altered(gas: str, **changes) -> Constants:
    return replace(read_constants(gas), **changes)


def test_coverage_out_of_order_is_a_fault():
    """Intervals must ascend and be disjoint, hold something, and hold nearly all of the intensity."""
    _, faults = list_faults(altered("HBr", covers_per_cm=((4000.0, 5200.0), (200.0, 3000.0))))
    assert any("expected ascending, disjoint" in fault for fault in faults)
    _, faults = list_faults(altered("HBr", covers_per_cm=((200.0, 3000.0), (12000.0, 12100.0))))
    assert any("nothing absorbs between 12000 and 12100" in fault for fault in faults)
    _, faults = list_faults(altered("HBr", covers_per_cm=((200.0, 2200.0), (4000.0, 5200.0))))
    assert any("of the intensity lies in its gaps" in fault for fault in faults)


def test_bands_that_do_not_add_up_are_a_fault():
    """Contours against their stated sum."""
    constants = read_constants("SF6")
    wrong = tuple({**part, "band_sum_cm": 2.0 * part["band_sum_cm"]} for part in constants.smooth_parts)
    _, faults = list_faults(replace(constants, smooth_parts=wrong))
    assert any("add up to 0.5" in fault for fault in faults)


def test_lines_that_do_not_add_up_are_a_fault(monkeypatch):
    """Lines against the sums of their bands, whatever the generator did."""
    from planner.spectroscopy import faults

    honest = faults.part_lines
    monkeypatch.setattr(faults, "part_lines", lambda *given: scaled(honest(*given), 1.05))
    _, found = list_faults(read_constants("CO"))
    assert any(fault.startswith("isotopologue 1, 1 from 0: the lines add up to 1.05") for fault in found)


def test_records_that_break_their_format_are_a_fault(monkeypatch):
    """A wavenumber too large for its column does not survive."""
    from planner.spectroscopy import faults

    honest = faults.part_lines

    def shifted(*given):
        lines = honest(*given)
        return replace(lines, wavenumber_per_cm=lines.wavenumber_per_cm + 2e6)

    monkeypatch.setattr(faults, "part_lines", shifted)
    _, found = list_faults(read_constants("HBr"))
    assert any(fault.startswith("records:") for fault in found)


def test_list_that_cannot_be_built_is_a_fault():
    """The message of the generator is kept."""
    text = b"""
formula = "CO"
covers_per_cm = [[2000.0, 2300.0]]
[sources]
[[part]]
kind = "statistical"
isotopologue = 1
seed = 1
weakest = 1e-3
self_width_ratio = 1.0
bins = [[2100.0, 2000.0, 1e-19, 1.0, 0.0, 0.0, 0.07, 0.7]]
"""
    lines, (fault,) = list_faults(parse_constants(text, Path("CO.toml")))
    assert lines is None
    assert fault.startswith("cannot be built:")


# ---------------------------------------------------------------- against real data


def test_list_against_itself_is_perfect(tmp_path):
    """No difference, band sum 1, every mark met; the region that was compared is not among the unseen."""
    report = check_against(tmp_path / "mine", carbon_monoxide(), "CO_2140-2180_hitran2020.par")
    (row,) = report.accuracy.judged
    assert row.verdict is Judgement.MEETS
    assert max(row.percentile_90) == 0.0
    assert row.sum_ratio == 1.0
    assert 0 <= row.real_lines - row.embedded_lines <= 2  # stragglers below the cut
    assert (row.compared_with, row.in_sample) == ("HITRAN2020, CO_2140-2180_hitran2020.par", True)
    seen = [(u.from_per_cm, u.to_per_cm) for u in report.accuracy.unseen if u.gas == "CO"]
    assert seen
    assert not any(low < 2175.0 and high > 2145.0 for low, high in seen)


def test_wrong_strength_is_a_miss(tmp_path):
    """Lines twice as strong: every mark that is missed is named, and the strength error is about two."""
    real = scaled(carbon_monoxide(), 0.5)
    (row,) = check_against(tmp_path / "mine", real, "CO_2140-2180.par").accuracy.judged
    assert row.verdict is Judgement.MISSES
    assert "mean 0.3" in row.missed
    assert 1.3 < row.strength_factor < 2.5
    assert row.compared_with.startswith("edition not named")


def test_like_with_like(tmp_path):
    """A file of the main isotopologue alone, cut at 1e-22, is not held against the list."""
    real = carbon_monoxide()
    real = real.where((real.isotopologue == 1) & (real.intensity_cm > 1e-22))
    (row,) = check_against(tmp_path / "mine", real, "CO_2140-2180.par").accuracy.judged
    assert row.embedded_lines == row.real_lines
    assert row.sum_ratio == 1.0


def test_declared_coverage_counts_before_the_name(tmp_path):
    """The window ends where the user says the file is complete."""
    folder = tmp_path / "mine"
    folder.mkdir()
    (folder / "coverage.toml").write_text(
        '[[file]]\nname = "CO_2140-2180.par"\ngas = "CO"\nrange_per_cm = [2150, 2170]\nedition = "HITRAN2016"\n'
    )
    (row,) = check_against(folder, carbon_monoxide(), "CO_2140-2180.par").accuracy.judged
    assert 2150.0 <= row.from_per_cm < row.to_per_cm <= 2170.0
    assert row.compared_with.startswith("HITRAN2016")


def test_fragments_that_no_one_vouches_for_are_left_out(tmp_path):
    """A file without a named range that holds a tenth of the embedded intensity in its run is no yardstick."""
    fragment = scaled(carbon_monoxide(), 0.1)
    assert check_against(tmp_path / "one", fragment, "co.par").accuracy.judged == ()
    assert len(check_against(tmp_path / "two", carbon_monoxide(), "co.par").accuracy.judged) == 1


def test_narrow_windows_get_no_verdict(tmp_path):
    """Less than half a bin of R = 100."""
    real = carbon_monoxide(2160.0, 2170.0)
    (row,) = check_against(tmp_path / "mine", real, "CO_2160-2170.par").accuracy.judged
    assert row.verdict is Judgement.NARROW


def measured(factor: float, temperature_k: float, noise: float = 0.0) -> CrossSectionTable:
    """The embedded SF6 as if it had been measured."""
    grid = np.linspace(920.0, 970.0, 2501)
    sigma = smooth_cross_section(read_constants("SF6"), grid, temperature_k)
    rng = np.random.default_rng(1)
    values = factor * sigma + noise * rng.standard_normal(grid.size)
    return CrossSectionTable(
        formula="SF6", from_per_cm=920.0, to_per_cm=970.0, temperature_k=temperature_k, pressure_torr=0.0,
        cross_section_cm2=values, largest_stated_cm2=float(values.max()), where="made up",
    )  # fmt: skip


def test_measured_cross_sections(tmp_path):
    """Several temperatures make one window, by the median: one bad table of three does not decide, two do."""
    good, bad, worse = measured(1.0, 250.0), measured(3.0, 270.0), measured(3.0, 290.0)
    for name, tables, verdict in (
        ("one", [good, measured(1.0, 230.0), bad], Judgement.MEETS),
        ("two", [good, bad, worse], Judgement.MISSES),
    ):
        folder = tmp_path / name
        folder.mkdir()
        for number, table in enumerate(tables):
            (folder / f"{number}.xsc").write_text(format_xsc(table))
        (row,) = linedata.check(folder).accuracy.judged
        assert row.verdict is verdict
        assert len(row.temperatures_k) == 3
        assert row.mixing_ratios[0] == 1e-9


def test_folder_without_data_is_refused(tmp_path):
    """With a message that names it."""
    with pytest.raises(LineDataError, match="holds no"):
        linedata.check(tmp_path)


# ---------------------------------------------------------------- what the judging rests on


def test_cut_off_of_a_list():
    """The edge where lines thin out if few lie below it, else the weakest line; infinite for no lines."""
    rng = np.random.default_rng(2)
    strong = 10.0 ** rng.uniform(-22.0, -19.0, 1000)
    assert cut_off_cm(np.append(strong, [1e-30, 1e-28])) == pytest.approx(1e-22)
    whole = 10.0 ** rng.uniform(-30.0, -19.0, 1000)
    assert cut_off_cm(whole) == pytest.approx(whole.min(), rel=1.0)
    assert cut_off_cm(np.zeros(0)) == np.inf


def test_noise_of_a_measurement():
    """White noise is found whatever the bands under it; negative values count too."""
    assert noise_cm2(measured(1.0, 250.0, noise=1e-20)) == pytest.approx(1e-20, rel=0.3)
    table = measured(1.0, 250.0)
    offset = replace(table, cross_section_cm2=table.cross_section_cm2 - 1e-18)
    assert noise_cm2(offset) > 5e-19


def test_running_mean():
    """Of a line, the line; of a short table, its mean."""
    ramp = np.linspace(0.0, 1.0, 101)
    assert np.allclose(averaged(ramp, 0.2)[3:-3], ramp[3:-3])
    assert np.allclose(averaged(np.array([1.0, 3.0]), 0.2), 2.0)
    assert averaged(np.ones(50), 0.1) == pytest.approx(1.0)


def test_real_lists_are_those_that_ship():
    """The fixture above hides none of them from the command."""
    assert {"CO", "HBr", "SF6"} < set(embedded_formulas())
