"""The commands choose and odds: what they call, print, write and return."""

from __future__ import annotations

import json
from types import SimpleNamespace

import pytest
from click.testing import CliRunner

from planner.catalogue.ledger import read_ledger, starting_ledger
from planner.cli import cli
from planner.detection.pattern import PatternBits
from planner.detection.worth import Worth
from planner.scenario import starting_scenario
from planner.studies.choices import Choice, ChoiceResult, Pattern
from planner.studies.results import BandShare, Counts, PlanRow, Verdict


def counts(transits):
    return Counts(
        snr_one_transit=1.0, snr_limit=9.0 if transits else 2.0, transits_required=transits,
        transits_unrounded=None if transits is None else float(transits),
        hours_required=None if transits is None else 3.0 * transits,
        in_transit_hours_required=None if transits is None else 0.9 * transits,
    )  # fmt: skip


def choice(gas, mode, bits, transits, tells=True):
    row = PlanRow(
        gas=gas, mixing_ratio=1e-6, mode=mode, verdict=Verdict.WITHIN_REACH if transits else Verdict.FLOOR,
        marginalised=counts(transits), all_known=counts(transits),
        best_bands=(BandShare(from_um=3.2, to_um=3.4, share=0.8),), confusion=(("CO2", 3.0),),
        confused_from=5.0, confused_to=3.0,
        uncovered_um=(), saturated_um=(), cautions=(),
    )  # fmt: skip
    return Choice(
        gas=gas, mode=mode, mixing_ratio=1e-6, mixing_ratio_range=(1e-7, 1e-5), tells=tells, plan=row, transits=20,
        snr=3.0, reachable_ratio=2e-6 if transits else None, limit_ratio=None, excluded_ratio=None, resembling=None,
        uniqueness=1.0,
        worth=Worth(prior=0.1, amplitude_bits=bits, detection_bits=bits / 2, detected_if_true=0.4,
                    detected_if_false=0.1),
        bits_spread=(bits / 2, 2 * bits), after_detection_spread=(0.1, 0.5), after_null_spread=(0.01, 0.09), wins=0.5,
    )  # fmt: skip


def made_up():
    return ChoiceResult(
        title="Made up", invented=True, hypothesis="life", means="life", opposite="none", context="a planet", prior=0.1,
        prior_range=(0.01, 0.5), prior_because="why", most_bits=0.47, hours=60.0, threshold_sigma=5.0, power=0.5,
        choices=(choice("CH4", "a-mode", 0.1, 15), choice("O3", "b-mode", 0.01, None),
                 choice("CO2", "a-mode", 0.0, 9, False), choice("CH4", "b-mode", 0.0, None),
                 choice("O3", "a-mode", 0.0, None),
                 choice("CO2", "b-mode", 0.0, None, False)),
        patterns=(Pattern(gases=("CH4", "O3"), mode="a-mode", how="literature", snr=4.0, transits_required=None,
                          joint=PatternBits(bits=0.12, error=0.001, without=(0.01, 0.1)), alone_bits=(0.1, 0.01),
                          droppable=(), best_single=("CH4", 0.1)),),
        without_data=("NO2",), opinions=400, nobody_wins=0.0, accuracy=("well",), assumptions=("some",),
        line_data=("CH4: embedded",), nuisances=(("radius", "5 %"),), cautions=("judgement",), version="0",
    )  # fmt: skip


@pytest.fixture
def calls(monkeypatch):
    """A study that answers at once, and what it was asked."""
    asked = []

    def study(scenario, **more):
        asked.append(SimpleNamespace(scenario=scenario, **more))
        return made_up()

    monkeypatch.setattr("planner.studies.choose.choose", study)
    return asked


@pytest.fixture
def scenario(tmp_path):
    path = tmp_path / "my.toml"
    path.write_text(starting_scenario())
    return path


def run(*arguments):
    return CliRunner().invoke(cli, [str(argument) for argument in arguments])


def test_choose_passes_on_what_it_was_asked(scenario, calls):
    """Gases, modes, hours with their unit, hypothesis and patterns."""
    answer = run(
        "choose", scenario, "--gases", "CH4, CFC-11", "--modes", "mid-infrared-slitless", "--hours", "2 d",
        "--hypothesis", "industry", "--pattern", "CH4,CO2", "--pattern", "CH4,CO",
    )  # fmt: skip
    assert answer.exit_code == 0, answer.output
    (asked,) = calls
    assert asked.gases == ("CH4", "CFC-11")
    assert asked.scenario.modes == ("mid-infrared-slitless",)
    assert asked.hours == 48
    assert asked.hypothesis == "industry"
    assert asked.together == (("CH4", "CO2"), ("CH4", "CO"))
    assert "CH4" in answer.output


def test_choose_writes_all_its_files(scenario, calls, tmp_path):
    """JSON, table and two figures in two formats, named on stderr."""
    answer = run("choose", scenario, "--out", tmp_path / "out", "--json", tmp_path / "c.json")
    assert answer.exit_code == 0, answer.output
    names = {"choice.json", "choice.ecsv", "worth.png", "worth.pdf", "transits.png", "transits.pdf"}
    assert {path.name for path in (tmp_path / "out").iterdir()} == names
    assert json.loads((tmp_path / "c.json").read_text())["rows"][0]["gas"] == "CH4"


def test_choose_to_stdout_is_json_alone(scenario, calls):
    """For pipes."""
    assert json.loads(run("choose", scenario, "--json", "-").stdout)["format"] == "limbcast choose 1"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("--modes", "no-such-mode"), "no-such-mode"),
        (("--hours", "60"), "the unit is missing"),
        (("--hours", "60 K"), "expected a time"),
        (("--gases", ","), "names with commas"),
        (("--json", "/no/such/folder/x.json"), "does not exist"),
    ],
)
def test_bad_input_is_refused_before_the_work(scenario, calls, arguments, message):
    """Exit status 2, one message, no study run."""
    answer = run("choose", scenario, *arguments)
    assert answer.exit_code == 2
    assert message in answer.output
    assert not calls


def test_odds_of_the_starting_ledger(tmp_path):
    """Table on stdout, JSON in a file."""
    assert run("new", "--ledger", tmp_path / "l.toml").exit_code == 0
    assert read_ledger(tmp_path / "l.toml").title == "My planet"
    answer = run("odds", tmp_path / "l.toml", "--json", tmp_path / "o.json")
    assert answer.exit_code == 0, answer.output
    assert "Chance after the findings" in answer.output
    assert json.loads((tmp_path / "o.json").read_text())["hypothesis"] == "life"
    again = run("new", "--ledger", tmp_path / "l.toml")
    assert (again.exit_code, "exists already" in again.output) == (2, True)


def test_damaged_ledgers_give_one_message_each(tmp_path):
    """Cut short, keys swapped, bytes lost: exit status 0 or 2, never a traceback."""
    text = starting_ledger()
    damaged = [text[: len(text) * k // 40] for k in range(40)]
    damaged += [text.replace(word, "?") for word in ("gas", "found", "sigma", '"', "[[", "=", "ppm", "true", "life")]
    for number, content in enumerate(damaged):
        path = tmp_path / f"{number}.toml"
        path.write_text(content)
        answer = run("odds", path)
        assert answer.exit_code in (0, 2), content
        assert answer.exit_code == 0 or str(path) in answer.output.replace("\n", "")
        assert answer.exception is None or isinstance(answer.exception, SystemExit)
