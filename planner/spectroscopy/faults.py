"""What can be wrong with an embedded list, found without any outside data."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import replace
from math import isfinite
from typing import Any

import numpy as np

from planner.errors import PlannerError
from planner.spectroscopy.claims import band_rows, plain_label
from planner.spectroscopy.hitran import format_par, parse_par
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import Constants, part_lines, smooth_cross_section
from planner.spectroscopy.molecules import partition_sum

__all__ = ["list_faults"]

_REFERENCE_K = 296.0
_RECORDS = 2000
"""Records that are written and read back: every n-th line."""
_TOO_MUCH, _TOO_LITTLE = 1.01, 0.99
"""Of a band's stated sum, its lines together."""
_SUM_FROM_CM = 1e-20
_OUTSIDE_FRACTION = 0.01
_STEP_PER_CM = 0.05
_FADE_PER_CM = 400.0


def list_faults(constants: Constants) -> tuple[Lines | None, list[str]]:
    """Build a list anew and look for faults.

    Parameters
    ----------
    constants : Constants

    Returns
    -------
    lines : Lines or None
        The list; None if it has no lines.
    faults : list of str
        Bands whose lines do not add up to the stated sum, records that the strict reader refuses, coverage that is
        out of order or holds nothing, intensity outside the coverage, partition sums that are not finite. One that
        cannot be built at all has that one fault.
    """
    try:
        parts = [part_lines(constants, part) for part in constants.line_parts]
        lines = Lines.join(parts) if parts else None
        faults = [fault for part, own in zip(constants.line_parts, parts, strict=True) for fault in _sums(part, own)]
        faults += _smooth_sums(constants)
        if lines is not None:
            faults += [*_records(lines), *_partition_sums(lines)]
        return lines, [*faults, *_coverage(constants, lines)]
    except PlannerError as error:
        return None, [f"cannot be built: {error}"]


def _sums(part: Mapping[str, Any], lines: Lines) -> Iterator[str]:
    """Bands of one part, told apart by the names of their levels, and bins of random lines."""
    stated: dict[tuple[int, str, tuple[str, ...]], float] = defaultdict(float)
    for row in band_rows(part):
        stated[row.isotopologue, row.lower, row.uppers] += row.sum_cm
    found: dict[tuple[int, str, str], float] = defaultdict(float)
    labels = np.stack([lines.isotopologue.astype(str), lines.lower_global, lines.upper_global])
    kinds, member = np.unique(labels, axis=1, return_inverse=True)
    sums = np.bincount(member.ravel(), lines.intensity_cm, minlength=kinds.shape[1])
    for (isotopologue, lower, upper), total in zip(kinds.T.tolist(), sums.tolist(), strict=True):
        found[int(isotopologue), plain_label(lower), plain_label(upper)] += total
    for (isotopologue, lower, uppers), total in stated.items():
        ours = sum(found.get((isotopologue, lower, upper), 0.0) for upper in uppers)
        if total >= _SUM_FROM_CM:
            yield from _sum_fault(f"isotopologue {isotopologue}, {'+'.join(uppers)} from {lower}", ours, total)
    if part["kind"] == "statistical":
        yield from _sum_fault("random lines", float(lines.intensity_cm.sum()), sum(row[2] for row in part["bins"]))


def _smooth_sums(constants: Constants) -> Iterator[str]:
    for part in constants.smooth_parts:
        if "band_sum_cm" in part:
            low, high = part["span_per_cm"]
            grid = np.arange(max(_STEP_PER_CM, low - _FADE_PER_CM), high + _FADE_PER_CM, _STEP_PER_CM)
            values = smooth_cross_section(replace(constants, smooth_parts=(part,)), grid, _REFERENCE_K)
            if values is not None:
                yield from _sum_fault(str(part.get("name")), float(values.sum()) * _STEP_PER_CM, part["band_sum_cm"])


def _sum_fault(name: str, ours_cm: float, stated_cm: float) -> Iterator[str]:
    ratio = ours_cm / stated_cm
    if not _TOO_LITTLE <= ratio <= _TOO_MUCH:
        yield f"{name}: the lines add up to {ratio:.3f} of the stated {stated_cm:.3g} cm per molecule"


def _records(lines: Lines) -> Iterator[str]:
    """A sample of the list as HITRAN records, through the strict reader."""
    sample = lines.where(np.arange(0, len(lines), max(1, len(lines) // _RECORDS)))
    try:
        again = parse_par(format_par(sample), "records")
    except PlannerError as error:
        yield f"records: {error}"
        return
    for name, tolerance in (("wavenumber_per_cm", 1e-6), ("lower_energy_per_cm", 1e-4)):
        if np.any(np.abs(getattr(again, name) - getattr(sample, name)) > tolerance):
            yield f"records: {name} does not survive the format"
    if np.any(np.abs(again.intensity_cm / sample.intensity_cm - 1.0) > 1e-3):
        yield "records: intensity_cm does not survive the format"


def _partition_sums(lines: Lines) -> Iterator[str]:
    for molecule, isotopologue in sorted({*zip(lines.molecule.tolist(), lines.isotopologue.tolist(), strict=True)}):
        value = partition_sum(molecule, isotopologue, _REFERENCE_K)
        if not (isfinite(value) and value > 0):
            yield f"isotopologue {isotopologue}: partition sum {value} at {_REFERENCE_K:g} K"


def _coverage(constants: Constants, lines: Lines | None) -> Iterator[str]:
    ends = [end for interval in constants.covers_per_cm for end in interval]
    if ends != sorted(set(ends)) or ends[0] < 0:
        yield f"covers_per_cm: expected ascending, disjoint intervals, got {ends}"
    if lines is None:
        return
    inside = np.zeros(len(lines), dtype=bool)
    for low, high in constants.covers_per_cm:
        here = (lines.wavenumber_per_cm >= low) & (lines.wavenumber_per_cm <= high)
        smooth = smooth_cross_section(constants, np.linspace(low, high, 1000), _REFERENCE_K)
        if not here.any() and (smooth is None or not smooth.any()):
            yield f"covers_per_cm: nothing absorbs between {low:g} and {high:g}"
        inside |= here
    # pure rotation below the first interval is left out on purpose: no mode sees it
    between = (lines.wavenumber_per_cm > ends[0]) & ~inside
    outside = float(lines.intensity_cm[between].sum() / lines.intensity_cm.sum())
    if outside > _OUTSIDE_FRACTION:
        yield f"covers_per_cm: {outside:.2g} of the intensity lies in its gaps or beyond"
