"""Instrument modes, their bins, and the noise of a transit depth."""

from __future__ import annotations

from planner.instrument.binning import Bins, make_bins
from planner.instrument.floor import floor_covariance
from planner.instrument.modefiles import list_modes, parse_mode, read_mode
from planner.instrument.modes import Detector, Floor, Mode, Photometer, Spectrometer, Telescope
from planner.instrument.noise import Noise, photon_weights, transit_noise

__all__ = [
    "Bins",
    "Detector",
    "Floor",
    "Mode",
    "Noise",
    "Photometer",
    "Spectrometer",
    "Telescope",
    "floor_covariance",
    "list_modes",
    "make_bins",
    "parse_mode",
    "photon_weights",
    "read_mode",
    "transit_noise",
]
