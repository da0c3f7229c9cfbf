"""Is a claim sound? Every check of a claimed feature, and the verdict with its weakest link."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from planner import __version__
from planner.claims.records import Claim
from planner.claims.spectrum import ObservedSpectrum
from planner.errors import RangeError
from planner.report.words import gas_text
from planner.studies.checks.bench import MOST_RATIO, Bench, make_bench
from planner.studies.checks.chance import check_evidence, check_trials
from planner.studies.checks.companions import check_companions
from planner.studies.checks.elsewhere import Prospect, check_follow_up, look_elsewhere
from planner.studies.checks.findings import FALLS_BELOW, NEEDED_SIGMA, AuditResult, Finding, judge
from planner.studies.checks.level import check_offsets, check_reductions
from planner.studies.checks.precision import check_noise
from planner.studies.checks.rivalry import AS_WELL, Rivalry, check_rivals, try_all
from planner.studies.checks.size import check_size
from planner.studies.checks.starlight import check_star

__all__ = ["audit"]

Progress = Callable[[str, float], None]

_CAUTIONS = (
    "A claim that stands up to these checks can still be wrong; one that does not can still be right. What cannot be "
    "tested counts neither way.",
    "A detected gas is not detected life or industry: most gases have other sources too.",
)
_LISTS_UP_TO_K = 600.0
_WORTH_TELLING = 0.02


def audit(
    claim: Claim,
    observed: ObservedSpectrum | None = None,
    *,
    follow_up: bool = True,
    lines_folder: Path | None = None,
    progress: Progress | None = None,
) -> AuditResult:
    """All checks of a claim.

    Parameters
    ----------
    claim : Claim
    observed : ObservedSpectrum, optional
        The spectrum itself; size, noise, rivals, star and offsets are then judged on it, and chance and evidence
        by its significance where that is less than the claimed one.
    follow_up : bool
        Whether to look for the observation that would settle the claim; it takes as long as the rest.
    lines_folder : Path, optional
        Real line files to lay over the embedded data.
    progress : callable, optional
        Called with a text and the share done.

    Raises
    ------
    PlannerError
        If line data or the mode cannot be read or used, or a spectrum is given for a claim without a planet.
    """
    bench = _bench(claim, observed, lines_folder, progress)
    rivalry = try_all(bench) if bench is not None and bench.fits is not None else None
    prospects: tuple[Prospect, ...] = ()
    trouble = None
    if bench is not None and follow_up:
        try:
            prospects = look_elsewhere(bench, rivalry, lines_folder=lines_folder, progress=progress)
        except RangeError as error:  # such as a star's own spectrum that not every mode can use: the claim stays judged
            trouble = str(error)
    findings = _checks(claim, bench, rivalry, prospects)
    if follow_up:
        findings = (*findings, check_follow_up(bench, prospects, trouble))
    name = gas_text(claim.claim.gas)
    sigma = claim.claim.sigma if bench is None else bench.weighed_sigma
    standing, verdict, weakest = judge(name, sigma, findings)
    return AuditResult(
        title=claim.title,
        source=claim.source,
        invented=claim.invented,
        gas=claim.claim.gas,
        claimed_sigma=claim.claim.sigma,
        standing=standing,
        verdict=verdict,
        weakest=weakest,
        findings=findings,
        line_data=_line_data(bench),
        assumptions=_assumptions(bench),
        cautions=_CAUTIONS,
        version=__version__,
    )


def _checks(
    claim: Claim, bench: Bench | None, rivalry: Rivalry | None, prospects: tuple[Prospect, ...]
) -> tuple[Finding, ...]:
    return (
        check_size(bench),
        check_noise(bench),
        check_companions(bench, prospects),
        check_rivals(bench, rivalry),
        check_trials(claim, bench),
        check_evidence(claim, bench),
        check_star(bench),
        check_offsets(claim, bench),
        check_reductions(claim),
    )


def _bench(
    claim: Claim, observed: ObservedSpectrum | None, lines_folder: Path | None, progress: Progress | None
) -> Bench | None:
    if claim.modelled:
        return make_bench(claim, observed, lines_folder=lines_folder, progress=progress)
    if observed is not None:
        missing = [name for name in ("star", "planet", "atmosphere") if getattr(claim, name) is None]
        raise RangeError(f"the spectrum cannot be judged: the claim lacks {', '.join(f'[{name}]' for name in missing)}")
    return None


def _line_data(bench: Bench | None) -> tuple[str, ...]:
    """What is used of the claimed gas and of the gases in the air."""
    if bench is None:
        return ()
    gases = dict.fromkeys([bench.gas, *bench.scenario.atmosphere.absorbers])
    known = [bench.library.gas(gas) for gas in gases if bench.model.opacities.has_data(gas)]
    return tuple(sentence for source in known for sentence in (*source.provenance, *source.partial))


def _assumptions(bench: Bench | None) -> tuple[str, ...]:
    """What the figures rest on, a sentence each."""
    sentences = [
        f"a check fails where it leaves less than {NEEDED_SIGMA:g} sigma (for rivals {AS_WELL:g}); a claim does not "
        f"stand where one leaves less than {FALLS_BELOW:.3g}, unless it is the rivals",
        "significances are one-sided, except for the Bayes factor, whose bound is for two-sided ones",
    ]
    if bench is None:
        return tuple(sentences)
    temperature_k = bench.scenario.atmosphere.temperature_k
    sentences += [
        f"isothermal air under a clear sky unless the claim says otherwise, {temperature_k:g} K; the "
        f"gas is a trace of at most {MOST_RATIO:g}; the air's unknowns are marginalised with the usual priors",
        f"mixing ratio in use: {bench.mixing_ratio:.3g}",
    ]
    if bench.uncovered_share > _WORTH_TELLING:
        share = f"{100 * bench.uncovered_share:.0f} %"
        sentences.append(
            f"the data of {gas_text(bench.gas)} leave out {share} of the range, where it counts as transparent"
        )
    if not bench.on_data:
        sentences.append(
            "no spectrum: the expected one stands in for it, with errors that make it as significant as claimed"
        )
    if temperature_k > _LISTS_UP_TO_K:
        sentences.append(
            f"embedded line lists are made for up to {_LISTS_UP_TO_K:g} K: above, hot bands are missing and windows "
            "between bands come out too clear"
        )
    return tuple(sentences)
