"""The built wheel works outside the checkout, shipped data included."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

CHECKOUT = Path(__file__).resolve().parents[1]


@pytest.mark.slow
def test_the_wheel_runs_the_demo_outside_the_checkout(tmp_path):
    """Build, install without dependencies into an empty folder, run the demo from elsewhere, store included."""
    pip = [sys.executable, "-m", "pip", "--quiet", "--disable-pip-version-check"]
    wheel = [*pip, "wheel", "--no-build-isolation", "--no-deps", "--wheel-dir", str(tmp_path), str(CHECKOUT)]
    subprocess.run(wheel, check=True, capture_output=True)
    (built,) = tmp_path.glob("limbcast-*.whl")
    site = tmp_path / "site"
    subprocess.run([*pip, "install", "--no-deps", "--target", str(site), str(built)], check=True, capture_output=True)
    elsewhere = tmp_path / "a folder with spaces"
    elsewhere.mkdir()
    program = (
        "import planner, sys; assert planner.__file__.startswith(sys.argv.pop(1)), planner.__file__; "
        "from planner.cli import main; main()"
    )
    environment = {**os.environ, "PYTHONPATH": str(site), "LIMBCAST_STORE": str(tmp_path / "store")}
    run = subprocess.run(
        [sys.executable, "-c", program, str(site), "demo", "--out", "result"],
        cwd=elsewhere, env=environment, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert run.returncode == 0, run.stderr
    rows = json.loads((elsewhere / "result" / "plan.json").read_text())["rows"]
    assert len(rows) >= 6
    assert (elsewhere / "result" / "plan.png").stat().st_size > 50_000
