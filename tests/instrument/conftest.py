"""An invented plain mode that tests change one thing at a time."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import pytest

from planner.instrument import Mode

DETECTOR: dict[str, Any] = {
    "name": "only one",
    "kind": "spectrometer",
    "ranges_um": [[1.0, 2.0]],
    "resolving_power": [[1.0, 1000.0]],
    "nm_per_pixel": [[1.0, 0.5]],
    "throughput": [[1.0, 0.4]],
    "extraction_height_pixels": 8,
    "brightest_pixel_share": 0.5,
    "read_noise": "10 electron",
    "dark_current": "0.02 electron/s",
    "full_well": "80000 electron",
    "frame_time": "1 s",
    "reset_frames": 1,
    "background": "0.5 electron/s",
}


def plain_mode(*detectors: dict[str, Any], floor: dict[str, Any] | None = None, **telescope: Any) -> Mode:
    """A mode with one detector per given change to the plain one, or one plain detector."""
    return Mode.model_validate(
        {
            "name": "plain",
            "summary": "invented for tests",
            "telescope": {"collecting_area": "10 m2", "settling": "30 min", "overhead": "1 h", **telescope},
            "detector": [
                {key: value for key, value in {**DETECTOR, **change}.items() if value is not None}
                for change in detectors or [{}]
            ],
            "floor": {"depth": "10 ppm", **(floor or {})},
        }
    )


@pytest.fixture(scope="session")
def make_mode() -> Callable[..., Mode]:
    """The function that makes such modes."""
    return plain_mode
