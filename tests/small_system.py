"""An invented star and planet that many tests look at, and a search in one narrow band of its air."""

from __future__ import annotations

__all__ = ["NARROW", "SYSTEM"]

SYSTEM = """
[star]
name = "s"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "12.8 pc"
magnitudes = { J = "11.28 mag", Ks = "10.28 mag" }
[planet]
name = "p"
mass = "0.85 M_earth"
radius = "1 R_earth"
period = "5.49 d"
impact_parameter = 0.25
"""
"""Tables of a scenario; those of the air, the candidates and the goal stand before or after."""

NARROW = f"""
title = "Narrow band"
invented = true
modes = ["grism-4-to-5-um"]
{SYSTEM.strip()}
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {{ CO = "10 ppm" }}
[[candidates]]
gas = "N2O"
mixing_ratio = "10 ppm"
[goal]
threshold = 5
transits_available = 200
[noise]
floor = "3 ppm"
"""
"""Quick to compute: N2O beside CO, at 3.9 to 5 um."""
