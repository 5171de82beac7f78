"""The record of a plan before its first look: its bounds, and what its design needs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import asdict

from app.model.boundary import Bound, PlannedBoundary
from app.model.extract import Finding
from app.model.plan import Hypothesis, Plan
from app.record.numbers import Record, estimate
from app.sequential.gatekeeping import family_alpha
from app.views.record_parts import bound_record, envelope, finding_record, hypothesis_record


def boundary_record(
    planned: PlannedBoundary,
    plan: Plan,
    *,
    run_at: str,
    hypotheses: Sequence[tuple[Hypothesis, Sequence[Bound]]] = (),
    findings: Sequence[Finding] = (),
) -> Record:
    """The bounds of a plan and what its design needs; each further hypothesis with its own bounds."""
    doubts = [finding_record(finding) for finding in findings]
    chances = (planned.chances_null, planned.chances_half, planned.chances_design)
    return {
        **envelope("boundary", plan.digest, [], None, run_at, doubts),
        "hypotheses": [_planned_hypothesis(*each, planned.sides) for each in hypotheses] or None,
        "alpha_of_all": family_alpha(plan.design.alpha, plan.hypotheses),
        "sides": planned.sides,
        "looks": [bound_record(bound, planned.sides) for bound in planned.bounds],
        "noncentrality": estimate(planned.noncentrality),
        "power": planned.power,
        "inflation": estimate(planned.inflation),
        "expected_information_fraction": {
            "null": estimate(planned.expected_fraction_null),
            "half": estimate(planned.expected_fraction_half),
            "design": estimate(planned.expected_fraction_design),
        },
        "crossing_probability": {
            effect: [asdict(chance) for chance in looks]
            for effect, looks in zip(("null", "half", "design"), chances, strict=True)
        },
        "power_reached": planned.feasibility.power_reached,
        "events_needed": planned.feasibility.events_needed,
        "fixed_design_events": {
            "schoenfeld": planned.feasibility.schoenfeld_events,
            "freedman": planned.feasibility.freedman_events,
        },
    }


def _planned_hypothesis(hypothesis: Hypothesis, bounds: Sequence[Bound], sides: int) -> Record:
    looks = [bound_record(bound, sides) for bound in bounds]
    return {**hypothesis_record(hypothesis), "planned_events": hypothesis.planned_events, "looks": looks}
