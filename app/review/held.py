"""Looks that a plan says were held before, with the bounds they used, beside the bounds we compute."""

from __future__ import annotations

from dataclasses import replace

from app.model.boundary import Bound, HeldCompared, LookAsUsed
from app.model.plan import HeldLook, Plan
from app.model.values import Absent
from app.sequential.effect import PlanRules, plan_rules
from app.sequential.rules import LookAhead, hazard_ratio_at
from app.sequential.verdict import crossed, first_crossed

NO_BOUND_RECORDED = Absent("no efficacy bound is recorded for this held look")


def held_looks(plan: Plan) -> tuple[tuple[LookAsUsed, ...], tuple[HeldCompared, ...]]:
    """The plan's held looks as used, and each compared with ours after the looks before it as used.

    A look without a bound stops nothing and, unless it says so, spends nothing. A look with a bound and no
    alpha has spent what the plan's rule spends by it.
    """
    rules = plan_rules(plan)
    past: list[LookAsUsed] = []
    compared: list[HeldCompared] = []
    for held in plan.held:
        ours = _computed(plan, rules, past, held)
        used = _as_used(plan, held, ours, past)
        past.append(used)
        compared.append(
            HeldCompared(
                number=held.number,
                events=held.events,
                source=held.source,
                z=held.z,
                efficacy_z=held.efficacy_z,
                alpha_spent=used.alpha_spent,
                computed_efficacy_z=ours.efficacy_z,
                computed_alpha_spent=ours.alpha_spent,
            )
        )
    return tuple(past), tuple(compared)


def _computed(plan: Plan, rules: PlanRules, past: list[LookAsUsed], held: HeldLook) -> Bound:
    look = LookAhead(
        number=held.number,
        kind="planned",
        information=float(held.events),
        fraction=held.events / plan.design.planned_events,
        events=held.events,
        score_variance=_planned_variance(plan, held),
    )
    untested = [replace(each, crossed="none") for each in past]
    return rules.bounds(untested, (look,))[0]


def _planned_variance(plan: Plan, held: HeldLook) -> float:
    """d p q: the V of a look held elsewhere is not known."""
    share = plan.arms.experimental_share
    return held.events * share * (1.0 - share)


def _as_used(plan: Plan, held: HeldLook, ours: Bound, past: list[LookAsUsed]) -> LookAsUsed:
    before = past[-1].alpha_spent if past else 0.0
    by_rule = before if held.efficacy_z is None else ours.alpha_spent
    bound = NO_BOUND_RECORDED if held.efficacy_z is None else held.efficacy_z
    used = LookAsUsed(
        number=held.number,
        kind="planned",
        information=float(held.events),
        events=held.events,
        fraction=ours.information_fraction,
        z=held.z,
        efficacy_z=bound,
        alpha_spent=by_rule if held.alpha_spent is None else held.alpha_spent,
        final=ours.final,
        efficacy_hazard_ratio=hazard_ratio_at(bound, _planned_variance(plan, held), plan.endpoint.direction),
    )
    over = first_crossed(past) is not None
    return replace(used, crossed="none" if over else crossed(held.z, used, plan.design.sides))
