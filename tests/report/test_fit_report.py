"""A made-up fit through everything that reports it."""

from __future__ import annotations

import io
import json
import math
from dataclasses import replace

import numpy as np
import pytest
from rich.console import Console

from planner.detection.nested import NestedState
from planner.errors import StoreError
from planner.report.figure import write_figure
from planner.report.fitfigure import fit_figure
from planner.report.fitjson import fit_json
from planner.report.fitstate import FitFolder
from planner.report.fittable import bins_table, draws_table, evidence_sentences, fit_view
from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.posterior import found_of, goodness_of, leave_out_each, offset_of
from planner.studies.fitting.records import BinReport, Evidence, FitResult, Recheck
from planner.studies.fitting.unknowns import Unknown

BINS, DRAWS = 60, 400


def gas(formula):
    words = "mixing ratio from 1e-10 to 0.05, evenly in the logarithm"
    return Unknown(name=formula, words=words, value=lambda u: 1e-10 * 5e8**u, gas=True, logarithmic=True)


@pytest.fixture
def result():
    """CH4 found, CFC-12 only limited, two detectors."""
    rng = np.random.default_rng(1)
    edges = np.geomspace(1, 5, BINS + 1)
    detector = np.repeat([0, 1], BINS // 2)
    model = 5000 + 60 * np.exp(-(((edges[:-1] - 3.3) / 0.2) ** 2))
    spectra = model + rng.normal(size=(DRAWS, 1)) * 5
    data = LevelledData(
        depth_ppm=model + 20 * rng.normal(size=BINS), error_ppm=np.full(BINS, 20.0), detector=detector, offset_ppm=100.0
    )
    draws = np.column_stack([rng.normal(-4, 0.2, DRAWS), rng.uniform(-10, -6, DRAWS), rng.normal(250, 20, DRAWS)])
    kelvin = Unknown(name="temperature", unit="K", words="15 % about 250 K", value=lambda z: 250 * math.exp(0.15 * z))
    left_out = leave_out_each(data.ln_densities(spectra), draws)
    trusted = left_out.trusted.copy()
    trusted[10] = False
    unknowns = (gas("CH4"), gas("CCl2F2"), kelvin)
    evidence = Evidence(
        without=None, ln_evidence=-270.0, error=0.25, information=11.0, parameters=3, evaluations=20000,
        effective_size=1400.0,
    )  # fmt: skip
    return FitResult(
        title="Made up",
        invented=True,
        spectrum="made-up.csv",
        seed=1,
        live=200,
        found=tuple(found_of(u, d) for u, d in zip(unknowns, draws.T, strict=True)),
        offsets=tuple(offset_of(name, rng.normal(0, 10, DRAWS), 100.0) for name in ("blue", "red")),
        evidences=(evidence, replace(evidence, without="CH4", ln_evidence=-281.0, parameters=2)),
        goodness=goodness_of(data, model, (edges[:-1], edges[1:]), 5),
        recheck=Recheck(
            draws=200, effective_size=190.0, ln_evidence_shift=0.02, shifts=(("CH4", 0.01), ("temperature", -0.03)),
            worst_ppm=0.4,
        ),
        bins=BinReport(
            from_um=edges[:-1], to_um=edges[1:], depth_ppm=data.depth_ppm, error_ppm=data.error_ppm, detector=detector,
            best_ppm=model, bands_ppm=np.quantile(spectra, (0.025, 0.16, 0.5, 0.84, 0.975), axis=0),
            gases=("CH4", "CCl2F2"), left_out_shift=left_out.means[:2], left_out_ln_density=left_out.ln_density,
            left_out_gain=np.exp(-(((edges[:-1] - 3.3) / 0.2) ** 2)), left_out_size=left_out.size, trusted=trusted,
        ),
        line_data=("CH4: embedded",),
        assumptions=("isothermal air",),
        cautions=("A detected gas is not detected life or industry.",),
        version="0",
    )  # fmt: skip


def text_of(result, width=100):
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(fit_view(result))
    return file.getvalue()


def test_text(result):
    """What is found, what is only limited, evidence, bins, and the caution."""
    text = " ".join(text_of(result).split())
    assert "The target is invented." in text
    assert "CFC-12 - not told from none below" in text
    assert "ln(Bayes factor) +11.00 +/- 0.35: strong evidence for CH4" in text
    assert "expected better with CH4 than without" in text
    assert "marked *" in text
    assert "A detected gas is not detected life or industry." in text
    assert max(map(len, text_of(result, 80).splitlines())) <= 80


def test_evidence_in_three_ways(result):
    """Odds are e to the ln of the Bayes factor, and the demand is what those odds bring to one half."""
    there, absent = result.evidences
    three = " ".join(evidence_sentences(replace(result, evidences=(there, replace(absent, ln_evidence=-273.0)))))
    assert "by a factor of 20.1 for CH4" in three
    assert "a probability of 0.047 before the data" in three
    against = " ".join(evidence_sentences(replace(result, evidences=(there, replace(absent, ln_evidence=-268.0)))))
    assert "by a factor of 7.39 against CH4" in against
    assert "1 - 0.12 before the data" in against
    surely = " ".join(evidence_sentences(replace(result, evidences=(there, replace(absent, ln_evidence=-300.0)))))
    assert "more than 1e+06 for CH4" in surely
    assert "less than one in a million before the data" in surely
    alone = evidence_sentences(replace(result, evidences=(there,)))
    assert len(alone) == 1


def test_json(result):
    """Every documented key, and nothing that JSON has no word for."""
    tree = json.loads(fit_json(result))
    assert tree["format"] == "limbcast fit 1"
    assert [p["name"] for p in tree["parameters"]] == [
        "CH4",
        "CCl2F2",
        "temperature",
        "offset of blue",
        "offset of red",
    ]
    assert tree["parameters"][0]["upper_95"] is None
    assert tree["parameters"][1]["upper_95"] == pytest.approx(10**-6.2, rel=0.2)
    assert tree["ln_bayes"] == pytest.approx(11)
    assert len(tree["bins"]["left_out_shift"]["CH4"]) == BINS
    assert json.loads(fit_json(replace(result, evidences=result.evidences[:1])))["ln_bayes"] is None


def test_tables(result):
    """Draws as values with their units; a row per bin."""
    draws, bins = draws_table(result), bins_table(result)
    assert len(draws) == DRAWS
    assert np.median(draws["CH4"]) == pytest.approx(1e-4, rel=0.1)
    assert draws["temperature"].unit == "K"
    assert draws.meta["ln_evidence"] == -270.0
    assert len(bins) == BINS
    assert {"gain", "shift_CH4", "model_q500_ppm", "trusted"} <= set(bins.colnames)


@pytest.mark.parametrize("alone", [False, True])
def test_figure(result, tmp_path, alone):
    """Drawn with and without a gas in question, and the same twice."""
    if alone:
        result = replace(
            result,
            evidences=result.evidences[:1],
            bins=replace(result.bins, left_out_gain=None),
            found=result.found[:1],
        )
    files = [tmp_path / name for name in ("a.svg", "b.svg")]
    for path in files:
        write_figure(fit_figure(result), path)
    assert files[0].read_bytes() == files[1].read_bytes()
    assert b"log" in files[0].read_bytes()


@pytest.fixture
def state():
    rng = np.random.default_rng(1)
    return NestedState(
        dead=rng.random((7, 2)), dead_ln_likelihood=rng.random(7), live=rng.random((3, 2)),
        live_ln_likelihood=rng.random(3), legs=4, evaluations=99,
    )  # fmt: skip


def test_state_comes_back(tmp_path, state):
    """As it was, only under its own name, until it is cleared."""
    folder = FitFolder(tmp_path)
    assert folder.fetch("with-all", "key") is None
    folder.keep("with-all", "key", state)
    found = folder.fetch("with-all", "key")
    for name in ("dead", "dead_ln_likelihood", "live", "live_ln_likelihood"):
        np.testing.assert_array_equal(getattr(found, name), getattr(state, name))
    assert (found.legs, found.evaluations) == (4, 99)
    assert folder.fetch("without-CH4", "key") is None
    assert [path.name for path in tmp_path.iterdir()] == ["with-all.state.npz"]
    folder.clear()
    assert folder.kept == []


def test_state_of_another_fit(tmp_path, state):
    """Refused in one sentence that names the file."""
    FitFolder(tmp_path).keep("with-all", "key", state)
    with pytest.raises(StoreError, match=r"with-all.state.npz: saved by another fit .* remove it, or choose another"):
        FitFolder(tmp_path).fetch("with-all", "other key")


@pytest.mark.parametrize("damage", ["cut", "empty", "other", "object"])
def test_damaged_state(tmp_path, state, damage):
    """Files that are cut off, empty, something else, or hold objects of the language are not read."""
    folder = FitFolder(tmp_path)
    folder.keep("with-all", "key", state)
    path = folder.kept[0]
    whole = path.read_bytes()
    if damage == "object":
        np.savez(path, key=np.array([{"a": 1}], dtype=object))
    else:
        path.write_bytes({"cut": whole[: len(whole) // 2], "empty": b"", "other": b"not this"}[damage])
    with pytest.raises(StoreError, match=r"with-all.state.npz: damaged, or not the saved state of a fit; remove it"):
        folder.fetch("with-all", "key")
