"""Going on or ending here: what each reading of a look says of both."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.boundary import Bound, LookAsUsed
from app.model.look import Information, Onwards
from app.model.outlook import ConditionalPower, Outlook, Stopping
from app.model.plan import Plan
from app.model.values import Absent, Estimate
from app.sequential.effect import PlanRules, plan_rules
from app.sequential.outlook import Held, Prior, conditional_power, outlook, repeated_interval
from app.sequential.stopping import stopping

NO_INFORMATION = Absent("there is no information yet")
LOWERED = Absent("the efficacy bounds count on binding futility: no interval from them holds at every look")


def onwards_of(
    plan: Plan,
    rules: PlanRules,
    z: Estimate,
    information_used: float,
    information: Information,
    past: Sequence[LookAsUsed],
    bounds: Sequence[Bound],
) -> Onwards:
    """From the z of one reading; `bounds` are that of this look and those of the looks to come.

    None of it depends on what earlier looks crossed: the view leaves out what a crossing has made moot.
    """
    if isinstance(z, Absent):
        return Onwards(z, z, z)
    if information.fraction <= 0.0:
        return Onwards(NO_INFORMATION, NO_INFORMATION, NO_INFORMATION)
    variance = information.score_variance
    return Onwards(
        _outlook(plan, rules, Held(information.fraction, z, variance), bounds[1:]),
        LOWERED if rules.binding else repeated_interval(z, bounds[0], rules.efficacy, variance),
        _stopping(rules, z, information_used, variance, past),
    )


def power_under(
    hazard_ratio: float, plan: Plan, z: Estimate, information: Information, ahead: Sequence[Bound]
) -> ConditionalPower | Absent:
    """From the z of one reading, were this ratio of its experimental arm to its control the truth."""
    if isinstance(z, Absent):
        return z
    if information.fraction <= 0.0:
        return NO_INFORMATION
    rules, held = plan_rules(plan), Held(information.fraction, z, information.score_variance)
    return conditional_power(held, ahead, rules.efficacy, rules.scale, hazard_ratio)


def _outlook(plan: Plan, rules: PlanRules, held: Held, ahead: Sequence[Bound]) -> Outlook | Absent:
    analysis, prior = plan.analysis, None
    if analysis.prior_hazard_ratio is not None and analysis.prior_std_error is not None:
        prior = Prior(analysis.prior_hazard_ratio, analysis.prior_std_error)
    return outlook(
        held,
        ahead,
        rules.efficacy,
        rules.scale,
        planned_hazard_ratio=plan.design.hazard_ratio,
        level=analysis.confidence,
        prior=prior,
    )


def _stopping(
    rules: PlanRules, z: float, information: float, variance: Estimate, past: Sequence[LookAsUsed]
) -> Stopping | Absent:
    """Nothing where this look brings no more information than one that had a bound."""
    if any(look.information >= information and not isinstance(look.efficacy_z, Absent) for look in past):
        return Absent("no new information since the looks before")
    return stopping(past, z, information, rules.efficacy, variance, binding=rules.binding)
