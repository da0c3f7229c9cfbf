"""One window of an embedded list judged against real data, like with like.

Of an embedded list only the isotopologues that the real file holds count, and of each, in both lists, only lines as
strong as those at which the file was cut off, so that neither what it leaves out nor its cut is held against the list.
Measured cross-sections are compared at their own temperature and pressure and held at all heights.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from math import exp, log

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.accuracy import MARKS, STRONG_MARKS, Marks, WindowScore, compare, compare_cross_sections
from planner.spectroscopy.accuracyfile import JudgedWindow, Judgement
from planner.spectroscopy.claims import claim_of
from planner.spectroscopy.coverage import Interval, inside
from planner.spectroscopy.crosssections import cross_sections
from planner.spectroscopy.files.xsc import BAR_PER_TORR, CrossSectionTable
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import Constants, smooth_cross_section
from planner.spectroscopy.windows import runs

__all__ = [
    "averaged",
    "cut_off_cm",
    "judge_lines",
    "judge_tables",
    "noise_cm2",
    "smooth_sum_cm",
    "sum_cm",
]

Floats = NDArray[np.float64]

_TEMPERATURE_K = 250.0
_REFERENCE_K = 296.0
_SHIFT_PER_CM = 0.005
_STEP_DECADES = 0.25
_FEW_BELOW = 0.1
_ROUNDED = 0.999
"""Records round intensities to four digits."""
_BOX_PER_CM = 1.0
_FINE_STEP_PER_CM = 0.02
_SMOOTH_STEP_PER_CM = 0.05
_SUM_FROM_CM = 1e-20
_SUM_TOLERANCE = 0.10
_END_PER_CM = 10.0
_END_SHARE = 0.05
"""A window holds whole bands if less than this share of its intensity lies within 10 per cm of its ends."""
_LEAST_FACTOR = 1.05
"""Real lists are not better than this themselves (HITRAN gives 2 to 10 % for strong bands)."""
_SIGMAS_AT_90 = 1.645
_NARROWEST = 0.005
"""Widths in ln(wavenumber) below half a bin of R = 100 are not judged."""


@dataclass(frozen=True, kw_only=True)
class _Sums:
    """Intensities and numbers of lines in a window."""

    real_cm: float
    ratio: float
    whole_bands: bool
    embedded_lines: int
    real_lines: int


def judge_lines(
    constants: Constants, embedded: Lines | None, real: Lines, window_per_cm: Interval, source: str
) -> JudgedWindow | None:
    """An embedded list against real lines in a window.

    Parameters
    ----------
    constants : Constants
        Of the molecule, for its smooth parts and what they say of their sources.
    embedded : Lines or None
        All its lines.
    real : Lines
        All real lines of the molecule where their file is complete.
    window_per_cm : (from, to)
        Inside a run of the real lines.
    source : str
        What the real lines are.

    Returns
    -------
    JudgedWindow or None
        None where the real lines show nothing.
    """
    ours, real = _alike(embedded, real, window_per_cm)
    marks = MARKS if constants.line_parts else STRONG_MARKS

    def smooth(wavenumber_per_cm: Floats, temperature_k: float) -> Floats:
        values = smooth_cross_section(constants, wavenumber_per_cm, temperature_k)
        return np.zeros(wavenumber_per_cm.size) if values is None else values

    score = compare(
        ours,
        real,
        window_per_cm,
        smooth=smooth if constants.smooth_parts else None,
        mixing_ratios=marks.mixing_ratios,
        temperature_k=_TEMPERATURE_K,
        like_with_like=False,
    )
    if not score.bins[0].any():
        return None
    total = sum_cm(real, window_per_cm)
    ends = [(window_per_cm[0], window_per_cm[0] + _END_PER_CM), (window_per_cm[1] - _END_PER_CM, window_per_cm[1])]
    sums = _Sums(
        real_cm=total,
        ratio=(sum_cm(ours, window_per_cm) + smooth_sum_cm(constants, window_per_cm)) / total,
        whole_bands=sum(sum_cm(real, end) for end in ends) < _END_SHARE * total,
        embedded_lines=_count(ours, window_per_cm),
        real_lines=_count(real, window_per_cm),
    )
    fitted = claim_of(constants, ours, window_per_cm).fitted_fraction
    return _row(constants, window_per_cm, source, marks, [score], (_TEMPERATURE_K,), sums, fitted)


def judge_tables(
    constants: Constants,
    embedded: Lines | None,
    tables: Sequence[CrossSectionTable],
    window_per_cm: Interval,
    source: str,
) -> JudgedWindow | None:
    """An embedded list against measured cross-sections of one stretch at several temperatures.

    Each figure is the median over the temperatures, so that one odd table does not decide. Both sides are averaged
    over 1 per cm first, and bins within five times the noise of a table are not judged; see `judge_lines`.
    """
    scores, ratios, sums = [], [], []
    for table in tables:
        here = inside(table.wavenumber_per_cm, [window_per_cm])
        nu, real = table.wavenumber_per_cm[here], table.cross_section_cm2[here]
        ours = _embedded_cross_section(constants, embedded, table, nu)
        score = compare_cross_sections(
            np.maximum(averaged(ours, table.step_per_cm), 0.0),
            np.maximum(averaged(real, table.step_per_cm), 0.0),
            (nu[0], nu[-1]),
            noise_cm2=noise_cm2(table),
            temperature_k=table.temperature_k,
        )
        if score.bins[0].any():
            scores.append(score)
            sums.append(float(real.sum()) * table.step_per_cm)
            ratios.append(float(ours.sum() / real.sum()))
    if not scores:
        return None
    kelvin = tuple(sorted({table.temperature_k for table in tables}))
    found = _Sums(
        real_cm=float(np.median(sums)),
        ratio=float(np.median(ratios)),
        whole_bands=True,
        embedded_lines=_count(embedded, window_per_cm),
        real_lines=0,
    )
    fitted = claim_of(constants, embedded, window_per_cm).fitted_fraction
    return _row(constants, window_per_cm, source, STRONG_MARKS, scores, kelvin, found, fitted)


def cut_off_cm(intensity_cm: Floats) -> float:
    """Where a list was cut off: its weakest line, or the edge below which its lines thin out.

    Lists hold the more lines the weaker these are. In steps of a quarter decade the edge is the lower end of the
    weakest step that holds a third of the fullest one; it counts where fewer than a tenth of the lines lie below it.
    """
    if not intensity_cm.size:
        return float("inf")
    decades = np.log10(np.maximum(intensity_cm, 1e-99))
    steps = np.floor(decades / _STEP_DECADES).astype(int)
    counts = np.bincount(steps - steps.min())
    edge = (steps.min() + int(np.flatnonzero(counts >= counts.max() / 3)[0])) * _STEP_DECADES
    return float(10.0**edge) if np.mean(decades < edge) < _FEW_BELOW else float(intensity_cm.min())


def noise_cm2(table: CrossSectionTable) -> float:
    """Noise of a measured cross-section: scatter of neighbours, or the negative values, whichever is larger.

    The median of ``|s_i - (s_i-1 + s_i+1)/2|`` is 0.6745 standard deviations times sqrt(3/2) for white noise.
    """
    values = table.cross_section_cm2
    curvature = values[1:-1] - 0.5 * (values[:-2] + values[2:])
    scatter = float(np.median(np.abs(curvature))) / (0.6745 * np.sqrt(1.5))
    negative = values[values < 0]
    return max(scatter, float(np.sqrt(np.mean(negative**2))) if negative.size else 0.0)


def averaged(values: Floats, step_per_cm: float) -> Floats:
    """Running mean over 1 per cm, so that single noisy points do not pull the heights; shorter at the ends."""
    box = np.ones(max(1, round(_BOX_PER_CM / step_per_cm)))
    if box.size > values.size:
        return np.full(values.size, values.mean())
    return np.asarray(np.convolve(values, box, "same") / np.convolve(np.ones(values.size), box, "same"))


def sum_cm(lines: Lines | None, window_per_cm: Interval) -> float:
    """Summed intensity of the lines in a window."""
    return 0.0 if lines is None else float(lines.intensity_cm[inside(lines.wavenumber_per_cm, [window_per_cm])].sum())


def smooth_sum_cm(constants: Constants, window_per_cm: Interval) -> float:
    """Integral of the smooth parts over a window at 296 K, in cm per molecule."""
    grid = np.linspace(*window_per_cm, max(2, int((window_per_cm[1] - window_per_cm[0]) / _SMOOTH_STEP_PER_CM)))
    smooth = smooth_cross_section(constants, grid, _REFERENCE_K)
    return 0.0 if smooth is None else float(smooth.mean() * (window_per_cm[1] - window_per_cm[0]))


def _alike(embedded: Lines | None, real: Lines, window: Interval) -> tuple[Lines | None, Lines]:
    """Both lists in the run of real lines that holds a window: of the real isotopologues, above the real cut-off.

    Random lines, which name no levels, stand for all lines of their bins together: they are not cut, nor is a real
    list that is compared with them for the most part.
    """
    low, high = next(run for run in runs(real.wavenumber_per_cm) if run[0] <= window[0] and run[1] >= window[1])
    ours = None
    if embedded is not None:
        present = inside(embedded.wavenumber_per_cm, [(low - _SHIFT_PER_CM, high + _SHIFT_PER_CM)])
        ours = embedded.where(present & np.isin(embedded.isotopologue, np.unique(real.isotopologue)))
        random = ours.upper_global == ""
        if sum_cm(ours.where(random), window) > 0.5 * sum_cm(ours, window):
            return ours, real
    here = inside(real.wavenumber_per_cm, [window])
    cuts = np.full(int(real.isotopologue.max()) + 1, np.inf)
    for isotopologue in np.unique(real.isotopologue):
        cuts[isotopologue] = cut_off_cm(real.intensity_cm[here & (real.isotopologue == isotopologue)])
    if ours is not None:
        ours = ours.where((ours.intensity_cm >= _ROUNDED * cuts[ours.isotopologue]) | random)
    return ours, real.where(real.intensity_cm >= cuts[real.isotopologue])


def _embedded_cross_section(
    constants: Constants, embedded: Lines | None, table: CrossSectionTable, wavenumber_per_cm: Floats
) -> Floats:
    """What the embedded list gives at the state of a table, averaged over the table's step, shape ``(wavenumber,)``."""
    step = table.step_per_cm
    fine = max(1, int(np.ceil(step / _FINE_STEP_PER_CM)))
    offsets = (np.arange(fine) + 0.5) / fine - 0.5
    grid = (wavenumber_per_cm[:, np.newaxis] + step * offsets).ravel()
    total = np.zeros(grid.size)
    if embedded is not None:
        bar = [table.pressure_torr * BAR_PER_TORR]
        total += cross_sections(embedded, grid, temperature_k=table.temperature_k, pressures_bar=bar)[0]
    smooth = smooth_cross_section(constants, grid, table.temperature_k)
    if smooth is not None:
        total += smooth
    return np.asarray(total.reshape(-1, fine).mean(axis=1))


def _row(
    constants: Constants,
    window: Interval,
    source: str,
    marks: Marks,
    scores: Sequence[WindowScore],
    temperatures_k: tuple[float, ...],
    sums: _Sums,
    fitted_fraction: float,
) -> JudgedWindow:
    p90, median, mean = (
        _typical([getattr(s, name)[0] for s in scores]) for name in ("percentile_90", "median", "mean")
    )
    missed = _missed(marks, p90, median, mean)
    if sums.real_cm > _SUM_FROM_CM and sums.whole_bands and abs(sums.ratio - 1.0) > _SUM_TOLERANCE:
        missed.append(f"band sum {sums.ratio:.2f} of the real one")
    narrow = log(window[1] / window[0]) < _NARROWEST
    spread = max((value for value in p90 if value is not None), default=0.0) / _SIGMAS_AT_90
    return JudgedWindow(
        gas=constants.molecule.formula,
        from_per_cm=round(window[0], 1),
        to_per_cm=round(window[1], 1),
        verdict=Judgement.NARROW if narrow else Judgement.MISSES if missed else Judgement.MEETS,
        missed="; ".join(missed),
        compared_with=source,
        in_sample=fitted_fraction > 0.5,
        temperatures_k=temperatures_k,
        mixing_ratios=marks.mixing_ratios,
        bins=tuple(int(n) for n in np.max([s.bins[0] for s in scores], axis=0)),
        percentile_90=p90,
        median=median,
        mean=mean,
        percentile_90_at_1000=_typical([s.percentile_90[1] for s in scores]),
        real_sum_cm=float(f"{sums.real_cm:.3g}"),
        sum_ratio=round(sums.ratio, 2),
        strength_factor=round(max(_LEAST_FACTOR, exp(2.0 * spread)), 2),
        embedded_lines=sums.embedded_lines,
        real_lines=sums.real_lines,
    )


def _typical(rows: Sequence[Floats]) -> tuple[float | None, ...]:
    """Per mixing ratio the median over the rows, to two decimals; None where there is no figure."""
    found = [column[np.isfinite(column)] for column in np.array(rows).T]
    return tuple(round(float(np.median(column)), 2) + 0.0 if column.size else None for column in found)


def _missed(
    marks: Marks,
    percentile_90: Sequence[float | None],
    median: Sequence[float | None],
    mean: Sequence[float | None],
) -> list[str]:
    """The marks that are not met, in words."""
    limits = (
        ("90 %", percentile_90, marks.percentile_90),
        ("median", median, marks.median),
        ("mean", mean, [marks.mean] * len(mean)),
    )
    return [
        f"{name} {value:.2f} at {ratio:.0e}, mark {limit:.2f}"
        for name, values, most in limits
        for ratio, value, limit in zip(marks.mixing_ratios, values, most, strict=True)
        if value is not None and abs(value) > limit
    ]


def _count(lines: Lines | None, window: Interval) -> int:
    return 0 if lines is None else int(inside(lines.wavenumber_per_cm, [window]).sum())
