"""The tree of errors.

::

    PlannerError                 anything the user can mend; the command line prints it and exits 2
    ├── ScenarioError            a scenario, claim or configuration file
    ├── LineDataError            line records, cross-section and collision files, spectroscopic constants
    ├── RangeError               a wavelength, temperature or pressure outside what the data or the mode cover
    ├── StoreError               the store of computed tables cannot be used as asked
    └── OutputError              a result cannot be written

Every message says where, which, what was expected, what came, and what to do.
Anything that is not a ``PlannerError`` is a fault of this program.
"""

from __future__ import annotations

__all__ = [
    "LineDataError",
    "OutputError",
    "PlannerError",
    "RangeError",
    "ScenarioError",
    "StoreError",
]


class PlannerError(Exception):
    """Base of all errors that a user can cause and mend."""


class ScenarioError(PlannerError):
    """A scenario, claim or configuration file that cannot be read as meant."""


class LineDataError(PlannerError):
    """A line, cross-section, collision or constants file that breaks its format."""


class RangeError(PlannerError):
    """A request outside the range that the data or the mode cover."""


class StoreError(PlannerError):
    """The store of computed tables cannot be used as asked."""


class OutputError(PlannerError):
    """A result that cannot be written where it was asked for."""
