"""One look on the open side: computed from a sample that has no arm."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.extract import PooledSample
from app.model.look import PooledResult
from app.model.plan import Plan
from app.review.counts import arm_counts, calendar_counts, pooled_strata, times_of
from app.review.look import LookDeclared
from app.survival import kaplan_meier


def review_pooled(
    plan: Plan, sample: PooledSample, declared: LookDeclared, past: Sequence[tuple[int, float, int]]
) -> PooledResult:
    """Counts, follow-up, calendar and the pooled curve; `past`: number, fraction, events of earlier looks."""
    time = times_of(sample)
    all_subjects = arm_counts(time, sample.event)
    return PooledResult(
        number=declared.number,
        kind=declared.kind,
        time_unit=sample.time_unit,
        cutoff=declared.cutoff,
        extracted=declared.extracted,
        subjects=all_subjects.subjects,
        events=all_subjects.events,
        fraction=all_subjects.events / plan.design.planned_events,
        planned_events=plan.design.planned_events,
        person_time=all_subjects.person_time,
        follow_up_median=all_subjects.follow_up_median,
        strata=pooled_strata(sample),
        calendar=calendar_counts(sample),
        curve=kaplan_meier(
            time, sample.event, level=plan.analysis.confidence, interval=plan.analysis.curve_interval
        ),
        past=tuple(past),
    )
