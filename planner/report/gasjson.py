"""The gas catalogue as JSON.

One object. Quantities carry their unit in the key; a pair is ``[lower, higher]``, equal where one value is known;
``null`` stands for what is not recorded. Every statement holds ``says``, ``source`` (or null) and ``flag``: ``read``,
``from memory``, ``computed`` or ``judgement``.

======================================  ==============================================================================
key                                     meaning
======================================  ==============================================================================
``format``, ``version``                 ``"limbcast gases 1"``; version of the program
``context``                             the kind of planet that presences are meant for
``hypotheses``                          ``life`` and ``industry``: a statement with ``means``, ``opposite``,
                                        ``probability``, ``probability_range``
``gases``                               one object per gas, see below
======================================  ==============================================================================

Each gas:

======================================  ==============================================================================
``formula``, ``names``, ``class``       ``class``: ``biogenic``, ``industrial``, ``either`` or ``abiotic``
``summary``                             a sentence
``origins``                             statements with ``who`` (``life``, ``industry``, ``neither``) and
                                        ``amount_tg_per_yr`` (pair or null)
``false_positives``                     statements with ``mimics`` (``life`` or ``industry``)
``losses``                              statements with ``lifetime_yr`` (pair or null)
``abundances``                          statements with ``epoch`` and ``mixing_ratio`` (pair)
``greenhouse``                          null, or ``radiative_efficiency_w_per_m2_ppb``, ``gwp_100``, source and flag
``cautions``                            statements with ``about``
``companions``                          statements with ``gas``, ``seen``, ``favours``
``bands``                               list of ``from_um``, ``to_um``, ``intensity_cm``, ``name``, ``source``, ``flag``
``rivals``                              formulas of gases that share bands, the most alike first
``shared_bands``                        list of ``gas``, ``from_um``, ``to_um``, ``own``, ``other``, ``alike``
``life``, ``industry``                  ``if_true`` and ``if_false``, or ``either_way``: a statement with
                                        ``probability``, ``probability_range``, ``mixing_ratio_range``
======================================  ==============================================================================
"""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping
from dataclasses import asdict
from pathlib import Path
from typing import Any

from planner.catalogue.records import GasRecord, Hypotheses, Hypothesis
from planner.catalogue.sharing import rivals_among, shared_bands
from planner.report.files import write_text

__all__ = ["gases_json", "write_gases_json"]


def gases_json(
    gases: Iterable[GasRecord], catalogue: Mapping[str, GasRecord], hypotheses: Hypotheses, version: str
) -> str:
    """Gases as indented JSON text with a newline at its end; the layout is the module's docstring.

    Parameters
    ----------
    gases : iterable of GasRecord
        Those to write.
    catalogue : mapping of formula to GasRecord
        All among which rivals are sought.
    """
    tree = {
        "format": "limbcast gases 1",
        "version": version,
        "context": hypotheses.context,
        "hypotheses": hypotheses.model_dump(mode="json", exclude={"context"}),
        "gases": [_gas(gas, catalogue) for gas in gases],
    }
    return json.dumps(tree, indent=2, ensure_ascii=False, allow_nan=False) + "\n"


def write_gases_json(
    gases: Iterable[GasRecord],
    catalogue: Mapping[str, GasRecord],
    hypotheses: Hypotheses,
    version: str,
    path: str | Path,
) -> None:
    """Write `gases_json` to a file.

    Raises
    ------
    OutputError
        If the file cannot be written.
    """
    write_text(path, gases_json(gases, catalogue, hypotheses, version))


def _gas(gas: GasRecord, catalogue: Mapping[str, GasRecord]) -> dict[str, Any]:
    rivals = rivals_among(gas, catalogue)
    plain = gas.model_dump(mode="json", exclude={"formula", "gas_class", "band_groups", "life", "industry"})
    return {
        "formula": gas.formula,
        "names": list(gas.names),
        "class": gas.gas_class,
        **plain,
        "bands": [asdict(band) for band in gas.bands],
        "rivals": list(rivals),
        "shared_bands": [asdict(shared) for shared in shared_bands(gas, [catalogue[rival] for rival in rivals])],
        "life": _hypothesis(gas.life),
        "industry": _hypothesis(gas.industry),
    }


def _hypothesis(hypothesis: Hypothesis) -> dict[str, Any]:
    unused = {"either_way"} if hypothesis.tells else {"if_true", "if_false"}
    return hypothesis.model_dump(mode="json", exclude=unused)
