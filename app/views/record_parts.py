"""What the record of a plan and the record of its looks are both made of."""

from __future__ import annotations

from dataclasses import asdict

from app import __version__
from app.model.boundary import Bound
from app.model.extract import Finding
from app.model.plan import Hypothesis
from app.record.numbers import Record, estimate
from app.record.schema import FORMAT


def envelope(
    kind: str,
    plan_digest: str,
    digests: list[str],
    orientation: dict[str, str] | None,
    run_at: str,
    findings: list[Record],
) -> Record:
    """What every record begins with."""
    return {
        "format": FORMAT,
        "kind": kind,
        "program": {"name": "Lookledger", "version": __version__},
        "plan_digest": plan_digest,
        "snapshot_digests": digests,
        "orientation": orientation,
        "run_at": run_at,
        "findings": findings,
    }


def finding_record(finding: Finding) -> Record:
    """The finding, its sentence in parts."""
    return {**asdict(finding), "rows": list(finding.rows)}


def hypothesis_record(hypothesis: Hypothesis) -> Record:
    """What the plan says of a further hypothesis."""
    return {
        "name": hypothesis.name,
        "parameter": hypothesis.parameter,
        "label": hypothesis.label,
        "event_is": hypothesis.event_is,
        "after": hypothesis.after,
        "alpha": hypothesis.alpha,
    }


def bound_record(bound: Bound, sides: int) -> Record:
    """The bound at one look, alphas of one side."""
    return {
        "number": bound.number,
        "information_fraction": bound.information_fraction,
        "events": bound.events,
        "final": bound.final,
        "sides": sides,
        "alpha_spent": bound.alpha_spent,
        "alpha_spent_here": bound.alpha_spent_here,
        "efficacy_z": estimate(bound.efficacy_z),
        "efficacy_p_one_sided": estimate(bound.efficacy_p_one_sided),
        "efficacy_hazard_ratio": estimate(bound.efficacy_hazard_ratio),
        "efficacy_b_value": estimate(bound.efficacy_b_value),
        "futility_z": estimate(bound.futility_z),
        "type_two_spent": bound.type_two_spent,
        "futility_hazard_ratio": estimate(bound.futility_hazard_ratio),
        "harm_z": estimate(bound.harm_z),
        "harm_alpha_spent": bound.harm_alpha_spent,
        "harm_hazard_ratio": estimate(bound.harm_hazard_ratio),
    }
