"""Mode files: the shipped ones, and what is wrong with broken ones."""

from __future__ import annotations

import re
import tomllib
from pathlib import Path
from typing import Any

import pytest
from pydantic import ValidationError

from planner.errors import ScenarioError
from planner.instrument import Mode, Spectrometer, list_modes, parse_mode, read_mode
from planner.resources import data_folder

NEEDED = {
    "near-infrared-prism": (0.6, 5.3),
    "grating-3-to-5-um": (2.87, 5.14),
    "cross-dispersed-near-infrared": (0.6, 2.83),
    "mid-infrared-slitless": (5.0, 12.0),
    "survey-telescope-1m": (0.5, 7.8),
    "low-orbit-grism": (1.12, 1.66),
}
TEXT = (data_folder("configs") / "instruments" / "near-infrared-prism.toml").read_text()


def shipped_text(name: str) -> str:
    return (data_folder("configs") / "instruments" / f"{name}.toml").read_text()


def line_with(text: str, start: str) -> int:
    return next(number for number, line in enumerate(text.splitlines(), 1) if line.startswith(start))


@pytest.mark.parametrize("name", list_modes())
def test_shipped_mode_reads(name: str) -> None:
    """Each shipped file is valid and carries its own name."""
    mode = read_mode(name)
    assert mode.name == name
    assert 0.3 < mode.span_um[0] < mode.span_um[1] < 30


def test_the_promised_modes_are_there() -> None:
    """With the ranges they are named for."""
    assert {name: read_mode(name).span_um for name in NEEDED} == NEEDED


@pytest.mark.parametrize("name", list_modes())
def test_every_figure_has_its_source(name: str) -> None:
    """Each key that holds a figure is named in the sources of its table."""
    tree = tomllib.loads(shipped_text(name))
    for table in [tree["telescope"], tree["floor"], *tree["detector"]]:
        figures = set(table) - {"name", "kind", "sources"}
        assert figures == set(table["sources"])


def test_the_grating_has_a_gap_between_two_detectors() -> None:
    """3.72 to 3.82 um belong to neither."""
    first, second = read_mode("grating-3-to-5-um").detectors
    assert first.ranges_um[-1][1] == 3.72
    assert second.ranges_um[0][0] == 3.82


def test_units_are_converted() -> None:
    """The same figures in other units give the same mode."""
    changed = TEXT.replace('"25.4 m2"', '"254000 cm2"').replace('"30 min"', '"0.5 h"')
    changed = changed.replace('"1.6 arcsec"', f'"{1.6 / 60} arcmin"').replace('"0.14364 s"', '"143.64 ms"')
    ours, other = parse_mode(TEXT, "a"), parse_mode(changed, "b")
    assert other.telescope.collecting_area_m2 == pytest.approx(25.4)
    assert other.telescope.settling_h == pytest.approx(ours.telescope.settling_h)
    assert other.detectors[0].slit_width_arcsec == pytest.approx(1.6)
    assert other.detectors[0].frame_time_s == pytest.approx(0.14364)


def test_a_mode_cannot_be_changed() -> None:
    """Records are frozen; changed copies are new records."""
    mode = read_mode("near-infrared-prism")
    with pytest.raises(ValidationError, match="frozen"):
        mode.detectors[0].frame_time_s = 1.0  # type: ignore[misc]


def test_a_file_of_ones_own(tmp_path: Path) -> None:
    """A path that ends in .toml is read as such, whether text or Path."""
    path = tmp_path / "own.toml"
    path.write_text(TEXT.replace('"near-infrared-prism"', '"own"'))
    assert read_mode(path).name == "own"
    assert read_mode(str(path)) == read_mode(path)


@pytest.mark.parametrize(
    ("name", "message"),
    [
        ("near-infared-prism", r'got "near-infared-prism"; did you mean "near-infrared-prism"\?'),
        ("xyz", r"known modes: cross-dispersed-near-infrared, grating-3-to-5-um"),
        ("no/such/file.toml", r"no/such/file\.toml: no such file"),
    ],
)
def test_read_mode_invalid(name: str, message: str) -> None:
    """Unknown names suggest the nearest; missing files are named."""
    with pytest.raises(ScenarioError, match=message):
        read_mode(name)


@pytest.mark.parametrize(
    ("old", "new", "key", "message"),
    [
        ('collecting_area = "25.4 m2"', "collecting_area = 25.4", "telescope.collecting_area", "unit is missing"),
        ('collecting_area = "25.4 m2"', 'collecting_area = "25.4 m"', "telescope.collecting_area", 'got "25.4 m"'),
        ('collecting_area = "25.4 m2"', 'collecting_area = "-1 m2"', "telescope.collecting_area", "greater than zero"),
        ('read_noise = "10.6 electron"', 'read_noise = "nan electron"', "detector[1].read_noise", "finite"),
        ('frame_time = "0.14364 s"', 'frame_tine = "0.2 s"', "detector[1].frame_tine", 'did you mean "frame_time"?'),
        ('depth = "14 ppm"', 'depths = "14 ppm"', "floor.depths", 'did you mean "depth"?'),
        ('kind = "spectrometer"', 'kind = "camera"', "detector[1]", 'got "camera"'),
        ("ranges_um = [[0.6, 5.3]]", "ranges_um = [[5.3, 0.6]]", "detector[1].ranges_um", "ascending"),
        ("ranges_um = [[0.6, 5.3]]", "ranges_um = [[1, 3], [2, 4]]", "detector[1].ranges_um", "not overlapping"),
        ("ranges_um = [[0.6, 5.3]]", "ranges_um = []", "detector[1].ranges_um", "got []"),
        ("[0.6, 0.24]", "[0.6, 1.24]", "detector[1].throughput", "up to 1, got the row [0.6, 1.24]"),
        ("[0.6, 0.24]", '[0.6, "a"]', "detector[1].throughput", "expected a list of rows"),
        ("[0.7, 49]", "[0.5, 49]", "detector[1].resolving_power", "got 0.5 um after 0.6 um"),
        ("[0.7, 49]", "[0.7, 0]", "detector[1].resolving_power", "above 0"),
        ("brightest_pixel_share = 0.55", "brightest_pixel_share = 55", "detector[1].brightest_pixel_share", "up to 1"),
        ("reset_frames = 1", 'reset_frames = "1"', "detector[1].reset_frames", "a number of frame times from 0"),
        ("reset_frames = 1", "reset_frames = 1\nframes_per_group = 1.5", "detector[1].frames_per_group", "whole"),
        ("excess_noise = 1.1", "excess_noise = 0.5", "detector[1].excess_noise", "from 1"),
        ('pixel_scale = "0.105 arcsec"\n', "", "detector[1]", "expected pixel_scale"),
        ("[floor.sources]\ndepth", "[floor.sources]\nwidth", "floor", 'sources: .*got "width"'),
    ],
)
def test_parse_mode_invalid(old: str, new: str, key: str, message: str) -> None:
    """The message names file, line and key, what was expected and what came."""
    assert TEXT.count(old) >= 1
    with pytest.raises(ScenarioError) as caught:
        parse_mode(TEXT.replace(old, new, 1), "m.toml")
    wanted = rf"m\.toml:\d+: {re.escape(key)}: .*"
    wanted += message if ".*" in message else re.escape(message)
    assert re.search(wanted, str(caught.value)), str(caught.value)


def test_messages_point_at_the_line() -> None:
    """Also where the mistake lies in the second of two detectors."""
    text = shipped_text("grating-3-to-5-um").replace("excess_noise = 1.1", "excess_noise = 0.1")
    with pytest.raises(ScenarioError) as caught:
        parse_mode(text, "m.toml")
    first = line_with(text, "excess_noise = 0.1")
    assert f"m.toml:{first}: detector[1].excess_noise" in str(caught.value)
    assert "detector[2].excess_noise" in str(caught.value)


def test_missing_keys_and_tables_are_named() -> None:
    """Each with what should stand there; several problems come in one message."""
    with pytest.raises(ScenarioError, match=r'telescope\.settling: missing; expected a time such as "30 min"'):
        parse_mode(TEXT.replace('settling = "30 min"\n', "").replace("\nsettling = ", "\noverhead2 = ", 1), "m.toml")
    with pytest.raises(ScenarioError) as caught:
        parse_mode('name = "x"\n', "m.toml")
    for part in ("summary: missing", "telescope: missing; expected a [telescope] table", "at least one [[detector]]"):
        assert part in str(caught.value)
    with pytest.raises(ScenarioError, match=r"detector: expected at least one \[\[detector\]\] table, got \[\]"):
        parse_mode("detector = []\n" + TEXT.split("[[detector]]")[0] + "[floor]\ndepth = '1 ppm'", "m.toml")


def test_not_toml() -> None:
    """A syntax error names file and line."""
    with pytest.raises(ScenarioError, match=r"m\.toml:2: not valid TOML"):
        parse_mode('name = "x"\nsummary = \n', "m.toml")


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"background": None}, "got neither"),
        ({"background_mjy_per_sr": [[1, 0.1]], "pixel_scale": "0.1 arcsec"}, "got both"),
        ({"slit_width": "1 arcsec"}, "slit_width only beside"),
        ({"kind": "photometer", "ranges_um": [[1, 2], [3, 4]]}, "expected one range"),
    ],
)
def test_what_does_not_go_together(make_mode: Any, change: dict[str, Any], message: str) -> None:
    """Rules across keys of a detector."""
    if change.get("kind") == "photometer":
        spectral = ("resolving_power", "nm_per_pixel", "extraction_height_pixels")
        change = {**change, **dict.fromkeys(spectral), "extraction_pixels": 9}
    with pytest.raises(ValidationError, match=message):
        make_mode(change)


def test_keys_of_the_other_kind_are_unknown() -> None:
    """A photometer has no dispersion."""
    text = shipped_text("survey-telescope-1m").replace("extraction_pixels = 30", "nm_per_pixel = [[1, 2]]", 1)
    with pytest.raises(ScenarioError, match=r"detector\[1\]\.nm_per_pixel: unknown key"):
        parse_mode(text, "m.toml")


def test_span_covers_all_detectors(make_mode: Any) -> None:
    """Shortest and longest end, in whatever order the detectors stand."""
    mode = make_mode({"ranges_um": [[3.0, 4.0]]}, {"ranges_um": [[1.0, 1.5], [2.0, 2.5]]})
    assert mode.span_um == (1.0, 4.0)
    assert all(isinstance(detector, Spectrometer) for detector in mode.detectors)
    assert isinstance(mode, Mode)
