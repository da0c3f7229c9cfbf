"""Plans on embedded lists against plans on published line lists where those are complete."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from planner.scenario.read import parse_scenario
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store
from planner.studies.plan import Workshop, see

YARDSTICK = Path(__file__).with_name("scenarios") / "co2_clear_e.toml"


def snr(gas: str, ratio: str, window_per_cm: tuple[float, float], lines_folder: Path | None) -> tuple[float, float]:
    """S/N of ten transits in the bins inside a window, all known and marginalised."""
    text = YARDSTICK.read_text().replace(
        'gas = "CO2"\nmixing_ratio = "0.04 %"', f'gas = "{gas}"\nmixing_ratio = {ratio}'
    )
    workshop = Workshop(parse_scenario(text, YARDSTICK), lines_folder=lines_folder)
    sight = see(workshop, workshop.scenario.cases[0])
    bins = workshop.views[0].bins
    inside = (bins.from_um >= 1e4 / window_per_cm[1]) & (bins.to_um <= 1e4 / window_per_cm[0])
    kept = inside[sight.usable[0]]
    whole = sight.measurements[0]
    part = replace(
        whole,
        template_ppm=whole.template_ppm[kept],
        white_ppm=whole.white_ppm[kept],
        floor_ppm2=whole.floor_ppm2[np.ix_(kept, kept)],
        directions_ppm=whole.directions_ppm[:, kept],
    )
    return part.known().snr(10.0), part.snr(10.0)


@pytest.mark.slow
@pytest.mark.parametrize(("gas", "window"), [("N2O", (2000.0, 3200.0)), ("CH4", (2833.0, 3246.0))])
@pytest.mark.parametrize("ratio", ["1e-6", "1e-4"])
def test_embedded_lists_give_the_significance_of_real_ones(reference_folder, tmp_path, gas, window, ratio, capsys):
    """S/N within 15 % where the published lists are complete (HITRAN2020, see PROVENANCE.md of the reference data)."""
    folder = tmp_path / "lines"
    folder.mkdir()
    for path in (reference_folder / "lines").glob(f"{gas}_{window[0]:.0f}-{window[1]:.0f}_*.par.gz"):
        (folder / path.name).symlink_to(path)
    real, embedded = snr(gas, ratio, window, folder), snr(gas, ratio, window, None)
    with capsys.disabled():
        pairs = ", ".join(f"{ours:.3f} / {theirs:.3f}" for ours, theirs in zip(embedded, real, strict=True))
        print(f"\n{gas} {ratio}: S/N embedded / real, all known then marginalised: {pairs}")
    assert embedded[0] == pytest.approx(real[0], rel=0.15)
    assert embedded[1] == pytest.approx(real[1], rel=0.15)
    assert embedded != real


@pytest.mark.slow
def test_the_whole_folder_reports_what_it_uses(reference_folder, tmp_path):
    """Complete stretches are used, fragments are named as partial, and no fragment stands for a band."""
    library = LineLibrary(Store(tmp_path / "store"), reference_folder / "lines")
    n2o, co2, ch4 = library.gas("N2O"), library.gas("CO2"), library.gas("CH4")
    assert any("N2O_2000-3200" in sentence for sentence in n2o.provenance)
    assert any("CH4_2833-3246" in sentence for sentence in ch4.provenance)
    used = [sentence for sentence in co2.provenance if "laserbands" in sentence]
    partial = [sentence for sentence in co2.partial if "laserbands" in sentence]
    assert partial
    for sentence in used:
        assert "2100" not in sentence, "selected hot bands must not stand for the 4.3 um band"
    # the sum of the 4.3 um band is that of the whole band, whatever fragments lie in the folder
    inside = (co2.lines.wavenumber_per_cm > 2200) & (co2.lines.wavenumber_per_cm < 2400)
    assert co2.lines.intensity_cm[inside].sum() == pytest.approx(1.07e-16, rel=0.1)
