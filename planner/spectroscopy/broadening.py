"""How much wider lines are in another gas than in air: one factor per gas, and the factor of a mixture."""

from __future__ import annotations

from collections.abc import Mapping

__all__ = ["WIDTH_FACTORS", "width_factor"]

WIDTH_FACTORS = {
    "N2": (1.0, "air widths taken for nitrogen; N2 broadens 1 to 10 % more than air"),
    "O2": (0.9, "from memory, +/- 15 %"),
    "Ar": (0.8, "from memory, +/- 20 %"),
    "CO2": (1.4, "from memory, +/- 25 %, between 1.2 and 1.9 from gas to gas"),
    "H2O": (1.9, "from memory, +/- 40 %"),
    "H2": (1.0, "from memory, +/- 30 %: 0.8 to 1.3 from gas to gas"),
    "He": (0.6, "from memory, +/- 25 %"),
}
"""Lorentz width in the gas divided by that in air, with the flag of the number."""


def width_factor(mixing_ratios: Mapping[str, float]) -> tuple[float, str]:
    """Factor on the air width in a mixture, and a sentence that says where it comes from.

    Widths in a mixture add in proportion to the partial pressures. A gas without an entry counts as air.
    """
    named = {gas: share for gas, share in mixing_ratios.items() if gas in WIDTH_FACTORS and share >= 0.01}
    factor = sum(share * WIDTH_FACTORS[gas][0] for gas, share in named.items()) + (1.0 - sum(named.values()))
    details = "; ".join(f"{gas} {WIDTH_FACTORS[gas][0]:g} ({WIDTH_FACTORS[gas][1]})" for gas in named)
    return factor, f"line widths: {factor:.3g} times those in air" + (f": {details}" if details else "")
