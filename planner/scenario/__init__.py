"""Reading and checking scenario files: star, planet, atmosphere, candidates, modes, goal."""

from planner.scenario.read import parse_scenario, read_scenario, starting_scenario
from planner.scenario.records import (
    Atmosphere,
    Bins,
    Candidate,
    Case,
    Cloud,
    Goal,
    Haze,
    Noise,
    Nuisances,
    Planet,
    Scenario,
    Star,
)

__all__ = [
    "Atmosphere",
    "Bins",
    "Candidate",
    "Case",
    "Cloud",
    "Goal",
    "Haze",
    "Noise",
    "Nuisances",
    "Planet",
    "Scenario",
    "Star",
    "parse_scenario",
    "read_scenario",
    "starting_scenario",
]
