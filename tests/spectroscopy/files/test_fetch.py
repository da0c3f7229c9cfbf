"""Fetching lines from a small server on this machine that speaks as HITRANonline does, its failures included.

The way is the true one: hapi forms the request and downloads; only the address is ours.
"""

from __future__ import annotations

import contextlib
import gzip
import io
import socket
import sys

import numpy as np
import pytest

from planner.errors import LineDataError, OutputError
from planner.spectroscopy.coverage import read_declarations
from planner.spectroscopy.files.fetch import WIDTH_GASES, FetchOrder, fetch_lines, order_lines
from planner.spectroscopy.files.service import LineService
from planner.spectroscopy.hitran import read_par
from planner.spectroscopy.molecules import find_molecule, quiet_hapi
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store


@pytest.fixture
def ask(service, tmp_path, monkeypatch):
    """Fetch CO2 from the service into a folder; rests are noted, not taken."""
    (tmp_path / "cwd").mkdir()
    monkeypatch.chdir(tmp_path / "cwd")
    service.rests = []

    def run(order: FetchOrder | None = None, *, timeout_s=1.0, tries=3, today="2026-03-01", progress=None):
        line_service = LineService(
            service.address, timeout_s=timeout_s, tries=tries, pause_s=1.0, sleep=service.rests.append
        )
        return fetch_lines(
            order or order_lines(find_molecule("CO2"), 500.0, 2500.0, 1e-3), tmp_path / "lines", line_service,
            today=today, progress=progress or (lambda text, share: None),
        )  # fmt: skip

    return run


def test_what_comes_is_what_the_service_has(ask, service, tmp_path):
    """All records of the range and isotopologues, in one file, with their widths beside and their record."""
    result = ask()
    lines = read_par(result.path)
    assert len(lines) == result.records
    np.testing.assert_array_equal(lines.isotopologue, service.lines.isotopologue)
    np.testing.assert_array_equal(lines.wavenumber_per_cm, service.lines.wavenumber_per_cm)
    assert sorted(path.name for path in (tmp_path / "lines").iterdir()) == [
        "CO2_500-2500_hitranonline.par.gz", "CO2_500-2500_hitranonline.widths.csv.gz", "coverage.toml",
    ]  # fmt: skip
    (row,) = read_declarations(tmp_path / "lines" / "coverage.toml")[result.path.name]
    assert (row.formula, row.isotopologues, row.interval_per_cm) == ("CO2", (1, 2, 3), (500.0, 2500.0))
    assert row.edition == "HITRANonline 2026-03-01"
    assert f"from {service.address} through hapi" in row.fetched
    assert "on 2026-03-01, isotopologues with an abundance of 0.001 or more" in row.fetched


def test_the_service_here_speaks_as_hapi_reads(service, tmp_path, monkeypatch):
    """hapi itself, asked directly, reads from the answers of this test's server what the server has."""
    hapi = sys.modules[quiet_hapi().queryHITRAN.__module__]
    monkeypatch.setitem(hapi.VARIABLES, "GLOBAL_HOST", service.address)
    monkeypatch.setitem(hapi.VARIABLES, "BACKEND_DATABASE_NAME", str(tmp_path))
    with contextlib.redirect_stdout(io.StringIO()):
        hapi.fetch_by_ids("x", [7], 500, 750, ParameterGroups=["160-char"], Parameters=["gamma_H2", "n_H2", "n_He"])
    table = hapi.LOCAL_TABLE_CACHE.pop("x")["data"]
    mine = service.lines.where((service.lines.isotopologue == 1) & (service.lines.wavenumber_per_cm < 750))
    np.testing.assert_array_equal(table["nu"], mine.wavenumber_per_cm)
    np.testing.assert_array_equal(table["gamma_h2"], np.full(len(mine), 0.105))
    np.testing.assert_array_equal(table["n_h2"], np.full(len(mine), 0.6))
    assert np.all(np.ma.getmaskarray(table["n_he"]))


def test_the_record_of_a_fetch_is_its_coverage(ask, tmp_path):
    """The folder serves as --lines at once: declared range, isotopologues, day, and the widths in other gases."""
    ask()
    source = LineLibrary(Store(tmp_path / "store"), tmp_path / "lines").gas("CO2")
    assert any("isotopologue 1 over 500-2500 per cm" in s and "HITRANonline 2026-03-01" in s for s in source.provenance)
    here = (source.lines.wavenumber_per_cm > 510) & (source.lines.wavenumber_per_cm < 2400)
    here &= source.lines.isotopologue <= 3
    np.testing.assert_allclose(source.widths.by_gas["H2"][:, here], [[0.105], [0.6]] * np.ones(here.sum()))
    assert np.all(np.isnan(source.widths.by_gas["He"][1]))
    assert set(source.widths.by_gas) == {"H2", "He"}


def test_questions_are_as_hapi_asks_them(ask, service):
    """One stretch of 250 per cm at a time, all isotopologues at once, a rest between, and who is asking."""
    ask()
    first = service.questions[0]
    assert first["path"] == "/lbl/api"
    assert (float(first["numin"]), float(first["numax"])) == (500.0, 750.0)
    assert first["iso_ids_list"] == "7,8,9"
    assert first["request_params"].startswith("par_line,gamma_H2,n_H2,")
    assert all(f"gamma_{gas}" in first["request_params"] for gas in WIDTH_GASES)
    assert first["agent"].startswith("limbcast/")
    assert service.rests == [1.0] * (len(service.questions) - 1)


def test_stretches_without_lines_are_asked_again_with_their_neighbours(ask, service):
    """404 means no lines or a fault; a stretch is taken to be empty only inside an answer that has lines."""
    ask()
    asked = [(float(q["numin"]), float(q["numax"])) for q in service.questions]
    assert (1750.0, 2000.0) in asked  # empty
    assert (1750.0, 2500.0) in asked  # again, with what follows
    assert asked[-1][1] == 2500.0


def test_an_empty_end_is_confirmed_by_the_last_line(ask, service):
    """At the end of the range there is nothing to follow: the last line known has to come with the answer."""
    order = order_lines(find_molecule("CO2"), 500.0, 2250.0, 0.9)
    result = ask(order)
    last = service.lines.wavenumber_per_cm[(service.lines.isotopologue == 1) & (service.lines.wavenumber_per_cm < 2000)]
    assert read_par(result.path).wavenumber_per_cm[-1] == last[-1]
    assert float(service.questions[-1]["numin"]) == last[-1]


def test_an_empty_body_is_an_answer_without_lines(ask, service):
    """Nothing with status 200 is treated as nothing found."""
    service.faults = ["nothing_found"]
    result = ask()
    np.testing.assert_array_equal(read_par(result.path).wavenumber_per_cm, service.lines.wavenumber_per_cm)


@pytest.mark.parametrize(
    "fault",
    [
        "truncated", "truncated_between_records", "truncated_chunks", "garbage", "binary", "other_molecule",
        "other_range", "other_parameters", "503", "429", "drop", "hang", "stall", "slow_start", "404",
    ],
)  # fmt: skip
def test_one_failure_is_overcome(ask, service, fault):
    """Whatever goes wrong once, the second attempt mends; every record comes once."""
    service.faults = [fault]
    result = ask(timeout_s=0.5)
    np.testing.assert_array_equal(read_par(result.path).wavenumber_per_cm, service.lines.wavenumber_per_cm)


@pytest.mark.parametrize(
    ("fault", "message"),
    [
        ("hang", r"500-750 per cm: no answer within 0.2 s \(3 tries\); run the same command again later"),
        ("stall", r"no answer within 0.2 s \(3 tries\)"),
        ("truncated", r"the answer ended early, after \d+ of \d+ bytes \(3 tries\)"),
        ("truncated_between_records", r"the answer ended early, after \d+ of \d+ bytes \(3 tries\)"),
        ("truncated_chunks", r"the answer ended early, after \d+ bytes \(3 tries\)"),
        ("404", r"no lines of CO2 in 500-2500 per cm: every answer was 404 \(not found\) or empty; check the gas"),
        ("garbage", r"not line records: line:1: record: expected 160 characters, got 5\d.* \(3 tries\)"),
        ("binary", r"hapi failed: 'utf-8' codec can't decode|not line records"),
        ("other_molecule", r"not line records: (lines of other molecules than CO2|line:\d+: isotopologue)"),
        ("other_range", r"not line records: lines from 9999 to 9999 per cm, outside 500-750 per cm"),
        ("other_parameters", r"not line records: line:1: expected a record and 8 parameters"),
        ("403", r"refused \(403\): the daily limit of queries may be reached; run the same command again later"),
        ("400", r"answered 400 Bad Request; run the same command again later"),
        ("503", r"answered 503 Service Unavailable \(3 tries\)"),
        ("drop", r"cannot be reached: .+ \(3 tries\)"),
    ],
)
def test_each_lasting_failure_is_one_clear_sentence(ask, service, tmp_path, fault, message):
    """What failed, where, how often it was tried and what to do; nothing is left that looks like data."""
    service.always = fault
    with pytest.raises(LineDataError, match=message) as caught:
        ask(timeout_s=0.2)
    assert "\n" not in str(caught.value)
    assert service.address in str(caught.value)
    assert [path.name for path in (tmp_path / "lines").iterdir()] == [".fetch"]


def test_nobody_there(ask, service, tmp_path):
    """An address where nothing listens is told as such."""
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        service.address = f"http://127.0.0.1:{free.getsockname()[1]}"
        with pytest.raises(LineDataError, match=r"cannot be reached: connection refused \(3 tries\)"):
            ask()


def test_rests_grow_after_failures(ask, service):
    """After each failure the rest doubles; what the service asks for is respected up to two minutes."""
    service.faults = ["503", "503"]
    ask()
    assert service.rests[:5] == [2.0, 1.0, 4.0, 1.0, 1.0]
    service.rests.clear()
    service.faults = ["429"]
    ask(order_lines(find_molecule("CO2"), 500.0, 700.0, 0.9))
    assert 7.0 in service.rests


def test_a_second_run_takes_up_where_the_first_ended(ask, service, tmp_path):
    """What came before the failure is kept and not asked for again; the record names both days."""
    service.faults = ["well", "well", *["503"] * 3]
    with pytest.raises(LineDataError, match="1000-1250 per cm: answered 503"):
        ask()
    assert len(list((tmp_path / "lines" / ".fetch").glob("*/*-*.txt"))) == 2
    service.questions.clear()
    result = ask(today="2026-03-02")
    assert float(service.questions[0]["numin"]) == 1000.0
    np.testing.assert_array_equal(read_par(result.path).wavenumber_per_cm, service.lines.wavenumber_per_cm)
    (row,) = read_declarations(tmp_path / "lines" / "coverage.toml")[result.path.name]
    assert "on 2026-03-01 to 2026-03-02" in row.fetched
    assert not (tmp_path / "lines" / ".fetch").exists()


def test_an_interrupt_loses_nothing_that_came(ask, service, tmp_path):
    """Stopped in the middle, the next run goes on from there."""

    def stop_at_1000(text, share):
        if share >= 0.25:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        ask(progress=stop_at_1000)
    service.questions.clear()
    assert len(read_par(ask().path)) == len(service.lines)
    assert float(service.questions[0]["numin"]) == 1000.0


def test_a_finished_fetch_is_not_repeated(ask, service):
    """The same command again asks nothing and says what is there."""
    ask()
    service.questions.clear()
    again = ask(today="2026-04-01")
    assert again.records is None
    assert "there already, from http://127.0.0.1" in again.sentence
    assert "on 2026-03-01" in again.sentence
    assert service.questions == []


def test_two_runs_at_once(ask, service, tmp_path):
    """While one run is at work on an order, a second is refused."""
    refused = []

    def try_again(text, share):
        if not refused:
            refused.append(True)
            with pytest.raises(OutputError, match="another run is fetching the same"):
                ask()

    ask(progress=try_again)
    assert refused


def test_nothing_of_hapi_is_left(ask, service, tmp_path):
    """Its tables go to a temporary folder; its settings are as before; it says nothing."""
    hapi = sys.modules[quiet_hapi().queryHITRAN.__module__]
    before = (dict(hapi.VARIABLES), hapi.urllib2, set(hapi.LOCAL_TABLE_CACHE))
    service.faults = ["garbage", "truncated"]
    ask()
    assert (dict(hapi.VARIABLES), hapi.urllib2, set(hapi.LOCAL_TABLE_CACHE)) == before
    assert list((tmp_path / "cwd").iterdir()) == []


def test_hapi_is_silent(ask, capsys):
    """Nothing is printed by the library."""
    ask()
    assert capsys.readouterr() == ("", "")


def test_progress_ascends_to_the_end(ask):
    """The share done never falls and ends at one."""
    shares = []
    ask(progress=lambda text, share: shares.append(share))
    assert shares == sorted(shares)
    assert (shares[0], shares[-1]) == (0.0, 1.0)


def test_an_unwritable_folder(service, tmp_path):
    """A file where the folder should be is refused before anything is asked."""
    (tmp_path / "lines").write_text("in the way")
    with pytest.raises(OutputError, match="expected a folder, got a file"):
        fetch_lines(
            order_lines(find_molecule("CO2"), 500.0, 700.0, 0.9), tmp_path / "lines", LineService(service.address),
            today="2026-03-01", progress=lambda text, share: None,
        )  # fmt: skip
    assert service.questions == []


@pytest.mark.parametrize(
    ("gas", "low", "high", "abundance", "message"),
    [
        ("CFC-11", 500, 700, 1e-6, "CCl3F: HITRAN has no line records of it"),
        ("CO2", 500, 700, 0.999, "CO2: no isotopologue has an abundance of 0.999 or more"),
        ("CO2", 700, 500, 1e-6, "range: expected 0 <= from < to in 1/cm, got 700 to 500"),
    ],
)
def test_orders_that_make_no_sense(gas, low, high, abundance, message):
    """Gas, abundance and range are checked before anything is asked."""
    with pytest.raises(LineDataError, match=message):
        order_lines(find_molecule(gas), low, high, abundance)


def test_widths_that_belong_to_other_records_are_refused(ask, tmp_path):
    """A file of records that was changed no longer fits its widths."""
    path = ask().path
    rows = gzip.decompress(path.read_bytes()).splitlines(keepends=True)
    path.write_bytes(gzip.compress(b"".join(rows[1:])))
    with pytest.raises(LineDataError, match=r"widths\.csv\.gz:1: these widths belong to other line records"):
        LineLibrary(Store(tmp_path / "store"), tmp_path / "lines")
