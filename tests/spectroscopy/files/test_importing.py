"""Taking files into a folder: what is said of them, what is written, what is refused."""

from __future__ import annotations

import gzip
import re

import numpy as np
import pytest

from planner.errors import LineDataError, OutputError
from planner.spectroscopy.files.importing import ColumnMeaning, Promise, import_files
from planner.spectroscopy.hitran import format_par, write_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store


def lines_of(molecule, low=1000.0, high=1100.0, count=400, isotopologue=1):
    rng = np.random.default_rng(molecule)
    return Lines.make(
        molecule=molecule, isotopologue=isotopologue, wavenumber_per_cm=np.linspace(low, high, count),
        intensity_cm=10.0 ** rng.uniform(-24, -20, count), lower_energy_per_cm=100.0, air_width_per_cm_atm=0.07,
        temperature_exponent=0.7, self_width_per_cm_atm=0.1,
    )  # fmt: skip


@pytest.fixture
def store(tmp_path):
    return Store(tmp_path / "store")


@pytest.fixture
def inbox(tmp_path):
    folder = tmp_path / "inbox"
    folder.mkdir()
    return folder


def test_all_kinds_at_once(inbox, tmp_path, store, make_xsc, make_cia):
    """Line records (mixed gases, gzip), cross-sections and collision blocks; every file is described and written."""
    write_par(inbox / "mixed.par.gz", Lines.join([lines_of(43), lines_of(52)]))
    (inbox / "freon.xsc").write_text(make_xsc(values=np.r_[np.full(30, 1e-19), -1e-21]))
    (inbox / "pair.cia").write_text(make_cia())
    report = import_files([inbox], tmp_path / "lines", store)
    said = "\n".join(report.files)
    assert (
        "mixed.par.gz: 800 line records from 1000.00 to 1100.00 per cm, gases and isotopologues C4H2 1, GeH4 1" in said
    )
    assert "freon.xsc:1: cross-sections of CCl3F at 293 K and 7.5 Torr from 830.00 to 860.00 per cm, 31 points" in said
    assert "1 negative and 0 zero values of 31" in said
    assert "pair.cia: 2 blocks of H2-N2 pairs at 200 to 300 K from 100.00 to 139.00 per cm" in said
    assert sorted(path.name for path in (tmp_path / "lines").iterdir()) == ["freon.xsc", "mixed.par.gz", "pair.cia"]


def test_the_report_says_what_is_not_used(inbox, tmp_path, store):
    """Without an embedded list and without a promise nothing is used, and the way out is named."""
    write_par(inbox / "a.par", lines_of(43))
    report = import_files([inbox / "a.par"], tmp_path / "lines", store)
    assert report.used == ()
    assert "no embedded list to judge it by; declare it in coverage.toml" in report.unused[0]


def test_a_promise_is_written_and_believed(inbox, tmp_path, store):
    """What the user declares goes into coverage.toml and stands from then on; older declarations stay."""
    write_par(inbox / "a.par", lines_of(43))
    write_par(inbox / "b.par", lines_of(52))
    folder = tmp_path / "lines"
    import_files(
        [inbox / "a.par"], folder, store, promise=Promise(interval_per_cm=(990.0, 1110.0), edition="HITRAN2020")
    )
    report = import_files([inbox / "b.par"], folder, store, promise=Promise(interval_per_cm=(1000.0, 1100.0)))
    assert report.used == ("GeH4: isotopologue 1 over 1000-1100 per cm from b.par (edition not named, "
                           + report.used[0][-9:],)  # fmt: skip
    source = LineLibrary(store, folder).gas("C4H2")
    assert source.covers_per_cm == ((990.0, 1110.0),)
    assert "from a.par (HITRAN2020" in source.provenance[0]


def test_a_folder_can_declare_its_own_files(inbox, store):
    """Importing a file into the folder it lies in only writes the declaration."""
    write_par(inbox / "a.par", lines_of(43))
    import_files([inbox / "a.par"], inbox, store, promise=Promise(interval_per_cm=(990.0, 1110.0), isotopologues=(1,)))
    assert sorted(path.name for path in inbox.iterdir()) == ["a.par", "coverage.toml"]
    assert LineLibrary(store, inbox).gas("C4H2").covers_per_cm == ((990.0, 1110.0),)


def test_importing_twice_changes_nothing(inbox, tmp_path, store):
    """The same file again is the same folder."""
    write_par(inbox / "a.par.gz", lines_of(43))
    first = import_files([inbox], tmp_path / "lines", store)
    before = (tmp_path / "lines" / "a.par.gz").read_bytes()
    assert import_files([inbox], tmp_path / "lines", store) == first
    assert (tmp_path / "lines" / "a.par.gz").read_bytes() == before


def test_two_columns(inbox, tmp_path, store):
    """A table of text becomes a .xsc file; the note says how."""
    (inbox / "so2.txt").write_text("\n".join(f"{nu:.2f} {1e-20:.4e}" for nu in np.arange(1000.0, 1010.0, 0.5)))
    meaning = ColumnMeaning(formula="C4H2", x_unit="1/cm", y_unit="cm2", temperature_k=296.0, pressure_bar=0.0)
    report = import_files([inbox / "so2.txt"], tmp_path / "lines", store, columns=meaning)
    assert report.files[-1] == "so2.txt: two columns in 1/cm and cm2, evenly spaced as it stands, kept to four digits"
    assert [path.name for path in (tmp_path / "lines").iterdir()] == ["so2.xsc"]
    assert LineLibrary(store, tmp_path / "lines").gas("C4H2").covers_per_cm == ((1000.0, 1009.5),)


def test_records_that_stand_twice_are_counted(inbox, tmp_path, store):
    """Published files hold exact duplicates; they are counted, not removed."""
    lines = lines_of(43, count=10)
    write_par(inbox / "a.par", Lines.join([lines, lines.where(np.array([3, 4]))]))
    assert "; 2 records stand twice" in import_files([inbox], tmp_path / "lines", store).files[0]


@pytest.mark.parametrize(
    ("name", "content", "message"),
    [
        ("a.txt", b"1 2\n", r"a\.txt: expected a \.par, \.xsc or \.cia file"),
        ("a.par", b"nonsense\n", r"a\.par:1: record: expected 160 characters"),
        ("a.xsc", b"nonsense\n", r"a\.xsc:1: header"),
        ("a.cia", b"nonsense\n", r"a\.cia:1: header"),
        ("a.cia.gz", gzip.compress(b"x" * 500)[:-6], r"a\.cia\.gz: expected a readable file"),
    ],
)
def test_nothing_is_written_when_a_file_is_refused(inbox, tmp_path, store, name, content, message):
    """One bad file among good ones, and the folder stays as it was."""
    write_par(inbox / "good.par", lines_of(43))
    (inbox / name).write_bytes(content)
    with pytest.raises(LineDataError, match=message):
        import_files([inbox / "good.par", inbox / name], tmp_path / "lines", store)
    assert not (tmp_path / "lines").exists()


def test_a_file_of_the_same_name_is_not_overwritten(inbox, tmp_path, store):
    """Another file under a name that is taken is refused."""
    (tmp_path / "lines").mkdir()
    write_par(tmp_path / "lines" / "a.par", lines_of(52))
    write_par(inbox / "a.par", lines_of(43))
    with pytest.raises(LineDataError, match="is there already and differs"):
        import_files([inbox / "a.par"], tmp_path / "lines", store)


def test_conflicts_with_what_is_there_are_refused(inbox, tmp_path, store, make_xsc):
    """A second table of the same state is refused before anything is written."""
    (inbox / "a.xsc").write_text(make_xsc())
    (inbox / "b.xsc").write_text(make_xsc(values=np.full(40, 2e-19)))
    import_files([inbox / "a.xsc"], tmp_path / "lines", store)
    with pytest.raises(LineDataError, match=r"[ab]\.xsc:1 and .*[ab]\.xsc:1: CCl3F was measured twice"):
        import_files([inbox / "b.xsc"], tmp_path / "lines", store)
    assert [path.name for path in (tmp_path / "lines").iterdir()] == ["a.xsc"]


def test_a_file_where_the_folder_should_be(inbox, tmp_path, store):
    """A folder that cannot be made is one clear error."""
    write_par(inbox / "a.par", lines_of(43))
    (tmp_path / "lines").write_text("in the way")
    with pytest.raises(OutputError, match="expected a folder, got a file"):
        import_files([inbox / "a.par"], tmp_path / "lines", store)


def number_spots(data: bytes) -> list[int]:
    """Offsets of the bytes that carry numbers in 160-character records: columns 1 to 67 and 147 to 160."""
    return [i for i in range(len(data)) if (i % 161 < 67 or 146 <= i % 161 < 160) and chr(data[i]).strip()]


@pytest.mark.parametrize("packed", [False, True])
@pytest.mark.parametrize("seed", range(50))
def test_fifty_damaged_line_files_are_refused(damage, inbox, tmp_path, store, seed, packed):
    """Whatever single fault breaks the record format is noticed, with file and line; nothing is written.

    A whole record that is lost or repeated, or a digit that became another digit, is not noticed: nothing in the
    format could tell.
    """
    rng = np.random.default_rng(seed)
    data = format_par(Lines.join([lines_of(2, count=40), lines_of(6, count=40)])).encode()
    kind = ("drop", "insert", "overwrite", "control", "cut", "wrap", "join")[seed % 7]
    spots = number_spots(data)
    bad = damage(data, [i for i in spots if kind != "cut" or i % 161 > 0], kind, rng)
    path = inbox / ("bad.par.gz" if packed else "bad.par")
    path.write_bytes(gzip.compress(bad) if packed else bad)
    with pytest.raises(LineDataError, match=re.escape(str(path)) + r":\d+: "):
        import_files([path], tmp_path / "lines", store)
    assert not (tmp_path / "lines").exists()


@pytest.mark.parametrize("seed", range(50))
def test_damaged_gzip_files_are_refused(inbox, tmp_path, store, seed):
    """A packed file with a wrong byte or a lost end is refused by name (no line of it can be trusted)."""
    rng = np.random.default_rng(seed)
    data = bytearray(gzip.compress(format_par(lines_of(2)).encode(), mtime=0))
    at = int(rng.integers(20, len(data)))
    if seed % 2:
        data[at] ^= int(rng.integers(1, 256))
    else:
        del data[at:]
    (inbox / "bad.par.gz").write_bytes(data)
    with pytest.raises(LineDataError, match=r"bad\.par\.gz"):
        import_files([inbox / "bad.par.gz"], tmp_path / "lines", store)
