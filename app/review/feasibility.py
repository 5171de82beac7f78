"""Whether a plan's hazard ratio, events and power say the same."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.boundary import Feasibility, PlannedBoundary
from app.model.extract import Finding
from app.model.plan import Plan
from app.sequential.design import planned_boundary

POWER_AGREES = 0.02  # whole events and a round total are no disagreement


def boundary_of(
    plan: Plan, fractions: Sequence[float] | None = None, *, final: bool = False
) -> PlannedBoundary:
    """The plan's bounds at its own looks, or at these fractions, and what its looks cost."""
    return planned_boundary(
        plan.design,
        plan.efficacy,
        experimental_share=plan.arms.experimental_share,
        direction=plan.endpoint.direction,
        futility=plan.futility,
        harm=plan.harm,
        parameter=plan.endpoint.parameter,
        fractions=fractions,
        final=final,
    )


def plan_doubts(plan: Plan) -> tuple[Finding, ...]:
    """What a person who locks, amends or reads this plan is to be told of it. It blocks nothing."""
    return power_doubts(plan, boundary_of(plan).feasibility)


def power_doubts(plan: Plan, reached: Feasibility) -> tuple[Finding, ...]:
    """A doubt when the planned events have another power than the plan says, at its ratio and looks."""
    design = plan.design
    if abs(reached.power_reached - design.power) <= POWER_AGREES:
        return ()
    return (
        Finding(
            id="power-reached",
            severity="doubt",
            what="hazard ratio, events and power disagree",
            where="the plan, [design]",
            found=f"{100 * reached.power_reached:.1f}% power with {design.planned_events} events at hazard "
            f"ratio {design.hazard_ratio:g}",
            accepted=f"{reached.events_needed} events for {100 * design.power:g}% power",
            remedy="check planned_events, hazard_ratio and power against the protocol",
        ),
    )
