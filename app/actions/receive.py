"""Receive an extract: show what was understood, then store it with its dates, kind and answered doubts."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import date
from typing import Literal

from app.actions.desk import Desk, UploadedFile
from app.actions.freeze import freeze_within
from app.actions.looks import by_events
from app.actions.names import recorded_name, recorded_reason
from app.errors import LedgerError, ValueRejected
from app.intake.extract import received_file
from app.ledger.bodies import SnapshotReceived
from app.ledger.history import State
from app.ledger.trial import Act
from app.model.extract import Acknowledgement, Changes, Extract, LookKind, Snapshot
from app.model.plan import Plan
from app.review.received import Delivery, changes_between, understand_delivery, usable_sample
from app.verification.assembly import delivery_of, plan_under


@dataclass(frozen=True)
class Incoming:
    """An extract as given, with what was declared about it."""

    files: tuple[UploadedFile, ...]
    cutoff: date
    extracted: date | None
    kind: LookKind

    @property
    def delivery(self) -> Delivery:
        files = tuple(received_file(file.name, file.content) for file in self.files)
        return Delivery(files, self.kind, self.cutoff, self.extracted)


@dataclass(frozen=True, eq=False)
class Understanding:
    """What was understood; nothing is stored. Only pooled numbers: nothing comparative is computed here.

    `fraction` is by events, which is said (`by`) where the plan counts information in another way.
    """

    incoming: Incoming
    extract: Extract
    look: int
    freezes: int | None
    subjects: int | None
    events: int | None
    fraction: float | None
    changes: Changes | None
    by: Literal["", "events"] = ""


def understand(desk: Desk, incoming: Incoming) -> Understanding:
    """Read the extract under the plan in force and compare it with the last snapshot."""
    state = desk.trial.state()
    refuse_impossible_dates(desk, incoming, state)
    plan = plan_under(desk.trial, state.plan_digest, desk.settings.limits)
    extract = understand_delivery(plan, incoming.delivery, desk.settings.limits)
    sample = extract.sample
    events = None if sample is None else int(sample.event.sum())
    return Understanding(
        incoming=incoming,
        extract=extract,
        look=state.next_number,
        freezes=None if state.open_look is None else state.open_look.number,
        subjects=None if sample is None else int(sample.time.size),
        events=events,
        fraction=None if events is None else events / plan.design.planned_events,
        changes=_changes(desk, plan, state, extract),
        by=by_events(plan),
    )


def _changes(desk: Desk, plan: Plan, state: State, extract: Extract) -> Changes | None:
    if extract.sample is None or not state.looks:
        return None
    earlier = delivery_of(desk.trial.snapshot(state.looks[-1].number))
    return changes_between(plan, earlier, extract.sample, desk.settings.limits)


def receive(
    desk: Desk,
    incoming: Incoming,
    *,
    acknowledgements: Mapping[str, str],
    by: str,
    freeze_open: bool = False,
) -> int:
    """Store the extract and open its look; returns the look's number.

    A look that is still open must be frozen first, since the bound here rests on the one used there;
    `freeze_open` does both in one act. Raises InputError when a finding blocks or a doubt has no reason.
    """
    understood = understand(desk, incoming)
    usable_sample(understood.extract)
    answered = _answered(understood.extract, acknowledgements)
    if understood.freezes is not None and not freeze_open:
        raise LedgerError(
            f"Look {understood.freezes} is still open",
            accepted="one open look at a time, because each bound rests on the one before it",
            remedy=f"freeze look {understood.freezes} first",
        )
    name = recorded_name(by)
    with desk.trial.act() as act:
        _refuse_overtaken(act, understood)
        if act.state.open_look is not None and freeze_open:
            freeze_within(desk, act, by=name)
        return _store(act, understood, answered, name)


def _refuse_overtaken(act: Act, understood: Understanding) -> None:
    """What was understood is stored; another snapshot that came in since would be the one compared with."""
    if act.state.next_number != understood.look:
        raise LedgerError(
            "Another snapshot came in meanwhile",
            found=f"look {act.state.next_number - 1} on file",
            accepted=f"this extract as look {understood.look}",
            remedy="receive the extract again",
        )


def _store(act: Act, understood: Understanding, answered: tuple[Acknowledgement, ...], by: str) -> int:
    delivery = understood.incoming.delivery
    snapshot = Snapshot(
        number=act.state.next_number,
        files=delivery.files,
        kind=delivery.kind,
        cutoff=understood.incoming.cutoff,
        extracted=delivery.extracted,
        received_at=act.at,
        by=by,
        acknowledgements=answered,
    )
    for file in snapshot.files:
        act.store(file.content)
    act.append(SnapshotReceived.of(snapshot, understood.extract.findings))
    return snapshot.number


def _answered(extract: Extract, acknowledgements: Mapping[str, str]) -> tuple[Acknowledgement, ...]:
    """A reason for every doubt; reasons for what is no doubt of this extract are refused."""
    doubts = list(dict.fromkeys(finding.id for finding in extract.doubts))
    stray = [given for given in acknowledgements if given not in doubts]
    if stray:
        raise ValueRejected(
            "A reason is given for something that is no doubt of this extract",
            found=", ".join(map(repr, stray)),
            accepted=", ".join(doubts) or "no reasons: there is no doubt",
            remedy="give reasons for the doubts listed",
        )
    missing = [finding for finding in extract.doubts if not acknowledgements.get(finding.id, "").strip()]
    if missing:
        raise DoubtsUnanswered(
            missing[0].id, tuple(dict.fromkeys(finding.id for finding in missing)), str(missing[0])
        )
    return tuple(Acknowledgement(doubt, recorded_reason(acknowledgements[doubt])) for doubt in doubts)


class DoubtsUnanswered(ValueRejected):
    """Doubts that nobody has answered with a reason; `ids` are their findings."""

    def __init__(self, first: str, ids: tuple[str, ...], sentence: str) -> None:
        self.ids = ids
        super().__init__(
            "A doubt has no reason beside it",
            found=f"{', '.join(ids)}; the first says: {sentence}",
            accepted="a reason for each doubt",
            remedy=f'acknowledge it, as in --acknowledge "{first}=the reason"',
        )


def refuse_impossible_dates(desk: Desk, incoming: Incoming, state: State) -> None:
    """Dates that cannot be: an extract before its cutoff or in the future, a cutoff before the last one."""
    today = desk.settings.clock().date()
    last = date.fromisoformat(state.looks[-1].snapshot.cutoff) if state.looks else None
    if incoming.cutoff > today:
        raise _date_refused("A data cutoff in the future", incoming.cutoff, f"a date up to {today}")
    if incoming.extracted is not None and not incoming.cutoff <= incoming.extracted <= today:
        accepted = f"a date from the cutoff {incoming.cutoff} to today, {today}"
        raise _date_refused("An extract date that cannot be", incoming.extracted, accepted)
    if last is not None and incoming.cutoff < last:
        raise _date_refused("A data cutoff before the last one", incoming.cutoff, f"a date from {last} on")


def _date_refused(what: str, found: date, accepted: str) -> ValueRejected:
    return ValueRejected(what, found=str(found), accepted=accepted, remedy="correct the date")
