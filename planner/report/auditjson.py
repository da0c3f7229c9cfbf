"""An audited claim as JSON.

One object. Quantities carry their unit in the key; ``null`` stands for what was not given or cannot be told.
Significances are in sigma, one-sided except where the key says otherwise.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast audit 1"``; version of the program
``title``, ``source``, ``invented``     of the claim
``gas``, ``claimed_sigma``              formula; significance as claimed, or null
``standing``                            ``"stands"``, ``"not settled"``, ``"does not stand"``, ``"cannot be judged"``
``verdict``                             a sentence with the weakest link
``weakest``                             name of that check, or null
``checks``                              one object per check, see below
``line_data``, ``assumptions``          lists of sentences
``cautions``                            list of sentences
======================================  ==============================================================================

Each check:

======================================  ==============================================================================
``check``                               ``size``, ``noise``, ``companions``, ``rivals``, ``trials``, ``evidence``,
                                        ``star``, ``offsets``, ``reductions`` or ``follow-up``
``outcome``                             ``"passed"``, ``"failed"`` or ``"cannot be tested"``
``tested``, ``says``, ``why``           what was tested, what was found, why it matters
``left_sigma``                          significance left once this is allowed for, or null
``on_data``                             whether it ran on the spectrum itself
``figures``                             names with numbers, words or null
======================================  ==============================================================================
"""

from __future__ import annotations

import json
import math
from dataclasses import asdict
from typing import Any

from planner.studies.checks.findings import AuditResult, Finding

__all__ = ["audit_json"]


def audit_json(result: AuditResult) -> str:
    """An audit as indented JSON text with a newline at its end; the layout is the module's docstring."""
    tree = {
        "format": "limbcast audit 1",
        "version": result.version,
        "title": result.title,
        "source": result.source,
        "invented": result.invented,
        "gas": result.gas,
        "claimed_sigma": result.claimed_sigma,
        "standing": result.standing.value,
        "verdict": result.verdict,
        "weakest": result.weakest.value if result.weakest is not None else None,
        "checks": [_check(finding) for finding in result.findings],
        "line_data": list(result.line_data),
        "assumptions": list(result.assumptions),
        "cautions": list(result.cautions),
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def _check(finding: Finding) -> dict[str, Any]:
    plain = asdict(finding)
    plain["check"], plain["outcome"] = finding.check.value, finding.outcome.value
    plain["figures"] = {name: _finite(value) for name, value in finding.figures.items()}
    return plain


def _finite(value: Any) -> Any:
    """Infinite limits have no place in JSON."""
    return None if isinstance(value, float) and not math.isfinite(value) else value
