"""The two arms compared, from the side of each, so that no number of an arm tells which arm it is.

A masked page speaks of arm A whichever arm that is. Were its numbers those of the experimental arm turned
over, their last bits could tell so. Hence both sides go through the same steps, and what they share (the
variance, the size of z and what follows from it) is the mean of the two, the same from either side.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.special import ndtr

from app.model.extract import Sample
from app.model.plan import Plan
from app.model.survival import ArmComparison, CoxResult, LogrankResult, LogrankStratum
from app.model.values import Absent
from app.review.counts import or_reason, times_of
from app.survival import cox_two_arms_of, logrank_of, two_arm_table
from app.survival.risk_table import RiskTable


def compare_arms(plan: Plan, sample: Sample) -> tuple[ArmComparison, ArmComparison]:
    """Experimental against control, and control against experimental."""
    time = times_of(sample)
    stratified = two_arm_table(time, sample.event, sample.experimental, sample.stratum)
    plain = two_arm_table(time, sample.event, sample.experimental)
    sides = zip(
        _logranks(plan, stratified),
        _logranks(plan, plain),
        _ratios(plan, stratified),
        _ratios(plan, plain),
        strict=True,
    )
    experimental, control = (ArmComparison(*side) for side in sides)
    return experimental, control


def _arms_exchanged(table: RiskTable) -> RiskTable:
    at_risk, events, censored = (
        np.ascontiguousarray(counts[::-1]) for counts in (table.at_risk, table.events, table.censored)
    )
    return RiskTable(table.time, table.stratum, at_risk, events, censored)


def _ratios(plan: Plan, table: RiskTable) -> tuple[CoxResult | Absent, CoxResult | Absent]:
    ties, level = plan.analysis.ties, plan.analysis.confidence
    return (
        or_reason(lambda: cox_two_arms_of(table, ties=ties, level=level)),
        or_reason(lambda: cox_two_arms_of(_arms_exchanged(table), ties=ties, level=level)),
    )


def _logranks(plan: Plan, table: RiskTable) -> tuple[LogrankResult | Absent, LogrankResult | Absent]:
    direction = plan.endpoint.direction
    one = or_reason(lambda: logrank_of(table, direction=direction))
    other = or_reason(lambda: logrank_of(_arms_exchanged(table), direction=direction))
    if isinstance(one, Absent) or isinstance(other, Absent):
        return one, other
    return _alike(one, other), _alike(other, one)


def _alike(one: LogrankResult, other: LogrankResult) -> LogrankResult:
    """`one` with what both sides share taken from both; z is exactly the other's with its sign turned."""
    z = (one.z - other.z) / 2
    return replace(
        one,
        variance=(one.variance + other.variance) / 2,
        z=z,
        chi_square=(one.chi_square + other.chi_square) / 2,
        p_one_sided=float(ndtr(-z)),
        p_two_sided=float(2 * ndtr(-abs(z))),
        strata=tuple(map(_alike_stratum, one.strata, other.strata)),
    )


def _alike_stratum(one: LogrankStratum, other: LogrankStratum) -> LogrankStratum:
    return replace(one, variance=(one.variance + other.variance) / 2)
