"""A choice between gases for people: ranking, reach, patterns and what it rests on, fit for 80 columns and more."""

from __future__ import annotations

import io
import string
from collections.abc import Iterable, Mapping, Sequence

from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.words import bands_text, count_text, gas_text, hours_text, ratio_text, snr_text
from planner.studies.choices import Choice, ChoiceResult, Pattern
from planner.studies.results import Verdict

__all__ = ["bits_text", "chance_text", "choice_text", "choice_view", "mode_letters", "percent_text", "telling"]

_RANKED = 20
_WORTH_TELLING = 0.01
"""Share of the best: what is worth less is named in a sentence."""
_PATTERNS = 8
_WIDE = 92
_WIDE_ONLY = ("all\nknown", "yes/no\nbits")
"""Columns that a narrow terminal goes without."""


def choice_text(result: ChoiceResult, width: int = 100) -> str:
    """What `choice_view` shows on a plain terminal of this width."""
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(choice_view(result, width))
    return "\n".join(line.rstrip() for line in file.getvalue().splitlines()) + "\n"


def choice_view(result: ChoiceResult, width: int) -> Group:
    """A choice as something a rich console of this width prints."""
    letters = mode_letters(result)
    modes = "; ".join(f"{letter} {mode}" for mode, letter in letters.items())
    ranked = telling(result)
    return Group(
        _headline(result),
        Text(f"Modes: {modes}."),
        *_titled("What it is worth in the hours given", _ranking(ranked, letters, width), _note(width)),
        _rest(result, ranked),
        *_titled("Which gas wins, over the opinions", _winners(result)),
        *_titled("Patterns: several gases in one mode", _patterns(result, letters), _PATTERN_NOTE),
        *_titled("Reach", _reach(result.choices, letters, width), _REACH_NOTE),
        *_list(
            "No line data yet", [", ".join(gas_text(gas) for gas in result.without_data)] * bool(result.without_data)
        ),
        *_list("Accuracy", result.accuracy),
        *_list("Held unknown", ["; ".join(f"{name} {prior}" for name, prior in result.nuisances)]),
        *_list("Assumptions", result.assumptions),
        *_list("Line data", _line_data(result, ranked)),
        *_list("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


_NOTES = (
    ("\ntransits", "transits: at the mixing ratio shown, all unknowns marginalised"),
    ("all\nknown", "; all known: with only the gas unknown"),
    ("\nbits", ". bits: what the measured amplitude tells about the hypothesis"),
    ("yes/no\nbits", "; yes/no: what a bare detection tells"),
    ("opinions\n16-84 %", ". opinions: 16 and 84 % of them give less"),
    (
        "chance\nif seen",
        ". chance: of the hypothesis after a detection, and after a null, between 16 and 84 % of opinions.",
    ),
)
"""By the heading of the column that each explains."""
_PATTERN_NOTE = (
    "each alone: in the order of the gases. A gas that can go costs less than a twentieth of the bits when left out; "
    "one that is worth nothing alone may still be needed to tell another apart. Not seeing a gas counts as well."
)
_REACH_NOTE = (
    "detects: least amount that the hours given detect; floor: the same after endless transits; null excludes: what "
    "would have been detected with 95 %. like: the gas hardest to tell apart, and the share of the S/N left beside it; "
    "unique: the share left beside all gases with like bands."
)


def mode_letters(result: ChoiceResult) -> dict[str, str]:
    """A letter for each mode, in the order of the scenario as far as the choices tell it."""
    modes = sorted(dict.fromkeys(choice.mode for choice in result.choices))
    return dict(zip(modes, string.ascii_uppercase, strict=False))


def telling(result: ChoiceResult) -> list[Choice]:
    """The choices that are worth a line: the best, and what is worth at least a hundredth of it."""
    best = max((float(choice.worth.amplitude_bits) for choice in result.choices), default=0.0)
    worthy = [
        c for c in result.choices if c.worth.amplitude_bits >= _WORTH_TELLING * best and c.worth.amplitude_bits > 0
    ]
    return worthy[:_RANKED]


def bits_text(bits: float) -> str:
    """Bits to three decimals at most; small ones by their power of ten."""
    if bits < 1e-12:  # rounding
        return "0"
    return f"{bits:.3f}" if bits >= 0.0095 else f"{bits:.0e}".replace("e-0", "e-")


def percent_text(share: float) -> str:
    """A share in per cent: whole from 1 up, below by its first digit."""
    percent = 100 * share
    if percent in (0, 100):
        return f"{percent:.0f} %"
    if percent > 99.5:
        return ">99 %"
    return f"{percent:.0f} %" if percent >= 0.95 else "<1 %"


def chance_text(chance: float) -> str:
    """A probability: two decimals, small ones by their power of ten; never 1, which no observation can reach."""
    if chance > 0.995:
        return ">.99"
    return f"{chance:.2f}" if chance >= 0.0095 else f"{chance:.0e}".replace("e-0", "e-")


def _span(chances: tuple[float, float]) -> str:
    return "-".join(map(chance_text, chances))


def _headline(result: ChoiceResult) -> Text:
    low, high = result.prior_range
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.invented:
        text.append("The target is invented.\n", style="italic")
    text.append(f"Hypothesis, {result.hypothesis}: {result.means}; against: {result.opposite}.\n")
    text.append(
        f"Chance before looking {result.prior:g}, opinions {low:g} to {high:g} (judgement: {result.prior_because}).\n"
        f"There are {bits_text(result.most_bits)} bits to learn. Meant for {result.context}.\n"
        f"{hours_text(result.hours)} h with one mode; detection at {result.threshold_sigma:g} sigma, one-sided, with a "
        f"chance of {100 * result.power:g} %."
    )
    return text


def _table() -> Table:
    return Table(box=None, pad_edge=False, padding=(0, 1, 0, 0), header_style="dim")


def _titled(title: str, table: Table, note: str = "") -> list[RenderableType]:
    if not table.row_count:
        return []
    return [Text(), Text(title, style="bold underline"), table, *([Text(note, style="dim")] if note else [])]


def _ranking(choices: Sequence[Choice], letters: Mapping[str, str], width: int) -> Table:
    table = _table()
    columns = (
        ("\ngas", 6), ("\n", 1), ("mixing\nratio", 7), ("\ntransits", 8), ("all\nknown", 5), ("S/N in\nthe h", 6),
        ("\nbits", 5), ("opinions\n16-84 %", 10), ("yes/no\nbits", 6), ("chance\nif seen", 9), ("if not\nseen", 9),
    )  # fmt: skip
    shown = [heading for heading, _ in columns if _is_shown(heading, width)]
    for heading, least in columns:
        if heading in shown:
            left = heading in ("\ngas", "\n")
            table.add_column(heading, justify="left" if left else "right", no_wrap=True, min_width=least)
    for choice in choices:
        counts, known = choice.plan.marginalised, choice.plan.all_known
        cells: tuple[str | Text, ...] = (
            Text(gas_text(choice.gas), style="bold"),
            letters[choice.mode],
            ratio_text(choice.mixing_ratio),
            count_text(counts.transits_required),
            Text(count_text(known.transits_required), style="dim"),
            snr_text(choice.snr),
            Text(bits_text(float(choice.worth.amplitude_bits)), style="bold"),
            "-".join(bits_text(end) for end in choice.bits_spread),
            Text(bits_text(float(choice.worth.detection_bits)), style="dim"),
            _span(choice.after_detection_spread),
            _span(choice.after_null_spread),
        )
        table.add_row(*(cell for cell, (heading, _) in zip(cells, columns, strict=True) if heading in shown))
    return table


def _is_shown(heading: str, width: int) -> bool:
    """Whether a terminal is wide enough for a column."""
    return width >= _WIDE or heading not in _WIDE_ONLY


def _note(width: int) -> str:
    """What the columns that are shown mean."""
    return "".join(words for heading, words in _NOTES if _is_shown(heading, width))


def _rest(result: ChoiceResult, ranked: Sequence[Choice]) -> Text:
    """The gases that are not in the ranking, and why."""
    shown = {choice.gas for choice in ranked}
    mute = sorted({choice.gas for choice in result.choices if not choice.tells})
    weak = sorted({choice.gas for choice in result.choices} - shown - set(mute))
    sentences = []
    if mute:
        sentences.append(f"Alike with and without {result.hypothesis}, worth nothing alone: {_named(mute)}.")
    if weak:
        sentences.append(f"Worth less than a hundredth of the best: {_named(weak)}.")
    return Text("\n".join(sentences))


def _named(gases: Iterable[str]) -> str:
    return ", ".join(gas_text(gas) for gas in gases)


def _winners(result: ChoiceResult) -> Table:
    table = _table()
    table.add_column("gas", min_width=7)
    table.add_column("wins in", justify="right")
    wins = {gas: result.wins_of(gas) for gas in dict.fromkeys(choice.gas for choice in result.choices)}
    for gas, share in sorted(wins.items(), key=lambda item: -item[1]):
        if share > 0:
            table.add_row(gas_text(gas), percent_text(share))
    if result.nobody_wins > 0:
        table.add_row("no gas", percent_text(result.nobody_wins))
    return table


def _patterns(result: ChoiceResult, letters: Mapping[str, str]) -> Table:
    table = _table()
    table.add_column("\ngases", min_width=16)
    table.add_column("\n", no_wrap=True)
    for heading in ("S/N\njointly", "\ntransits", "\nbits", "each\nalone"):
        table.add_column(heading, justify="right")
    table.add_column("can\ngo")
    table.add_column("against the\nbest single gas")
    for pattern in result.patterns[:_PATTERNS]:
        table.add_row(
            " + ".join(gas_text(gas) for gas in pattern.gases),
            letters[pattern.mode],
            snr_text(pattern.snr),
            count_text(pattern.transits_required),
            Text(bits_text(pattern.joint.bits), style="bold"),
            ", ".join(bits_text(bits) for bits in pattern.alone_bits),
            _named(pattern.droppable) or "none",
            _against_single(pattern),
        )
    return table


def _against_single(pattern: Pattern) -> str:
    gas, bits = pattern.best_single
    verdict = "more than" if pattern.better_than_single else "no more than"
    return f"{verdict} {gas_text(gas)}, {bits_text(bits)}"


def _reach(choices: Sequence[Choice], letters: Mapping[str, str], width: int) -> Table:
    wide = width >= _WIDE
    table = _table()
    table.add_column("\ngas", min_width=7)
    table.add_column("\n")
    for heading in (*["range\nbelieved"] * wide, "\ndetects", "\nfloor", "null\nexcludes"):
        table.add_column(heading, justify="right", no_wrap=True)
    table.add_column("\nlike", no_wrap=True)
    table.add_column("\nunique", justify="right", no_wrap=True)
    table.add_column("\nbest bands, um" if wide else "\nbest band, um", ratio=1)
    for choice in choices:
        low, high = choice.mixing_ratio_range
        like = choice.resembling
        if choice.plan.verdict is Verdict.NO_BAND:
            continue
        table.add_row(
            gas_text(choice.gas),
            letters[choice.mode],
            *[f"{ratio_text(low)} - {ratio_text(high)}"] * wide,
            *(_ratio_or_never(x) for x in (choice.reachable_ratio, choice.limit_ratio, choice.excluded_ratio)),
            f"{gas_text(like.gas)} ({like.snr_left:.2f})" if like else "-",
            f"{choice.uniqueness:.2f}",
            bands_text(choice.plan.best_bands[: 2 if wide else 1]) or "-",
        )
    return table


def _line_data(result: ChoiceResult, ranked: Sequence[Choice]) -> list[str]:
    """Sources of the gases in the ranking, and where the rest can be read."""
    gases = dict.fromkeys(choice.gas for choice in ranked)
    shown = [line for line in result.line_data if line.split(":")[0] in gases]
    rest = len(result.line_data) - len(shown)
    return [*shown, f"{rest} more sentences, on the other gases and on widths, in the JSON"] if rest else shown


def _ratio_or_never(ratio: float | None) -> str:
    return "never" if ratio is None else ratio_text(ratio)


def _list(title: str, items: Iterable[str]) -> list[RenderableType]:
    lines: list[RenderableType] = []
    for item in items:
        grid = Table.grid(padding=(0, 1, 0, 0))
        grid.add_row(Text("-"), Text(item))
        lines.append(grid)
    return [Text(), Text(title, style="bold"), *lines] if lines else []
