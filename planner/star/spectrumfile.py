"""A user's own spectrum of the star: two columns with units, ECSV or CSV."""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from planner.errors import ScenarioError

if TYPE_CHECKING:
    from astropy.table import Table
    from astropy.units import Quantity

__all__ = ["StarSpectrum", "parse_spectrum", "read_spectrum"]

_HOW = (
    "a table of two columns, wavelength and flux density, as ECSV with units or as CSV whose first line names "
    'them with units in brackets, such as "wavelength [um],flux [W / (m2 um)]"'
)
_PHOTONS = "photon / (s m2 um)"
_NAME_AND_UNIT = re.compile(r"\s*([^\[\]]+?)\s*\[\s*([^\[\]]+?)\s*\]\s*")


@dataclass(frozen=True, kw_only=True, eq=False)
class StarSpectrum:
    """A spectrum in photons, wavelengths ascending; arrays of shape ``(sample,)`` are made read-only.

    Attributes
    ----------
    wavelength_um : array
        Positive and strictly ascending, at least two.
    photons_per_s_m2_um : array
        Photon flux density, finite and not negative, not everywhere zero.
    at_earth : bool
        Whether the flux is the one that arrives at Earth, or the one that leaves the stellar surface.
    """

    wavelength_um: NDArray[np.float64]
    photons_per_s_m2_um: NDArray[np.float64]
    at_earth: bool

    def __post_init__(self) -> None:
        for name in ("wavelength_um", "photons_per_s_m2_um"):
            value = np.array(getattr(self, name), dtype=np.float64)
            value.flags.writeable = False
            object.__setattr__(self, name, value)
        wavelength, photons = self.wavelength_um, self.photons_per_s_m2_um
        if wavelength.ndim != 1 or wavelength.shape != photons.shape or wavelength.size < 2:
            raise ScenarioError(f"star.spectrum: expected {_HOW}, at least two rows")
        if not (np.all(np.isfinite(wavelength)) and wavelength[0] > 0 and np.all(np.diff(wavelength) > 0)):
            raise ScenarioError("star.spectrum: expected wavelengths that are finite, positive and all different")
        if not (np.all(np.isfinite(photons)) and photons.min() >= 0 and photons.max() > 0):
            raise ScenarioError("star.spectrum: expected flux densities that are finite, not negative, not all zero")


def read_spectrum(path: str | Path, *, at_earth: bool = False) -> StarSpectrum:
    """The spectrum in a file; see `parse_spectrum`.

    Raises
    ------
    ScenarioError
        If the file cannot be read or is not such a table.
    """
    try:
        text = Path(path).read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise ScenarioError(f"{path}: expected a text file with the star's spectrum, got: {error}") from None
    return parse_spectrum(text, str(path), at_earth=at_earth)


def parse_spectrum(text: str, where: str, *, at_earth: bool = False) -> StarSpectrum:
    """The spectrum in a text.

    Two columns: a wavelength (or frequency, or wavenumber), and a flux density per wavelength or per frequency, in
    energy or in photons. ECSV carries the units in its header; in CSV each column name ends in its unit in square
    brackets. Any order of rows.

    Parameters
    ----------
    text : str
        Contents of the file.
    where : str
        Name of the file, for messages.
    at_earth : bool
        Whether the flux density is the one that arrives at Earth; else it is the one at the stellar surface.

    Raises
    ------
    ScenarioError
        Naming the file, what was expected and what came.
    """
    import astropy.units as u

    first, second = _columns(_table(text, where), where)
    try:
        wavelength = first.to(u.um, u.spectral())
    except u.UnitConversionError:
        raise ScenarioError(f'{where}: expected a first column in a unit such as um, got "{first.unit}"') from None
    try:
        photons = second.to(u.Unit(_PHOTONS), u.spectral_density(wavelength))
    except u.UnitConversionError:
        raise ScenarioError(
            f'{where}: expected a second column in a unit of flux density such as "W / (m2 um)" or Jy, '
            f'got "{second.unit}"'
        ) from None
    order = np.argsort(wavelength.value, kind="stable")
    try:
        return StarSpectrum(
            wavelength_um=wavelength.value[order], photons_per_s_m2_um=photons.value[order], at_earth=at_earth
        )
    except ScenarioError as error:
        raise ScenarioError(f"{where}: {error}") from None


def _table(text: str, where: str) -> Table:
    """The text as an astropy table with a unit on each of its two columns."""
    from astropy.table import Table

    ecsv = text.lstrip().startswith("# %ECSV")
    try:
        table = Table.read(text.splitlines(), format="ascii.ecsv" if ecsv else "ascii.csv")
    except Exception as error:  # the readers of astropy raise many kinds
        raise ScenarioError(f"{where}: expected {_HOW}; got: {error}") from None
    if len(table.colnames) != 2:
        raise ScenarioError(f"{where}: expected {_HOW}; got {len(table.colnames)} columns")
    if not ecsv:
        _take_units_from_names(table, where)
    return table


def _take_units_from_names(table: Table, where: str) -> None:
    import astropy.units as u

    for name in table.colnames:
        match = _NAME_AND_UNIT.fullmatch(name)
        if match is None:
            raise ScenarioError(f'{where}: expected {_HOW}; got the name "{name}" without a unit')
        try:
            table[name].unit = u.Unit(match[2])
        except ValueError:
            raise ScenarioError(f'{where}: column "{match[1]}": "{match[2]}" is not a unit') from None


def _columns(table: Table, where: str) -> tuple[Quantity, Quantity]:
    import astropy.units as u

    for name in table.colnames:
        column = table[name]
        if column.unit is None:
            raise ScenarioError(f'{where}: column "{name}": expected a unit in the header, got none')
        if column.dtype.kind not in "iuf" or np.any(getattr(column, "mask", False)):
            raise ScenarioError(f'{where}: column "{name}": expected a number in every row')
    first, second = (np.asarray(table[name], dtype=np.float64) * table[name].unit for name in table.colnames)
    if not np.all(first > 0 * first.unit):
        raise ScenarioError(f"{where}: expected wavelengths that are finite, positive and all different")
    return u.Quantity(first), u.Quantity(second)
