"""The whole of one look on the closed side, experimental against control."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date

from app.model.boundary import Bound, LookAsUsed
from app.model.extract import Changes, Finding, LookKind, Sample
from app.model.look import Information, LookResult
from app.model.plan import Plan
from app.model.survival import LogrankResult, SurvivalCurve
from app.model.values import Absent, Estimate
from app.review.comparison import compare_arms
from app.review.counts import arm_counts, calendar_counts, strata_counts, times_of
from app.sequential.boundary import LookAhead, bounds_ahead, efficacy_rule
from app.sequential.design import planned_looks
from app.sequential.verdict import verdict
from app.survival import kaplan_meier


@dataclass(frozen=True)
class LookDeclared:
    """What was declared and noted when the snapshot was received, before any comparative result."""

    number: int
    kind: LookKind
    cutoff: date | None = None
    extracted: date | None = None
    findings: tuple[Finding, ...] = ()
    changes: Changes | None = None
    snapshot_digests: tuple[str, ...] = ()


def review_look(plan: Plan, sample: Sample, declared: LookDeclared, past: Sequence[LookAsUsed]) -> LookResult:
    """Compute everything of one look.

    `past` are the looks as used, in order. The bound does not depend on what earlier looks crossed: a
    crossing depends on which arm is experimental, and the masked view reads the same bound both ways.
    """
    compared, mirrored = compare_arms(plan, sample)
    test = compared.logrank
    information = _information(plan, sample, test)
    now, *planned = _bounds(plan, information, declared, past)
    curves = [_curve(plan, sample, arm) for arm in (False, True)]
    return LookResult(
        number=declared.number,
        kind=declared.kind,
        final=now.final,
        time_unit=sample.time_unit,
        cutoff=declared.cutoff,
        extracted=declared.extracted,
        findings=declared.findings,
        changes=declared.changes,
        information=information,
        information_used=_information_used(information),
        calendar=calendar_counts(sample),
        logrank=test,
        logrank_unstratified=compared.logrank_unstratified,
        cox=compared.cox,
        cox_unstratified=compared.cox_unstratified,
        mirrored=mirrored,
        control_curve=curves[0],
        experimental_curve=curves[1],
        bound=now,
        verdict=verdict(past, None if isinstance(test, Absent) else test.z, now, plan.design.sides),
        past=tuple(past),
        planned=tuple(planned),
        snapshot_digests=declared.snapshot_digests,
        plan_digest=plan.digest,
    )


def _curve(plan: Plan, sample: Sample, experimental: bool) -> SurvivalCurve:
    arm = sample.experimental == experimental
    return kaplan_meier(
        times_of(sample)[arm],
        sample.event[arm],
        level=plan.analysis.confidence,
        interval=plan.analysis.curve_interval,
    )


def _information(plan: Plan, sample: Sample, test: LogrankResult | Absent) -> Information:
    time, design = times_of(sample), plan.design
    events = int(sample.event.sum())
    arms = [arm_counts(time[arm], sample.event[arm]) for arm in (~sample.experimental, sample.experimental)]
    variance: Estimate = test if isinstance(test, Absent) else test.variance
    share = plan.arms.experimental_share
    return Information(
        subjects=int(time.size),
        events=events,
        fraction=events / design.planned_events,
        planned_events=design.planned_events,
        score_variance=variance,
        variance_ratio=variance
        if isinstance(variance, Absent)
        else variance / (events * share * (1 - share)),
        control=arms[0],
        experimental=arms[1],
        strata=strata_counts(sample),
    )


def _information_used(information: Information) -> float:
    return float(information.events)


def _bounds(
    plan: Plan, information: Information, declared: LookDeclared, past: Sequence[LookAsUsed]
) -> tuple[Bound, ...]:
    """The bound here, then the bounds at the plan's looks still to come, were they held as planned."""
    rule = efficacy_rule(plan.design, plan.efficacy, plan.endpoint.direction)
    here = LookAhead(
        number=declared.number,
        kind=declared.kind,
        information=_information_used(information),
        fraction=information.fraction,
        events=information.events,
        score_variance=information.score_variance,
    )
    ahead = () if here.final or _was_final(past) else _looks_to_come(plan, here, past)
    untested = [replace(look, crossed="none") for look in past]
    return bounds_ahead(rule, untested, (here, *ahead))


def _was_final(past: Sequence[LookAsUsed]) -> bool:
    return any(look.final for look in past)


def _looks_to_come(plan: Plan, here: LookAhead, past: Sequence[LookAsUsed]) -> tuple[LookAhead, ...]:
    """The plan's looks after as many planned ones as were held, and beyond the information reached."""
    fractions = fractions_to_come(
        plan.design.looks, [*(look.kind for look in past), here.kind], here.fraction
    )
    return planned_looks(
        plan.design, fractions, plan.arms.experimental_share, final=False, first_number=here.number + 1
    )


def fractions_to_come(looks: Sequence[float], kinds: Sequence[LookKind], reached: float) -> tuple[float, ...]:
    held = sum(kind == "planned" for kind in kinds)
    return tuple(fraction for fraction in looks[min(held, len(looks) - 1) :] if fraction > reached)


def planned_fraction(looks: Sequence[float], kinds: Sequence[LookKind]) -> float | None:
    """The plan's fraction that the last of these looks used up: the n-th for the n-th planned look."""
    if kinds[-1] == "final":
        return looks[-1]
    held = sum(kind == "planned" for kind in kinds)
    return looks[held - 1] if kinds[-1] == "planned" and held <= len(looks) else None
