"""The folder that the accuracy table of the embedded lists is measured against, made from the reference data.

The reference data are excerpts of published line lists (HITRAN: Gordon et al. 2022, JQSRT 277, 107949, and earlier
editions) and measured cross-sections (Massie et al. 1991, NCAR TN-358; PNNL, Sharpe et al. 2004, Appl. Spectrosc. 58,
1452; NIST SRD 79, Chu et al. 1999). They are not ours to ship. This script links the line files, says where they are
complete, and writes the cross-sections in HITRAN's own layout::

    python tests/external/comparison_folder.py REFERENCE OUT
    limbcast lines check --against OUT --write
"""

from __future__ import annotations

import gzip
import re
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np

from planner.spectroscopy.files.xsc import CrossSectionTable, format_xsc

COMPLETE = """\
# Ranges over which the files are complete, where that is not what their names say.
[[file]]
name = "C2H4_full400-10000_hitran2012.par.gz"
gas = "C2H4"
range_per_cm = [400.0, 2917.0]
[[file]]
name = "C2H4_full400-10000_hitran2012.par.gz"
gas = "C2H4"
range_per_cm = [3200.0, 10000.0]
[[file]]
name = "O2_full400-16000_hitran2012.par.gz"
gas = "O2"
range_per_cm = [400.0, 7760.0]
[[file]]
name = "O2_full400-16000_hitran2012.par.gz"
gas = "O2"
range_per_cm = [8009.0, 16000.0]
# Of methanol HITRAN2012 holds the CO stretch; beyond, only stray lines of its wing, where other bands take over.
[[file]]
name = "CH3OH_full400-10000_hitran2012.par.gz"
gas = "CH3OH"
range_per_cm = [400.0, 1083.0]
# Beyond 2446 HITRAN2012 stops at J = 15, though higher J carry most of what there is.
[[file]]
name = "PH3_full400-10000_hitran2012.par.gz"
gas = "PH3"
range_per_cm = [400.0, 2446.0]
[[file]]
name = "PH3_full400-10000_hitran2012.par.gz"
gas = "PH3"
range_per_cm = [2700.0, 10000.0]
[[file]]
name = "HF_4034-4114_sfit.par.gz"
gas = "HF"
range_per_cm = [4034.7, 4043.2]
edition = "HITRAN2016"
[[file]]
name = "HF_4034-4114_sfit.par.gz"
gas = "HF"
range_per_cm = [4105.5, 4114.2]
[[file]]
name = "OCS_4034-4114_sfit.par.gz"
gas = "OCS"
range_per_cm = [4034.7, 4043.2]
edition = "HITRAN2016"
[[file]]
name = "OCS_4034-4114_sfit.par.gz"
gas = "OCS"
range_per_cm = [4105.5, 4114.2]
"""
BEAM_PATH = {"SO2_NISTquantIR": (2270.0, 2400.0)}
"""Where a spectrum shows the carbon dioxide of the air in the beam and not the gas."""
SELECTED = "selected"
"""In the name of files that hold some bands of a stretch only: nothing to compare with."""
TRUE_PRESSURE_TORR = {"C5H8_isoprene": 760.0, "CHF3_HFC23": 760.0}
"""PNNL spectra are of 1 atm of nitrogen; the headers of these two hold something else."""


def make_comparison_folder(reference: Path, out: Path) -> Path:
    """Fill ``out`` with what the embedded lists are compared with; returns it."""
    out.mkdir(parents=True, exist_ok=True)
    for path in sorted((reference / "lines").glob("*.par.gz")):
        if SELECTED not in path.name:
            (out / path.name).symlink_to(path.resolve())
    (out / "coverage.toml").write_text(COMPLETE)
    for path in sorted((reference / "xsc").glob("*.gz")):
        table = read_columns(path) if path.name.endswith(".txt.gz") else read_even_grid(path)
        name = path.name.split(".aerxs")[0].split(".txt")[0]
        blocked = next((stretch for start, stretch in BEAM_PATH.items() if name.startswith(start)), None)
        parts = [table] if blocked is None else [cut(table, 0.0, blocked[0]), cut(table, blocked[1], np.inf)]
        (out / f"{name}.xsc").write_text("".join(format_xsc(part) for part in parts))
    return out


def cut(table: CrossSectionTable, low: float, high: float) -> CrossSectionTable:
    """The part of a table between two wavenumbers."""
    nu = table.wavenumber_per_cm
    inside = (nu >= low) & (nu <= high)
    ends = {"from_per_cm": round(float(nu[inside][0]), 4), "to_per_cm": round(float(nu[inside][-1]), 4)}
    return replace(table, cross_section_cm2=table.cross_section_cm2[inside], **ends)


def read_even_grid(path: Path) -> CrossSectionTable:
    """One header line (name, ends, number of points, temperature, pressure, ...), then values."""
    with gzip.open(path, "rt") as stream:
        header, *rows = stream.read().splitlines()
    low, high, count, kelvin, torr = (float(text) for text in header.split()[1:6])
    values = np.array([float(text) for text in re.findall(r"-?\d\.\d+E[+-]\d\d", " ".join(rows))])[: int(count)]
    name = re.match(r"[^.]*?(?=_\d)", path.name)[0]
    return _table(path, (low, high), values, kelvin, TRUE_PRESSURE_TORR.get(name, torr))


def read_columns(path: Path) -> CrossSectionTable:
    """Two columns, wavenumber and cross-section, at 296 K and 1 atm."""
    with gzip.open(path, "rt") as stream:
        wavenumber, values = np.loadtxt(stream).T
    step = np.diff(wavenumber)
    assert np.ptp(step) < 0.01 * step.mean()  # rounded to four decimals
    return _table(path, (wavenumber[0], wavenumber[-1]), values, 296.0, 760.0)


def _table(path: Path, ends: tuple[float, float], values: np.ndarray, kelvin: float, torr: float) -> CrossSectionTable:
    return CrossSectionTable(
        formula=path.name.split("_")[0],
        from_per_cm=round(float(ends[0]), 4),
        to_per_cm=round(float(ends[1]), 4),
        temperature_k=kelvin,
        pressure_torr=torr,
        cross_section_cm2=values,
        largest_stated_cm2=float(values.max()),
        where=path.name,
    )


if __name__ == "__main__":
    make_comparison_folder(Path(sys.argv[1]), Path(sys.argv[2]))
