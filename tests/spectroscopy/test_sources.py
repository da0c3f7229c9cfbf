"""Which data stand for a gas: the coverage rule, precedence of editions, joins with the embedded list."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.coverage import measured_coverage
from planner.spectroscopy.hitran import write_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import build_lines, read_constants
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store


def lines_between(low, high, step=1.0, strength=1e-21):
    nu = np.arange(low, high, step)
    return Lines.make(
        molecule=5, isotopologue=1, wavenumber_per_cm=nu, intensity_cm=strength, lower_energy_per_cm=100.0,
        air_width_per_cm_atm=0.07, temperature_exponent=0.7,
    )  # fmt: skip


def test_a_complete_stretch_is_covered():
    """As much intensity as the embedded list means complete."""
    good, why = measured_coverage(lines_between(2000, 2100), lines_between(1900, 2300))
    assert good == ((2000.0, 2099.0),)
    assert why == []


def test_a_fragment_never_stands_for_a_band():
    """Half the intensity of a stretch is not used, whatever its ends."""
    good, why = measured_coverage(lines_between(2000, 2100, 2.0), lines_between(1900, 2300))
    assert good == ()
    assert "partial, not used (holds 0.5" in why[0]


def test_gaps_split_a_file_into_stretches():
    """A gap over 5 per cm ends a stretch; each is judged for itself."""
    file = Lines.join([lines_between(2000, 2100), lines_between(2200, 2300, 4.0)])
    good, why = measured_coverage(file, lines_between(1900, 2300))
    assert good == ((2000.0, 2099.0),)
    assert len(why) == 1
    assert why[0].startswith("2200.00-2296.00")


def test_short_stretches_are_not_used():
    """A handful of lines closer than the gap is no coverage."""
    good, why = measured_coverage(lines_between(2000, 2004), lines_between(1900, 2300))
    assert good == ()
    assert "4 lines" in why[0]


def test_without_a_yardstick_nothing_is_covered():
    """With no embedded list the user must declare the coverage."""
    good, why = measured_coverage(lines_between(2000, 2100), None)
    assert good == ()
    assert "coverage.toml" in why[0]


@pytest.fixture
def store(tmp_path):
    return Store(tmp_path / "store")


@pytest.fixture
def folder(tmp_path):
    folder = tmp_path / "real lines"
    folder.mkdir()
    return folder


def co_within(store, low, high):
    lines = build_lines(read_constants("CO"), store)
    return lines.where((lines.wavenumber_per_cm >= low) & (lines.wavenumber_per_cm <= high))


def test_real_lines_replace_embedded_ones_where_complete(store, folder):
    """Each isotopologue and interval has one source; the rest stays embedded; the output says so."""
    file = co_within(store, 2050, 2250)
    write_par(folder / "CO_hitran2020.par", file)
    source = LineLibrary(store, folder).gas("CO")
    embedded = build_lines(read_constants("CO"), store)
    assert len(source.lines) == pytest.approx(len(embedded), abs=len(embedded) * 0.01)
    assert any("CO_hitran2020.par (HITRAN2020" in sentence for sentence in source.provenance)
    assert any("embedded" in sentence for sentence in source.provenance)


def test_a_fragment_leaves_the_embedded_list_untouched(store, folder):
    """A file with every second line is reported and changes nothing."""
    file = co_within(store, 2050, 2250)
    write_par(folder / "part.par", file.where(np.arange(0, len(file), 2)))
    source = LineLibrary(store, folder).gas("CO")
    np.testing.assert_array_equal(source.lines.intensity_cm, build_lines(read_constants("CO"), store).intensity_cm)
    assert any("partial, not used" in sentence for sentence in source.partial)
    assert not any("part.par" in sentence for sentence in source.provenance)


def test_the_newer_edition_wins(store, folder):
    """Where two files overlap, the lines come from the newer edition only."""
    file = co_within(store, 2050, 2250)
    write_par(folder / "CO_hitran2012.par", file)
    write_par(folder / "CO_hitran2020.par", file.where(file.wavenumber_per_cm < 2150))
    sentences = " ".join(LineLibrary(store, folder).gas("CO").provenance)
    assert sentences.index("CO_hitran2020") < sentences.index("CO_hitran2012")
    source = LineLibrary(store, folder).gas("CO")
    assert len(source.lines) <= len(build_lines(read_constants("CO"), store)) + 1


@pytest.mark.parametrize(
    ("name", "edition"),
    [
        ("05_hit12.par", "HITRAN2012"),
        ("05_HIT04.par", "HITRAN2004"),
        ("hit96.par", "HITRAN1996"),
        ("CO_hitran_2016.par", "HITRAN2016"),
        ("CO_2000-2300.par", "edition not named"),
    ],
)
def test_editions_in_names(store, folder, name, edition):
    """HITRAN's own file names say the edition with two digits."""
    write_par(folder / name, co_within(store, 2050, 2250))
    assert any(f"from {name} ({edition}, " in s for s in LineLibrary(store, folder).gas("CO").provenance)


def test_the_same_line_twice_names_both_files(store, folder):
    """Two files of one edition that hold the same line are refused."""
    file = co_within(store, 2050, 2250)
    write_par(folder / "a.par", file)
    write_par(folder / "b.par", file)
    with pytest.raises(LineDataError, match=r"a\.par.*b\.par.*stands in both|b\.par.*a\.par.*stands in both"):
        LineLibrary(store, folder).gas("CO")


def test_declared_coverage_is_believed(store, folder):
    """A declaration overrides the measured rule, also for a sparse file."""
    file = co_within(store, 2050, 2250)
    write_par(folder / "part.par", file.where(np.arange(0, len(file), 2)))
    (folder / "coverage.toml").write_text(
        '[[file]]\nname = "part.par"\ngas = "CO"\nrange_per_cm = [2050, 2250]\nedition = "HITRAN2024"\n'
    )
    source = LineLibrary(store, folder).gas("CO")
    assert any("HITRAN2024" in sentence for sentence in source.provenance)
    assert len(source.lines) < len(build_lines(read_constants("CO"), store)) - 0.3 * len(file)


@pytest.mark.parametrize(
    "text", ["[[file]]\nname = 'x'\n", "not toml", '[[file]]\nname="x"\ngas="CO"\nrange_per_cm=[2,1]']
)
def test_broken_declarations_are_refused(store, folder, text):
    """A coverage file that cannot be read names itself and what it should look like."""
    write_par(folder / "part.par", co_within(store, 2050, 2250))
    (folder / "coverage.toml").write_text(text)
    with pytest.raises(LineDataError, match=r"coverage\.toml: expected tables"):
        LineLibrary(store, folder)


@pytest.mark.parametrize("make", [lambda f: f / "absent", lambda f: f])
def test_absent_and_empty_folders_are_refused(store, folder, make):
    """A folder that is not there or holds no line files is one clear error."""
    with pytest.raises(LineDataError, match=r"expected a folder|holds no \.par"):
        LineLibrary(store, make(folder))


def test_unknown_gas_lists_what_there_is(store):
    """A gas without data names the gases that have some."""
    with pytest.raises(LineDataError, match=r"embedded gases are|CO2"):
        LineLibrary(store).gas("Ar")
