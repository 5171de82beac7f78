"""The trial file, opened: read what it says, add to it one whole act at a time."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Iterator, Sequence
from contextlib import contextmanager
from datetime import UTC, date
from pathlib import Path

from app.errors import LedgerChanged, LedgerError
from app.ledger import schema
from app.ledger.backup import copied_whole
from app.ledger.bodies import ArmsUnmasked, Backup, Body, Named, PlanLocked, SnapshotReceived
from app.ledger.chain import Problem, chain_problems
from app.ledger.check import full_check, quick_check
from app.ledger.closing import Closing
from app.ledger.creation import created_whole
from app.ledger.database import WAIT_SECONDS, Database
from app.ledger.entries import Entry
from app.ledger.faults import MISSING, NOT_STORED, UNWRITABLE
from app.ledger.history import ClockWentBack, State, fold, follow
from app.ledger.letters import LetterKey, draw_letters
from app.ledger.reading import read_as
from app.ledger.rows import Table, insert_entry, is_kept, keep_bytes, kept_bytes, read_entries
from app.model.extract import Acknowledgement, ReceivedFile, Snapshot
from app.record.canonical import parse_strict
from app.settings import Settings

STARTS_UNMASKED = "The plan says that this committee sees the arms by name"


class Act:
    """What one person does at one time: stored bytes and entries that enter the file together."""

    def __init__(self, database: Database, state: State, at: str) -> None:
        self.state = state
        self.at = at
        self._database = database
        self._not_named: set[str] = set()

    def store(self, content: bytes) -> str:
        """Keep these bytes and return their digest, for an entry of this act to name."""
        return self._keep("content", content)

    def seal(self, secret: bytes) -> str:
        """Keep these bytes out of every export and return their digest, for an entry to commit to."""
        return self._keep("secret", secret)

    def append(self, body: Body) -> Entry:
        """Add an entry; LedgerError when it cannot follow what the history says so far."""
        entry = Entry.following(self.state.head, self.at, body)
        reached = follow(self.state, entry)
        self._claim("content", body.contents())
        self._claim("secret", body.secrets())
        insert_entry(self._database, entry)
        self.state = reached
        return entry

    def refuse_loose_ends(self) -> None:
        """Bytes that no entry names would not be protected by the chain."""
        if self._not_named:
            raise ValueError(f"stored, but named by no entry of the act: {sorted(self._not_named)}")

    def _keep(self, table: Table, content: bytes) -> str:
        key, is_new = keep_bytes(self._database, table, content)
        if is_new:
            self._not_named.add(key)
        return key

    def _claim(self, table: Table, contents: Iterable[Named]) -> None:
        for place, key in contents:
            if not is_kept(self._database, table, key):
                raise ValueError(f"{place} is named by an entry and was not stored: {key}")
            self._not_named.discard(key)


class Trial(Closing):
    """One open trial file. Threads take turns; several programs may have it open at once.

    `damage` is what was found wrong with it, and is empty for a sound file; a damaged one is only read.
    """

    def __init__(self, database: Database, settings: Settings, *, read_only: bool) -> None:
        self.path = database.path
        self.read_only = read_only
        self.damage: tuple[Problem, ...] = ()
        self._database = database
        self._settings = settings
        self._state = State()
        self._acting: Act | None = None
        self._clock_doubts: tuple[ClockWentBack, ...] = ()

    @classmethod
    def create(
        cls,
        path: Path,
        settings: Settings,
        *,
        name: str,
        plan: bytes,
        by: str,
        masked: bool = True,
        looks_held_before: int = 0,
    ) -> Trial:
        """Lock a plan into a new trial file, which appears under its name whole or not at all.

        The arm letters are drawn here; a plan that starts unmasked reveals them in the same act.
        `looks_held_before` are the plan's looks of before this file, which have no snapshot in it.
        """
        with created_whole(path) as unfinished:
            database = Database(path, read_only=False, wait_seconds=WAIT_SECONDS, unfinished=unfinished)
            with cls(database, settings, read_only=False) as trial:
                database.keep_rollback_journal()
                schema.migrate(database, trial._now())
                with trial.act() as act:
                    key = draw_letters(settings.random_bytes)
                    identity = settings.random_bytes(16).hex()
                    plan_kept, key_sealed = act.store(plan), act.seal(key.sealed)
                    act.append(PlanLocked(name, identity, plan_kept, key_sealed, by, looks_held_before))
                    if not masked:
                        act.append(ArmsUnmasked.of(key, STARTS_UNMASKED, by))
        return cls.open(path, settings)

    @classmethod
    def open(
        cls, path: Path, settings: Settings, *, read_only: bool = False, wait_seconds: float = WAIT_SECONDS
    ) -> Trial:
        """Open a trial file; for reading only when so asked, not permitted to write, or damaged."""
        if not path.is_file():
            raise MISSING.at(path)
        read_only = read_only or not _may_be_written(path)
        database = Database(path, read_only=read_only, wait_seconds=wait_seconds)
        trial = cls(database, settings, read_only=read_only)
        try:
            schema.refuse_foreign(database)
            trial.damage = quick_check(database)
            if not read_only and not trial.damage:
                database.keep_rollback_journal()
                schema.migrate(database, trial._now())
        except BaseException:
            trial.close()
            raise
        if trial.damage and not read_only:
            trial.close()
            return cls.open(path, settings, read_only=True, wait_seconds=wait_seconds)
        return trial

    def close(self) -> None:
        self._database.close()

    @contextmanager
    def act(self) -> Iterator[Act]:
        """One act, one transaction: what is stored and appended in the block enters whole, or not at all."""
        self._refuse_writing()
        with self._database.lock:
            with self._database.transaction():
                before = self._caught_up()
                act = Act(self._database, before, self._now())
                self._acting = act
                try:
                    yield act
                    act.refuse_loose_ends()
                finally:
                    self._acting = None
            self._state = act.state  # what was told as done must be there at the next act
            self._clock_doubts += act.state.clock_doubts[len(before.clock_doubts) :]

    def take_clock_doubts(self) -> tuple[ClockWentBack, ...]:
        """Doubts about the time of acts done since this was last asked."""
        with self._database.lock:
            doubts, self._clock_doubts = self._clock_doubts, ()
        return doubts

    def state(self) -> State:
        """All that the history says now; inside an act, with what the act has added so far."""
        with self._database.lock:
            if self._acting:
                return self._acting.state
            with self._database.reading():
                return self._caught_up()

    def head(self) -> str:
        """The digest of the last entry."""
        return self.state().head.digest

    def entries(self) -> tuple[Entry, ...]:
        return read_entries(self._database)

    def content(self, key: str) -> bytes:
        """Stored bytes by their digest, hashed again; LedgerChanged when they are gone or others."""
        return kept_bytes(self._database, "content", key)

    def snapshot(self, number: int) -> Snapshot:
        """A snapshot as received, with the bytes of its files."""
        look = self.state().look(number)
        return _snapshot(look.snapshot, look.received_at, self.content)

    def letter_key(self) -> LetterKey:
        """Which arm is which letter, and the salt: for views of the closed side, and for unmasking."""
        sealed = kept_bytes(self._database, "secret", self.state().letters_commitment)
        key: LetterKey = read_as(LetterKey, parse_strict(sealed, "the sealed arm letters"))
        return key

    def check_quickly(self) -> None:
        """Tables, triggers, chain and order, as before each freeze; LedgerChanged when any was changed."""
        self._found(quick_check(self._database))
        if self.damage:
            self._refuse_writing()

    def back_up(self, to: Path, *, by: str) -> Backup:
        """Copy the trial file to a new name, verify the copy, and record it; no act comes between.

        A file that is open for reading only is copied without a record of it.
        """
        if self.read_only and not self.damage:
            return copied_whole(self.path, self.state().head, to, by=by)
        with self.act() as act:
            body = copied_whole(self.path, act.state.head, to, by=by)
            act.append(body)
        return body

    def check_chain(self, witnessed_heads: Sequence[str] = ()) -> tuple[Problem, ...]:
        """Walk the history and re-hash every stored byte (check.py); a problem ends all writing."""
        return self._found(full_check(self._database, witnessed_heads))

    def _found(self, problems: tuple[Problem, ...]) -> tuple[Problem, ...]:
        self.damage = tuple(dict.fromkeys((*self.damage, *problems)))
        self.read_only = self.read_only or bool(problems)
        return problems

    def _refuse_writing(self) -> None:
        if self.damage:
            raise LedgerChanged(
                "A damaged trial file is not written to",
                where=str(self.path),
                found="; ".join(map(str, self.damage[: self._settings.limits.findings_shown])),
                remedy=f"{NOT_STORED}; keep this file as it is and go on from a verified backup",
            )
        if self.read_only:
            raise UNWRITABLE.at(self.path, detail="a trial file that is open for reading only")

    def _caught_up(self) -> State:
        """The state with entries that came in since, by this program or another; called in a transaction."""
        known = self._state.head
        entries = read_entries(self._database, first=max(known.id, 1))
        if known.id:
            kept, entries = entries[:1], entries[1:]
            if [entry.head for entry in kept] != [known]:
                raise self._changed(f"entry {known.id} gone or another")
        for problem in chain_problems(entries, known):
            raise self._changed(str(problem))
        try:
            self._state = fold(entries, self._state)
        except LedgerError as impossible:
            raise self._changed(str(impossible)) from impossible
        return self._state

    def _changed(self, found: str) -> LedgerChanged:
        return LedgerChanged(
            "A history that is not as it was written",
            where=str(self.path),
            found=found,
            remedy=f"{NOT_STORED}; keep this file as it is, verify it, and go on from a verified backup",
        )

    def _now(self) -> str:
        return self._settings.clock().astimezone(UTC).strftime("%Y-%m-%dT%H:%M:%SZ")


def _may_be_written(path: Path) -> bool:
    """The folder too: the journal of an act lies beside the file."""
    return os.access(path, os.W_OK) and os.access(path.parent, os.W_OK)


def _snapshot(body: SnapshotReceived, received_at: str, content: Callable[[str], bytes]) -> Snapshot:
    return Snapshot(
        number=body.number,
        files=tuple(ReceivedFile(file.name, content(file.digest), file.digest) for file in body.files),
        kind=body.kind,
        cutoff=date.fromisoformat(body.cutoff),
        extracted=date.fromisoformat(body.extracted) if body.extracted else None,
        received_at=received_at,
        by=body.by,
        acknowledgements=tuple(Acknowledgement(a.finding, a.reason) for a in body.acknowledgements),
    )
