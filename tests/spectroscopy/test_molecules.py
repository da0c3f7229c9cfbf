"""Names, numbers, masses and partition sums of molecules."""

from __future__ import annotations

import os
import subprocess
import sys

import pytest

from planner.errors import LineDataError, RangeError
from planner.spectroscopy.molecules import (
    MOLECULES,
    find_molecule,
    isotopologue_abundance,
    isotopologue_mass_g,
    isotopologues,
    molar_mass_g,
    molecule_numbered,
    partition_sum,
    partition_sum_range_k,
)


@pytest.mark.parametrize(
    ("name", "formula"),
    [
        ("CH4", "CH4"),
        ("ch4", "CH4"),
        ("Methane", "CH4"),
        (" nitrous   oxide ", "N2O"),
        ("WATER", "H2O"),
        ("CFC-11", "CCl3F"),
        ("cfc11", "CCl3F"),
        ("ccl3f", "CCl3F"),
        ("Freon-12", "CCl2F2"),
        ("dms", "C2H6S"),
        ("Dimethyl sulfide", "C2H6S"),
        ("methanethiol", "CH3SH"),
        ("isoprene", "C5H8"),
        ("hfc-134a", "C2H2F4"),
        ("argon", "Ar"),
    ],
)
def test_find_molecule(name, formula):
    """A molecule answers to its formula and its common names in any letter case."""
    assert find_molecule(name).formula == formula


def test_find_molecule_unknown_suggests():
    """An unknown name is an error that offers the nearest known one."""
    with pytest.raises(LineDataError, match=r"got 'methan'; did you mean methane"):
        find_molecule("methan")


def test_find_molecule_hopeless():
    """A name near to nothing is an error that says where to look."""
    with pytest.raises(LineDataError, match="lines list"):
        find_molecule("???")


def test_names_are_unique():
    """No two molecules share a name, whatever the case and hyphens."""
    names = [n.replace("-", "").replace(" ", "").casefold() for m in MOLECULES for n in {m.formula, *m.names}]
    assert len(names) == len(set(names))


def test_molecule_numbered():
    """HITRAN numbers lead back to the molecule; a number without a gas is an error."""
    for molecule in MOLECULES:
        if molecule.hitran_number is not None:
            assert molecule_numbered(molecule.hitran_number) is molecule
    with pytest.raises(LineDataError, match="got 34"):
        molecule_numbered(34)


def test_molar_mass_by_hand():
    """Methanol by hand: 12.011 + 4 x 1.008 + 15.999."""
    assert molar_mass_g("CH3OH") == pytest.approx(32.042)


@pytest.mark.parametrize("formula", ["", "ch4", "C-H", "C2H4 ", "(CH3)2S"])
def test_molar_mass_invalid(formula):
    """Anything but elements with counts is refused."""
    with pytest.raises(LineDataError, match="elements with counts"):
        molar_mass_g(formula)


def test_molar_mass_unknown_element():
    """An element without a weight here is named."""
    with pytest.raises(LineDataError, match=r"got Xe$"):
        molar_mass_g("XeF2")


def test_mass_near_main_isotopologue():
    """The molar mass lies within 3 % of the main isotopologue for all but chlorine, bromine and germanium gases."""
    for molecule in MOLECULES:
        if molecule.hitran_number is None or any(e in molecule.formula for e in ("Cl", "Br", "Ge")):
            continue
        main = isotopologue_mass_g(molecule.hitran_number, 1)
        assert molecule.molar_mass_g == pytest.approx(main, rel=0.03), molecule.formula


def test_isotopologues_of_co2():
    """CO2 has twelve isotopologues in HITRAN and their abundances add up to one."""
    assert isotopologues(2) == tuple(range(1, 13))
    assert sum(isotopologue_abundance(2, i) for i in isotopologues(2)) == pytest.approx(1.0, abs=2e-5)


def test_isotopologue_unknown():
    """An isotopologue that HITRAN lacks is an error that lists the known ones."""
    with pytest.raises(LineDataError, match=r"isotopologue 9 of HITRAN molecule 6: expected one of 1, 2, 3, 4"):
        isotopologue_mass_g(6, 9)
    with pytest.raises(LineDataError, match="no such molecule"):
        isotopologue_abundance(99, 1)


def test_partition_sum_grows():
    """A partition sum grows with temperature."""
    assert 0 < partition_sum(6, 1, 100.0) < partition_sum(6, 1, 296.0) < partition_sum(6, 1, 1000.0)


@pytest.mark.parametrize("temperature_k", [0.5, 1000.5, 1e5, float("nan")])
def test_partition_sum_range(temperature_k):
    """Outside its table (ozone: 1 to 1000 K) the partition sum is refused."""
    assert partition_sum_range_k(3, 1) == (1.0, 1000.0)
    with pytest.raises(RangeError, match=r"expected 1 to 1000 K.*molecule 3"):
        partition_sum(3, 1, temperature_k)


def test_partition_sum_missing():
    """An isotopologue without a TIPS-2021 table is an error (a third NO2 isotopologue came later)."""
    with pytest.raises(LineDataError, match="TIPS-2021 has none"):
        partition_sum(10, 3, 296.0)


def test_hapi_is_quiet(tmp_path):
    """Importing hapi is silent, writes no file, leaves the warning filters alone."""
    code = (
        "import warnings; before = list(warnings.filters)\n"
        "from planner.spectroscopy.molecules import partition_sum; partition_sum(2, 1, 296.0)\n"
        "assert warnings.filters == before"
    )
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", code], cwd=tmp_path, capture_output=True, text=True, env=dict(os.environ)
    )
    assert (done.returncode, done.stdout, done.stderr) == (0, "", "")
    assert list(tmp_path.iterdir()) == []


def test_threads_do_not_lose_stdout():
    """Two threads that import hapi at once leave stdout where it was."""
    code = (
        "import sys, threading\n"
        "from planner.spectroscopy.molecules import quiet_hapi\n"
        "before, go = sys.stdout, threading.Barrier(8)\n"
        "threads = [threading.Thread(target=lambda: (go.wait(), quiet_hapi())) for _ in range(8)]\n"
        "[thread.start() for thread in threads]\n"
        "[thread.join() for thread in threads]\n"
        "sys.__stdout__.write(str(sys.stdout is before))\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == "True"
