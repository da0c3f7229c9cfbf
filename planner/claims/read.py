"""Reading claims: TOML in, a checked `Claim` out, or one message that names every problem."""

from __future__ import annotations

from pathlib import Path

from planner.claims.records import Claim
from planner.errors import ScenarioError
from planner.instrument.modefiles import list_modes, read_mode
from planner.resources import data_folder
from planner.scenario.locate import heading
from planner.scenario.readings import nearest
from planner.scenario.tomlfile import parse_as, read_text

__all__ = ["parse_claim", "read_claim", "starting_claim"]

_TOLERANCE_UM = 0.1
"""By how much a claim's range may go beyond its mode: modes are used out to different ends."""


def read_claim(path: str | Path) -> Claim:
    """The claim in a TOML file, its mode and files looked up.

    Raises
    ------
    ScenarioError
        If the file cannot be read, is not TOML, or breaks a rule; every problem is listed with file, line and key.
    """
    path = Path(path)
    text = read_text(path, "limbcast new --claim")
    claim = _from_folder(parse_claim(text, str(path)), path.parent)
    _check_mode(claim, text, str(path))
    _check_star(claim, text, str(path))
    return claim


def parse_claim(text: str, where: str = "claim") -> Claim:
    """The claim in TOML text; ``where`` names it in messages. Paths stay as they stand, no file is looked for.

    Raises
    ------
    ScenarioError
        As `read_claim`.
    """
    return parse_as(Claim, text, where)


def starting_claim() -> str:
    """Text of a commented claim to start from."""
    return (data_folder("configs") / "claims" / "starting.toml").read_text(encoding="utf-8")


def _from_folder(claim: Claim, folder: Path) -> Claim:
    """The claim with relative paths starting from its folder."""
    search, star = claim.search, claim.star
    if search.mode is not None and search.mode.endswith(".toml"):
        search = search.model_copy(update={"mode": str(folder / Path(search.mode).expanduser())})
    if star is not None and star.spectrum is not None:
        star = star.model_copy(update={"spectrum": folder / star.spectrum})
    return claim.model_copy(update={"search": search, "star": star})


def _check_mode(claim: Claim, text: str, where: str) -> None:
    mode, place = claim.search.mode, heading(text, where, ("search", "mode"))
    if mode is None:
        return
    if not mode.endswith(".toml") and mode not in list_modes():
        hint = nearest(mode, list_modes()) or f"; known modes: {', '.join(list_modes())}"
        raise ScenarioError(f'{place}: expected a known mode or the path of a .toml file, got "{mode}"{hint}')
    low, high = read_mode(mode).span_um
    if claim.claim.from_um < low - _TOLERANCE_UM or claim.claim.to_um > high + _TOLERANCE_UM:
        raise ScenarioError(
            f"{heading(text, where, ('claim', 'from'))}: expected a range inside that of the mode, {low:g} to "
            f"{high:g} um, got {claim.claim.from_um:g} to {claim.claim.to_um:g} um"
        )


def _check_star(claim: Claim, text: str, where: str) -> None:
    if claim.star is not None and claim.star.spectrum is not None and not claim.star.spectrum.is_file():
        raise ScenarioError(f"{heading(text, where, ('star', 'spectrum'))}: no such file: {claim.star.spectrum}")
