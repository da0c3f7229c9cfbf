"""An audited claim in the terminal: the verdict first, then every check with its figures and why it matters."""

from __future__ import annotations

import io
from collections.abc import Iterable

from rich.console import Console, Group, RenderableType
from rich.table import Table
from rich.text import Text

from planner.report.words import gas_text, snr_text
from planner.studies.checks.findings import AuditResult, Finding, Outcome, Standing

__all__ = ["audit_text", "audit_view"]

_STYLES = {Outcome.PASSED: "green", Outcome.FAILED: "red", Outcome.UNTESTED: "dim"}
_STANDINGS = {Standing.STANDS: "green", Standing.OPEN: "yellow", Standing.FALLS: "red", Standing.UNTESTED: "dim"}


def audit_text(result: AuditResult, width: int = 100) -> str:
    """What `audit_view` shows on a plain terminal of this width."""
    file = io.StringIO()
    Console(file=file, width=width, force_terminal=False, color_system=None).print(audit_view(result, width))
    return "\n".join(line.rstrip() for line in file.getvalue().splitlines()) + "\n"


def audit_view(result: AuditResult, width: int) -> Group:
    """An audit as something a rich console prints."""
    table = Table(box=None, pad_edge=False, padding=(0, 2 if width >= 100 else 1, 0, 0), header_style="dim")
    table.add_column("check", no_wrap=True)
    table.add_column("outcome", max_width=9)
    table.add_column("sigma\nleft", justify="right", no_wrap=True)
    table.add_column("what was found", ratio=1)
    for finding in result.findings:
        left = "-" if finding.left_sigma is None else snr_text(finding.left_sigma)
        outcome = Text(finding.outcome.value, style=_STYLES[finding.outcome])
        table.add_row(Text(finding.check.value, style="bold"), outcome, left, _found(finding))
    return Group(
        _headline(result),
        Text(),
        table,
        *_list("Rests on", [*result.assumptions, *result.line_data]),
        *_list("Cautions", result.cautions),
        Text(f"\nlimbcast {result.version}"),
    )


def _headline(result: AuditResult) -> Text:
    text = Text()
    text.append(f"{result.title}\n", style="bold")
    if result.source:
        text.append(f"{result.source}\n", style="dim")
    if result.invented:
        text.append("The claim is invented.\n", style="italic")
    claimed = "no significance given" if result.claimed_sigma is None else f"{result.claimed_sigma:.3g} sigma claimed"
    text.append(f"{gas_text(result.gas)}, {claimed}\n\n")
    text.append(result.verdict, style=_STANDINGS[result.standing])
    return text


def _found(finding: Finding) -> Text:
    text = Text(finding.says[:1].upper() + finding.says[1:] + ".")
    if finding.on_data:
        text.append(" On the data.", style="italic")
    text.append(f"\n{finding.why}", style="dim")
    return text


def _list(title: str, items: Iterable[str]) -> list[RenderableType]:
    rows = list(items)
    if not rows:
        return []
    table = Table.grid(padding=(0, 1, 0, 0))
    for row in rows:
        table.add_row("-", Text(row))
    return [Text(), Text(title, style="bold"), table]
