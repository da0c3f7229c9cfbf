"""Where the data that ship with the package lie.

``linelists/`` and ``configs/`` stand beside the package in a checkout and inside it (``planner/_data``) in an
installed wheel. This is the only place that knows.
"""

from __future__ import annotations

from pathlib import Path

__all__ = ["data_folder"]

_PACKAGE = Path(__file__).resolve().parent


def data_folder(name: str) -> Path:
    """Folder of shipped data, ``"linelists"`` or ``"configs"``.

    Raises
    ------
    FileNotFoundError
        If the installation is incomplete.
    """
    for root in (_PACKAGE / "_data", _PACKAGE.parent):
        folder = root / name
        if folder.is_dir():
            return folder
    raise FileNotFoundError(f"the folder {name!r} is missing from this installation of limbcast; install it again")
