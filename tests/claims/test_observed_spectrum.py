"""Reading the spectrum of a claim: layouts, units, edges, and what bad ones are told."""

from __future__ import annotations

import numpy as np
import pytest

from planner.claims.spectrum import parse_observed, read_observed
from planner.errors import ScenarioError

EDGES = """\
from [um],to [um],depth [ppm],error [ppm]
4.0,4.1,5000,30
4.1,4.2,5010,31
4.2,4.3,5020,32
4.3,4.4,5030,33
"""
ECSV = """\
# %ECSV 1.0
# ---
# datatype:
# - {name: wavelength, unit: nm, datatype: float64}
# - {name: depth, unit: '', datatype: float64}
# - {name: error, unit: '%', datatype: float64}
# - {name: detector, datatype: string}
# schema: astropy-2.0
wavelength depth error detector
4000.0 0.0050 0.003 blue
4100.0 0.0051 0.003 blue
4200.0 0.0052 0.003 red
4300.0 0.0053 0.003 red
"""


def test_edges_in_csv():
    """Values as they stand, one detector."""
    found = parse_observed(EDGES, "x.csv")
    assert found.from_um.tolist() == [4.0, 4.1, 4.2, 4.3]
    assert found.depth_ppm.tolist() == [5000, 5010, 5020, 5030]
    assert found.error_ppm.tolist() == [30, 31, 32, 33]
    assert found.detector.tolist() == [0, 0, 0, 0]


def test_middles_in_ecsv_with_other_units():
    """nm, plain shares and per cent; edges half way in the logarithm, and never across detectors."""
    found = parse_observed(ECSV, "x.ecsv")
    assert found.depth_ppm == pytest.approx([5000, 5100, 5200, 5300])
    assert found.error_ppm == pytest.approx([30, 30, 30, 30])
    assert found.detectors == ("blue", "red")
    assert found.to_um[0] == pytest.approx(np.sqrt(4.0 * 4.1))
    assert found.to_um[1] != found.from_um[2]
    assert np.log(found.to_um / found.from_um)[0] == pytest.approx(np.log(4.1 / 4.0))


def test_order_of_rows_plays_no_part():
    """Rows upside down give the same spectrum."""
    head, *rows = EDGES.splitlines()
    found = parse_observed("\n".join([head, *rows[::-1]]), "x.csv")
    for name in ("from_um", "to_um", "depth_ppm", "error_ppm"):
        assert np.array_equal(getattr(found, name), getattr(parse_observed(EDGES, "x.csv"), name))


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("depth [ppm]", "depth", r'x.csv: column "depth": expected a unit such as ppm, got none'),
        ("depth [ppm]", "depth [um]", r'x.csv: column "depth": expected a unit such as ppm, got "um"'),
        ("depth [ppm]", "depth [elephants]", r'x.csv: column "depth": "elephants" is not a unit'),
        ("depth [ppm]", "flux [ppm]", r'x.csv: .*got a column "flux"'),
        ("error [ppm]", "detector", r'no column "error"'),
        ("5010,31", "5010,0", r'column "error": expected errors above zero in every row, got 0 ppm'),
        ("5010,31", "5010,-31", r'column "error": expected errors above zero'),
        ("5010,31", "nan,31", r'column "depth": expected a finite number in every row'),
        ("5010,31", ",31", r'column "depth": expected a number in every row'),
        ("5010,31", "many,31", r'column "depth": expected a number in every row'),
        ("5010,31", "5010", r'column "error": expected a number in every row'),
        ("5010,31", "5010,31,9", r"x.csv: expected a table"),
        ("4.1,4.2", "4.2,4.1", r"x.csv: row 2: expected 0 < from < to, got 4.2 to 4.1 um"),
        ("4.1,4.2", "4.05,4.2", r"x.csv: bins of one detector overlap"),
        ("4.1,4.2", "4.1,4.1001", r"row 2: expected bins of R = 4000 or wider"),
        ("4.3,4.4", "4.3,440", r"expected wavelengths from 0.2 to 30 um"),
        ("4.3,4.4,5030,33\n", "", r"expected at least 4 rows, got 3"),
        ("from [um]", "wavelength [um]", r'expected either "wavelength" or "from" and "to"'),
    ],
)
def test_invalid(old, new, message):
    """File, column or row, what was expected and what came."""
    assert old in EDGES
    with pytest.raises(ScenarioError, match=message):
        parse_observed(EDGES.replace(old, new), "x.csv")


def test_missing_file(tmp_path):
    """Names the file."""
    with pytest.raises(ScenarioError, match=r"none.csv: cannot be read"):
        read_observed(tmp_path / "none.csv")
