"""A choice between gases as JSON.

One object. Quantities carry their unit in the key; ``null`` stands for what no amount or number of transits reaches,
and for a limit that is not there. Significances are one-sided; chances, presences and ranges are judgement.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast choose 1"``; version of the program
``title``, ``invented``                 of the scenario
``hypothesis``, ``means``, ``opposite`` ``"life"`` or ``"industry"``, what it says, what it is weighed against
``context``                             the kind of planet that presences are meant for
``prior``, ``prior_range``              chance of the hypothesis before looking, lowest and highest held
``prior_because``                       the reason
``most_bits``                           what there is to learn at this prior
``hours``                               with one mode, as charged
``threshold_sigma``, ``power``          as for a plan
``rows``                                one object per gas and mode, most worth first, see below
``patterns``                            one object per set of gases and mode, most worth first, see below
``wins``                                object: share of the opinions under which each gas is worth most
``nobody_wins``                         share under which nothing is worth a thousandth of what there is to learn
``opinions``                            number drawn
``without_data``                        gases without line data
``nuisances``                           list of ``name``, ``prior`` (width in words)
``accuracy``, ``assumptions``, ``line_data``, ``cautions``   lists of sentences
======================================  ==============================================================================

Each row: ``gas``, ``mode``, ``mixing_ratio`` (reference), ``mixing_ratio_range`` (where the hypothesis is true),
``tells`` (false where the gas is alike either way), ``verdict``, ``best_bands``, ``confusion`` and the counts as in a
plan (plain and ``_all_known``), ``transits`` and ``snr`` (in the hours given), ``reachable_ratio`` (least amount
detected in the hours), ``limit_ratio`` (the same after endless transits), ``excluded_ratio`` (by a null result, with
95 %), ``resembling`` (``gas``, ``mixing_ratio``, ``snr_left`` as a share, or null), ``uniqueness`` (share of the S/N
beside all gases with like bands), ``amplitude_bits``, ``amplitude_bits_16``, ``amplitude_bits_84`` (over the opinions),
``detection_bits``, ``detected_if_true``, ``detected_if_false``, ``after_detection``, ``after_null`` (chances of the
hypothesis), ``after_detection_16_84``, ``after_null_16_84`` (over the opinions), ``odds_after_detection``,
``odds_after_null``, ``wins``.

Each pattern: ``gases``, ``mode``, ``how``, ``snr``, ``transits_required``, ``bits``, ``bits_error`` (standard error of
the draws), ``alone_bits`` and ``without_bits`` (per gas), ``droppable``, ``best_single`` (``gas``, ``bits``),
``better_than_single``.
"""

from __future__ import annotations

import json
import math
from dataclasses import asdict
from pathlib import Path
from typing import Any

from planner.report.files import write_text
from planner.studies.choices import Choice, ChoiceResult, Pattern
from planner.studies.results import Counts

__all__ = ["choice_json", "write_choice_json"]

_PLAIN = (
    "title", "invented", "hypothesis", "means", "opposite", "context", "prior", "prior_because", "most_bits", "hours",
    "threshold_sigma", "power", "nobody_wins", "opinions",
)  # fmt: skip
_LISTS = ("prior_range", "without_data", "accuracy", "assumptions", "line_data", "cautions")


def choice_json(result: ChoiceResult) -> str:
    """The choice as indented JSON text with a newline at its end; the layout is the module's docstring."""
    tree = {
        "format": "limbcast choose 1",
        "version": result.version,
        **{key: getattr(result, key) for key in _PLAIN},
        **{key: list(getattr(result, key)) for key in _LISTS},
        "rows": [_row(choice) for choice in result.choices],
        "patterns": [_pattern(pattern) for pattern in result.patterns],
        "wins": {gas: result.wins_of(gas) for gas in dict.fromkeys(choice.gas for choice in result.choices)},
        "nuisances": [{"name": name, "prior": prior} for name, prior in result.nuisances],
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_choice_json(result: ChoiceResult, path: str | Path) -> None:
    """Write `choice_json` to a file.

    Raises
    ------
    OutputError
        If the file cannot be written.
    """
    write_text(path, choice_json(result))


def _row(choice: Choice) -> dict[str, Any]:
    plan, worth = choice.plan, choice.worth
    low, high = choice.bits_spread
    return {
        "gas": choice.gas,
        "mode": choice.mode,
        "mixing_ratio": choice.mixing_ratio,
        "mixing_ratio_range": list(choice.mixing_ratio_range),
        "tells": choice.tells,
        "verdict": plan.verdict.value,
        "best_bands": [asdict(band) for band in plan.best_bands],
        "confusion": [{"nuisance": name, "snr_left": snr} for name, snr in plan.confusion],
        **_counts(plan.marginalised, ""),
        **_counts(plan.all_known, "_all_known"),
        **{
            key: getattr(choice, key) for key in ("transits", "snr", "reachable_ratio", "limit_ratio", "excluded_ratio")
        },
        "resembling": asdict(choice.resembling) if choice.resembling else None,
        "uniqueness": choice.uniqueness,
        "amplitude_bits": float(worth.amplitude_bits),
        "amplitude_bits_16": low,
        "amplitude_bits_84": high,
        "detection_bits": float(worth.detection_bits),
        "detected_if_true": float(worth.detected_if_true),
        "detected_if_false": float(worth.detected_if_false),
        "after_detection": float(worth.after_detection),
        "after_null": float(worth.after_null),
        "after_detection_16_84": list(choice.after_detection_spread),
        "after_null_16_84": list(choice.after_null_spread),
        "odds_after_detection": _odds(float(worth.after_detection)),
        "odds_after_null": _odds(float(worth.after_null)),
        "wins": choice.wins,
    }


def _odds(chance: float) -> float | None:
    return chance / (1 - chance) if chance < 1 else None


def _counts(counts: Counts, suffix: str) -> dict[str, float | int | None]:
    return {
        key + suffix: None if value is None or math.isinf(value) else value for key, value in asdict(counts).items()
    }


def _pattern(pattern: Pattern) -> dict[str, Any]:
    gas, bits = pattern.best_single
    return {
        "gases": list(pattern.gases),
        "mode": pattern.mode,
        "how": pattern.how,
        "snr": pattern.snr,
        "transits_required": pattern.transits_required,
        "bits": pattern.joint.bits,
        "bits_error": pattern.joint.error,
        "alone_bits": list(pattern.alone_bits),
        "without_bits": list(pattern.joint.without),
        "droppable": list(pattern.droppable),
        "best_single": {"gas": gas, "bits": bits},
        "better_than_single": pattern.better_than_single,
    }
