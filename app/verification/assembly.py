"""One look put together again from what the trial file holds."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Any

from app.errors import LedgerChanged
from app.intake.plan import read_plan
from app.ledger.history import State
from app.ledger.trial import Trial
from app.model.boundary import HeldCompared, LookAsUsed
from app.model.extract import Extract, Snapshot
from app.model.look import LookResult
from app.model.plan import Plan
from app.record.canonical import parse_strict
from app.record.schema import LOOKS_RECORD, differences
from app.review.as_used import as_used_of_record, with_bounds_as_used
from app.review.held import held_looks
from app.review.received import Delivery, review_delivery
from app.settings import Limits
from app.views.closed import ClosedView, Letters, masked_view, unmasked_view

PLAN_NAME = "the locked plan"
LARGEST_Z = 1e9  # no counts of subjects come near it, and what is drawn to scale needs an end
PLANS_KEPT = 16


@dataclass(frozen=True, eq=False)
class Assembled:
    """A look with all it was made from."""

    plan: Plan
    snapshot: Snapshot
    extract: Extract
    result: LookResult


def plan_under(trial: Trial, digest: str, limits: Limits) -> Plan:
    """The plan stored under this digest, whose bytes are hashed again each time."""
    return _plan_of(trial.content(digest), limits)


@lru_cache(maxsize=PLANS_KEPT)
def _plan_of(content: bytes, limits: Limits) -> Plan:
    """Every page asks for the plan, and the same bytes always say the same."""
    return read_plan(content, name=PLAN_NAME, limits=limits)


def delivery_of(snapshot: Snapshot) -> Delivery:
    return Delivery(snapshot.files, snapshot.kind, snapshot.cutoff, snapshot.extracted)


def frozen_record(trial: Trial, number: int) -> dict[str, Any]:
    """The full record that was frozen with a look."""
    frozen = trial.state().frozen_look(number)
    where = f"look {number}, frozen record"
    record: dict[str, Any] = parse_strict(trial.content(frozen.body.record_digest), where)
    for difference in differences(record, LOOKS_RECORD):
        raise LedgerChanged("A frozen record that is not a record", where=where, found=difference)
    if [look["number"] for look in record["looks"]] != [number]:
        raise LedgerChanged("A frozen record of other looks", where=where, accepted=f"look {number} alone")
    for z in _all_z(record["looks"][0]):
        if abs(z) > LARGEST_Z:
            raise LedgerChanged("A frozen record with a z that no test gives", where=where, found=repr(z))
    return record


def _all_z(look: dict[str, Any]) -> Iterator[float]:
    """z and the bounds for it, of the plan's endpoint and of each further hypothesis."""
    bound = look["boundary"]
    found = (look["logrank"].get("z"), *(bound[name] for name in ("efficacy_z", "futility_z", "harm_z")))
    yield from (value for value in found if isinstance(value, float | int))
    for each in look.get("hypotheses") or ():
        yield from _all_z(each)


def looks_as_used(trial: Trial, before: int) -> tuple[LookAsUsed, ...]:
    """The looks in this file before this one as their frozen records have them: never recomputed."""
    numbers = range(trial.state().first_number, before)
    return tuple(as_used_of_record(frozen_record(trial, number)["looks"][0]) for number in numbers)


def held_before(trial: Trial, limits: Limits) -> tuple[tuple[LookAsUsed, ...], tuple[HeldCompared, ...]]:
    """The looks of before this file as the plan was locked with them: no amendment touches them."""
    state = trial.state()
    plan = plan_under(trial, state.plans[0].plan_digest, limits)
    if len(plan.held) != state.looks_held_before:
        raise LedgerChanged(
            "A lock that says other held looks than its plan",
            where="entry 1",
            found=f"{state.looks_held_before} looks held before",
            accepted=f"{len(plan.held)}, as the plan has them",
        )
    return held_looks(plan)


def compute(trial: Trial, number: int, limits: Limits) -> Assembled:
    """The look computed from its snapshot, its plan and the looks as used before it."""
    look = trial.state().look(number)
    plan = plan_under(trial, look.plan_digest, limits)
    snapshot = trial.snapshot(number)
    is_first = number == trial.state().first_number
    earlier = None if is_first else delivery_of(trial.snapshot(number - 1))
    before, held = held_before(trial, limits)
    past = (*before, *looks_as_used(trial, number))
    try:
        reviewed = review_delivery(
            plan, delivery_of(snapshot), earlier, past, number=number, limits=limits, held=held
        )
    except (ValueError, ArithmeticError) as fault:
        # elsewhere a bug; here it is the frozen records of the looks before that say what cannot be
        raise LedgerChanged(
            "Looks as used that cannot have been",
            where=f"the frozen records before look {number}",
            found=str(fault),
        ) from fault
    return Assembled(plan, snapshot, reviewed.extract, reviewed.result)


def assemble(trial: Trial, number: int, limits: Limits) -> Assembled:
    """The look as it is to be shown: once frozen, with the bound as it was used."""
    assembled = compute(trial, number, limits)
    if trial.state().look(number).frozen is None:
        return assembled
    stored = frozen_record(trial, number)["looks"][0]
    _refuse_other_hypotheses(assembled.plan, stored)
    return replace(assembled, result=with_bounds_as_used(assembled.result, stored))


def _refuse_other_hypotheses(plan: Plan, stored: dict[str, Any]) -> None:
    foreseen = [each.parameter for each in plan.hypotheses]
    found = [each["parameter"] for each in stored.get("hypotheses") or ()]
    if found != foreseen:
        raise LedgerChanged(
            "A frozen record of other hypotheses than its plan's",
            where=f"look {stored['number']}, frozen record",
            found=", ".join(map(repr, found)) or "none",
            accepted=", ".join(map(repr, foreseen)) or "none",
        )


def letters_for(plan: Plan, trial: Trial) -> Letters:
    """The drawn letters; a plan that starts unmasked shows none and gives A's ink to experimental."""
    return Letters(trial.letter_key().letters.control) if plan.arms.masked else Letters(control="B")


def closed_view(
    trial: Trial, state: State, assembled: Assembled, *, unmasked: bool | None = None
) -> ClosedView:
    """The look as the closed side sees it now, or as it was when the arms were (un)masked."""
    letters = letters_for(assembled.plan, trial)
    shown = state.unmasked if unmasked is None else unmasked
    view = unmasked_view if shown else masked_view
    return view(assembled.result, assembled.plan, letters)
