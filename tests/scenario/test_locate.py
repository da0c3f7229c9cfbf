"""Lines of keys in TOML text."""

from __future__ import annotations

import tomllib

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.scenario.locate import heading, key_lines, line_of

TEXT = '''# a comment with [brackets] and key = 1
title = "a # not a comment, = not a sign"
note = """
[not.a.header]
mass = "also not"
"""
modes = [
  "one",   # ] not the end
  "two",
]
together = [["A", "B"], ["C"]]

[star]
magnitudes = { J = "11 mag", "Ks" = "10 mag" }
planet.mass = 1.5e-3

[[candidates]]
gas = 'x = y'

[[candidates]]
  gas = "CFC-12"
  mixing_ratio = [1e-9,
    2e-9]
[candidates.more]
deep = true
[atmosphere.cloud]
top = "0.1 bar"
'''


@pytest.mark.parametrize(
    ("place", "line"),
    [
        (("title",), 2),
        (("note",), 3),
        (("modes",), 7),
        (("modes", 1), 9),
        (("together", 0), 11),
        (("together", 1, 0), 11),
        (("star",), 13),
        (("star", "magnitudes"), 14),
        (("star", "magnitudes", "Ks"), 14),
        (("star", "planet", "mass"), 15),
        (("candidates", 0, "gas"), 18),
        (("candidates", 1), 20),
        (("candidates", 1, "gas"), 21),
        (("candidates", 1, "mixing_ratio", 1), 23),
        (("candidates", 1, "more", "deep"), 25),
        (("atmosphere", "cloud"), 26),
        (("atmosphere", "cloud", "top"), 27),
        (("atmosphere",), 26),
    ],
)
def test_line_of(place, line):
    """Keys, headers, entries of arrays and keys of inline tables are found where they stand."""
    assert line_of(TEXT, place) == line


def test_line_of_falls_back_outwards():
    """A key that is missing gets the line of the table that lacks it, and none when that is missing as well."""
    assert line_of(TEXT, ("star", "radius")) == 13
    assert line_of(TEXT, ("mass",)) is None
    assert line_of(TEXT, ("goal", "threshold")) is None


def test_windows_line_ends():
    """Carriage returns do not move the count."""
    assert line_of(TEXT.replace("\n", "\r\n"), ("candidates", 1, "gas")) == 21


def test_heading_counts_entries_from_one():
    """Messages count entries the way people do."""
    assert heading(TEXT, "a.toml", ("candidates", 1, "gas")) == "a.toml:21: candidates[2].gas"
    assert heading(TEXT, "a.toml", ("goal",)) == "a.toml: goal"


_KEYS = st.sampled_from(["a", "b", "c", "long-key", "k_9"])
_VALUES = st.sampled_from(
    ['"x = [1]"', "1.5e-3", "true", "[1, [2, 3],\n 4]", "{ p = 1, q = [2] }", "'#'", '"""\n[z]\n"""']
)


@given(tables=st.lists(st.tuples(_KEYS, st.booleans(), st.dictionaries(_KEYS, _VALUES)), max_size=6))
@settings(derandomize=True, deadline=None, max_examples=200)
def test_every_key_is_found(tables):
    """Of any file built line by line, each key is found on the line it was written on."""
    lines, expected, seen = [], {}, {}
    for name, is_array, pairs in tables:
        array = seen.setdefault(name, (is_array, []))[0]
        if not array and seen[name][1]:
            continue
        seen[name][1].append(1)
        place = (name, len(seen[name][1]) - 1) if array else (name,)
        lines.append(f"[[{name}]]" if array else f"[{name}]  # header")
        expected[place] = len("\n".join(lines).split("\n"))
        for key, value in pairs.items():
            start = len("\n".join(lines).split("\n")) + 1
            lines.append(f"{key} = {value}")
            expected[(*place, key)] = start
    text = "\n".join(lines)
    tomllib.loads(text)
    found = key_lines(text)
    assert {place: found.get(place) for place in expected} == expected
