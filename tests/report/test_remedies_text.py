"""What would help, in words, in the table and in the JSON."""

from __future__ import annotations

import json
import math
from dataclasses import replace

import pytest

from planner.report.jsonio import plan_json
from planner.report.remedies import confusion_text, remedy_text, rivals_text
from planner.report.table import plan_text
from planner.studies.results import Remedy, RemedyKind, Rival

MODE = Remedy(
    kind=RemedyKind.MODE, enough=True, transits=100, snr=6.1, mode="grism-4-to-5-um", band_um=(4.2, 4.52),
    transits_required=40, hours_required=321.0,
)  # fmt: skip
FLOOR = Remedy(kind=RemedyKind.FLOOR, enough=True, transits=100, snr=5.0, floor_factor=0.43, floor_ppm=21.5)
AMOUNT = Remedy(kind=RemedyKind.AMOUNT, enough=True, transits=100, snr=5.0, mixing_ratio=1.2e-6)
SKY = Remedy(kind=RemedyKind.SKY, enough=False, transits=100, snr=3.3, cloud_top_bar=math.inf)
RIVALS = (
    Rival(gas="CCl3F", mixing_ratio=2.3e-10, snr_left=1.4, snr=2.1, transits=100),
    Rival(gas="SF6", mixing_ratio=1e-11, snr_left=2.1, snr=2.1, transits=100),
)


@pytest.fixture
def row(fake_plan):
    """CFC-12, out of reach by the floor, in the mid-infrared."""
    return replace(fake_plan.rows[3], rivals=RIVALS, remedies=(MODE, FLOOR, AMOUNT, SKY))


@pytest.mark.parametrize(
    ("remedy", "sentence"),
    [
        (
            MODE,
            "grism-4-to-5-um as well: 6.10 sigma after 100 transits with each, most through 4.20-4.52 um; "
            "needed: 40 with each, 321 h in all",
        ),
        (replace(MODE, enough=False, transits_required=400, hours_required=3210.0), "more than there are"),
        (replace(MODE, enough=False, transits_required=None), "no number of transits is enough"),
        (FLOOR, "a floor of 22 ppm, 0.43 of the present one: within reach after 100 transits"),
        (replace(FLOOR, floor_ppm=None), "floors at 0.43 of the present one: within reach after 100 transits"),
        (
            replace(FLOOR, enough=False, floor_factor=0.0, snr=4.2),
            "without any floor: still only 4.20 sigma after 100 transits",
        ),
        (AMOUNT, "1.2 ppm of CFC-12 (2 400 times as much): within reach after 100 transits"),
        (SKY, "a sky without clouds: still only 3.30 sigma after 100 transits"),
        (replace(SKY, enough=True, cloud_top_bar=0.31), "a cloud top at 0.31 bar: within reach after 100 transits"),
    ],
)
def test_sentences(row, remedy, sentence):
    """Each remedy is quantified, and says whether it is enough."""
    assert sentence in remedy_text(remedy, row)


def test_confusion_in_a_phrase(row):
    """What the unknowns cost, all together, and which cost most."""
    assert confusion_text(row) == "confused with CO2 and radius: 5.00 becomes 1.19"
    assert confusion_text(replace(row, confusion=())) == ""


def test_rivals_in_a_phrase():
    """The rivals that matter with what they leave, and all that were tried."""
    text = rivals_text(RIVALS)
    assert "2.10 sigma after 100 transits would become: CFC-11 at 230 ppt 1.40" in text
    assert "(tried: CFC-11, SF6)" in text
    assert "none would matter: SF6" in rivals_text(RIVALS[1:])


@pytest.mark.parametrize("width", [80, 120])
def test_remedies_in_the_table(fake_plan, row, width):
    """The block tells how the search stands and what would help, without cutting anything."""
    text = plan_text(replace(fake_plan, rows=(row,), spectra=fake_plan.spectra[3:4]), width)
    block = " ".join(text[text.index("What would help") : text.index("Held unknown")].split())
    assert "at most 2.20 sigma however many transits; confused with CO2 and radius" in block
    for sentence in ("321 h in all", "22 ppm", "2 400 times", "without clouds", "CFC-11 at 230 ppt 1.40"):
        assert sentence in block
    assert max(map(len, text.splitlines())) <= width


def test_no_block_without_remedies(fake_plan):
    """A plan with nothing to advise does not speak of it."""
    assert "What would help" not in plan_text(fake_plan)


def test_remedies_in_the_json(fake_plan, row):
    """All figures leave, with the sentence; no cloud at all is null."""
    entry = json.loads(plan_json(replace(fake_plan, rows=(row,))))["rows"][0]
    assert [remedy["kind"] for remedy in entry["remedies"]] == [kind.value for kind in RemedyKind]
    assert entry["remedies"][0]["band_um"] == [4.2, 4.52]
    assert entry["remedies"][1]["floor_ppm"] == 21.5
    assert entry["remedies"][3]["cloud_top_bar"] is None
    assert all(remedy["says"] for remedy in entry["remedies"])
    assert entry["rivals"][0] == {
        "gas": "CCl3F", "mixing_ratio": 2.3e-10, "snr_left": 1.4, "snr": 2.1, "transits": 100
    }  # fmt: skip
    assert entry["confused_from"] == 5.0
