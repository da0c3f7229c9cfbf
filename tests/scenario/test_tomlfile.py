"""Text files that become records: what editors and systems do to them, and whose keys a message names."""

from __future__ import annotations

import pytest

from planner.errors import ScenarioError
from planner.instrument.modes import Mode
from planner.scenario import parse_scenario, read_scenario, starting_scenario
from planner.scenario.tomlfile import parse_as, read_text

MODE = """
name = "M"
[[detector]]
kind = "photometer"
[[detector]]
kind = "spectograph"
[[detector]]
kind = "spectrometer"
nm_pr_pixel = 5
"""


@pytest.mark.parametrize("head", [b"", b"\xef\xbb\xbf"])
@pytest.mark.parametrize("end", [b"\n", b"\r\n"])
def test_ends_of_lines_and_the_mark_at_the_head(tmp_path, head, end):
    """A file saved on another system, with a byte order mark or without, is the same scenario."""
    path = tmp_path / "my scenario.toml"
    path.write_bytes(head + starting_scenario().encode().replace(b"\n", end))
    plain = parse_scenario(starting_scenario(), path)
    assert read_scenario(path).model_dump() == plain.model_dump()


def test_lines_are_counted_as_editors_do(tmp_path):
    """Problems of a file with other ends of lines are where an editor shows them."""
    path = tmp_path / "s.toml"
    path.write_bytes(starting_scenario().replace("mass =", "mas =", 1).replace("\n", "\r\n").encode())
    number = next(i for i, line in enumerate(starting_scenario().splitlines(), 1) if line.startswith("mass ="))
    with pytest.raises(ScenarioError, match=rf"s\.toml:{number}: star\.mas: unknown key; did you mean \"mass\""):
        read_scenario(path)


def test_missing_file_comes_with_its_remedy(tmp_path):
    """A command that writes one, ready to be pasted, where there is one."""
    path = tmp_path / "my file.toml"
    with pytest.raises(ScenarioError, match=r"my file\.toml: no such file$"):
        read_text(path)
    with pytest.raises(ScenarioError, match=f"no such file; `limbcast new '{path}'` writes one"):
        read_text(path, "limbcast new")


def test_misspelt_keys_are_told_once():
    """A needed key under a wrong name is not missing as well; one that is not there at all is."""
    text = starting_scenario().replace("mass =", "mas =", 1).replace("threshold = 5", "")
    with pytest.raises(ScenarioError) as caught:
        parse_scenario(text)
    told = str(caught.value)
    assert told.count("star.mas") == 1
    assert "goal.threshold: missing" in told


def test_kinds_of_a_record():
    """Of records of several kinds a message names place and keys of the kind that the file says, or all kinds."""
    with pytest.raises(ScenarioError) as caught:
        parse_as(Mode, MODE, "m.toml")
    told = str(caught.value).splitlines()
    assert any(
        line.startswith("m.toml:5: detector[2]: ") and '"spectrometer" or "photometer", got "spectograph"' in line
        for line in told
    )
    assert 'm.toml:9: detector[3].nm_pr_pixel: unknown key; did you mean "nm_per_pixel"?' in told
    assert any(line.startswith("m.toml:3: detector[1].") and "missing; expected" in line for line in told)
