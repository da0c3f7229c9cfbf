"""The molecules this tool knows: names, HITRAN numbers, masses, partition sums.

Isotopologue masses, natural abundances and partition sums come from hapi (the Python library that HITRAN itself
publishes), so that line lists and cross-sections use the numbers the lists were made with. Molar masses of whole
molecules are summed from standard atomic weights.
"""

from __future__ import annotations

import contextlib
import difflib
import io
import re
import threading
import warnings
from dataclasses import dataclass
from functools import cache
from types import ModuleType

from planner.errors import LineDataError, RangeError

__all__ = [
    "MOLECULES",
    "Molecule",
    "find_molecule",
    "isotopologue_abundance",
    "isotopologue_mass_g",
    "isotopologues",
    "molar_mass_g",
    "molecule_numbered",
    "partition_sum",
    "partition_sum_range_k",
    "quiet_hapi",
]

_ONE_AT_A_TIME = threading.Lock()

# Abridged standard atomic weights, g/mol: Prohaska et al. 2022, Pure Appl. Chem. 94, 573, table 1.
_ATOMIC_WEIGHT_G = {
    "H": 1.0080,
    "He": 4.0026,
    "C": 12.011,
    "N": 14.007,
    "O": 15.999,
    "F": 18.998,
    "Ne": 20.180,
    "P": 30.974,
    "S": 32.06,
    "Cl": 35.45,
    "Ar": 39.95,
    "Ge": 72.630,
    "Br": 79.904,
    "I": 126.90,
}


@dataclass(frozen=True, kw_only=True)
class Molecule:
    """One molecule.

    Attributes
    ----------
    formula : str
        As used for file names and tables, ``"CCl3F"``.
    names : tuple of str
        Common names, the most usual first; may be empty.
    hitran_number : int or None
        Molecule number in HITRAN line lists; None where HITRAN has no lines of it.
    molar_mass_g : float
        Grams per mole at natural isotopic composition.
    """

    formula: str
    names: tuple[str, ...]
    hitran_number: int | None
    molar_mass_g: float


def molar_mass_g(formula: str) -> float:
    """Molar mass in g/mol of a plain formula such as ``"CH3OH"``, from standard atomic weights.

    Raises
    ------
    LineDataError
        If the formula holds anything but known elements with counts.

    Notes
    -----
    Atomic weights: Prohaska et al. 2022, Pure Appl. Chem. 94, 573, table 1 (abridged values).
    """
    atoms = re.findall(r"([A-Z][a-z]?)(\d*)", formula)
    if not atoms or "".join(element + count for element, count in atoms) != formula:
        raise LineDataError(f'formula: expected elements with counts such as "CH3OH", got {formula!r}')
    unknown = sorted({element for element, _ in atoms} - set(_ATOMIC_WEIGHT_G))
    if unknown:
        raise LineDataError(
            f"formula {formula!r}: expected elements among {', '.join(_ATOMIC_WEIGHT_G)}; got {', '.join(unknown)}"
        )
    return sum(_ATOMIC_WEIGHT_G[element] * int(count or 1) for element, count in atoms)


# (formula, HITRAN number, common names). Numbers: hitran.org/docs/molec-meta, as in hapi's table ISO.
_ROWS: tuple[tuple[str, int | None, tuple[str, ...]], ...] = (
    ("H2O", 1, ("water", "water vapour", "water vapor")),
    ("CO2", 2, ("carbon dioxide",)),
    ("O3", 3, ("ozone",)),
    ("N2O", 4, ("nitrous oxide",)),
    ("CO", 5, ("carbon monoxide",)),
    ("CH4", 6, ("methane",)),
    ("O2", 7, ("oxygen", "molecular oxygen")),
    ("NO", 8, ("nitric oxide", "nitrogen monoxide")),
    ("SO2", 9, ("sulfur dioxide", "sulphur dioxide")),
    ("NO2", 10, ("nitrogen dioxide",)),
    ("NH3", 11, ("ammonia",)),
    ("HNO3", 12, ("nitric acid",)),
    ("OH", 13, ("hydroxyl",)),
    ("HF", 14, ("hydrogen fluoride",)),
    ("HCl", 15, ("hydrogen chloride",)),
    ("HBr", 16, ("hydrogen bromide",)),
    ("HI", 17, ("hydrogen iodide",)),
    ("ClO", 18, ("chlorine monoxide",)),
    ("OCS", 19, ("carbonyl sulfide", "carbonyl sulphide", "COS")),
    ("H2CO", 20, ("formaldehyde", "methanal")),
    ("HOCl", 21, ("hypochlorous acid",)),
    ("N2", 22, ("nitrogen", "molecular nitrogen")),
    ("HCN", 23, ("hydrogen cyanide",)),
    ("CH3Cl", 24, ("methyl chloride", "chloromethane")),
    ("H2O2", 25, ("hydrogen peroxide",)),
    ("C2H2", 26, ("acetylene", "ethyne")),
    ("C2H6", 27, ("ethane",)),
    ("PH3", 28, ("phosphine",)),
    ("COF2", 29, ("carbonyl fluoride",)),
    ("SF6", 30, ("sulfur hexafluoride", "sulphur hexafluoride")),
    ("H2S", 31, ("hydrogen sulfide", "hydrogen sulphide")),
    ("HCOOH", 32, ("formic acid",)),
    ("HO2", 33, ("hydroperoxyl",)),
    ("ClONO2", 35, ("chlorine nitrate",)),
    ("HOBr", 37, ("hypobromous acid",)),
    ("C2H4", 38, ("ethylene", "ethene")),
    ("CH3OH", 39, ("methanol", "methyl alcohol")),
    ("CH3Br", 40, ("methyl bromide", "bromomethane")),
    ("CH3CN", 41, ("acetonitrile", "methyl cyanide")),
    ("CF4", 42, ("carbon tetrafluoride", "tetrafluoromethane", "CFC-14", "PFC-14")),
    ("C4H2", 43, ("diacetylene", "butadiyne")),
    ("HC3N", 44, ("cyanoacetylene",)),
    ("H2", 45, ("hydrogen", "molecular hydrogen")),
    ("CS", 46, ("carbon monosulfide", "carbon monosulphide")),
    ("SO3", 47, ("sulfur trioxide", "sulphur trioxide")),
    ("C2N2", 48, ("cyanogen",)),
    ("COCl2", 49, ("phosgene",)),
    ("SO", 50, ("sulfur monoxide", "sulphur monoxide")),
    ("CH3F", 51, ("methyl fluoride", "fluoromethane", "HFC-41")),
    ("GeH4", 52, ("germane",)),
    ("CS2", 53, ("carbon disulfide", "carbon disulphide")),
    ("CH3I", 54, ("methyl iodide", "iodomethane")),
    ("NF3", 55, ("nitrogen trifluoride",)),
    ("CCl3F", None, ("CFC-11", "freon-11", "R-11", "trichlorofluoromethane")),
    ("CCl2F2", None, ("CFC-12", "freon-12", "R-12", "dichlorodifluoromethane")),
    ("CClF3", None, ("CFC-13", "freon-13", "R-13", "chlorotrifluoromethane")),
    ("CHClF2", None, ("HCFC-22", "freon-22", "R-22", "chlorodifluoromethane")),
    ("CHF3", None, ("HFC-23", "fluoroform", "R-23", "trifluoromethane")),
    ("C2H2F4", None, ("HFC-134a", "R-134a", "1,1,1,2-tetrafluoroethane")),
    ("CCl4", None, ("carbon tetrachloride", "tetrachloromethane")),
    ("C2F6", None, ("hexafluoroethane", "PFC-116")),
    ("C3F8", None, ("octafluoropropane", "perfluoropropane", "PFC-218")),
    ("C2H6S", None, ("DMS", "dimethyl sulfide", "dimethyl sulphide")),
    ("CH3SH", None, ("methanethiol", "methyl mercaptan")),
    ("C5H8", None, ("isoprene",)),
    ("He", None, ("helium",)),
    ("Ne", None, ("neon",)),
    ("Ar", None, ("argon",)),
)

MOLECULES: tuple[Molecule, ...] = tuple(
    Molecule(formula=formula, names=names, hitran_number=number, molar_mass_g=molar_mass_g(formula))
    for formula, number, names in _ROWS
)
"""Every molecule known here, HITRAN numbers first."""


def _key(name: str) -> str:
    """A name without regard to letter case, blanks, hyphens and underscores."""
    return re.sub(r"[\s_-]+", "", name).casefold()


_BY_NAME = {_key(name): molecule for molecule in MOLECULES for name in (molecule.formula, *molecule.names)}
_BY_NUMBER = {molecule.hitran_number: molecule for molecule in MOLECULES if molecule.hitran_number is not None}


def find_molecule(name: str) -> Molecule:
    """The molecule of a formula or common name, in any letter case (``"CFC-11"``, ``"ccl3f"``, ``"Methane"``).

    Raises
    ------
    LineDataError
        If no molecule goes by this name; the message gives the nearest names.
    """
    try:
        return _BY_NAME[_key(name)]
    except KeyError:
        pass
    shown = {_key(n): n for m in MOLECULES for n in (m.formula, *m.names)}
    near = [shown[key] for key in difflib.get_close_matches(_key(name), shown, n=3, cutoff=0.5)]
    hint = f"did you mean {' or '.join(near)}?" if near else "see `limbcast lines list` for the gases known"
    raise LineDataError(f"molecule: expected a formula or common name, got {name!r}; {hint}")


def molecule_numbered(hitran_number: int) -> Molecule:
    """The molecule of a HITRAN molecule number.

    Raises
    ------
    LineDataError
        If the number is not one of a gas known here.
    """
    try:
        return _BY_NUMBER[hitran_number]
    except KeyError:
        raise LineDataError(
            f"HITRAN molecule number: expected one of {min(_BY_NUMBER)} to {max(_BY_NUMBER)} that stands for a "
            f"gas, got {hitran_number}"
        ) from None


@cache
def quiet_hapi() -> ModuleType:
    """The module ``hapi``, imported once without its banner and without its change of the warning filters.

    Importing hapi writes nothing to disk. It prints a page of text and sets ``always`` for user warnings; both are
    undone here. It takes 0.4 s (2.5 s where no compiled files are kept), hence not at start-up.
    """
    # two threads that redirect stdout at once would leave it redirected for good
    with _ONE_AT_A_TIME, contextlib.redirect_stdout(io.StringIO()), warnings.catch_warnings():
        warnings.simplefilter("ignore")
        import hapi
    return hapi


@cache
def isotopologues(hitran_number: int) -> tuple[int, ...]:
    """Numbers of the isotopologues that HITRAN gives this molecule, ascending; empty if it has none."""
    return tuple(sorted(i for m, i in quiet_hapi().ISO if m == hitran_number))


def _hapi_entry(hitran_number: int, isotopologue: int, field: str) -> float:
    hapi = quiet_hapi()
    try:
        return float(hapi.ISO[(hitran_number, isotopologue)][hapi.ISO_INDEX[field]])
    except KeyError:
        known = isotopologues(hitran_number)
        raise LineDataError(
            f"isotopologue {isotopologue} of HITRAN molecule {hitran_number}: expected one of "
            f"{', '.join(map(str, known)) if known else 'none (no such molecule)'}; check the line records"
        ) from None


def isotopologue_mass_g(hitran_number: int, isotopologue: int) -> float:
    """Molar mass in g/mol of one isotopologue (HITRAN metadata, through hapi).

    Raises
    ------
    LineDataError
        If HITRAN has no such isotopologue.
    """
    return _hapi_entry(hitran_number, isotopologue, "mass")


def isotopologue_abundance(hitran_number: int, isotopologue: int) -> float:
    """Natural abundance of one isotopologue as a fraction (HITRAN metadata, through hapi).

    Raises
    ------
    LineDataError
        If HITRAN has no such isotopologue.
    """
    return _hapi_entry(hitran_number, isotopologue, "abundance")


@cache
def partition_sum_range_k(hitran_number: int, isotopologue: int) -> tuple[float, float]:
    """Lowest and highest temperature in K of the TIPS-2021 table of one isotopologue.

    Raises
    ------
    LineDataError
        If TIPS-2021 does not hold the isotopologue.
    """
    try:
        nodes_k = quiet_hapi().TIPS_2021_ISOT_HASH[(hitran_number, isotopologue)]
    except KeyError:
        raise LineDataError(
            f"partition sum of isotopologue {isotopologue} of HITRAN molecule {hitran_number}: TIPS-2021 has none; "
            "leave its lines out"
        ) from None
    return float(min(nodes_k)), float(max(nodes_k))


@cache
def partition_sum(hitran_number: int, isotopologue: int, temperature_k: float) -> float:
    """Total internal partition sum Q(T) of one isotopologue, from TIPS-2021 through hapi.

    Raises
    ------
    LineDataError
        If TIPS-2021 does not hold the isotopologue.
    RangeError
        If the temperature lies outside its table.

    Notes
    -----
    Gamache et al. 2021, J. Quant. Spectrosc. Radiat. Transfer 271, 107713. The edition is named in the call since
    hapi's default moved to a later one in its version 1.3.
    """
    low_k, high_k = partition_sum_range_k(hitran_number, isotopologue)
    if not low_k <= temperature_k <= high_k:
        raise RangeError(
            f"temperature: expected {low_k:g} to {high_k:g} K, where the partition sum of isotopologue "
            f"{isotopologue} of HITRAN molecule {hitran_number} is known, got {temperature_k:g} K"
        )
    return float(quiet_hapi().partitionSum(hitran_number, isotopologue, float(temperature_k), version=2021))
