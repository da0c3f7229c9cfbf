"""What a ledger comes to: for people, and as JSON.

The JSON holds ``format`` (``"limbcast odds 1"``), ``version``, ``title``, ``invented``, ``hypothesis``, ``means``,
``opposite``, ``context``, ``prior``, ``posterior``, ``together`` (likelihood ratio of all findings), each a list of the
2.5, 50 and 97.5 % points of the opinions; ``odds`` (the same of the posterior odds, null for a certainty),
``prior_because``, ``weighed`` (list of ``what``, ``ratio``), ``prior_width_dex``, ``evidence_width_dex``,
``evidence_dex``, ``even_prior``, ``rests_on_prior``, ``next`` (list of ``gas``, ``could_see``, ``if_found``,
``if_not``, ``moves_dex``, ``because``), ``relations``, ``likelihood_words`` (lower, higher), ``level``,
``opinions``, ``cautions``.
"""

from __future__ import annotations

import io
import json
from collections.abc import Sequence
from typing import Any

from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.catalogue.ledger import NOT_DETECTED, Evidence, Finding
from planner.report.words import gas_text, ratio_text
from planner.studies.odds import OddsResult

__all__ = ["entry_text", "likelihood_words", "odds_json", "odds_text", "odds_view"]

# ends read in the text of Catling et al. 2018, Astrobiology 18, 709; the limits between them from memory
_WORDS = ((0.66, "likely"), (0.33, "inconclusive"), (0.1, "unlikely"))
_WORDS_FROM = "Catling et al. 2018, Astrobiology 18, 709 (limits of the middle ones from memory)"
# in our words, after Green et al. 2021, Nature 598, 575, as described in institute news
_STEPS = (
    "a signal known to come from life is detected",
    "contamination is ruled out",
    "life can make it in such surroundings",
    "known sources without life are implausible",
    "a second, independent signal is there",
    "later observations rule out other explanations",
    "independent follow-up confirms what life predicts",
)
_STEPS_FROM = "Green et al. 2021, Nature 598, 575"
_QUESTIONS = (
    "Questions in order (Meadows et al. 2022, arXiv:2210.14293, from memory): is the signal real, is it identified, "
    "are there sources without life, could life make it here, are there independent lines of evidence?"
)
_CAUTIONS = (
    "Priors, presences and ranges are judgement; independence of the findings, the hypothesis given, is assumed.",
    "A detected gas is not detected life or industry.",
    "A detection in one band with one instrument near 3 sigma answers at most the first two of the questions above.",
)


def odds_text(result: OddsResult, width: int = 100) -> str:
    """What `odds_view` shows on a plain terminal of this width."""
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(odds_view(result))
    return "\n".join(line.rstrip() for line in file.getvalue().splitlines()) + "\n"


def odds_view(result: OddsResult) -> Group:
    """The odds as something a rich console prints."""
    return Group(
        _headline(result),
        Text("\nWhat the findings say: times likelier where the hypothesis is true", style="bold"),
        _weighed(result),
        Text("\nWhere the answer comes from", style="bold"),
        *map(_bullet, _sources(result)),
        *_next_block(result),
        *_titled("Findings that belong together, after the catalogue", result.relations),
        *_titled("Published scales", _scales(result)),
        *_titled("Cautions", _CAUTIONS),
        Text(f"\nlimbcast {result.version}"),
    )


def odds_json(result: OddsResult) -> str:
    """The odds as indented JSON text with a newline at its end; the layout is the module's docstring."""
    plain = (
        "version", "title", "invented", "hypothesis", "means", "opposite", "context", "prior", "prior_because",
        "together", "posterior", "prior_width_dex", "evidence_width_dex", "evidence_dex", "even_prior",
        "rests_on_prior", "relations", "level", "opinions",
    )  # fmt: skip
    tree: dict[str, Any] = {"format": "limbcast odds 1", **{key: getattr(result, key) for key in plain}}
    tree["odds"] = [chance / (1 - chance) if chance < 1 else None for chance in result.posterior]
    tree["weighed"] = [{"what": entry_text(item.entry), "ratio": item.ratio} for item in result.weighed]
    tree["next"] = [
        {key: getattr(item, key) for key in ("gas", "could_see", "if_found", "if_not", "moves_dex", "because")}
        for item in result.nexts
    ]
    tree["likelihood_words"] = [likelihood_words(result.posterior[0]), likelihood_words(result.posterior[2])]
    tree["cautions"] = list(_CAUTIONS)
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def likelihood_words(chance: float) -> str:
    """The published word for a chance of life: ``very likely`` from 90 % to ``very unlikely`` up to 10 %."""
    if chance >= 0.9:
        return "very likely"
    return next((word for least, word in _WORDS if chance > least), "very unlikely")


def entry_text(entry: Finding | Evidence) -> str:
    """An entry of a ledger in a few words."""
    if isinstance(entry, Evidence):
        return entry.says
    name = gas_text(entry.gas)
    if entry.found == NOT_DETECTED and entry.limit is not None:
        return f"{name} not detected, less than {ratio_text(entry.limit)}"
    if entry.mixing_ratio is not None:
        low, high = map(ratio_text, entry.mixing_ratio)
        return f"{name} detected, {low} to {high}"
    return f"{name} detected"


def _headline(result: OddsResult) -> Text:
    low, middle, high = result.posterior
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.invented:
        text.append("The planet is invented.\n", style="italic")
    text.append(f"Hypothesis, {result.hypothesis}: {result.means}; against: {result.opposite}.\n")
    text.append(f"Meant for {result.context}.\n")
    text.append(f"Chance after the findings: {_chance(low)} to {_chance(high)}", style="bold")
    text.append(
        f" (95 % of {result.opinions} opinions; the middle one {_chance(middle)})\nbefore: "
        f"{_chance(result.prior[0])} to {_chance(result.prior[2])} (judgement: {result.prior_because})\n"
        f"odds: from {_odds(low)} up to {_odds(high)}"
    )
    return text


def _chance(chance: float) -> str:
    percent = 100 * chance
    if percent > 99.95:
        return ">99.9 %"
    if percent >= 0.095:
        return f"{percent:.1f} %"
    return f"{percent:.1g} %" if percent >= 1e-4 else "<1e-4 %"


def _odds(chance: float) -> str:
    if chance >= 1:
        return "beyond measure"
    odds = chance / (1 - chance)
    return f"{_number(odds)} to 1" if odds >= 1 else f"1 to {_number(1 / odds)}"


def _number(value: float) -> str:
    return f"{value:.2g}" if value < 99.5 else f"{float(f'{value:.2g}'):,.0f}".replace(",", " ")


def _times(ratio: float) -> str:
    return _number(ratio) if ratio >= 1 else f"1/{_number(1 / ratio)}"


def _weighed(result: OddsResult) -> Table:
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("finding", ratio=1)
    for heading in ("lower", "middle", "higher"):
        table.add_column(heading, justify="right", no_wrap=True)
    for item in result.weighed:
        table.add_row(entry_text(item.entry), *map(_times, item.ratio))
    table.add_row(Text("all together", style="bold"), *map(_times, result.together))
    return table


def _sources(result: OddsResult) -> list[str]:
    told = [
        f"the findings move the odds by {result.evidence_dex:+.1f} decades (middle opinion); judging them otherwise "
        f"moves the answer over {result.evidence_width_dex:.1f} decades, the prior alone over "
        f"{result.prior_width_dex:.1f}",
        f"the findings leave the hypothesis even for whoever held it at {_chance(result.even_prior)} before",
    ]
    if result.rests_on_prior:
        told.insert(0, "the answer rests on the prior more than on the findings")
    return told


def _next_block(result: OddsResult) -> list[RenderableType]:
    if not result.nexts:
        return []
    table = Table(box=None, pad_edge=False, padding=(0, 2, 0, 0), header_style="dim")
    table.add_column("gas", min_width=7)
    for heading in ("down to", "if found", "if not", "decades\napart"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("because", ratio=1)
    for item in result.nexts:
        spans = (f"{_chance(low)}-{_chance(high)}" for low, high in (item.if_found, item.if_not))
        table.add_row(gas_text(item.gas), ratio_text(item.could_see), *spans, f"{item.moves_dex:.1f}", item.because)
    return [Text("\nWhat was not looked for, and would move it most", style="bold"), table]


def _scales(result: OddsResult) -> list[str]:
    low, high = (likelihood_words(result.posterior[end]) for end in (0, 2))
    words = low if low == high else f"{low} to {high}"
    step = f"step {result.level} of 7: {_STEPS[result.level - 1]}" if result.level else "no step of 7 yet"
    wanting = f"; next: {_STEPS[result.level]}" if result.level < len(_STEPS) else ""
    return [f'"{words}" in the words of {_WORDS_FROM}', f"{step}{wanting} ({_STEPS_FROM}; in our words)", _QUESTIONS]


def _titled(title: str, items: Sequence[str]) -> list[RenderableType]:
    return [Text(f"\n{title}", style="bold"), *map(_bullet, items)] if items else []


def _bullet(text: str) -> RenderableType:
    grid = Table.grid(padding=(0, 1, 0, 0))
    grid.add_row(Text("-"), Text(text))
    return grid
