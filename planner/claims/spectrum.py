"""A user's spectrum: wavelengths or bin edges, depth and error, every column with its unit."""

from __future__ import annotations

import io
import re
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import ScenarioError

if TYPE_CHECKING:
    from astropy.table import Table

__all__ = ["ObservedSpectrum", "parse_observed", "read_observed"]

Array = NDArray[np.float64]

_HOW = (
    "a table, ECSV or FITS with units or CSV whose first line names columns with units in brackets, such as "
    '"from [um],to [um],depth [ppm],error [ppm]" or "wavelength [um],depth [ppm],error [ppm]", and perhaps "detector"'
)
_NAME_AND_UNIT = re.compile(r"\s*([^\[\]]+?)\s*\[\s*([^\[\]]+?)\s*\]\s*")
_LEAST_ROWS = 4
_NARROWEST_LN = 1 / 4000
"""Bins narrower than this hold too few samples of the forward model."""


@dataclass(frozen=True, kw_only=True, eq=False)
class ObservedSpectrum:
    """A transmission spectrum, wavelengths ascending within each detector. All arrays have shape ``(bin,)``.

    Attributes
    ----------
    from_um, to_um : array
    depth_ppm, error_ppm : array
    detector : int array
        0 throughout where the file does not tell detectors apart.
    detectors : tuple of str
        Names by number.
    """

    from_um: Array
    to_um: Array
    depth_ppm: Array
    error_ppm: Array
    detector: NDArray[np.int64]
    detectors: tuple[str, ...]


def read_observed(path: str | Path) -> ObservedSpectrum:
    """The spectrum in a file; see `parse_observed`.

    Raises
    ------
    ScenarioError
        If the file cannot be read or is not such a table.
    """
    try:
        data = Path(path).read_bytes()
    except OSError as error:
        raise ScenarioError(f"{path}: cannot be read: {error.strerror}") from None
    if data.startswith(b"SIMPLE"):
        return _observed(_fits_table(data, str(path)), str(path))
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError:
        raise ScenarioError(f"{path}: neither FITS nor a text file in UTF-8") from None
    return parse_observed(text, str(path))


def parse_observed(text: str, where: str) -> ObservedSpectrum:
    """The spectrum in a text.

    Columns are told by their names: ``wavelength`` or ``from`` and ``to``; ``depth``; ``error``; ``detector`` if there
    is more than one. Where bins are given by their middle they are taken to meet half way, in the logarithm.

    Raises
    ------
    ScenarioError
        Naming the file, the column, what was expected and what came.
    """
    return _observed(_text_table(text, where), where)


def _observed(table: Table, where: str) -> ObservedSpectrum:
    _check_table(table, where)
    names, detector = _detectors(table, where)
    depth, error = (_column(table, name, "ppm", where) for name in ("depth", "error"))
    if np.any(error <= 0):
        raise ScenarioError(
            f'{where}: column "error": expected errors above zero in every row, got {error.min():g} ppm'
        )
    from_um, to_um = _edges(table, detector, where)
    _check_bins(from_um, to_um, detector, where)
    order = np.lexsort((from_um, detector))
    return ObservedSpectrum(
        from_um=from_um[order],
        to_um=to_um[order],
        depth_ppm=depth[order],
        error_ppm=error[order],
        detector=detector[order],
        detectors=names,
    )


def _fits_table(data: bytes, where: str) -> Table:
    """The first table of a FITS file; names of columns in small letters, for FITS does not tell them apart."""
    import warnings

    from astropy.table import Table

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")
            table = Table.read(io.BytesIO(data), format="fits")
            table.convert_bytestring_to_unicode()
            for name in list(table.colnames):
                if name != name.lower():
                    table.rename_column(name, name.lower())
    except Exception as error:  # the reader of astropy raises many kinds
        raise ScenarioError(f"{where}: expected {_HOW}; got FITS: {_first_words(error)}") from None
    return table


def _text_table(text: str, where: str) -> Table:
    import warnings

    from astropy.table import Table

    ecsv = text.lstrip().startswith("# %ECSV")
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # what astropy warns of here is an error below
            table = Table.read(text.splitlines(), format="ascii.ecsv" if ecsv else "ascii.csv")
    except Exception as error:  # the readers of astropy raise many kinds
        raise ScenarioError(f"{where}: expected {_HOW}; got: {_first_words(error)}") from None
    if not ecsv:
        _take_units_from_names(table, where)
    return table


def _first_words(error: Exception) -> str:
    return " ".join(str(error).split())[:200]


def _check_table(table: Table, where: str) -> None:
    known = {"wavelength", "from", "to", "depth", "error", "detector"}
    for name in table.colnames:
        if name not in known:
            raise ScenarioError(f'{where}: expected {_HOW}; got a column "{name}"')
    if len(table) < _LEAST_ROWS:
        raise ScenarioError(f"{where}: expected at least {_LEAST_ROWS} rows, got {len(table)}")


def _take_units_from_names(table: Table, where: str) -> None:
    import astropy.units as u

    for name in list(table.colnames):
        match = _NAME_AND_UNIT.fullmatch(name)
        if match is None:
            continue
        try:
            unit = u.Unit(match[2]) if match[2] != "ppm" else 1e-6 * u.one
        except (ValueError, TypeError):
            raise ScenarioError(f'{where}: column "{match[1]}": "{match[2]}" is not a unit') from None
        if match[1] in table.colnames:
            raise ScenarioError(f'{where}: column "{match[1]}" stands there twice')
        table[name].unit = unit
        table.rename_column(name, match[1])


def _column(table: Table, name: str, unit: str, where: str) -> Array:
    """A column of finite numbers in a unit."""
    import astropy.units as u

    if name not in table.colnames:
        raise ScenarioError(f'{where}: expected {_HOW}; no column "{name}"')
    column: Any = table[name]
    if column.dtype.kind not in "iuf" or np.any(getattr(column, "mask", False)) or column.ndim != 1:
        raise ScenarioError(f'{where}: column "{name}": expected a number in every row')
    if column.unit is None:
        raise ScenarioError(f'{where}: column "{name}": expected a unit such as {unit}, got none')
    try:
        with u.add_enabled_units([u.def_unit("ppm", 1e-6 * u.one)]):  # astropy lacks it
            wanted = u.um if unit == "um" else 1e-6 * u.one
            values = (np.asarray(column, dtype=np.float64) * u.Unit(str(column.unit))).to_value(wanted)
    except (u.UnitConversionError, ValueError, TypeError):
        message = f'column "{name}": expected a unit such as {unit}, got "{column.unit}"'
        raise ScenarioError(f"{where}: {message}") from None
    if not np.all(np.isfinite(values)):
        raise ScenarioError(f'{where}: column "{name}": expected a finite number in every row')
    return np.asarray(values, dtype=np.float64)


def _detectors(table: Table, where: str) -> tuple[tuple[str, ...], NDArray[np.int64]]:
    if "detector" not in table.colnames:
        return ("the spectrum",), np.zeros(len(table), dtype=np.int64)
    if np.any(getattr(table["detector"], "mask", False)):
        raise ScenarioError(f'{where}: column "detector": expected a name or number in every row')
    words = [str(value) for value in table["detector"]]
    names = tuple(dict.fromkeys(words))
    return names, np.array([names.index(word) for word in words], dtype=np.int64)


def _edges(table: Table, detector: NDArray[np.int64], where: str) -> tuple[Array, Array]:
    """Edges as given, or half way between the middles of neighbours on one detector."""
    if "wavelength" not in table.colnames:
        return _column(table, "from", "um", where), _column(table, "to", "um", where)
    if "from" in table.colnames or "to" in table.colnames:
        raise ScenarioError(f'{where}: expected either "wavelength" or "from" and "to", got both')
    middle = _column(table, "wavelength", "um", where)
    if np.any(middle <= 0):
        raise ScenarioError(f'{where}: column "wavelength": expected values above zero, got {middle.min():g} um')
    low, high = np.empty_like(middle), np.empty_like(middle)
    for number in np.unique(detector):
        mine = np.flatnonzero(detector == number)
        mine = mine[np.argsort(middle[mine])]
        ln = np.log(middle[mine])
        if ln.size < 2 or np.any(np.diff(ln) <= 0):
            raise ScenarioError(f"{where}: expected at least two different wavelengths for each detector")
        half = (ln[1:] + ln[:-1]) / 2
        low[mine] = np.exp(np.concatenate([[2 * ln[0] - half[0]], half]))
        high[mine] = np.exp(np.concatenate([half, [2 * ln[-1] - half[-1]]]))
    return low, high


def _check_bins(from_um: Array, to_um: Array, detector: NDArray[np.int64], where: str) -> None:
    for row, (low, high) in enumerate(zip(from_um, to_um, strict=True)):
        if not 0 < low < high:
            raise ScenarioError(f"{where}: row {row + 1}: expected 0 < from < to, got {low:g} to {high:g} um")
        if np.log(high / low) < _NARROWEST_LN:
            raise ScenarioError(
                f"{where}: row {row + 1}: expected bins of R = {1 / _NARROWEST_LN:.0f} or wider, got {low:g} to "
                f"{high:g} um"
            )
    if from_um.min() < 0.2 or to_um.max() > 30:
        raise ScenarioError(
            f"{where}: expected wavelengths from 0.2 to 30 um, got {from_um.min():g} to {to_um.max():g} um"
        )
    for number in np.unique(detector):
        mine = np.flatnonzero(detector == number)
        mine = mine[np.argsort(from_um[mine])]
        if np.any(from_um[mine][1:] < to_um[mine][:-1] * (1 - 1e-6)):
            raise ScenarioError(f"{where}: bins of one detector overlap")
