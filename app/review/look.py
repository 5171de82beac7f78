"""One endpoint at one look on the closed side, experimental against control."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from datetime import date

from app.errors import ValueRejected
from app.model.boundary import Bound, LookAsUsed, Verdict
from app.model.extract import Changes, Finding, LookKind, Sample
from app.model.look import HarmResult, Information, LookResult
from app.model.plan import Plan
from app.model.survival import LogrankResult, SurvivalCurve
from app.model.values import Absent, Estimate
from app.review.comparison import compare_arms
from app.review.counts import arm_counts, calendar_counts, strata_counts, times_of
from app.review.onwards import onwards_of
from app.review.shape import shape_of
from app.sequential.boundary import LookAhead
from app.sequential.effect import PlanRules, plan_rules, planned_looks
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


def review_endpoint(
    plan: Plan,
    sample: Sample,
    declared: LookDeclared,
    past: Sequence[LookAsUsed],
    harm: HarmResult | None = None,
) -> LookResult:
    """Everything of the plan's endpoint at one look; `harm` where it is judged on an endpoint of its own."""
    compared, mirrored = compare_arms(plan, sample)
    test = compared.logrank
    information = _information(plan, sample, test)
    rules, used = plan_rules(plan), _information_used(plan, information)
    now, *planned = _bounds(plan, rules, information, declared, past, harm)
    z = test if isinstance(test, Absent) else test.z
    mirrored_z = z if isinstance(z, Absent) else -z + 0.0
    curves = _curve(plan, sample, False), _curve(plan, sample, True)
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
        information_used=used,
        calendar=calendar_counts(sample),
        logrank=test,
        logrank_unstratified=compared.logrank_unstratified,
        cox=compared.cox,
        cox_unstratified=compared.cox_unstratified,
        mirrored=mirrored,
        shape=shape_of(plan, sample, curves),
        mirrored_shape=shape_of(plan, sample, curves, mirrored=True),
        control_curve=curves[0],
        experimental_curve=curves[1],
        bound=now,
        verdict=_verdict(plan, rules, past, z, now, harm),
        past=tuple(past),
        planned=tuple(planned),
        onwards=onwards_of(plan, rules, z, used, information, past, (now, *planned)),
        mirrored_onwards=onwards_of(plan, rules, mirrored_z, used, information, past, (now, *planned)),
        snapshot_digests=declared.snapshot_digests,
        plan_digest=plan.digest,
        harm=harm,
    )


def _verdict(
    plan: Plan,
    rules: PlanRules,
    past: Sequence[LookAsUsed],
    z: Estimate,
    now: Bound,
    harm: HarmResult | None,
) -> Verdict:
    known = None if isinstance(z, Absent) else z
    of_harm = None if harm is None else harm.z
    return verdict(past, known, now, plan.design.sides, binding=rules.binding, z_for_harm=of_harm)


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
        fraction=_fraction(plan, events, variance),
        planned_events=design.planned_events,
        score_variance=variance,
        variance_ratio=variance
        if isinstance(variance, Absent)
        else variance / (events * share * (1 - share)),
        control=arms[0],
        experimental=arms[1],
        strata=strata_counts(sample),
    )


def _fraction(plan: Plan, events: int, variance: Estimate) -> float:
    """Information so far over the planned: events, or V where the plan says so (0 where there is no V)."""
    planned_variance = plan.design.planned_score_variance
    if planned_variance is None:
        return events / plan.design.planned_events
    return 0.0 if isinstance(variance, Absent) else variance / planned_variance


def _information_used(plan: Plan, information: Information) -> float:
    """What correlations use of this look."""
    if plan.design.information == "events":
        return float(information.events)
    variance = information.score_variance
    return 0.0 if isinstance(variance, Absent) else variance


def _bounds(
    plan: Plan,
    rules: PlanRules,
    information: Information,
    declared: LookDeclared,
    past: Sequence[LookAsUsed],
    harm: HarmResult | None,
) -> tuple[Bound, ...]:
    """The bound here, then the bounds at the plan's looks still to come, were they held as planned."""
    here = LookAhead(
        number=declared.number,
        kind=declared.kind,
        information=_information_used(plan, information),
        fraction=information.fraction,
        events=information.events,
        score_variance=information.score_variance,
        clock=calendar_fraction(plan, declared.cutoff, declared.number),
        harm_information=None if harm is None else harm.information_used,
        harm_score_variance=None if harm is None else _harm_variance(harm),
    )
    ahead = () if here.final or _was_final(past) else _looks_to_come(plan, here, past)
    untested = [replace(look, crossed="none") for look in past]
    return rules.bounds(untested, (here, *ahead))


def _harm_variance(harm: HarmResult) -> Estimate:
    test = harm.compared.logrank
    return test if isinstance(test, Absent) else test.variance


def calendar_fraction(plan: Plan, cutoff: date | None, number: int) -> float | None:
    """How much of the planned time has gone by the data cutoff; None where alpha is spent by information."""
    start, end = plan.trial.start_date, plan.trial.planned_end_date
    if plan.design.spending_clock == "information" or start is None or end is None:
        return None
    if cutoff is None:
        raise ValueRejected(
            "no data cutoff although alpha is spent by the calendar",
            where=f"look {number}",
            found="no date",
            accepted="the day up to which events are counted",
            remedy="give the cutoff of the look",
        )
    return max(0.0, (cutoff - start).days / (end - start).days)


def _was_final(past: Sequence[LookAsUsed]) -> bool:
    return any(look.final for look in past)


def _looks_to_come(plan: Plan, here: LookAhead, past: Sequence[LookAsUsed]) -> tuple[LookAhead, ...]:
    """The plan's looks after as many planned ones as were held, and beyond the information reached."""
    fractions = fractions_to_come(
        plan.design.looks, [*(look.kind for look in past), here.kind], here.fraction
    )
    looks = planned_looks(
        plan.design, fractions, plan.arms.experimental_share, final=False, first_number=here.number + 1
    )
    if here.harm_information is not None:
        looks = tuple(_harm_in_proportion(look, here) for look in looks)
    if here.clock is None:
        return looks
    pace = (1.0 - here.clock) / (1.0 - here.fraction)  # along the straight line to the planned end
    return tuple(
        replace(look, clock=1.0 - pace * (1.0 - look.fraction) if look.fraction < 1.0 else 1.0)
        for look in looks
    )


def _harm_in_proportion(look: LookAhead, here: LookAhead) -> LookAhead:
    """The information of harm's own endpoint, were it to grow as that of the test does."""
    growth = look.information / here.information if here.information else 1.0
    information, variance = here.harm_information, here.harm_score_variance
    return replace(
        look,
        harm_information=None if information is None else information * growth,
        harm_score_variance=variance * growth if isinstance(variance, float) else variance,
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
