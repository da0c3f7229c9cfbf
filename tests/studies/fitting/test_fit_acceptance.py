"""The fit that the tool promises: 150 bins of R = 100, eight parameters, found again, also after being killed."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from dataclasses import replace

import numpy as np
import pytest

from planner.claims.spectrum import ObservedSpectrum
from planner.resources import data_folder
from planner.scenario import parse_scenario
from planner.studies.fit import fit
from planner.studies.fitting.observed import fitted_scenario, view_observed
from planner.studies.workshop import Workshop

TRUTH = {"CH4": 1e-4, "CO2": 4e-4, "temperature": 250.0, "radius": 1.0, "gravity": 1.0, "cloud top": 0.3}
ERROR_PPM = 15.0
COMMAND = [sys.executable, "-c", "from planner.cli import main; main()"]


def demo_with_methane():
    """The demonstration's planet under a cloud, CH4 its only candidate: three gases and five numbers are unknown.

    (Its clear sky would be the end of a one-sided prior, near which no posterior has its middle.)
    """
    text = (data_folder("configs") / "scenarios" / "demo.toml").read_text()
    first, last = text.index('[[candidates]]\ngas = "CFC-12"'), text.index("[goal]")
    return text[:first] + '[atmosphere.cloud]\ntop = "0.3 bar"\n' + text[last:]


def methane_spectrum(scenario):
    """From 1 um on, two detectors with levels of their own."""
    edges = np.exp(np.arange(151) / 100)
    detector = (edges[:-1] > 2.8).astype(np.int64)
    blank = ObservedSpectrum(
        from_um=edges[:-1],
        to_um=edges[1:],
        depth_ppm=np.zeros(150),
        error_ppm=np.full(150, ERROR_PPM),
        detector=detector,
        detectors=("short", "long"),
    )
    fitted = fitted_scenario(scenario)
    depth = Workshop(fitted, view=view_observed(fitted, blank)).model.binned(fitted.cases[0])[0].depth_ppm
    noise = ERROR_PPM * np.random.default_rng(5).normal(size=150)
    return replace(blank, depth_ppm=depth + noise + np.array([300.0, -200.0])[detector])


@pytest.mark.slow
@pytest.mark.benchmark
def test_finds_what_was_put_in(capsys):
    """The truth lies in the middle 95 % of every posterior, the full grid agrees, and the time is printed."""
    scenario = parse_scenario(demo_with_methane())
    observed = methane_spectrum(scenario)
    wall, processor = time.perf_counter(), time.process_time()
    result = fit(scenario, observed, spectrum="simulated")
    wall, processor = time.perf_counter() - wall, time.process_time() - processor
    found = {one.name: one for one in result.found}
    with capsys.disabled():
        print(f"\n{wall:.0f} s, {processor:.0f} s of processor; {result.evidences[0]}; {result.recheck}")
        print("; ".join(f"{n} {f.low_95:.3g} to {f.high_95:.3g}" for n, f in found.items()))
    assert len(found) == 8
    for name, value in TRUTH.items():
        assert found[name].low_95 < value < found[name].high_95, name
    assert found["CH4"].upper_95 is None
    assert result.goodness.p_value > 0.01
    assert result.recheck.effective_size > 100
    assert dict(result.recheck.shifts)["CH4"] == pytest.approx(0, abs=0.2)


@pytest.mark.slow
def test_survives_a_kill(tmp_path, small_text, small_observed):
    """Killed outright in the middle and given again, the command ends with what it gives undisturbed."""
    scenario, spectrum = tmp_path / "s.toml", tmp_path / "s.csv"
    scenario.write_text(small_text)
    columns = (small_observed.from_um, small_observed.to_um, small_observed.depth_ppm, small_observed.error_ppm)
    rows = "\n".join(",".join(map(repr, row)) for row in zip(*(c.tolist() for c in columns), strict=True))
    spectrum.write_text(f"from [um],to [um],depth [ppm],error [ppm]\n{rows}\n")

    def command(out):
        return [*COMMAND, "fit", str(spectrum), str(scenario), "--out", str(tmp_path / out)]

    subprocess.run(command("whole"), check=True, capture_output=True)
    killed = subprocess.Popen(command("killed"), stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    state = tmp_path / "killed" / "with-all.state.npz"
    while killed.poll() is None and not state.exists():
        time.sleep(0.01)
    os.kill(killed.pid, signal.SIGKILL)
    killed.wait()
    assert state.exists()
    assert not (tmp_path / "killed" / "fit.json").exists()
    subprocess.run(command("killed"), check=True, capture_output=True)
    one, other = (json.loads((tmp_path / out / "fit.json").read_text()) for out in ("whole", "killed"))
    for key in ("parameters", "evidences", "goodness"):
        assert one[key] == other[key]
    assert not state.exists()
