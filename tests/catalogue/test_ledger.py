"""Ledgers: the starting one, and every kind of mistake with its place."""

from __future__ import annotations

import re

import pytest

from planner.catalogue.ledger import parse_ledger, read_ledger, starting_ledger
from planner.errors import ScenarioError

HEAD = 'title = "x"\nhypothesis = "life"\n'


def gas(text):
    return f'{HEAD}[[gas]]\ngas = "CH4"\n{text}'


def test_starting_ledger_is_read():
    """As it is, invented, with one gas of each kind."""
    ledger = parse_ledger(starting_ledger())
    assert ledger.invented
    assert [f.found for f in ledger.findings] == ["detected", "not detected", "not looked for"]
    assert ledger.findings[0].significance_sigma == 4.1


def test_commented_keys_of_the_starting_ledger_are_known():
    """Every key that stands there as a comment can be uncommented."""
    text = re.sub(r"^# (?=\[|[a-z_]+ = )", "", starting_ledger(), flags=re.MULTILINE)
    ledger = parse_ledger(text)
    assert ledger.evidence
    assert ledger.beliefs.life.probability == 0.1
    assert ledger.findings[0].bayes_factor == (20, 400)
    assert "CH4" in ledger.beliefs.gases


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("title = 3", "expected a string in quotes"),
        (HEAD, "expected at least one [[gas]] or [[evidence]] table, got none"),
        (HEAD.replace("life", "love"), 'expected one of "life", "industry", got "love"'),
        (gas('found = "seen"'), 'expected one of "detected", "not detected", "not looked for", got "seen"'),
        (gas('found = "detected"'), 'expected a significance or a bayes_factor for what is "detected", got none'),
        (gas('found = "not detected"'), 'expected a limit for what is "not detected", got none'),
        (
            gas('found = "not detected"\nlimit = "1 ppm"\nsignificance = "3 sigma"'),
            "gas[1].significance: belongs to a gas",
        ),
        (gas('found = "detected"\nsignificance = 4.1'), "the unit is missing"),
        (gas('found = "detected"\nsignificance = "4 K"'), "expected a significance"),
        (gas('found = "detected"\nsignificance = "4 sigma"\nmixing_ratio = "1 ppm"'), "a pair [lower, higher]"),
        (gas('found = "not looked for"\ncolour = 1'), "unknown key"),
        (gas('found = "not looked for"\n[[gas]]\ngas = "methane"\nfound = "not looked for"'), "has an entry already"),
        (f'{HEAD}[[gas]]\ngas = "He"\nfound = "not looked for"', "put it down as [[evidence]]"),
        (f'{HEAD}[[evidence]]\nsays = "x"\nif_true = 0\nif_false = 0.5', "expected a probability above 0 up to 1"),
        (f'{HEAD}[shown]\nsecond_signal = "yes"', "expected true or false"),
        ("title = ", "not valid TOML"),
    ],
)
def test_mistakes_are_told_with_their_place(text, message):
    """One message, with file and, where there is one, line."""
    with pytest.raises(ScenarioError, match=re.escape(message)) as caught:
        parse_ledger(text, "my.toml")
    assert str(caught.value).startswith("my.toml")


def test_missing_file_says_how_to_get_one(tmp_path):
    """The command that writes a starting ledger is named."""
    with pytest.raises(ScenarioError, match="limbcast new --ledger"):
        read_ledger(tmp_path / "none.toml")
