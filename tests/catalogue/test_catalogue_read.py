"""Catalogue files: the shipped ones, and what is wrong with broken ones."""

from __future__ import annotations

import re

import pytest

from planner.catalogue.read import (
    find_gas,
    has_gas,
    list_gases,
    parse_gas,
    parse_hypotheses,
    read_catalogue,
    read_gas,
    read_hypotheses,
)
from planner.catalogue.records import GasRecord
from planner.errors import LineDataError, ScenarioError
from planner.resources import data_folder
from planner.spectroscopy.lists.build import embedded_formulas

FOLDER = data_folder("configs") / "gases"
TEXT = (FOLDER / "CCl3F.toml").read_text(encoding="utf-8")
PROMISED = (
    "CO CO2 N2O HCN C2H2 OCS HCl HF HBr NO NH3 PH3 CH3Cl CH3Br C2H6 CH3OH CH4 H2O O3 SO2 NO2 H2S H2CO C2H4 HNO3 O2 "
    "CCl3F CCl2F2 CHClF2 CHF3 C2H2F4 CCl4 CF4 C2F6 C3F8 SF6 NF3 C2H6S CH3SH CH3CN C5H8"
)


def line_with(text: str, start: str) -> int:
    return next(number for number, line in enumerate(text.splitlines(), 1) if line.startswith(start))


def problem(text: str) -> str:
    with pytest.raises(ScenarioError) as caught:
        parse_gas(text, "gas.toml")
    return str(caught.value)


@pytest.mark.parametrize("formula", PROMISED.split())
def test_promised_gas_reads(formula: str) -> None:
    """Each promised gas has a valid file under its formula, and its formula leads to it."""
    gas = read_gas(FOLDER / f"{formula}.toml")
    assert gas.formula == formula == find_gas(formula).formula


def test_every_embedded_gas_is_recorded() -> None:
    """Whoever adds a line list writes a record too."""
    assert set(embedded_formulas()) <= set(list_gases())


def test_found_by_common_name() -> None:
    """In any case of letters, as everywhere."""
    assert find_gas("cfc-11") is find_gas("CCl3F")
    assert find_gas("dms").formula == "C2H6S"
    assert has_gas("methane")
    assert not has_gas("N2")


def test_catalogue_is_sorted_and_complete() -> None:
    """By formula, one record per file."""
    assert list(read_catalogue()) == sorted(path.stem for path in FOLDER.glob("*.toml"))


def test_gas_without_record() -> None:
    """A known molecule that the catalogue lacks is refused with the list of those it holds."""
    with pytest.raises(ScenarioError, match=r"no record of N2; recorded: .*CCl3F"):
        find_gas("nitrogen")


def test_unknown_molecule() -> None:
    """As everywhere, with near names."""
    with pytest.raises(LineDataError, match="CFC-11"):
        find_gas("CFC-111")


def test_file_name_is_the_formula(tmp_path) -> None:
    """A record under another name is refused."""
    path = tmp_path / "CFC-11.toml"
    path.write_text(TEXT, encoding="utf-8")
    with pytest.raises(ScenarioError, match=r'formula: expected that of the file name, "CFC-11", got "CCl3F"'):
        read_gas(path)


def test_file_that_cannot_be_read(tmp_path) -> None:
    """No such file, and bytes that are not text."""
    with pytest.raises(ScenarioError, match=r"XY\.toml: no such file"):
        read_gas(tmp_path / "XY.toml")
    (tmp_path / "CO.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(ScenarioError, match="not a text file in UTF-8"):
        read_gas(tmp_path / "CO.toml")


@pytest.mark.parametrize(
    ("old", "new", "line", "message"),
    [
        ('class = "industrial"', 'class = "industry"', "class", r'class: expected one of "biogenic", .*"industrial"\?'),
        ('class = "industrial"\n', "", None, r"class: missing; expected one of"),
        ('summary = "', 'sumary = "', "sumary", r'sumary: unknown key; did you mean "summary"\?'),
        ('lifetime = "52 yr"', 'lifetime = "52"', "lifetime", r'loss\[1\]\.lifetime: expected a lifetime .*"52"'),
        ('lifetime = "52 yr"', 'lifetime = "52 km"', "lifetime", r"loss\[1\]\.lifetime: expected a lifetime"),
        ('lifetime = "52 yr"', 'lifetime = ["52 yr", "5 yr"]', "lifetime", r"a pair \[lower, higher\]"),
        ('lifetime = "52 yr"', 'lifetyme = "52 yr"', "lifetyme", r'unknown key; did you mean "lifetime"\?'),
        ('mixing_ratio = "226 ppt"', 'mixing_ratio = "226 m"', 'mixing_ratio = "226', r"abundance\[2\]\.mixing_ratio"),
        ('mixing_ratio = "226 ppt"', "mixing_ratio = true", "mixing_ratio = true", r"abundance\[2\].*got true"),
        ('gas = "CCl2F2"', 'gas = "CFC-111"', "gas", r"companion\[1\]\.gas: .*did you mean CFC-11"),
        ('seen = "present"', 'seen = "here"', "seen", r'seen: expected one of "present", "absent", got "here"'),
        ("[8.98, 9.48, ", "[9.48, 8.98, ", "  [9.48", r"bands\[1\]\.rows: .*each with from < to, got the row"),
        ("probability = 0.3", "probability = 0.9", "probability = 0.9", r"expected a value inside probability_range"),
        ("probability = 0.3", "probability = 1", "probability = 1", r"expected a probability above 0 below 1, got 1"),
        ("0.291 W m-2 ppb-1", "0.291 W m-2", "radiative_eff", r"greenhouse\.radiative_efficiency: .*ppb-1"),
        ("gwp_100 = 6230", "gwp_100 = -1", "gwp_100", r"expected a warming potential above 0, got -1"),
    ],
)
def test_problem_names_line_and_key(old: str, new: str, line: str | None, message: str) -> None:
    """File, line and key, what was expected and what came."""
    assert old in TEXT
    text = TEXT.replace(old, new, 1)
    found = problem(text)
    assert re.search(message, found), found
    if line and "rows" not in message:
        place = f"gas.toml:{line_with(text, line)}: "
        assert any(re.match(re.escape(place), item) and re.search(message, item) for item in found.splitlines())


def test_source_is_owed_for_what_was_read() -> None:
    """A statement flagged as read or computed without its source is refused; one from memory is not."""
    bare = re.sub(r'source = "IPCC[^"]*chapter 7"\n', "", TEXT)
    assert 'loss[1].source: missing; what is flagged "read" must name its source' in problem(bare)
    assert parse_gas(bare.replace('"read"', '"from memory"'), "gas.toml").lifetime_yr == (52, 52)


def test_chance_may_only_be_judgement() -> None:
    """Nobody has measured how often worlds hold a gas."""
    start = TEXT.index("[industry.if_true]")
    text = TEXT[:start] + TEXT[start:].replace('flag = "judgement"', 'flag = "read"', 1)
    assert 'industry.if_true.flag: expected "judgement", got "read"' in problem(text)


@pytest.mark.parametrize("gone", ["[industry.if_false]", "[life.either_way]"])
def test_hypothesis_is_said_in_one_way(gone: str) -> None:
    """Both opposites, or one table for either; nothing half."""
    renamed = gone.replace("if_false", "either_way").replace("life.either_way", "life.if_true")
    assert "expected either the two tables if_true and if_false, or" in problem(TEXT.replace(gone, renamed))


def test_all_problems_at_once_in_the_order_of_the_file() -> None:
    """Nobody wants to mend a file one message at a time."""
    found = problem(TEXT.replace('class = "industrial"', 'class = "x"').replace("gwp_100", "gwp100")).splitlines()
    assert [re.match(r"gas\.toml:\d+: ([\w.]+)", line)[1] for line in found] == ["class", "greenhouse.gwp100"]


def test_text_that_is_not_toml() -> None:
    """The line is named."""
    assert problem("formula = CCl3F\n").startswith("gas.toml:1: not valid TOML")


def test_hypotheses_read() -> None:
    """Two hypotheses with wide priors; a broken file is refused as a gas is."""
    shipped = read_hypotheses()
    for prior in (shipped.life, shipped.industry):
        low, high = prior.probability_range
        assert low < prior.probability < high
        assert prior.flag == "judgement"
    with pytest.raises(ScenarioError, match=r"h\.toml: life: missing; expected a \[life\] table"):
        parse_hypotheses('context = "x"\n', "h.toml")


def test_readme_names_every_key() -> None:
    """The folder's README explains each key and table that a file may hold."""
    readme = (FOLDER / "README.md").read_text(encoding="utf-8")
    for name, field in GasRecord.model_fields.items():
        key = field.alias or name
        assert re.search(rf"`\[*{key}\]*`", readme) or key in ("formula", "summary"), key
