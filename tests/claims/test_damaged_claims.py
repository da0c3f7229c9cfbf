"""Two hundred damaged claims, and as many spectra: one clear message each, no traceback, exit status 2."""

from __future__ import annotations

import random
import re

import click
import pytest
from click.testing import CliRunner

from planner.claims.read import read_claim, starting_claim
from planner.claims.spectrum import read_observed
from planner.cli import cli
from planner.commands.audit import audit
from planner.errors import ScenarioError

SPECTRUM = "from [um],to [um],depth [ppm],error [ppm]\n" + "".join(
    f"{3 + 0.1 * k:.1f},{3.1 + 0.1 * k:.1f},{5000 + k},{30 + k}\n" for k in range(12)
)
JUNK = ["\x00", '"x', "[", "]]", "=", "{", "nan", "-1e999", "\\u", "'''", "٣", "#\n[claim]\n"]
COUNT = 200


def damaged_claim(number: int) -> str:
    """A claim with one thing wrong: a value garbled, of the wrong kind or unit, cut off, or a key misspelt or twice."""
    rng = random.Random(number)
    lines = starting_claim().splitlines()
    keys = [i for i, line in enumerate(lines) if " = " in line and not line.startswith("#")]
    place = rng.choice(keys)
    key, _, value = lines[place].partition(" = ")
    kind = number % 6
    if kind == 0:
        lines[place] = f"{key}x = {value}"
    elif kind == 1:
        lines[place] = f"{key} = {value.strip()[: rng.randrange(1, 4)]}" + rng.choice(JUNK)
    elif kind == 2:
        lines[place] = f"{key} = {rng.choice(['-5', '[[1], 2]', '{ a = { b = 1 } }', '1979-05-27', 'inf', '[]'])}"
    elif kind == 3:
        lines = [*lines[:place], lines[place][: len(key) + 2]]
    elif kind == 4:
        lines.insert(place, lines[place])
    else:
        place = rng.choice([i for i in keys if re.search(r'"[\d.]+ \S+"', lines[i])])
        wrong = rng.choice(["", "furlong", "mol", "5 m", ",5 ppm", "um ppm"])
        lines[place] = re.sub(r'"([\d.]+) \S+"', rf'"\1 {wrong}"', lines[place], count=1)
    return "\n".join(lines)


def damaged_spectrum(number: int) -> str:
    """A spectrum with one thing wrong: a cell, a heading, a row, or the end."""
    rng = random.Random(number)
    rows = [line.split(",") for line in SPECTRUM.splitlines()]
    row, column = rng.randrange(1, len(rows)), rng.randrange(4)
    kind = number % 5
    if kind == 0:
        rows[row][column] = rng.choice(["", "nan", "inf", "x", "3 ppm", "1e400", "--", "\x00", "3,3"])
    elif kind == 1:
        rows[0][column] = rng.choice(
            ["", "depth", "um", "wavelength [um]", "error [", "to [furlong2]", "[ppm]", "from [K]"]
        )
    elif kind == 2:
        rows[row] = rows[row][: rng.randrange(1, 4)]
    elif kind == 3:
        rows = rows[: rng.randrange(0, 4)]
    else:
        rows.insert(row, rows[row])
    return "\n".join(",".join(cells) for cells in rows)


@pytest.mark.parametrize("number", range(COUNT))
def test_damaged_claim(tmp_path, number):
    """Every one is refused with the file's name first, and nothing else escapes."""
    path = tmp_path / "claim.toml"
    path.write_text(damaged_claim(number), encoding="utf-8")
    with pytest.raises(ScenarioError) as caught:
        read_claim(path)
    clear(str(caught.value), path)


@pytest.mark.parametrize("number", range(COUNT))
def test_damaged_spectrum(tmp_path, number):
    """The same for the table."""
    path = tmp_path / "spectrum.csv"
    path.write_text(damaged_spectrum(number), encoding="utf-8")
    with pytest.raises(ScenarioError) as caught:
        read_observed(path)
    clear(str(caught.value), path)


def clear(message: str, path) -> None:
    """Short, headed by the file, without the innards of a library."""
    lines = message.splitlines()
    assert all(line.startswith(str(path)) for line in lines), message
    assert 1 <= len(lines) <= 3
    assert "Traceback" not in message
    assert "pydantic" not in message
    assert max(map(len, lines)) < 700


@pytest.mark.parametrize("data", [b"\xff\xfe\x00", bytes(range(256)), b""])
def test_not_text(tmp_path, data):
    """Binary and empty files."""
    path = tmp_path / "file"
    path.write_bytes(data)
    for read in (read_claim, read_observed):
        with pytest.raises(ScenarioError, match=str(path)):
            read(path)


@pytest.mark.parametrize("number", range(0, COUNT, 20))
def test_command_line_says_so_and_exits_2(tmp_path, number):
    """Through the command, whichever of the two files is damaged; nothing on stdout."""
    good, bad, spectrum = tmp_path / "good.toml", tmp_path / "bad.toml", tmp_path / "s.csv"
    good.write_text(starting_claim())
    bad.write_text(damaged_claim(number))
    spectrum.write_text(damaged_spectrum(number))
    group: click.Group = type(cli)(commands={"audit": audit})
    for asked in (["audit", str(bad)], ["audit", str(good), "--spectrum", str(spectrum)]):
        result = CliRunner().invoke(group, asked)
        assert result.exit_code == 2
        assert result.stdout == ""
        assert result.stderr.startswith(str(tmp_path))
