"""Whether a plan's hazard ratio, events and power say the same."""

from __future__ import annotations

from app.model.boundary import Feasibility
from app.model.extract import Finding
from app.model.plan import Plan

POWER_AGREES = 0.02  # whole events and a round total are no disagreement


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
