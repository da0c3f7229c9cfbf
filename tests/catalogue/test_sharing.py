"""Gases that share bands: the closed form against boxes on a grid, and the rules of rivalry."""

from __future__ import annotations

import numpy as np
import pytest

from planner.catalogue.read import find_gas, read_catalogue
from planner.catalogue.records import GasRecord
from planner.catalogue.sharing import likeness, rivals_among, shared_bands, sharing_bands
from planner.errors import LineDataError

CATALOGUE = read_catalogue()
GRID = np.arange(np.log(0.2), np.log(40.0), 2e-5)


def with_bands(formula: str, rows: list[tuple[float, float, float, str]], gas_class: str = "abiotic") -> GasRecord:
    gas = find_gas(formula)
    group = gas.band_groups[0].model_copy(update={"rows": tuple(rows)})
    return gas.model_copy(update={"band_groups": (group,), "gas_class": gas_class})


def boxes(gas: GasRecord) -> np.ndarray:
    """The slow way: a weighted box per band on a grid of ln(wavelength); bands of one gas may overlap."""
    mean = [s / (1e4 / a - 1e4 / b) for a, b, s, _ in (row for group in gas.band_groups for row in group.rows)]
    rows = [row for group in gas.band_groups for row in group.rows]
    top = max(m for m, row in zip(mean, rows, strict=True) if row[0] >= 0.5)
    drawn = []
    for m, (low, high, _, _) in zip(mean, rows, strict=True):
        weight = min(1.0, max(0.0, 1 - np.log10(top / m) / 3))
        drawn.append(weight * ((np.log(low) <= GRID) & (np.log(high) > GRID)))
    return np.array(drawn)


def slow_likeness(gas: GasRecord, other: GasRecord) -> float:
    a, b = boxes(gas), boxes(other)
    common = sum(float(x @ y) for x in a for y in b if np.count_nonzero(x * y) * 2e-5 >= 0.01)
    return common / np.sqrt(float((a**2).sum()) * float((b**2).sum()))


@pytest.mark.parametrize(("one", "two"), [("CH4", "C2H6"), ("CF4", "N2O"), ("SF6", "NH3"), ("O2", "HF"), ("O3", "NO2")])
def test_likeness_against_boxes_on_a_grid(one: str, two: str) -> None:
    """The closed form is the cosine of the drawn boxes; the grid step of 2e-5 in 0.01 leaves 0.5 %."""
    a, b = CATALOGUE[one], CATALOGUE[two]
    assert likeness(a, b) == pytest.approx(slow_likeness(a, b), rel=5e-3, abs=1e-6)


def test_likeness_is_symmetric_and_at_most_one() -> None:
    """For every pair of the catalogue; a gas is itself exactly."""
    gases = list(CATALOGUE.values())
    for i, a in enumerate(gases):
        assert likeness(a, a) == pytest.approx(1.0)
        for b in gases[:i]:
            assert likeness(a, b) == pytest.approx(likeness(b, a), abs=1e-12)
            assert 0 <= likeness(a, b) <= 1 + 1e-12


def test_sharing_holds_both_ways() -> None:
    """Whoever is a rival of a gas has it as rival, within the rule about gases of industry."""
    rivals = {gas.formula: rivals_among(gas, CATALOGUE) for gas in CATALOGUE.values()}
    for formula, others in rivals.items():
        for rival in others:
            one_sided = CATALOGUE[formula].gas_class == "industrial" != CATALOGUE[rival].gas_class
            assert (formula in rivals[rival]) is not one_sided


def test_gases_of_industry_are_rivals_of_their_kind_only() -> None:
    """CFC-12 lies on ozone's flank: ozone is a rival of CFC-12, not the other way round."""
    assert "O3" in sharing_bands("CFC-12")
    assert "CCl2F2" not in sharing_bands("ozone")
    for gas in CATALOGUE.values():
        kinds = {CATALOGUE[rival].gas_class for rival in sharing_bands(gas.formula)}
        assert gas.gas_class == "industrial" or "industrial" not in kinds


def test_most_alike_first() -> None:
    """The order is that of the likeness over all bands."""
    gas = CATALOGUE["C2H2"]
    order = [likeness(gas, CATALOGUE[rival]) for rival in sharing_bands("C2H2")]
    assert order == sorted(order, reverse=True)
    assert sharing_bands("C2H2")[0] == "HCN"


def test_shared_stretch_is_common_to_both() -> None:
    """And at least one element of R = 100 wide."""
    gas = CATALOGUE["CH4"]
    for shared in shared_bands(gas, CATALOGUE.values()):
        other = CATALOGUE[shared.gas]
        assert np.log(shared.to_um / shared.from_um) >= 0.01
        for record, name in ((gas, shared.own), (other, shared.other)):
            assert any(b.name == name and b.from_um <= shared.from_um and shared.to_um <= b.to_um for b in record.bands)


def test_narrow_touch_and_weak_bands_do_not_count() -> None:
    """Bands that touch over less than an element, or weigh nothing beside the strongest, are not shared."""
    a = with_bands("CO", [(4.0, 4.4, 1e-17, "strong"), (9.0, 10.0, 1e-21, "weak")])
    touching = with_bands("NO", [(4.39, 4.8, 1e-17, "touching")])
    under_weak = with_bands("HF", [(9.0, 10.0, 1e-17, "under the weak one")])
    alike = with_bands("HCl", [(4.0, 4.4, 1e-20, "alike")])
    catalogue = {gas.formula: gas for gas in (a, touching, under_weak, alike)}
    assert rivals_among(a, catalogue) == ("HCl",)
    assert shared_bands(a, [alike])[0].alike == pytest.approx(1.0)


def test_gas_without_record_has_no_rivals() -> None:
    """N2 is known but not recorded; a name nobody knows is an error."""
    assert sharing_bands("N2") == ()
    with pytest.raises(LineDataError, match="expected a formula"):
        sharing_bands("unobtainium")
