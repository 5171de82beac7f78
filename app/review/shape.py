"""How the arms differ beyond one ratio, from the side of each: the same steps whichever arm is which."""

from __future__ import annotations

from collections.abc import Callable
from typing import TypeVar

from app.model.extract import Sample
from app.model.plan import Plan
from app.model.survival import (
    LandmarkComparison,
    RatioOverTime,
    RestrictedMeanComparison,
    ScaledResiduals,
    Shape,
    SurvivalCurve,
    WeightedMaximum,
    WeightedResult,
)
from app.model.values import Absent
from app.review.counts import or_reason, times_of
from app.survival import (
    EventTable,
    compare_landmarks,
    compare_restricted_means,
    fleming_harrington,
    hazard_ratio_over_time,
    proportionality,
    scaled_residuals,
    two_arm_events,
    weighted_logrank_of,
    weighted_maximum_of,
)

TRANSFORM = "km"
T = TypeVar("T")
Curves = tuple[SurvivalCurve, SurvivalCurve]


def shape_of(plan: Plan, sample: Sample, curves: Curves, *, mirrored: bool = False) -> Shape:
    """Of the experimental arm against control, or mirrored; `curves` are control's and experimental's.

    Stratified as the test is where a method knows strata; curves, landmarks and means are not.
    """
    time, of = times_of(sample), ~sample.experimental if mirrored else sample.experimental
    against, one = reversed(curves) if mirrored else curves
    arguments = (time, sample.event, of)
    table = two_arm_events(*arguments, sample.stratum)

    def along_time(estimate: Callable[..., T]) -> T | Absent:
        settings = {"stratum": sample.stratum, "ties": plan.analysis.ties, "transform": TRANSFORM}
        return or_reason(lambda: estimate(*arguments, **settings))

    tested, residuals = along_time(proportionality), along_time(scaled_residuals)
    if isinstance(residuals, Absent) and isinstance(tested, Absent):
        residuals = tested  # one fact, said of arms and not of a covariate
    return Shape(
        proportionality=tested,
        residuals=residuals,
        ratio_over_time=_ratio_over_time(plan, residuals),
        restricted_mean=_restricted_mean(plan, against, one),
        weighted=_weighted(plan, table),
        weighted_maximum=_maximum(plan, table),
        landmarks=_landmarks(plan, against, one),
    )


def _ratio_over_time(plan: Plan, residuals: ScaledResiduals | Absent) -> RatioOverTime | Absent:
    if isinstance(residuals, Absent):
        return residuals
    return or_reason(lambda: hazard_ratio_over_time(residuals, level=plan.analysis.confidence))


def _restricted_mean(
    plan: Plan, against: SurvivalCurve, of: SurvivalCurve
) -> RestrictedMeanComparison | Absent | None:
    at, level = plan.analysis.restricted_mean_at, plan.analysis.confidence
    return None if at is None else or_reason(lambda: compare_restricted_means(against, of, at, level=level))


def _landmarks(
    plan: Plan, against: SurvivalCurve, of: SurvivalCurve
) -> tuple[LandmarkComparison, ...] | None:
    level = plan.analysis.confidence
    compared = (compare_landmarks(against, of, at, level=level) for at in plan.analysis.landmarks_at)
    return tuple(compared) or None


def _weighted(plan: Plan, table: EventTable) -> tuple[WeightedResult | Absent, ...] | None:
    def by(rho: float, gamma: float) -> WeightedResult | Absent:
        weight, direction = fleming_harrington(rho, gamma), plan.endpoint.direction
        return or_reason(lambda: weighted_logrank_of(table, weight, direction=direction))

    return tuple(by(rho, gamma) for rho, gamma in plan.analysis.weights) or None


def _maximum(plan: Plan, table: EventTable) -> WeightedMaximum | Absent | None:
    weights = [fleming_harrington(rho, gamma) for rho, gamma in plan.analysis.weights]
    if not weights:
        return None
    return or_reason(lambda: weighted_maximum_of(table, weights, direction=plan.endpoint.direction))
