"""Fixtures that all rooms share."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

# The matrices here are small: threads of the linear algebra would only get in each other's way, above all when tests
# run in several processes. It must be said before numpy is loaded.
for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS"):
    os.environ.setdefault(name, "1")


@pytest.fixture(scope="session")
def reference_folder() -> Path:
    """Folder of reference data that are not ours to ship; named by an environment variable."""
    name = os.environ.get("LIMBCAST_REFERENCE")
    if not name:
        pytest.skip("LIMBCAST_REFERENCE is not set: the reference spectroscopic data are not at hand")
    folder = Path(name)
    if not folder.is_dir():
        pytest.fail(f"LIMBCAST_REFERENCE={name!r} is not a folder")
    return folder
