"""Small files of each kind, invented, and ways to damage them."""

from __future__ import annotations

import numpy as np
import pytest


def xsc_text(
    name="CCl3F", low=830.0, high=860.0, values=None, temperature=293.0, pressure=7.5, common="CFC-11", count=None
):
    """A cross-section table laid out as HITRAN does, written apart from the program's own writer."""
    values = np.linspace(1e-19, 4e-18, 57) if values is None else np.asarray(values, dtype=float)
    count = len(values) if count is None else count
    header = (
        name.rjust(20) + f"{low:10.4f}" + f"{high:10.4f}" + str(count).rjust(7) + f"{temperature:7.1f}"
        + f"{pressure:6.1f}" + f"{max(values):10.3E}" + "0.03 " + common.rjust(15) + "    " + "N2 " + " 34"
    )  # fmt: skip
    assert len(header) == 100
    written = [f"{value:10.3E}" for value in values]
    rows = ["".join(written[i : i + 10]) for i in range(0, len(written), 10)]
    return "\n".join([header, *rows]) + "\n"


def cia_text(pair="N2-H2", temperatures=(200.0, 300.0), wavenumber=None, coefficient=None, errors=False):
    """Collision blocks laid out as HITRAN does."""
    wavenumber = np.arange(100.0, 140.0) if wavenumber is None else wavenumber
    blocks = []
    for number, temperature in enumerate(temperatures):
        k = 1e-44 * (number + 1) * np.ones(wavenumber.size) if coefficient is None else coefficient[number]
        blocks.append(
            pair.rjust(20) + f"{wavenumber[0]:10.3f}" + f"{wavenumber[-1]:10.3f}" + str(wavenumber.size).rjust(7)
            + f"{temperature:7.1f}" + f"{max(k):10.3E}" + " -.999" + " " * 27 + " 12"
        )  # fmt: skip
        blocks += [
            f"{nu:10.4f}{value:11.3E}" + (f"{value / 10:11.3E}" if errors else "")
            for nu, value in zip(wavenumber, k, strict=True)
        ]
    return "\n".join(blocks) + "\n"


@pytest.fixture
def make_xsc():
    return xsc_text


@pytest.fixture
def make_cia():
    return cia_text


KINDS = ("drop", "insert", "overwrite", "control", "cut", "wrap", "join", "lose", "repeat")


def damage_bytes(data: bytes, spots, kind: str, rng: np.random.Generator) -> bytes:
    """A copy of a file with one fault, at one of the given places (offsets of bytes that carry a number or name)."""
    at = int(rng.choice(spots))
    begin, end = data.rfind(b"\n", 0, at) + 1, data.find(b"\n", at)
    letter = rng.choice(list(b"!$%&*=?@GHJKQRZxyz~"))
    match kind:
        case "drop":
            return data[:at] + data[at + 1 :]
        case "insert":
            return data[:at] + bytes([rng.choice(list(b"0123456789.x"))]) + data[at:]
        case "overwrite":
            return data[:at] + bytes([letter]) + data[at + 1 :]
        case "control":
            return data[:at] + bytes([rng.choice([0, 7, 27, 127, 195, 255])]) + data[at + 1 :]
        case "cut":
            return data[:at]
        case "wrap":
            return data[:at] + b"\n" + data[at:]
        case "join":
            return data[:end] + data[end + 1 :] if end < len(data) - 1 else data[: begin - 1] + data[begin:]
        case "lose":
            return data[:begin] + data[end + 1 :]
        case "repeat":
            return data[: end + 1] + data[begin:]
    raise ValueError(kind)


@pytest.fixture
def damage():
    return damage_bytes
