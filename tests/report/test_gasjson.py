"""The catalogue as JSON: keys as documented, numbers as in the records."""

from __future__ import annotations

import json
import re

import planner.report.gasjson
from planner.catalogue.read import find_gas, read_catalogue, read_hypotheses
from planner.catalogue.sharing import sharing_bands
from planner.report.gasjson import gases_json, write_gases_json

CATALOGUE, HYPOTHESES = read_catalogue(), read_hypotheses()


def tree(*names: str):
    return json.loads(gases_json([find_gas(name) for name in names], CATALOGUE, HYPOTHESES, "0.1.0"))


def test_keys_are_those_documented() -> None:
    """The tables of the docstring name every key of the top and of a gas, and no others."""
    documented = set(re.findall(r"``(\w+)``", planner.report.gasjson.__doc__ or ""))
    found = tree("CFC-11")
    keys = set(found) | set(found["gases"][0])
    assert keys <= documented
    for part in ("origins", "losses", "abundances", "bands", "shared_bands", "companions"):
        assert set(found["gases"][0][part][0]) <= documented


def test_numbers_are_those_of_the_record() -> None:
    """Units as the keys say."""
    gas = tree("CFC-11")["gases"][0]
    assert gas["losses"][0]["lifetime_yr"] == [52, 52]
    assert gas["abundances"][1]["mixing_ratio"] == [226e-12, 226e-12]
    assert gas["greenhouse"]["radiative_efficiency_w_per_m2_ppb"] == 0.291
    assert gas["industry"]["if_true"]["probability"] == 0.3
    assert set(gas["life"]) == {"either_way"}
    assert tuple(gas["rivals"]) == sharing_bands("CFC-11")


def test_several_gases_and_hypotheses() -> None:
    """In the order given, with the context that presences are meant for."""
    found = tree("CO", "CH4")
    assert [gas["formula"] for gas in found["gases"]] == ["CO", "CH4"]
    assert found["format"] == "limbcast gases 1"
    assert "rocky planet" in found["context"]
    assert set(found["hypotheses"]) == {"life", "industry"}


def test_written_whole(tmp_path) -> None:
    """The file holds the text."""
    path = tmp_path / "co.json"
    write_gases_json([find_gas("CO")], CATALOGUE, HYPOTHESES, "0.1.0", path)
    assert json.loads(path.read_text(encoding="utf-8")) == tree("CO")
