"""Walk the history and re-hash every stored byte; say in plain words what is not as it was written.

What a chain proves: an entry or a stored file that was changed, left out or put in between is found. What
it cannot prove: that nobody who holds the file cut off its end, or wrote the whole of it anew. Only a head
kept elsewhere tells that, which is why every closed report prints one; pass those as `witnessed_heads`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence

from app.errors import LedgerChanged, LedgerError
from app.ledger.bodies import Body, Named
from app.ledger.chain import Problem, chain_problems
from app.ledger.database import Database
from app.ledger.entries import Entry, read_body
from app.ledger.history import State, follow
from app.ledger.rows import Table, entry_rows, kept_bytes, kept_digests
from app.ledger.schema import schema_problems

THE_FILE = "the trial file"


def quick_check(database: Database) -> tuple[Problem, ...]:
    """Tables, triggers, chain and order of the history; the stored bytes are not read."""
    return _told(database, (schema_problems, _entry_problems))


def full_check(database: Database, witnessed_heads: Sequence[str] = ()) -> tuple[Problem, ...]:
    """All of it: pages, tables, triggers, chain, order, every stored byte, and heads kept elsewhere."""

    def witness_problems(database: Database) -> Iterator[Problem]:
        return _witness_problems(database, witnessed_heads)

    checks = (_page_problems, schema_problems, _entry_problems, _byte_problems, witness_problems)
    return _told(database, checks)


def _told(
    database: Database, checks: Sequence[Callable[[Database], Iterable[Problem]]]
) -> tuple[Problem, ...]:
    """Every problem of every check, once; a check that cannot go on is a problem itself."""
    found: dict[Problem, None] = {}
    with database.reading():
        for check in checks:
            try:
                found.update(dict.fromkeys(check(database)))
            except LedgerChanged as fault:
                found[Problem(THE_FILE, str(fault))] = None
    return tuple(found)


def _page_problems(database: Database) -> Iterator[Problem]:
    for (text,) in database.run("PRAGMA integrity_check(10)"):
        if text != "ok":
            yield Problem("the pages of the trial file", f"damaged ({text})")


def _entry_problems(database: Database) -> Iterator[Problem]:
    entries, unreadable = _readable_entries(database)
    broken = (*unreadable, *chain_problems(entries))
    yield from broken
    if not entries:
        yield Problem("the history", "no entry left")
    if not broken:  # else what follows is only an echo
        yield from _order_problems(entries)


def _readable_entries(database: Database) -> tuple[list[Entry], list[Problem]]:
    entries: list[Entry] = []
    unreadable: list[Problem] = []
    for row in entry_rows(database):
        try:
            entries.append(Entry.of_row(row))
        except LedgerChanged as fault:
            unreadable.append(Problem(fault.where, "damaged: its columns do not read"))
    return entries, unreadable


def _order_problems(entries: Iterable[Entry]) -> Iterator[Problem]:
    """The first entry that cannot follow those before it, though its digests say so."""
    state = State()
    for entry in entries:
        try:
            state = follow(state, entry)
        except LedgerError as fault:
            yield Problem(f"entry {entry.id}", str(fault))
            return


def _byte_problems(database: Database) -> Iterator[Problem]:
    entries, _ = _readable_entries(database)
    bodies = tuple(_readable_bodies(entries))
    yield from _kept_problems(database, "content", [named for body in bodies for named in body.contents()])
    yield from _kept_problems(database, "secret", [named for body in bodies for named in body.secrets()])


def _readable_bodies(entries: Iterable[Entry]) -> Iterator[Body]:
    for entry in entries:
        try:
            yield read_body(entry)
        except LedgerChanged:  # told by the walk along the entries
            continue


def _kept_problems(database: Database, table: Table, named: Sequence[Named]) -> Iterator[Problem]:
    """Bytes that an entry names and that are not there as they were; bytes that none names."""
    faults = {key: _fault_of(database, table, key) for key in dict.fromkeys(key for _, key in named)}
    for place, key in named:
        if fault := faults[key]:
            yield Problem(place, fault)
    for key in kept_digests(database, table):
        if key not in faults:
            yield Problem(f"stored bytes {key}", "no entry names them")


def _fault_of(database: Database, table: Table, key: str) -> str:
    try:
        kept_bytes(database, table, key)
    except LedgerChanged as fault:
        return fault.what
    return ""


def _witness_problems(database: Database, witnessed_heads: Sequence[str]) -> Iterator[Problem]:
    entries, _ = _readable_entries(database)
    digests = {entry.digest for entry in entries}
    for head in witnessed_heads:
        if head not in digests:
            yield Problem(
                f"the head {head}", "no entry has it: the end was cut off, or the history rewritten"
            )
