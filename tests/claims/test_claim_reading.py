"""Reading claims: what may be left out, what follows from what, and what bad ones are told."""

from __future__ import annotations

import pytest
from click.testing import CliRunner

from planner.claims.read import parse_claim, read_claim, starting_claim
from planner.cli import cli
from planner.errors import ScenarioError

BARE = """\
title = "CO on a planet"
[claim]
gas = "carbon monoxide"
from = "4.4 um"
to = "5000 nm"
"""


def test_nearly_everything_may_be_left_out():
    """A gas and a range are enough; names become formulas, wavelengths um, and what is not told stays unknown."""
    claim = parse_claim(BARE)
    assert (claim.claim.gas, claim.claim.from_um, claim.claim.to_um) == ("CO", 4.4, 5.0)
    assert claim.claim.sigma is None
    assert not claim.modelled


@pytest.mark.parametrize(
    ("lines", "sigma", "error"),
    [
        ("significance = 4", 4.0, None),
        ('amplitude = "60 ppm"\nerror = "15 ppm"', 4.0, 15.0),
        ('amplitude = "60 ppm"\nsignificance = 3', 3.0, 20.0),
        ("ln_bayes_factor = 5", 3.61, None),
    ],
)
def test_ways_to_quote_a_result(lines, sigma, error):
    """A significance; amplitude over error; an error from the two others; a Bayes factor through its bound."""
    claim = parse_claim(BARE + lines).claim
    assert claim.sigma == pytest.approx(sigma, abs=0.001)
    assert claim.amplitude_error_ppm == error


def test_starting_claim_is_whole(tmp_path):
    """What `new` writes can be read, and makes a scenario; it is never written over another file."""
    path = tmp_path / "claim.toml"
    assert CliRunner().invoke(cli, ["new", "--claim", str(path)]).exit_code == 0
    claim = read_claim(path)
    assert path.read_text() == starting_claim()
    assert claim.modelled
    assert claim.scenario(("near-infrared-prism",)).cases[0].gases == ("CH4",)
    again = CliRunner().invoke(cli, ["new", "--claim", str(path)])
    assert (again.exit_code, "exists already" in again.output) == (2, True)


def test_every_optional_key_of_the_starting_claim_is_real():
    """The commented keys, put in force, are read."""
    text = starting_claim().replace("# error_per_bin", "error_per_bin")
    lines = [
        line.removeprefix("# ") if line.startswith("# ") and " = " in line.split("#")[1] else line
        for line in text.splitlines()
    ]
    lines = [line.removeprefix("# ") if line.startswith("# [[") else line for line in lines]
    claim = parse_claim("\n".join(lines))
    assert claim.reductions[0].later
    assert claim.search.error_per_bin_ppm == 40
    assert claim.claim.other_bands == "seen"


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('to = "5000 nm"', 'to = "4 um"', r"claim.toml:5: claim.to: expected more than from, 4.4 um, got 4 um"),
        (
            'to = "5000 nm"',
            "to = 5",
            r'claim.toml:5: claim.to: expected a wavelength such as "4.3 um", got 5',
        ),
        ('from = "4.4 um"', "", r"claim.toml:\d: claim.from: missing; expected a wavelength"),
        ('gas = "carbon monoxide"', 'gas = "phlogiston"', r"claim.toml:3: claim.gas: .*phlogiston"),
        ('gas = "carbon monoxide"', 'gass = "CO"', r'claim.toml:3: claim.gass: unknown key; did you mean "gas"\?'),
        ("[claim]", "[search]\ntransits = 1.5\n[claim]", r"claim.toml:3: search.transits: expected a count"),
        ("[claim]", "[search\n[claim]", r"claim.toml:2: not valid TOML"),
        ('to = "5000 nm"', 'to = "5 um"\nsignificance = -1', r"claim.toml:6: claim.significance: expected a number"),
        (
            'to = "5000 nm"',
            'to = "5 um"\nsignificance = nan',
            r"claim.toml:6: claim.significance: expected a number",
        ),
        (
            'to = "5000 nm"',
            'to = "5 um"\nother_bands = "yes"',
            r"claim.toml:6: claim.other_bands: expected one of",
        ),
        ('to = "5000 nm"', 'to = "5 um"\nfeature_from = "4.6 um"', r"feature_from: expected both"),
        (
            'to = "5000 nm"',
            'to = "5 um"\nfeature_from = "4.6 um"\nfeature_to = "6 um"',
            r"claim.toml:6: claim.feature_from: expected a stretch inside 4.4 to 5 um",
        ),
    ],
)
def test_invalid(tmp_path, old, new, message):
    """File, line, key, what was expected and what came."""
    path = tmp_path / "claim.toml"
    path.write_text(BARE.replace(old, new))
    with pytest.raises(ScenarioError, match=message):
        read_claim(path)


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ('mode = "medium-grating-3-to-5-um"', 'mode = "medium-grating-3-to-6-um"', r"search.mode: .* did you mean"),
        ('from = "2.9 um"', 'from = "2.2 um"', r"claim.from: expected a range inside that of the mode, 2.87 to 5.1 um"),
        ('radius = "1.00 R_earth"', 'radius = "1.00 R_sun"', r"planet.radius: the planet is larger than its star"),
        ("impact_parameter = 0.25", "impact_parameter = 1.25", r"planet.impact_parameter: no transit"),
        ("background = { N2 = 1.0 }", "background = { CH4 = 1.0 }", r"CH4 is the whole background"),
        ('distance = "12.8 pc"', 'distance = "12.8 pc"\nspectrum = "none.ecsv"', r"star.spectrum: no such file"),
    ],
)
def test_claims_that_do_not_add_up(tmp_path, old, new, message):
    """What needs several values, or files, to be seen as wrong."""
    path = tmp_path / "claim.toml"
    text = starting_claim()
    assert old in text
    path.write_text(text.replace(old, new))
    with pytest.raises(ScenarioError, match=message) as caught:
        read_claim(path)
    assert str(caught.value).startswith(f"{path}:")


def test_missing_file(tmp_path):
    """Says how to get one to start from."""
    with pytest.raises(ScenarioError, match=r"limbcast new --claim"):
        read_claim(tmp_path / "none.toml")
