"""The record that carries spectral lines from readers and generators to the cross-section kernel."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

__all__ = ["Lines"]

_NUMBERS = (
    "wavenumber_per_cm",
    "intensity_cm",
    "einstein_a_per_s",
    "air_width_per_cm_atm",
    "self_width_per_cm_atm",
    "lower_energy_per_cm",
    "temperature_exponent",
    "air_shift_per_cm_atm",
)
_LABELS = ("upper_global", "lower_global", "upper_local", "lower_local")


@dataclass(frozen=True, kw_only=True, eq=False)
class Lines:
    """Spectral lines of one or several isotopologues, one array element per line.

    The fields are those of the HITRAN 160-character record (Rothman et al. 2005, JQSRT 96, 139, table 1).
    All arrays have shape ``(line,)``; they are sorted by wavenumber and made read-only here.

    Attributes
    ----------
    molecule : int16
        HITRAN molecule number.
    isotopologue : int16
        HITRAN isotopologue number of that molecule, from 1.
    wavenumber_per_cm : float64
        Vacuum wavenumber, > 0.
    intensity_cm : float64
        Line intensity at 296 K in cm per molecule, natural abundance included, >= 0.
    einstein_a_per_s : float64
        Einstein A coefficient; 0 where it is not known.
    air_width_per_cm_atm, self_width_per_cm_atm : float64
        Lorentz half widths at half maximum at 296 K.
    lower_energy_per_cm : float64
        Energy of the lower state; -1 where it is unknown (old editions).
    temperature_exponent : float64
        Exponent n of the air width, ``(296/T)**n``.
    air_shift_per_cm_atm : float64
        Pressure shift in air at 296 K.
    upper_global, lower_global, upper_local, lower_local : str arrays
        Quantum labels, at most 15 characters.
    upper_weight, lower_weight : float64
        Statistical weights; 0 where they are not known.
    """

    molecule: NDArray[np.int16]
    isotopologue: NDArray[np.int16]
    wavenumber_per_cm: NDArray[np.float64]
    intensity_cm: NDArray[np.float64]
    einstein_a_per_s: NDArray[np.float64]
    air_width_per_cm_atm: NDArray[np.float64]
    self_width_per_cm_atm: NDArray[np.float64]
    lower_energy_per_cm: NDArray[np.float64]
    temperature_exponent: NDArray[np.float64]
    air_shift_per_cm_atm: NDArray[np.float64]
    upper_global: NDArray[np.str_]
    lower_global: NDArray[np.str_]
    upper_local: NDArray[np.str_]
    lower_local: NDArray[np.str_]
    upper_weight: NDArray[np.float64]
    lower_weight: NDArray[np.float64]

    def __post_init__(self) -> None:
        wavenumber = np.asarray(self.wavenumber_per_cm)
        order = np.argsort(wavenumber, kind="stable") if np.any(np.diff(wavenumber) < 0) else None
        for field in fields(self):
            value = np.asarray(getattr(self, field.name))
            if value.shape != wavenumber.shape:
                raise ValueError(f"Lines.{field.name}: expected shape {wavenumber.shape}, got {value.shape}")
            value = value.view() if order is None else value[order]
            value.flags.writeable = False
            object.__setattr__(self, field.name, value)
        for name in _NUMBERS:
            if not np.all(np.isfinite(getattr(self, name))):
                raise ValueError(f"Lines.{name}: every value must be finite")
        if len(self) and (self.wavenumber_per_cm[0] <= 0 or self.intensity_cm.min() < 0):
            raise ValueError("Lines: wavenumbers must be positive and intensities not negative")

    def __len__(self) -> int:
        return int(self.wavenumber_per_cm.size)

    @classmethod
    def make(
        cls,
        *,
        molecule: int,
        isotopologue: Any,
        wavenumber_per_cm: Any,
        intensity_cm: Any,
        lower_energy_per_cm: Any,
        air_width_per_cm_atm: Any,
        temperature_exponent: Any,
        self_width_per_cm_atm: Any = None,
        **more: Any,
    ) -> Lines:
        """Lines from scalars and arrays, broadcast against the wavenumbers; what is not given is unknown.

        A missing self width is taken equal to the air width, a missing shift is 0, missing labels are blank.
        """
        wavenumber = np.atleast_1d(np.asarray(wavenumber_per_cm, dtype=np.float64))

        def filled(value: Any, dtype: Any) -> NDArray[Any]:
            return np.broadcast_to(np.asarray(value, dtype=dtype), wavenumber.shape)

        numbers = {
            "intensity_cm": intensity_cm,
            "einstein_a_per_s": more.pop("einstein_a_per_s", 0.0),
            "air_width_per_cm_atm": air_width_per_cm_atm,
            "self_width_per_cm_atm": air_width_per_cm_atm if self_width_per_cm_atm is None else self_width_per_cm_atm,
            "lower_energy_per_cm": lower_energy_per_cm,
            "temperature_exponent": temperature_exponent,
            "air_shift_per_cm_atm": more.pop("air_shift_per_cm_atm", 0.0),
            "upper_weight": more.pop("upper_weight", 0.0),
            "lower_weight": more.pop("lower_weight", 0.0),
        }
        labels = {name: more.pop(name, "") for name in _LABELS}
        if more:
            raise TypeError(f"Lines.make: unknown fields {sorted(more)}")
        return cls(
            molecule=filled(molecule, np.int16),
            isotopologue=filled(isotopologue, np.int16),
            wavenumber_per_cm=wavenumber,
            **{name: filled(value, np.float64) for name, value in numbers.items()},
            **{name: filled(value, np.str_) for name, value in labels.items()},
        )

    @classmethod
    def join(cls, parts: Sequence[Lines]) -> Lines:
        """All lines of several sets as one sorted set."""
        return cls(**{f.name: np.concatenate([getattr(p, f.name) for p in parts]) for f in fields(cls)})

    def where(self, mask: NDArray[Any] | slice) -> Lines:
        """The lines picked by a mask or an index array of shape ``(line,)``, or by a slice, which copies nothing."""
        return Lines(**{f.name: getattr(self, f.name)[mask] for f in fields(self)})
