"""Open a look: its sheets for the closed side, its sheets for the open side, its record."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from datetime import date
from typing import Any, Literal

from app.actions.desk import Desk
from app.ledger.bodies import ResultsOpened
from app.ledger.entries import Entry, read_body
from app.ledger.history import Look, State
from app.model.extract import LookKind
from app.model.look import PooledResult
from app.model.plan import Plan
from app.review.feasibility import plan_doubts
from app.review.look import planned_fraction
from app.review.received import pool_delivery
from app.sheets.blocks import LookBook
from app.sheets.book import closed_book as set_closed_book
from app.sheets.book import open_book as set_open_book
from app.sheets.frame import LookOnFile, Surroundings
from app.sheets.record import Freezing, History
from app.verification.assembly import (
    Assembled,
    assemble,
    closed_view,
    delivery_of,
    frozen_record,
    plan_under,
)
from app.views.closed import ClosedView
from app.views.open import OpenView
from app.views.record import looks_record


def looks(desk: Desk) -> tuple[int, ...]:
    """Numbers of the looks received, in order."""
    return tuple(look.number for look in desk.trial.state().looks)


def assembled_look(desk: Desk, number: int) -> Assembled:
    """The look computed, once: what it is made from never changes."""
    state = desk.trial.state()
    look = state.look(number)
    key = (number, look.plan_digest, look.frozen is not None)
    return desk.closed_looks.get(key, lambda: assemble(desk.trial, number, desk.settings.limits))


def view_of(desk: Desk, number: int) -> ClosedView:
    return closed_view(desk.trial, desk.trial.state(), assembled_look(desk, number))


def closed_book(desk: Desk, look: int, *, session: str | None, by: str = "") -> LookBook:
    """All sheets of a look as the closed side sees it now; the first opening in a session is recorded."""
    book = closed_book_of(desk, look, history_now(desk), desk.settings.clock().date())
    if session is not None:
        _record_opening(desk, look, session, by)
    return book


def closed_book_of(desk: Desk, number: int, history: History, run_on: date) -> LookBook:
    """The sheets of a look as they stand at one point of the history."""
    assembled = assembled_look(desk, number)
    view = closed_view(desk.trial, history.state, assembled)
    pooled = surroundings(desk, history.state, number, run_on, freezing=history.freezing)
    around = closed_surroundings(desk, pooled, assembled.plan)
    doubts = plan_doubts(assembled.plan)
    return set_closed_book(view, around, assembled.snapshot, assembled.extract, history, doubts)


def _record_opening(desk: Desk, look: int, session: str, by: str) -> None:
    """Once per look and session; a file that may only be read is read without it."""
    state = desk.trial.state()
    if not desk.may_write or state.opened(look, session):
        return
    with desk.trial.act() as act:
        if not act.state.opened(look, session):
            act.append(ResultsOpened(look, session, "unmasked" if act.state.unmasked else "masked", by))


def history_now(desk: Desk) -> History:
    return history_of(desk.trial.state(), desk.trial.entries())


def history_of(state: State, entries: Sequence[Entry], freezing: Freezing | None = None) -> History:
    return History(state, tuple((entry, read_body(entry)) for entry in entries), freezing)


def record_of(desk: Desk, look: int) -> dict[str, Any]:
    """The record as the view now shows it: masked while the arms are masked."""
    run_at = desk.settings.clock().isoformat().replace("+00:00", "Z")
    return looks_record("look", [view_of(desk, look)], run_at=run_at)


# --- the frame ------------------------------------------------------------------------------------------


def surroundings(
    desk: Desk, state: State, number: int, run_on: date, *, freezing: Freezing | None = None
) -> Surroundings:
    """The looks on file around this one. Pooled numbers only, read without the arm column."""
    held = state.look(number).plan
    plan = plan_under(desk.trial, held.plan_digest, desk.settings.limits)
    on_file = (_on_file(desk, plan, state, look, freezing) for look in state.looks)
    return Surroundings(
        looks=(*_held_before(plan), *on_file),
        planned=plan.design.looks,
        planned_events=plan.design.planned_events,
        plan_version=held.version,
        run_on=run_on,
        by=by_events(plan),
    )


def by_events(plan: Plan) -> Literal["", "events"]:
    """Pooled counts are counts of events; that is said where the plan counts information in another way."""
    return "" if plan.design.information == "events" else "events"


def closed_surroundings(desk: Desk, around: Surroundings, plan: Plan) -> Surroundings:
    """The same looks by the information that the plan counts: V / planned V, which needs the arms."""
    planned = plan.design.planned_score_variance
    if planned is None:
        return around
    looks = (replace(look, fraction=_information_used(desk, look.number) / planned) for look in around.looks)
    return replace(around, looks=tuple(looks), by="score variance")


def _information_used(desk: Desk, number: int) -> float:
    """As it was recorded, or as it stands while the look is open."""
    if desk.trial.state().look(number).frozen is None:
        return assembled_look(desk, number).result.information_used
    used: float = frozen_record(desk.trial, number)["looks"][0]["boundary"]["information"]
    return used


def _held_before(plan: Plan) -> tuple[LookOnFile, ...]:
    """The plan's held looks: their events, which are pooled, and nothing of what was compared there."""
    return tuple(
        LookOnFile(
            number=held.number,
            kind="planned",
            fraction=held.events / plan.design.planned_events,
            events=held.events,
            state="held before",
            planned=planned_fraction(plan.design.looks, ["planned"] * held.number),
        )
        for held in plan.held
    )


def _on_file(desk: Desk, plan: Plan, state: State, look: Look, freezing: Freezing | None) -> LookOnFile:
    events = pooled_counts(desk, look.number)[2]
    received = [earlier.snapshot.kind for earlier in state.looks if earlier.number <= look.number]
    before: list[LookKind] = ["planned" for _ in plan.held]
    frozen = look.frozen is not None or (freezing is not None and look is state.open_look)
    return LookOnFile(
        number=look.number,
        kind=look.snapshot.kind,
        fraction=events / plan.design.planned_events,  # on the scale of the look shown, whatever its version
        events=events,
        plan_version=look.plan.version,
        state="frozen" if frozen else "open",
        planned=planned_fraction(plan.design.looks, [*before, *received]),
    )


# --- the open side --------------------------------------------------------------------------------------


def pooled_look(desk: Desk, number: int) -> PooledResult:
    """The look without arms, from files read without the arm column; cached apart from the closed side."""
    look = desk.trial.state().look(number)
    return desk.open_looks.get((number, look.plan_digest), lambda: _pool(desk, number, look.plan_digest))


def pooled_counts(desk: Desk, number: int) -> tuple[int, float, int]:
    """Number, information fraction and events of a look: all that the looks after it say of it.

    Kept for every look, since each look needs them of all before it.
    """
    look = desk.trial.state().look(number)
    return desk.open_counts.get((number, look.plan_digest), lambda: _counts(pooled_look(desk, number)))


def _counts(pooled: PooledResult) -> tuple[int, float, int]:
    return pooled.number, pooled.fraction, pooled.events


def _pool(desk: Desk, number: int, plan_digest: str) -> PooledResult:
    limits = desk.settings.limits
    plan = plan_under(desk.trial, plan_digest, limits)
    held = [(look.number, look.events / plan.design.planned_events, look.events) for look in plan.held]
    received = [pooled_counts(desk, before) for before in range(desk.trial.state().first_number, number)]
    past = [*held, *received]
    return pool_delivery(plan, delivery_of(desk.trial.snapshot(number)), past, number=number, limits=limits)


def open_view(desk: Desk, number: int) -> OpenView:
    look = desk.trial.state().look(number)
    plan = plan_under(desk.trial, look.plan_digest, desk.settings.limits)
    return OpenView(
        trial_name=plan.trial.name,
        trial_title=plan.trial.title,
        planned=plan.design.looks,
        planned_subjects=plan.enrolment.planned_subjects,
        look=pooled_look(desk, number),
        by=by_events(plan),
    )


def open_book(desk: Desk, look: int) -> LookBook:
    around = surroundings(desk, desk.trial.state(), look, desk.settings.clock().date())
    return set_open_book(open_view(desk, look), around)
