"""What may follow what, and what the entries add up to. Pure: entries in, state out.

A rule here can be loosened by a later version and never tightened, because every trial file ever written must
still fold.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, replace
from datetime import UTC, date, datetime
from functools import reduce, singledispatch
from typing import TypeVar

from app.errors import LedgerError, LookAlreadyFrozen
from app.ledger.bodies import (
    ArmsUnmasked,
    Backup,
    Body,
    Erratum,
    LookFrozen,
    PlanAmended,
    PlanLocked,
    Recommendation,
    RefusalRecorded,
    ReportWritten,
    ResultsOpened,
    SnapshotReceived,
    Verification,
)
from app.ledger.entries import BEFORE_THE_FIRST, Entry, Head, read_body
from app.ledger.letters import Letters

Moment = TypeVar("Moment", date, datetime)


@dataclass(frozen=True)
class Frozen:
    """The freeze of a look: what it holds, when, and the head that the freeze itself became."""

    body: LookFrozen
    at: str
    head: Head


@dataclass(frozen=True)
class PlanVersion:
    """A plan as locked (version 1) or amended. It governs the looks received while it was the last."""

    version: int
    plan_digest: str
    entry: int
    at: str
    by: str
    amended: PlanAmended | None = None


@dataclass(frozen=True)
class Look:
    """A look as far as it has come: received, then frozen.

    The plan it is held under is the one in force when its snapshot was received; no amendment changes that.
    """

    snapshot: SnapshotReceived
    received_at: str
    plan: PlanVersion
    frozen: Frozen | None = None

    @property
    def plan_digest(self) -> str:
        return self.plan.plan_digest

    @property
    def number(self) -> int:
        return self.snapshot.number


@dataclass(frozen=True)
class ClockWentBack:
    """An entry that carries an earlier time than the one before it: a doubt about both times."""

    entry: int
    at: str
    before: str

    def __str__(self) -> str:
        return (
            f"The clock went back: entry {self.entry} carries {self.at}, the one before it {self.before}. "
            "Check the clock of this machine; if a recorded time is wrong, say so in an erratum."
        )


@dataclass(frozen=True)
class State:
    """All that the history says at its head. `letters` is None while the arms are masked.

    Looks are numbered through the whole trial; those held before this file come first, then come `looks`.
    """

    head: Head = BEFORE_THE_FIRST
    name: str = ""
    trial: str = ""
    locked_at: str = ""
    locked_by: str = ""
    looks_held_before: int = 0
    plans: tuple[PlanVersion, ...] = ()
    letters_commitment: str = ""
    letters: Letters | None = None
    looks: tuple[Look, ...] = ()
    openings: frozenset[tuple[int, str]] = frozenset()  # look, session
    reports_written: frozenset[int] = frozenset()  # looks
    clock_doubts: tuple[ClockWentBack, ...] = ()
    last_at: str = ""

    @property
    def plan(self) -> PlanVersion:
        """The plan in force: for the next snapshot to be received."""
        return self.plans[-1]

    @property
    def plan_digest(self) -> str:
        return self.plan.plan_digest

    @property
    def unmasked(self) -> bool:
        return self.letters is not None

    @property
    def results_opened(self) -> tuple[int, ...]:
        """The looks whose comparative results left the file: opened on a page, or written in a report."""
        return tuple(sorted({look for look, _ in self.openings} | self.reports_written))

    @property
    def open_look(self) -> Look | None:
        """The look that is received and not frozen; at most one, and always the last."""
        return self.looks[-1] if self.looks and self.looks[-1].frozen is None else None

    @property
    def frozen_looks(self) -> tuple[Look, ...]:
        return tuple(look for look in self.looks if look.frozen)

    @property
    def first_number(self) -> int:
        """The number of the first look that has its snapshot in this file."""
        return self.looks_held_before + 1

    @property
    def next_number(self) -> int:
        """The number of the next snapshot to be received."""
        return self.first_number + len(self.looks)

    def look(self, number: int) -> Look:
        if self.first_number <= number < self.next_number:
            return self.looks[number - self.first_number]
        if 1 <= number < self.first_number:
            raise LedgerError(
                f"Look {number} was held before this trial file",
                found="no snapshot of it, and so no sheets, freeze or report",
                accepted=f"look {self.first_number} or a later one",
                remedy="read what is known of it in the plan, under [[held]]",
            )
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
    at = read_time(datetime.fromisoformat, entry.at)
    if isinstance(body, PlanLocked) != (state.head == BEFORE_THE_FIRST):
        raise LedgerError("A history begins with its plan being locked, once", found=f"{entry.kind!r} here")
    reached = advance(body, state, entry)
    if state.last_at and at.replace(tzinfo=UTC) < datetime.fromisoformat(state.last_at).replace(tzinfo=UTC):
        doubt = ClockWentBack(entry.id, entry.at, state.last_at)
        reached = replace(reached, clock_doubts=(*reached.clock_doubts, doubt))
    return replace(reached, head=entry.head, last_at=entry.at)


def read_time(read: Callable[[str], Moment], text: str) -> Moment:
    """A forged history may hold any text; what is shown as a time or date is one."""
    try:
        return read(text)
    except ValueError as fault:
        raise LedgerError("A time or date that is none", found=repr(text)) from fault


@singledispatch
def advance(body: Body, state: State, entry: Entry) -> State:
    """The rule for one kind of entry; each is registered below."""
    raise TypeError(f"no rule for an entry of kind {body.entry_kind!r}")


@advance.register
def _plan_locked(body: PlanLocked, state: State, entry: Entry) -> State:
    if body.looks_held_before < 0:
        raise LedgerError("Fewer than no looks held before", found=str(body.looks_held_before))
    return replace(
        state,
        name=body.name,
        trial=body.trial,
        locked_at=entry.at,
        locked_by=body.by,
        looks_held_before=body.looks_held_before,
        plans=(PlanVersion(1, body.plan_digest, entry.id, entry.at, body.by),),
        letters_commitment=body.letters_commitment,
    )


@advance.register
def _plan_amended(body: PlanAmended, state: State, entry: Entry) -> State:
    number = state.plan.version + 1
    if body.version != number:
        raise LedgerError(
            "A plan version out of its turn", found=f"version {body.version}", accepted=f"version {number}"
        )
    if body.plan_digest == state.plan_digest or not body.changes:
        raise LedgerError("An amendment that changes nothing", remedy="give it the changed plan")
    if (body.results_opened, body.unmasked) != (state.results_opened, state.unmasked):
        raise LedgerError(
            "An amendment that states otherwise what was known when it was made",
            found=known(body.results_opened, body.unmasked),
            accepted=known(state.results_opened, state.unmasked),
            remedy="amend again",
        )
    version = PlanVersion(number, body.plan_digest, entry.id, entry.at, body.by, body)
    return replace(state, plans=(*state.plans, version))


def known(results_opened: tuple[int, ...], unmasked: bool) -> str:
    """ "results of looks 1, 2 opened, arms masked"."""
    noun = "look" if len(results_opened) == 1 else "looks"
    results = f"results of {noun} {', '.join(map(str, results_opened))}" if results_opened else "no results"
    return f"{results} opened, arms {'unmasked' if unmasked else 'masked'}"


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
    read_time(date.fromisoformat, body.cutoff)
    if body.extracted is not None:
        read_time(date.fromisoformat, body.extracted)
    refuse_unanswered(body)
    look = Look(body, received_at=entry.at, plan=state.plan)
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
def _refusal_recorded(body: RefusalRecorded, state: State, entry: Entry) -> State:
    if not any(finding.severity == "block" for finding in body.findings):
        raise LedgerError(
            "A refusal without a finding that blocks",
            accepted="an extract that cannot be used",
            remedy="receive it instead",
        )
    read_time(date.fromisoformat, body.cutoff)
    if body.extracted is not None:
        read_time(date.fromisoformat, body.extracted)
    return state


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
    return replace(state, looks=(*state.looks[:-1], replace(look, frozen=frozen)))


@advance.register
def _report_written(body: ReportWritten, state: State, entry: Entry) -> State:
    frozen = state.frozen_look(body.look)
    if body.report_digest != frozen.body.report_digest:
        raise LedgerError(f"The report written is not the frozen report of look {body.look}")
    return replace(state, reports_written=state.reports_written | {body.look})


@advance.register
def _recommendation(body: Recommendation, state: State, entry: Entry) -> State:
    state.frozen_look(body.look)  # a recommendation rests on what was shown
    read_time(date.fromisoformat, body.held_on)
    return state


@advance.register
def _erratum(body: Erratum, state: State, entry: Entry) -> State:
    if not 1 <= body.entry <= state.head.id:
        raise LedgerError(
            "An erratum to an entry that does not exist",
            found=f"entry {body.entry}",
            accepted=f"an entry from 1 to {state.head.id}",
            remedy="name the entry that is to be corrected by its number",
        )
    return state


@advance.register
def _backup(body: Backup, state: State, entry: Entry) -> State:
    refuse_grown(state, Head(body.entries, body.head), "it was copied", "make the backup again")
    return state


@advance.register
def _verification(body: Verification, state: State, entry: Entry) -> State:
    refuse_grown(state, Head(body.entries, body.head), "it was verified", "verify again")
    return state


def refuse_grown(state: State, last: Head, meanwhile: str, remedy: str) -> None:
    """What is said of a whole history is said of the history as it stands."""
    if state.head != last:
        raise LedgerError(
            f"The history grew while {meanwhile}",
            found=f"entry {state.head.id}",
            accepted=f"entry {last.id} as the last",
            remedy=remedy,
        )
