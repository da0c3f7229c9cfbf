"""Where a file is complete: gaps of the spectrum and gaps of the file, and the file of declarations."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.coverage import (
    Declaration,
    format_declarations,
    inside,
    measured_coverage,
    read_declarations,
    subtract,
    union,
)
from planner.spectroscopy.lines import Lines


def lines_at(wavenumber, strength=1e-21):
    return Lines.make(
        molecule=15, isotopologue=1, wavenumber_per_cm=wavenumber, intensity_cm=strength, lower_energy_per_cm=100.0,
        air_width_per_cm_atm=0.07, temperature_exponent=0.7,
    )  # fmt: skip


def test_wide_spacing_of_the_spectrum_is_no_gap():
    """Lines 20 per cm apart in both lists, as of hydrogen chloride, form one stretch."""
    nu = np.arange(2700.0, 3100.0, 20.0)
    assert measured_coverage(lines_at(nu + 0.01), lines_at(nu)) == (((2700.01, 3080.01),), [])


def test_faint_lines_in_a_gap_do_not_make_it_one_of_the_file():
    """What the embedded list has in the gap is below a thousandth of what is around."""
    nu = np.arange(2700.0, 3100.0, 20.0)
    embedded = Lines.join([lines_at(nu), lines_at(nu[:-1] + 10.0, 1e-26)])
    good, _ = measured_coverage(lines_at(nu), embedded)
    assert good == ((2700.0, 3080.0),)


def test_gaps_wider_than_fifty_are_not_bridged():
    """Two bands are two stretches, whatever the embedded list has between them."""
    nu = np.concatenate([np.arange(2000.0, 2050.0), np.arange(2110.0, 2160.0)])
    good, why = measured_coverage(lines_at(nu), lines_at(nu))
    assert good == ((2000.0, 2049.0), (2110.0, 2159.0))
    assert why == []


def test_skipped_lines_count_as_missing_on_both_sides():
    """A file that skips strong lines between two stretches is complete in neither."""
    embedded = lines_at(np.arange(2000.0, 2040.0))
    skipped = (embedded.wavenumber_per_cm > 2015) & (embedded.wavenumber_per_cm < 2025)
    good, why = measured_coverage(embedded.where(~skipped), embedded)
    assert good == ()
    assert [reason.split(":")[0] for reason in why] == ["2000.00-2015.00 per cm", "2025.00-2039.00 per cm"]


@pytest.mark.parametrize("seed", range(20))
def test_random_fragments_are_never_used(seed):
    """Any half of the lines of a band, picked at random, stands for nothing."""
    rng = np.random.default_rng(seed)
    nu = np.sort(rng.uniform(2000.0, 2200.0, 400))
    embedded = lines_at(nu, 10.0 ** rng.uniform(-24, -20, nu.size))
    good, _ = measured_coverage(embedded.where(rng.random(nu.size) < 0.5), embedded)
    assert sum(high - low for low, high in good) < 20.0  # a tenth of the band: a stretch may hold its one strong line


def test_an_empty_file_covers_nothing():
    """No lines, no stretches, no reasons."""
    assert measured_coverage(lines_at(np.array([])), lines_at(np.arange(2000.0, 2100.0))) == ((), [])


def test_declarations_read_as_they_were_written(tmp_path):
    """Names with quotes, all fields and few, in order."""
    declared = {
        'odd "name".par': [
            Declaration(formula="CO2", isotopologues=(1, 2), interval_per_cm=(2100.0, 2300.5), edition="HITRAN2020"),
            Declaration(formula="CO", interval_per_cm=(0.0, 1e4)),
        ],
        "b.par.gz": [Declaration(formula="CH4", interval_per_cm=(1.25, 2.5), fetched="from x on y")],
    }
    (tmp_path / "coverage.toml").write_text(format_declarations(declared), encoding="utf-8")
    assert read_declarations(tmp_path / "coverage.toml") == declared


def test_unknown_keys_suggest_the_nearest(tmp_path):
    """A misspelt key is not passed over."""
    path = tmp_path / "coverage.toml"
    path.write_text('[[file]]\nname = "a.par"\ngas = "CO"\nrange_per_cm = [1, 2]\nisotopologs = [1]\n')
    with pytest.raises(LineDataError, match=r"unknown key 'isotopologs', did you mean 'isotopologues'\?"):
        read_declarations(path)


def test_sets_of_intervals():
    """Union, difference and membership, ends included."""
    assert union([(3.0, 5.0), (1.0, 2.0), (2.0, 2.5), (4.0, 6.0)]) == ((1.0, 2.5), (3.0, 6.0))
    assert subtract([(1.0, 6.0)], [(2.0, 3.0), (5.0, 9.0)]) == ((1.0, 2.0), (3.0, 5.0))
    assert inside(np.array([0.9, 1.0, 2.5, 2.6]), [(1.0, 2.5)]).tolist() == [False, True, True, False]
