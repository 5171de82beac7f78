"""What may follow what, and what the entries add up to. Pure: entries in, state out.

A rule here can be loosened by a later version and never tightened, because every trial file ever written must
still fold.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from datetime import date, datetime
from functools import reduce, singledispatch

from app.errors import LedgerError, LookAlreadyFrozen
from app.ledger.entries import (
    BEFORE_THE_FIRST,
    ArmsUnmasked,
    Body,
    Entry,
    Head,
    LookFrozen,
    PlanLocked,
    ReportWritten,
    ResultsOpened,
    SnapshotReceived,
    Verification,
    read_body,
)
from app.ledger.letters import Letters


@dataclass(frozen=True)
class Frozen:
    """The freeze of a look: what it holds, when, and the head that the freeze itself became."""

    body: LookFrozen
    at: str
    head: Head


@dataclass(frozen=True)
class Look:
    """A look as far as it has come: received, then frozen. `plan_digest` names the plan it is held under."""

    snapshot: SnapshotReceived
    received_at: str
    plan_digest: str
    frozen: Frozen | None = None

    @property
    def number(self) -> int:
        return self.snapshot.number


@dataclass(frozen=True)
class State:
    """All that the history says at its head. `letters` is None while the arms are masked."""

    head: Head = BEFORE_THE_FIRST
    name: str = ""
    trial: str = ""
    locked_at: str = ""
    locked_by: str = ""
    plan_digest: str = ""
    letters_commitment: str = ""
    letters: Letters | None = None
    looks: tuple[Look, ...] = ()
    openings: frozenset[tuple[int, str]] = frozenset()  # look, session
    last_at: str = ""

    @property
    def unmasked(self) -> bool:
        return self.letters is not None

    @property
    def open_look(self) -> Look | None:
        """The look that is received and not frozen; at most one, and always the last."""
        return self.looks[-1] if self.looks and self.looks[-1].frozen is None else None

    @property
    def frozen_looks(self) -> tuple[Look, ...]:
        return tuple(look for look in self.looks if look.frozen)

    @property
    def next_number(self) -> int:
        """The number of the next snapshot to be received."""
        return len(self.looks) + 1

    def look(self, number: int) -> Look:
        if 1 <= number <= len(self.looks):
            return self.looks[number - 1]
        raise LedgerError(
            f"There is no look {number} in this trial file",
            found=f"{len(self.looks)} looks",
            remedy="name one of them, or receive its snapshot first",
        )

    def frozen_look(self, number: int) -> Frozen:
        """The freeze of a look; LedgerError while it is still open."""
        if frozen := self.look(number).frozen:
            return frozen
        raise LedgerError(f"Look {number} is not frozen", remedy="freeze it first")

    def opened(self, look: int, session: str) -> bool:
        """Whether comparative results of this look were opened in this session before."""
        return (look, session) in self.openings


def fold(entries: Iterable[Entry], state: State | None = None) -> State:
    """The state after these entries, from the beginning or from a state already reached."""
    return reduce(follow, entries, state or State())


def follow(state: State, entry: Entry) -> State:
    """The state after one more entry; LedgerError says why it cannot follow."""
    body = read_body(entry)
    refuse_no_time(datetime.fromisoformat, entry.at)
    if isinstance(body, PlanLocked) != (state.head == BEFORE_THE_FIRST):
        raise LedgerError("A history begins with its plan being locked, once", found=f"{entry.kind!r} here")
    reached = advance(body, state, entry)
    return replace(reached, head=entry.head, last_at=entry.at)


def refuse_no_time(read: Callable[[str], object], text: str) -> None:
    """A forged history may hold any text; what is shown as a time or date is one."""
    try:
        read(text)
    except ValueError as fault:
        raise LedgerError("A time or date that is none", found=repr(text)) from fault


@singledispatch
def advance(body: Body, state: State, entry: Entry) -> State:
    """The rule for one kind of entry; each is registered below."""
    raise TypeError(f"no rule for an entry of kind {body.entry_kind!r}")


@advance.register
def _plan_locked(body: PlanLocked, state: State, entry: Entry) -> State:
    return replace(
        state,
        name=body.name,
        trial=body.trial,
        locked_at=entry.at,
        locked_by=body.by,
        plan_digest=body.plan_digest,
        letters_commitment=body.letters_commitment,
    )


@advance.register
def _snapshot_received(body: SnapshotReceived, state: State, entry: Entry) -> State:
    if open_look := state.open_look:
        raise LedgerError(
            f"Look {open_look.number} is still open",
            found="a further snapshot",
            accepted="one open look at a time",
            remedy=f"freeze look {open_look.number} first",
        )
    if body.number != state.next_number:
        raise LedgerError(
            "A snapshot out of its turn",
            found=f"snapshot {body.number}",
            accepted=f"snapshot {state.next_number}",
        )
    refuse_no_time(date.fromisoformat, body.cutoff)
    if body.extracted is not None:
        refuse_no_time(date.fromisoformat, body.extracted)
    refuse_unanswered(body)
    look = Look(body, received_at=entry.at, plan_digest=state.plan_digest)
    return replace(state, looks=(*state.looks, look))


def refuse_unanswered(body: SnapshotReceived) -> None:
    """A finding that blocks stores nothing; a doubt is stored together with its answer."""
    answered = {answer.finding for answer in body.acknowledgements}
    for finding in body.findings:
        if finding.severity == "block":
            raise LedgerError("A snapshot with a finding that blocks", found=finding.sentence)
        if finding.severity == "doubt" and finding.id not in answered:
            raise LedgerError(
                f"The doubt {finding.id!r} is not answered",
                found=finding.sentence,
                remedy="acknowledge it with a reason",
            )


@advance.register
def _results_opened(body: ResultsOpened, state: State, entry: Entry) -> State:
    look = state.look(body.look)
    if state.opened(look.number, body.session):
        raise LedgerError(f"Results of look {look.number} are on record as opened in this session already")
    if body.view == "unmasked" and not state.unmasked:
        raise LedgerError(f"Results of look {look.number} cannot be opened unmasked", found="masked arms")
    return replace(state, openings=state.openings | {(look.number, body.session)})


@advance.register
def _arms_unmasked(body: ArmsUnmasked, state: State, entry: Entry) -> State:
    if state.unmasked:
        raise LedgerError("The arms are unmasked already", remedy="nothing needs to be done")
    if body.key.commitment != state.letters_commitment:
        raise LedgerError("These arm letters are not the ones committed to when the plan was locked")
    return replace(state, letters=body.letters)


@advance.register
def _look_frozen(body: LookFrozen, state: State, entry: Entry) -> State:
    look = state.look(body.look)
    if look.frozen:
        raise LookAlreadyFrozen(
            f"Look {look.number} is frozen already",
            found=f"its freeze of {look.frozen.at}",
            remedy="read its report; what comes after belongs to the next look",
        )
    if body.head_before != state.head.digest:
        raise LedgerError(
            f"The report of look {look.number} prints a head that is no longer the last",
            found=body.head_before,
            accepted=state.head.digest,
            remedy="freeze again",
        )
    if body.disclosure == "unmasked" and not state.unmasked:
        raise LedgerError(f"Look {look.number} cannot be frozen unmasked", found="masked arms")
    return _with_freeze(state, look, Frozen(body, entry.at, entry.head))


def _with_freeze(state: State, look: Look, frozen: Frozen) -> State:
    """Only the last look can be open, so it is the one that is replaced."""
    done = replace(look, frozen=frozen, plan_digest=state.plan_digest)
    return replace(state, looks=(*state.looks[:-1], done))


@advance.register
def _report_written(body: ReportWritten, state: State, entry: Entry) -> State:
    frozen = state.frozen_look(body.look)
    if body.report_digest != frozen.body.report_digest:
        raise LedgerError(f"The report written is not the frozen report of look {body.look}")
    return state


@advance.register
def _verification(body: Verification, state: State, entry: Entry) -> State:
    if (body.entries, body.head) != state.head:
        raise LedgerError(
            "The history grew while it was verified",
            found=f"entry {state.head.id}",
            accepted=f"entry {body.entries} as the last",
            remedy="verify again",
        )
    return state
