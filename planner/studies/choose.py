"""Which gas to go for, in the hours there are: reach, rivals and worth of each gas of the catalogue with each mode."""

from __future__ import annotations

from collections.abc import Sequence
from math import floor
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from planner import __version__
from planner.catalogue.read import find_gas, read_catalogue, read_hypotheses
from planner.catalogue.records import Prior
from planner.detection.significance import target_snr
from planner.detection.worth import Channel, Worth, entropy_bits, worth
from planner.errors import RangeError
from planner.scenario.records import Scenario
from planner.studies.beliefs import (
    MOST_RATIO,
    OPINIONS,
    SHIFT_DEX,
    Opinions,
    believed_gas,
    believed_prior,
    occurrence,
    opinions,
    span,
)
from planner.studies.choices import Choice, ChoiceResult, Pattern
from planner.studies.nuisances import prior_widths
from planner.studies.patterns import Candidate, find_patterns
from planner.studies.plan import CAUTIONS, assumptions, cautions_about_star
from planner.studies.survey import Survey, snr_after
from planner.studies.workshop import Progress, Workshop

__all__ = ["JUDGEMENT", "choose"]

Array = NDArray[np.float64]

JUDGEMENT = (
    "Priors, presences and ranges are judgement: nobody has measured how often nature makes these gases without life "
    "or industry. Read the spread and the shares of opinions, not a single figure.",
    "Once the hypothesis is fixed, gases are taken as independent; those that come together by chemistry count for too "
    "much in a pattern.",
)
SEED = 1
_EXCLUDED_WITH = 0.95
_TRIED_ON_ALL = 2
_WORTHLESS = 1e-3


def choose(
    scenario: Scenario,
    *,
    hypothesis: str = "life",
    gases: Sequence[str] = (),
    hours: float | None = None,
    together: Sequence[tuple[str, ...]] = (),
    lines_folder: Path | None = None,
    progress: Progress | None = None,
    seed: int = SEED,
) -> ChoiceResult:
    """The worth of gases with the modes of a scenario, alone and together.

    Parameters
    ----------
    scenario : Scenario
        Its candidates play no part.
    hypothesis : str
        ``"life"`` or ``"industry"``.
    gases : sequence of str
        Formulas or names; all of the catalogue when left out.
    hours : float, optional
        As charged, for each mode; those of all transits on offer when left out.
    together : sequence of sets of gases
        Patterns to judge beside those of the literature and those found by search.
    lines_folder, progress
        As for a plan.
    seed : int
        Of the draws.

    Raises
    ------
    PlannerError
        If a gas is not in the catalogue, or data cannot be read or used.
    """
    sets = [tuple(find_gas(gas).formula for gas in pattern) for pattern in together]
    asked = [find_gas(gas).formula for gas in gases] or list(read_catalogue())
    asked = list(dict.fromkeys([*asked, *(gas for pattern in sets for gas in pattern)]))
    workshop = Workshop(scenario, lines_folder=lines_folder, progress=progress)
    possible = [gas for gas in asked if set(scenario.atmosphere.background) - {gas}]
    most = max(view.charged_hours for view in workshop.views)
    study = _Study(workshop, hypothesis, hours or scenario.transits_on_offer * most, progress)
    study.look(possible, seed)
    choices = study.choices()
    return study.told(choices, study.patterns(sets, choices, seed), [gas for gas in asked if gas not in study.beliefs])


class _Study:
    """The worth of what a survey has seen."""

    def __init__(self, workshop: Workshop, hypothesis: str, hours: float, progress: Progress | None) -> None:
        self.workshop, self.scenario = workshop, workshop.scenario
        self.hypothesis, self.hours = hypothesis, hours
        self.prior: Prior = believed_prior(self.scenario.beliefs, hypothesis)
        self.transits = [floor(hours / view.charged_hours + 1e-9) for view in workshop.views]
        self.survey = Survey(workshop, hypothesis, self.transits, progress or (lambda text, share: None))

    def look(self, gases: Sequence[str], seed: int) -> None:
        """See the gases with every mode, and ask every opinion what that is worth."""
        self.survey.look(gases)
        seen = list(self.survey.sights)
        if not seen:
            raise RangeError(f"{', '.join(gases)}: there are no line data for any of these gases; name others")
        self.beliefs = {gas: believed_gas(self.scenario.beliefs, gas, self.hypothesis) for gas in seen}
        self.pairs = [(gas, index) for gas in seen for index in range(len(self.transits))]
        self.channels = {
            (gas, index): Channel.make(self.survey.curves[gas, index].at_hours, *span(self.beliefs[gas]))
            for gas, index in self.pairs
        }
        drawn = opinions(self.prior, self.beliefs, np.random.default_rng(seed))
        self.opinions = {pair: self._opinions(pair, drawn) for pair in self.pairs}
        self.wins, self.nobody_wins = self._winners(drawn)

    def _opinions(self, pair: tuple[str, int], drawn: Opinions) -> Worth:
        """The worth under every opinion, ``(draw,)``."""
        kinds = (drawn.if_true[pair[0]], drawn.if_false[pair[0]])
        return worth(self.channels[pair], *kinds, drawn.prior, self.scenario.goal.threshold_sigma)

    def _winners(self, drawn: Opinions) -> tuple[dict[tuple[str, int], float], float]:
        """Share of the opinions that each gas and mode wins, and the share in which nothing is worth going for."""
        bits = np.array([self.opinions[pair].amplitude_bits for pair in self.pairs])
        worthy = bits.max(axis=0) > _WORTHLESS * np.asarray(entropy_bits(drawn.prior))
        won = np.bincount(np.argmax(bits, axis=0)[worthy], minlength=len(bits)) / worthy.size
        return dict(zip(self.pairs, won.tolist(), strict=True)), float(1 - worthy.mean())

    def choices(self) -> list[Choice]:
        """Every gas with every mode, the most worth first."""
        choices = [self._choice(gas, index) for gas, index in self.pairs]
        return sorted(choices, key=lambda choice: (-float(choice.worth.amplitude_bits), -choice.snr))

    def _choice(self, gas: str, index: int) -> Choice:
        goal, belief = self.scenario.goal, self.beliefs[gas]
        target = target_snr(goal.threshold_sigma, goal.power)
        certain = target_snr(goal.threshold_sigma, _EXCLUDED_WITH)
        sight, curve = self.survey.sights[gas], self.survey.curves[gas, index]
        views = self.opinions[gas, index]
        row = self.survey.rows[gas, index]
        resembling, unique = self.survey.rivals(gas, index)
        kinds = (occurrence(belief.presence(True)), occurrence(belief.presence(False)))
        return Choice(
            gas=gas,
            mode=row.mode,
            mixing_ratio=row.mixing_ratio,
            mixing_ratio_range=belief.presence(True).mixing_ratio_range,
            tells=belief.tells,
            plan=row,
            transits=self.transits[index],
            snr=snr_after(sight.measurements[index], self.transits[index]),
            reachable_ratio=_possible(curve.at_hours.mixing_ratio_for(target)),
            limit_ratio=_possible(curve.at_limit.mixing_ratio_for(target)),
            excluded_ratio=_possible(curve.at_hours.mixing_ratio_for(certain)),
            resembling=resembling,
            uniqueness=unique,
            worth=worth(self.channels[gas, index], *kinds, self.prior.probability, goal.threshold_sigma),
            bits_spread=_spread(views.amplitude_bits),
            after_detection_spread=_spread(views.after_detection),
            after_null_spread=_spread(views.after_null),
            wins=self.wins[gas, index],
        )

    def patterns(self, sets: Sequence[tuple[str, ...]], choices: Sequence[Choice], seed: int) -> list[Pattern]:
        """Sets that were asked for, those of the literature, and what a greedy search finds, with each mode."""
        names = [view.mode.name for view in self.workshop.views]
        bits = {(choice.gas, names.index(choice.mode)): float(choice.worth.amplitude_bits) for choice in choices}
        candidates = [
            Candidate(
                gas=gas,
                index=index,
                channel=self.channels[gas, index],
                if_true=occurrence(self.beliefs[gas].presence(True)),
                if_false=occurrence(self.beliefs[gas].presence(False)),
                bits=bits[gas, index],
            )
            for gas, index in self.pairs
        ]
        rng = np.random.default_rng([seed, 1])
        return find_patterns(self.survey, candidates, sets, self.prior.probability, rng)

    def told(self, choices: Sequence[Choice], patterns: Sequence[Pattern], without_data: Sequence[str]) -> ChoiceResult:
        """Everything, with what it rests on."""
        scenario, prior = self.scenario, self.prior
        leading = list(dict.fromkeys(choice.gas for choice in choices))[:_TRIED_ON_ALL]
        return ChoiceResult(
            title=scenario.title,
            invented=scenario.invented,
            hypothesis=self.hypothesis,
            means=prior.means,
            opposite=prior.opposite,
            context=read_hypotheses().context,
            prior=prior.probability,
            prior_range=prior.probability_range,
            prior_because=prior.says,
            most_bits=float(entropy_bits(prior.probability)),
            hours=self.hours,
            threshold_sigma=scenario.goal.threshold_sigma,
            power=scenario.goal.power,
            choices=tuple(choices),
            patterns=tuple(patterns),
            without_data=tuple(without_data),
            opinions=OPINIONS,
            nobody_wins=self.nobody_wins,
            accuracy=self.survey.accuracy(leading),
            assumptions=(*assumptions(self.workshop), _DRAWN),
            line_data=(*self._line_data(), *self.workshop.store.notices),
            nuisances=prior_widths(scenario),
            cautions=(*JUDGEMENT, *CAUTIONS, *cautions_about_star(self.workshop)),
            version=__version__,
        )

    def _line_data(self) -> list[str]:
        """Sources of the gases that were seen, and of the rest of the air."""
        library, opacities = self.workshop.library, self.workshop.opacities
        rest = [gas for gas in self.scenario.air() if gas not in self.beliefs and opacities.has_data(gas)]
        sentences = [s for gas in rest for s in (*library.gas(gas).provenance, *library.gas(gas).partial)]
        pairs = library.pair_provenance([*self.beliefs, *rest])
        return [*self.survey.line_data, *sentences, *pairs, *opacities.broadening_notes]


_DRAWN = (
    f"{OPINIONS} opinions: probabilities drawn evenly in log odds, half on each side of the central value; ends of "
    f"ranges of mixing ratios moved by up to {SHIFT_DEX:g} dex; mixing ratios above {100 * MOST_RATIO:g} % left out"
)


def _spread(values: float | Array) -> tuple[float, float]:
    """Between 16 and 84 % of the opinions."""
    low, high = np.quantile(values, [0.16, 0.84])
    return float(low), float(high)


def _possible(ratio: float | None) -> float | None:
    return ratio if ratio is not None and ratio <= 1 else None
