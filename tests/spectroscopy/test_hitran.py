"""Reading and writing HITRAN line records."""

from __future__ import annotations

import gzip
from dataclasses import fields

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import LineDataError, OutputError
from planner.spectroscopy.hitran import format_par, parse_par, parse_par_slowly, read_par, write_par
from planner.spectroscopy.lines import Lines

# Invented lines in the layout of Rothman et al. 2005, table 1 (160 characters).
RECORD = (
    " 21 2300.123456 1.234E-21 2.345E+01.07120.093  345.67890.71-.002345"
    "       0 0 0 11       0 0 0 01                    R 12e     46646324299 9 9711    25.0   23.0"
)
# The same in the layout of Rothman et al. 1998 (100 characters).
OLD_RECORD = " 21 2300.123456 1.234E-21 5.678E-03.0712.0930  345.6789 .71-.002345  9  1           R 12   000 0 0 0"


def changed(start: int, text: str, record: str = RECORD) -> str:
    return record[: start - 1] + text + record[start - 1 + len(text) :]


def assert_same(one: Lines, other: Lines) -> None:
    for field in fields(Lines):
        np.testing.assert_array_equal(getattr(one, field.name), getattr(other, field.name), err_msg=field.name)


def test_record_of_160_characters():
    """Every field of a record lands where the layout says."""
    assert len(RECORD) == 160
    lines = parse_par(RECORD + "\n", "here")
    assert (lines.molecule[0], lines.isotopologue[0]) == (2, 1)
    assert lines.wavenumber_per_cm[0] == 2300.123456
    assert lines.intensity_cm[0] == 1.234e-21
    assert lines.einstein_a_per_s[0] == 23.45
    assert lines.air_width_per_cm_atm[0] == 0.0712
    assert lines.self_width_per_cm_atm[0] == 0.093
    assert lines.lower_energy_per_cm[0] == 345.6789
    assert lines.temperature_exponent[0] == 0.71
    assert lines.air_shift_per_cm_atm[0] == -0.002345
    assert lines.upper_global[0] == "       0 0 0 11"
    assert lines.lower_local[0] == "     R 12e"
    assert (lines.upper_weight[0], lines.lower_weight[0]) == (25.0, 23.0)


def test_record_of_100_characters():
    """The older edition has the same numbers in the same columns, no Einstein coefficient and no weights."""
    assert len(OLD_RECORD) == 100
    lines, new = parse_par(OLD_RECORD + "\n", "here"), parse_par(RECORD + "\n", "here")
    for name in ("wavenumber_per_cm", "intensity_cm", "air_width_per_cm_atm", "lower_energy_per_cm"):
        assert getattr(lines, name)[0] == getattr(new, name)[0]
    assert (lines.einstein_a_per_s[0], lines.upper_weight[0], lines.lower_weight[0]) == (0.0, 0.0, 0.0)
    assert (lines.upper_global[0], lines.lower_global[0], lines.lower_local[0]) == ("  9", "  1", "  R 12")


@pytest.mark.parametrize(("code", "number"), [("1", 1), ("9", 9), ("0", 10), ("A", 11), ("B", 12)])
def test_isotopologue_codes(code, number):
    """The tenth to twelfth isotopologue of CO2 are written 0, A and B."""
    record = changed(3, code)
    assert parse_par(record + "\n", "here").isotopologue[0] == number
    assert format_par(parse_par(record + "\n", "here"))[2] == code


@pytest.mark.parametrize("end", ["\n", "\r\n"])
@pytest.mark.parametrize("last", [True, False])
def test_line_ends(end, last):
    """Unix and Windows line ends are read alike, with or without the last one."""
    text = end.join([RECORD, changed(4, " 2301.000000")]) + (end if last else "")
    assert parse_par(text, "here").wavenumber_per_cm.tolist() == [2300.123456, 2301.0]


def test_mixed_line_ends():
    """A file whose line ends were partly changed is still read."""
    assert len(parse_par(RECORD + "\r\n" + RECORD + "\n" + RECORD, "here")) == 3


def test_several_molecules_come_out_sorted():
    """Molecules may be mixed in any order; lines come out by wavenumber."""
    text = "\n".join([RECORD, changed(1, " 61 1300.000000"), changed(1, " 11 1700.000000")])
    lines = parse_par(text, "here")
    assert lines.molecule.tolist() == [6, 1, 2]


def test_unknown_lower_energy_is_kept():
    """A lower energy of -1, the mark of the unknown, is kept."""
    assert parse_par(changed(46, "   -1.0000") + "\n", "here").lower_energy_per_cm[0] == -1.0


def test_blank_fields():
    """Self width, shift, Einstein coefficient and weights may be blank, as published; they read as 0."""
    record = RECORD
    for start, stop in ((26, 35), (41, 45), (60, 67), (147, 160)):
        record = changed(start, " " * (stop - start + 1), record)
    lines = parse_par(record + "\n", "here")
    assert lines.self_width_per_cm_atm[0] == lines.air_shift_per_cm_atm[0] == lines.upper_weight[0] == 0.0
    assert_same(lines, parse_par_slowly(record.encode(), "here"))


@pytest.mark.parametrize(
    ("text", "value"), [("2.700-164 ", 2.7e-164), ("1.234D-21 ", 1.234e-21), ("1.23E-101 ", 1.23e-101)]
)
def test_fortran_exponents(text, value):
    """Exponents without their letter, or with a D, occur in published files and are read."""
    assert parse_par(changed(16, text) + "\n", "here").intensity_cm[0] == value


@pytest.mark.parametrize(
    ("start", "text", "message"),
    [
        (1, "x1", r"molecule \(columns 1-2\): expected a HITRAN molecule number, got 'x1'"),
        (1, "99", r"HITRAN has no molecule 99"),
        (1, " 0", r"HITRAN has no molecule 0"),
        (3, "Z", r"isotopologue \(column 3\): expected one of 1 2 3 4 5 6 7 8 9 0 A B for molecule 2, got 'Z'"),
        (3, " ", r"isotopologue \(column 3\)"),
        (
            4,
            "    0.000000",
            r"wavenumber_per_cm \(columns 4-15\): expected a number greater than 0, got '    0.000000'",
        ),
        (4, "-2300.000000", r"wavenumber_per_cm .* greater than 0"),
        (4, " " * 12, r"wavenumber_per_cm"),
        (4, "  23 0.00000", r"wavenumber_per_cm"),
        (4, " 2_300.00000", r"wavenumber_per_cm"),
        (16, "-1.234E-21", r"intensity_cm \(columns 16-25\): expected a number of 0 or more, got '-1.234E-21'"),
        (16, "       nan", r"intensity_cm"),
        (16, "       inf", r"intensity_cm"),
        (16, " 1.0E+9999", r"intensity_cm"),
        (16, " 1.234E+99x"[1:], r"intensity_cm"),
        (26, " -1.00E+00", r"einstein_a_per_s"),
        (36, "-.071", r"air_width_per_cm_atm \(columns 36-40\)"),
        (36, "     ", r"air_width_per_cm_atm"),
        (41, "0.x93", r"self_width_per_cm_atm"),
        (46, "          ", r"lower_energy_per_cm"),
        (46, "********* ", r"lower_energy_per_cm \(columns 46-55\): expected a number, got '\*\*\*\*\*\*\*\*\* '"),
        (56, "n.a.", r"temperature_exponent"),
        (60, "--.00234", r"air_shift_per_cm_atm"),
        (147, "  -25.0", r"upper_weight"),
        (154, "twenty!", r"lower_weight \(columns 154-160\)"),
        (70, "\t", r"column 70: expected a printable ASCII character, got byte 9"),
        (70, "\x00", r"column 70: .* byte 0"),
    ],
)
def test_bad_field(start, text, message):
    """The first field that breaks the format is named with file, line, what was expected and what came."""
    data = "\n".join([RECORD, changed(start, text), changed(16, "      oops")]) + "\n"
    with pytest.raises(LineDataError, match=r"^data\.par:2: .*" + message):
        parse_par(data, "data.par")


@pytest.mark.parametrize("length", [0, 1, 99, 100, 101, 159, 161])
def test_bad_length(length):
    """A cut, lengthened or empty line is an error, also one as long as another edition's."""
    data = f"{RECORD}\n{RECORD.ljust(200)[:length]}\n{RECORD}\n"
    with pytest.raises(LineDataError, match=rf"^data\.par:2: record: expected 160 characters, got {length}"):
        parse_par(data, "data.par")


def test_first_line_of_odd_length():
    """A file that is no line list at all is refused at its first line."""
    with pytest.raises(LineDataError, match=r"^page\.html:1: record: expected 160 characters, got 6"):
        parse_par("<html>\n", "page.html")


def test_not_ascii():
    """A character outside ASCII is named by its column."""
    with pytest.raises(LineDataError, match=r"^a:1: column 70"):
        parse_par(changed(70, "é").encode("latin-1"), "a")


@pytest.mark.parametrize("data", ["", b""])
def test_empty(data):
    """An empty file is an error: it is no line list."""
    with pytest.raises(LineDataError, match="got an empty file"):
        parse_par(data, "here")


def test_read_par_plain_and_gzip(tmp_path):
    """A gzip file is told by its content, not its name."""
    (tmp_path / "a.par").write_text(RECORD + "\n")
    (tmp_path / "b.par").write_bytes(gzip.compress((RECORD + "\n").encode()))
    assert_same(read_par(tmp_path / "a.par"), read_par(tmp_path / "b.par"))


def test_read_par_unreadable(tmp_path):
    """A missing, truncated or damaged file is an error that names it."""
    whole = gzip.compress((RECORD + "\n").encode())
    damaged = whole[:30] + bytes([whole[30] ^ 255]) + whole[31:]
    for name, content in (("cut.gz", whole[:-9]), ("bad.gz", damaged), ("tail.gz", whole[:12])):
        (tmp_path / name).write_bytes(content)
        with pytest.raises(LineDataError, match=name):
            read_par(tmp_path / name)
    with pytest.raises(LineDataError, match=r"absent\.par"):
        read_par(tmp_path / "absent.par")
    with pytest.raises(LineDataError, match="expected a readable file"):
        read_par(tmp_path)


def test_write_par(tmp_path):
    """What is written is read back, plain or gzip, and the same lines give the same bytes."""
    lines = parse_par(RECORD + "\n" + changed(4, " 2301.000000"), "here")
    write_par(tmp_path / "a.par", lines)
    write_par(tmp_path / "b.par.gz", lines)
    first = (tmp_path / "b.par.gz").read_bytes()
    write_par(tmp_path / "b.par.gz", lines)
    assert (tmp_path / "b.par.gz").read_bytes() == first
    assert_same(read_par(tmp_path / "a.par"), lines)
    assert_same(read_par(tmp_path / "b.par.gz"), lines)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.par", "b.par.gz"]


def test_write_par_nowhere(tmp_path):
    """An unwritable place is an output error and leaves nothing behind."""
    with pytest.raises(OutputError, match="cannot write line records"):
        write_par(tmp_path / "absent" / "a.par", parse_par(RECORD, "here"))


def test_write_restores_the_record():
    """A record as HITRAN writes it survives reading and writing, but for the codes that `Lines` does not carry."""
    written = format_par(parse_par(RECORD, "here")).rstrip("\n")
    for start, stop in ((1, 40), (46, 127), (147, 160)):
        assert written[start - 1 : stop] == RECORD[start - 1 : stop]
    assert (written[40:45], written[127:146]) == (".0930", "000000 0 0 0 0 0 0 ")


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("wavenumber_per_cm", 123456.7),
        ("air_width_per_cm_atm", 123456.0),
        ("lower_energy_per_cm", 1e11),
        ("temperature_exponent", -1000.0),
        ("upper_weight", 1e9),
    ],
)
def test_write_too_wide(name, value):
    """A value too wide for its columns is an error, never cut."""
    given_lines = {
        "molecule": 2,
        "isotopologue": 1,
        "wavenumber_per_cm": 2300.0,
        "intensity_cm": 1e-20,
        "lower_energy_per_cm": 0.0,
        "air_width_per_cm_atm": 0.07,
        "temperature_exponent": 0.7,
    }
    if name == "wavenumber_per_cm":  # six decimals are given up before the value is
        assert format_par(Lines.make(**given_lines | {name: value}))[3:15] == "123456.70000"
        value = 1e13
    with pytest.raises(LineDataError, match=f"{name} of line 1"):
        format_par(Lines.make(**given_lines | {name: value}))


def test_write_bad_label_or_species():
    """Labels over 15 characters and isotopologues unknown to HITRAN are errors."""
    base = {
        "wavenumber_per_cm": 2300.0,
        "intensity_cm": 1e-20,
        "lower_energy_per_cm": 0.0,
        "air_width_per_cm_atm": 0.07,
        "temperature_exponent": 0.7,
    }
    with pytest.raises(LineDataError, match="upper_local: expected at most 15"):
        format_par(Lines.make(molecule=2, isotopologue=1, upper_local="x" * 16, **base))
    with pytest.raises(LineDataError, match="no isotopologue 13 of molecule 2"):
        format_par(Lines.make(molecule=2, isotopologue=13, **base))


numbers = st.floats(allow_nan=False, allow_infinity=False)


@settings(derandomize=True, deadline=None, max_examples=200)
@given(
    wavenumber=st.floats(1e-6, 99999.0),
    intensity=st.floats(0.0, 1e-10),
    einstein=st.floats(0.0, 1e10),
    width=st.floats(0.0, 9.0),
    energy=st.one_of(st.just(-1.0), st.floats(0.0, 90000.0)),
    exponent=st.floats(-0.99, 9.9),
    shift=st.floats(-0.99, 0.99),
    weight=st.floats(0.0, 9999.0),
    label=st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=15),
)
def test_round_trip(wavenumber, intensity, einstein, width, energy, exponent, shift, weight, label):
    """Reading what was written gives the same lines at the precision of the fields, and the same text again."""
    lines = Lines.make(
        molecule=2,
        isotopologue=12,
        wavenumber_per_cm=wavenumber,
        intensity_cm=intensity,
        einstein_a_per_s=einstein,
        air_width_per_cm_atm=width,
        lower_energy_per_cm=energy,
        temperature_exponent=exponent,
        air_shift_per_cm_atm=shift,
        upper_weight=weight,
        lower_local=label,
    )
    text = format_par(lines)
    assert len(text) == 161
    back = parse_par(text, "here")
    assert format_par(back) == text
    assert_same(back, parse_par_slowly(text.encode(), "here"))
    assert back.lower_local[0] == label.rstrip()
    for name, half_unit in (
        ("wavenumber_per_cm", 5e-7),
        ("air_width_per_cm_atm", 5e-4 if width >= 0.99995 else 5e-5),
        ("self_width_per_cm_atm", 5e-4 if width >= 0.99995 else 5e-5),
        ("lower_energy_per_cm", 5e-5),
        ("temperature_exponent", 5e-2 if exponent <= -0.995 else 5e-3),
        ("air_shift_per_cm_atm", 5e-7),
        ("upper_weight", 5e-2),
    ):
        assert getattr(back, name)[0] == pytest.approx(getattr(lines, name)[0], rel=1e-15, abs=half_unit * 1.001), name
    for name in ("intensity_cm", "einstein_a_per_s"):
        value = getattr(lines, name)[0]
        digits = 5.001e-4 if value == 0 or value > 1e-99 else 5.001e-3
        assert getattr(back, name)[0] == pytest.approx(value, rel=digits, abs=1e-300), name


@settings(derandomize=True, deadline=None, max_examples=300)
@given(column=st.integers(1, 160), byte=st.integers(0, 255))
def test_fast_equals_slow(column, byte):
    """With any one byte of a record changed, the fast and the slow parser agree: same lines or same error."""
    data = bytearray(("\n".join([RECORD, RECORD]) + "\n").encode())
    data[column - 1] = byte
    outcomes = []
    for parser in (parse_par, parse_par_slowly):
        try:
            outcomes.append(format_par(parser(bytes(data), "here")))
        except LineDataError as error:
            outcomes.append(str(error))
    assert outcomes[0] == outcomes[1]
