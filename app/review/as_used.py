"""What a look leaves behind for the looks after it."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from app.model.boundary import Bound, LookAsUsed
from app.model.look import LookResult
from app.model.values import Absent, Estimate


def as_used(look: LookResult) -> LookAsUsed:
    """The part of a look that later bounds rest on; once frozen it is never recomputed."""
    return LookAsUsed(
        number=look.number,
        kind=look.kind,
        information=look.information_used,
        events=look.information.events,
        fraction=look.information.fraction,
        z=None if isinstance(look.logrank, Absent) else look.logrank.z,
        efficacy_z=look.bound.efficacy_z,
        alpha_spent=look.bound.alpha_spent,
        alpha_spent_here=look.bound.alpha_spent_here,
        final=look.final,
        crossed=look.verdict.crossed,
        efficacy_hazard_ratio=look.bound.efficacy_hazard_ratio,
        futility_z=look.bound.futility_z,
        type_two_spent=look.bound.type_two_spent or 0.0,
        harm_z=look.bound.harm_z,
        harm_alpha_spent=look.bound.harm_alpha_spent or 0.0,
        harm_information=None if look.harm is None else look.harm.information_used,
        z_for_harm=None if look.harm is None else look.harm.z,
        further=tuple((each.hypothesis.parameter, as_used(each.result)) for each in look.hypotheses),
    )


def as_used_of_record(look: dict[str, Any]) -> LookAsUsed:
    """A held look from the full record that was frozen with it, every number as it stands there."""
    bound, test, harm = look["boundary"], look["logrank"], look.get("harm_endpoint")
    return LookAsUsed(
        number=look["number"],
        kind=look["kind"],
        information=bound["information"],
        events=look["information"]["events"],
        fraction=look["information"]["fraction"],
        z=test.get("z"),
        efficacy_z=_read(bound["efficacy_z"]),
        alpha_spent=bound["alpha_spent"],
        alpha_spent_here=bound["alpha_spent_here"],
        final=look["final"],
        crossed=bound["crossed"],
        efficacy_hazard_ratio=_read(bound["efficacy_hazard_ratio"]),
        futility_z=_read_if_asked(bound["futility_z"]),
        type_two_spent=bound["type_two_spent"] or 0.0,
        harm_z=_read_if_asked(bound["harm_z"]),
        harm_alpha_spent=bound["harm_alpha_spent"] or 0.0,
        harm_information=None if harm is None else harm["information"],
        z_for_harm=None if harm is None else harm["logrank"].get("z"),
        further=tuple((each["parameter"], as_used_of_record(each)) for each in look.get("hypotheses") or ()),
    )


def _read_if_asked(value: float | dict[str, str] | None) -> Estimate | None:
    return None if value is None else _read(value)


def _read(value: float | dict[str, str]) -> Estimate:
    return Absent(value["not_estimable"]) if isinstance(value, dict) else value


def with_bounds_as_used(result: LookResult, look: dict[str, Any]) -> LookResult:
    """A look with the bounds that were used, from the full record frozen with it, hypotheses included."""
    stored = {each["parameter"]: each for each in look.get("hypotheses") or ()}
    further = tuple(
        replace(each, result=with_bounds_as_used(each.result, stored[each.hypothesis.parameter]))
        for each in result.hypotheses
    )
    return replace(result, bound=bound_of_record(look), hypotheses=further)


def bound_of_record(look: dict[str, Any]) -> Bound:
    """The bound as it was used, from the full record that was frozen with its look."""
    bound = look["boundary"]
    return Bound(
        number=bound["number"],
        information_fraction=bound["information_fraction"],
        events=bound["events"],
        final=bound["final"],
        alpha_spent=bound["alpha_spent"],
        alpha_spent_here=bound["alpha_spent_here"],
        efficacy_z=_read(bound["efficacy_z"]),
        efficacy_p_one_sided=_read(bound["efficacy_p_one_sided"]),
        efficacy_hazard_ratio=_read(bound["efficacy_hazard_ratio"]),
        futility_z=_read_if_asked(bound["futility_z"]),
        type_two_spent=bound["type_two_spent"],
        futility_hazard_ratio=_read_if_asked(bound["futility_hazard_ratio"]),
        harm_z=_read_if_asked(bound["harm_z"]),
        harm_alpha_spent=bound["harm_alpha_spent"],
        harm_hazard_ratio=_read_if_asked(bound["harm_hazard_ratio"]),
    )
