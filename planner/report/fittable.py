"""A fit for people, its draws and its bins as tables."""

from __future__ import annotations

from collections.abc import Sequence
from math import exp, isfinite

import numpy as np
from astropy.table import Column, Table
from rich.console import Group
from rich.table import Table as TextTable
from rich.text import Text

from planner.detection.evidence import even_prior, strength_of
from planner.report.table import sentences_block
from planner.report.words import band_text, gas_text, ratio_text
from planner.studies.fitting.records import BinReport, FitResult, Found

__all__ = ["bins_table", "draws_table", "evidence_sentences", "fit_view", "range_text"]

_BINS_SHOWN = 5
_MOST_ODDS = 1e6


def fit_view(result: FitResult) -> Group:
    """A fit as something a rich console prints: does the model fit, what came out, for which bins, what it rests on."""
    return Group(
        _heading(result),
        *sentences_block("Does the model describe the data?", _goodness(result)),
        Text(),
        _numbers((*result.found, *result.offsets)),
        *sentences_block("Evidence", evidence_sentences(result)),
        *sentences_block("Which bins carry the result", _bins(result.bins, result.evidences[-1].without)),
        *sentences_block("Checked on the full grid", _recheck(result)),
        *sentences_block("Priors", [f"{name_text(f)}: {f.prior}" for f in (*result.found, *result.offsets)]),
        *sentences_block("Assumptions", result.assumptions),
        *sentences_block("Line data", result.line_data),
        *sentences_block("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


def name_text(found: Found) -> str:
    """What people call a parameter."""
    return gas_text(found.name) if found.gas else found.name


def range_text(found: Found, low: float, high: float) -> str:
    """Two ends of a range of a parameter, with its unit."""
    return f"{value_text(found, low)} to {value_text(found, high)}"


def value_text(found: Found, value: float) -> str:
    """A value of a parameter to three digits, mixing ratios in the unit that suits."""
    if found.gas:
        return ratio_text(value)
    return f"{value:.3g}"


def evidence_sentences(result: FitResult) -> list[str]:
    """ln of the evidences, and what the difference amounts to in words."""
    sentences = []
    for evidence in result.evidences:
        which = f"without {gas_text(evidence.without)}" if evidence.without else "with all gases"
        sentences.append(
            f"{which}: ln(evidence) {evidence.ln_evidence:.2f} +/- {evidence.error:.2f} (per ppm for each bin), "
            f"{evidence.parameters} parameters, {evidence.information:.1f} nats from prior to posterior, "
            f"{evidence.evaluations} models"
        )
    if result.ln_bayes is None:
        return sentences
    gas = gas_text(str(result.evidences[1].without))
    ln_bayes, error = result.ln_bayes
    return [*sentences, *_bayes(gas, ln_bayes, error)]


def _bayes(gas: str, ln_bayes: float, error: float) -> list[str]:
    for_it, size = ln_bayes >= 0, abs(ln_bayes)
    side = f"for {gas}" if for_it else f"against {gas}"
    odds = f"{exp(size):.3g}" if exp(min(size, 700.0)) < _MOST_ODDS else f"more than {_MOST_ODDS:.0e}"
    doubt = even_prior(size)
    if doubt < 1 / _MOST_ODDS:
        before = "less than one in a million" if for_it else "all but one in a million"
    else:
        before = f"{doubt:.2g}" if for_it else f"1 - {doubt:.2g}"
    return [
        f"ln(Bayes factor) {ln_bayes:+.2f} +/- {error:.2f}: {strength_of(size)} evidence {side} on Jeffreys' scale",
        f"the same in odds: the data move them by a factor of {odds} {side}",
        f"the same as a demand: who gave {gas} a probability of {before} before the data is at even odds after them",
    ]


def _heading(result: FitResult) -> Text:
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.invented:
        text.append("The target is invented.\n", style="italic")
    text.append(f"Fit to {result.spectrum}: {result.goodness.bins} bins, {result.goodness.parameters} free parameters.")
    return text


def _goodness(result: FitResult) -> list[str]:
    found = result.goodness
    largest = ", ".join(f"{r.sigma:+.1f} sigma at {band_text(r.from_um, r.to_um)} um" for r in found.largest)
    return [
        f"{found.verdict} (chi-squared {found.chi2:.1f} of the best model for {found.bins} bins less "
        f"{found.parameters} parameters; one as large or larger has a chance of {found.p_value:.2g})",
        f"largest residuals: {largest}; neighbouring residuals go together at {found.neighbours_sigma:+.1f} sigma",
    ]


def _numbers(found: Sequence[Found]) -> TextTable:
    table = TextTable(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("", overflow="fold")
    for heading in ("median", "68 %", "95 %"):
        table.add_column(heading, justify="right", no_wrap=True)
    for one in found:
        name = f"{name_text(one)}" + (f" ({one.unit})" if one.unit else "")
        if one.upper_95 is not None:
            table.add_row(name, Text("-"), Text("not told from none"), Text(f"below {value_text(one, one.upper_95)}"))
        else:
            table.add_row(
                name,
                Text(value_text(one, one.median), style="bold"),
                range_text(one, one.low_68, one.high_68),
                range_text(one, one.low_95, one.high_95),
            )
    return table


def _bins(bins: BinReport, without: str | None) -> list[str]:
    """The bins that the gas in question, or each gas, would miss most."""
    sentences = []
    if bins.left_out_gain is not None:
        best = [i for i in np.argsort(-bins.left_out_gain)[:_BINS_SHOWN].tolist() if bins.left_out_gain[i] > 0]
        places = ", ".join(f"{_place(bins, i)} ({bins.left_out_gain[i]:+.2f})" for i in best)
        sentences.append(
            f"expected better with {gas_text(str(without))} than without, from all other bins, in nats: "
            f"{places or 'none'}"
        )
    for gas, shift in zip(bins.gases, bins.left_out_shift, strict=True):
        best = np.argsort(-np.abs(shift))[:_BINS_SHOWN].tolist()
        places = ", ".join(f"{_place(bins, i)} ({shift[i]:+.2f})" for i in best)
        sentences.append(f"{gas_text(gas)}: left out, the mean log10 mixing ratio moves, in its widths, by: {places}")
    if not bins.trusted.all():
        where = ", ".join(_place(bins, i) for i in np.flatnonzero(~bins.trusted).tolist())
        sentences.append(
            f"not to be judged from these draws, for too few of them would remain (marked *): {where}; fit without them"
        )
    return sentences


def _place(bins: BinReport, index: int) -> str:
    mark = "" if bins.trusted[index] else "*"
    return f"{band_text(float(bins.from_um[index]), float(bins.to_um[index]))}{mark}"


def _recheck(result: FitResult) -> list[str]:
    check = result.recheck
    most = sorted(check.shifts, key=lambda pair: -abs(pair[1]))[:3]
    moved = ", ".join(f"{name} {shift:+.2f}" for name, shift in most)
    return [
        f"{check.draws} draws computed on the full grid are worth {check.effective_size:.0f} with the weights that it "
        f"gives them; ln(evidence) moves by {check.ln_evidence_shift:+.3f}; means move most, in posterior widths: "
        f"{moved}; no depth differs by more than {check.worst_ppm:.2g} ppm"
    ]


def draws_table(result: FitResult) -> Table:
    """Equally likely draws, a row each: values, not logarithms; gases as mixing ratios."""
    table = Table(meta=_meta(result) | {"priors": {f.name: f.prior for f in (*result.found, *result.offsets)}})
    for found in (*result.found, *result.offsets):
        values = 10**found.draws if found.logarithmic else found.draws
        table[found.name.replace(" ", "_")] = Column(values, unit=_UNITS.get(found.unit))
    return table


_UNITS = {"K": "K", "bar": "bar", "R_earth": "earthRad", "ppm": "1e-6", "% of the disc": "%"}


def bins_table(result: FitResult) -> Table:
    """The bins of the spectrum with the model and what leaving each out does.

    ``model_q*_ppm`` are quantiles of the model with its levels, ``shift_<GAS>`` the change of the mean log10 mixing
    ratio in posterior widths, ``gain`` the nats by which air with the gas in question expects the bin better.
    """
    bins = result.bins
    table = Table(meta=_meta(result))
    table["detector"] = bins.detector
    for name in ("from_um", "to_um"):
        table[name] = Column(getattr(bins, name), unit="um")
    for name in ("depth_ppm", "error_ppm", "best_ppm"):
        table[name] = Column(getattr(bins, name), unit="1e-6")
    for label, values in zip(("025", "160", "500", "840", "975"), bins.bands_ppm, strict=True):
        table[f"model_q{label}_ppm"] = Column(values, unit="1e-6")
    table["left_out_ln_density"] = bins.left_out_ln_density
    if bins.left_out_gain is not None:
        table["gain"] = bins.left_out_gain
    for gas, shift in zip(bins.gases, bins.left_out_shift, strict=True):
        table[f"shift_{gas}"] = shift
    table["left_out_size"] = bins.left_out_size
    table["trusted"] = bins.trusted
    return table


def _meta(result: FitResult) -> dict[str, object]:
    there = {
        f"ln_evidence_without_{e.without}" if e.without else "ln_evidence": e.ln_evidence for e in result.evidences
    }
    return {
        "title": result.title,
        "invented": result.invented,
        "spectrum": result.spectrum,
        "seed": result.seed,
        **{name: value for name, value in there.items() if isfinite(value)},
        "assumptions": list(result.assumptions),
        "line_data": list(result.line_data),
        "cautions": list(result.cautions),
        "limbcast": result.version,
    }
