"""Tables, triggers and the ordered migrations that made them. A migration once released is never edited."""

from __future__ import annotations

import sqlite3
from collections.abc import Callable

from app.errors import LedgerError
from app.ledger.chain import Problem
from app.ledger.database import Database
from app.ledger.faults import NOT_A_TRIAL_FILE

APPLICATION_ID = int.from_bytes(b"LkLg")
"""Stands in bytes 68-71 of the file and tells a trial file from any other SQLite file."""

Run = Callable[[str], object]


def refuse(event: str, table: str, message: str, when: str = "") -> str:
    """A trigger that refuses `event` (UPDATE, DELETE, INSERT) on a table with a message."""
    return (
        f"CREATE TRIGGER {table}_{event.lower()} BEFORE {event} ON {table}{when}"
        f" BEGIN SELECT RAISE(ABORT, '{table} {message}'); END"
    )


def lay_out_entries_contents_and_secrets(run: Run) -> None:
    """Version 1. Rows of content and secret have no hidden row number through which one could be replaced."""
    run(f"PRAGMA application_id = {APPLICATION_ID}")
    run("CREATE TABLE migration (number INTEGER PRIMARY KEY, name TEXT NOT NULL, at TEXT NOT NULL)")
    run(
        "CREATE TABLE entry (id INTEGER PRIMARY KEY, at TEXT NOT NULL, kind TEXT NOT NULL,"
        " body TEXT NOT NULL, previous TEXT NOT NULL, digest TEXT NOT NULL)"
    )
    run("CREATE TABLE content (digest TEXT PRIMARY KEY NOT NULL, bytes BLOB NOT NULL) WITHOUT ROWID")
    run("CREATE TABLE secret (digest TEXT PRIMARY KEY NOT NULL, bytes BLOB NOT NULL) WITHOUT ROWID")
    for table in ("migration", "entry", "content", "secret"):
        run(refuse("UPDATE", table, "is never changed"))
        run(refuse("DELETE", table, "is never deleted from"))
    for table, key in (("migration", "number"), ("content", "digest"), ("secret", "digest")):
        # INSERT OR REPLACE comes here before it deletes
        present = f" WHEN EXISTS (SELECT 1 FROM {table} WHERE {key} = NEW.{key})"
        run(refuse("INSERT", table, "is never replaced", present))
    next_id = "SELECT coalesce(max(id), 0) + 1 FROM entry"
    head = f"coalesce((SELECT digest FROM entry ORDER BY id DESC LIMIT 1), '{'0' * 64}')"
    out_of_turn = f" WHEN NEW.id IS NOT ({next_id}) OR NEW.previous IS NOT {head}"
    run(refuse("INSERT", "entry", "follows the last one", out_of_turn))


def admit_amendments_refusals_recommendations_errata_and_backups(run: Run) -> None:
    """Version 2. The history may hold these kinds of entries; a program of version 1 then says it is older.

    The tables serve them as they are. What is new in the file keeps the record of migrations in its order.
    """
    out_of_turn = " WHEN NEW.number IS NOT (SELECT coalesce(max(number), 0) + 1 FROM migration)"
    run("DROP TRIGGER migration_insert")
    run(refuse("INSERT", "migration", "follows the last one", out_of_turn))


MIGRATIONS: tuple[Callable[[Run], None], ...] = (
    lay_out_entries_contents_and_secrets,
    admit_amendments_refusals_recommendations_errata_and_backups,
)


def version(database: Database) -> int:
    return int(database.value("PRAGMA user_version"))


def migrate(database: Database, at: str) -> None:
    """Run what this file has not seen yet, each migration in one transaction with the record that it ran."""
    while (done := version(database)) < len(MIGRATIONS):
        with database.transaction():
            if version(database) == done:  # else another program was faster
                _run_migration(database, done, at)


def _run_migration(database: Database, done: int, at: str) -> None:
    migration = MIGRATIONS[done]
    migration(database.run)
    database.run("INSERT INTO migration VALUES (?, ?, ?)", done + 1, migration.__name__, at)
    database.run(f"PRAGMA user_version = {done + 1}")


def refuse_foreign(database: Database) -> None:
    """Not a trial file, or one that a newer program has written: nothing here can read it."""
    if database.value("PRAGMA application_id") != APPLICATION_ID:
        raise NOT_A_TRIAL_FILE.at(database.path)
    if (found := version(database)) > len(MIGRATIONS):
        raise LedgerError(
            "The trial file was written by a newer version of this program",
            found=f"schema {found}",
            where=str(database.path),
            accepted=f"schemas up to {len(MIGRATIONS)}",
            remedy="open it with the newer version; nothing was changed",
        )


def schema_problems(database: Database) -> tuple[Problem, ...]:
    """What differs from the tables and triggers that the migrations of this version made."""
    found: dict[str, str] = dict(database.run("SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL"))
    made = _as_made(version(database))
    return tuple(
        Problem(f"the rule or table {name!r} of the file", _difference(found.get(name), made.get(name)))
        for name in sorted(found.keys() | made.keys(), key=str)
        if found.get(name) != made.get(name)
    )


def _difference(found: str | None, made: str | None) -> str:
    if found is None:
        return "missing"
    return "changed" if made else "not made by this program"


def _as_made(version: int) -> dict[str, str]:
    with_migrations = sqlite3.connect(":memory:", isolation_level=None)
    for migration in MIGRATIONS[:version]:
        migration(with_migrations.execute)
    made = dict(with_migrations.execute("SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL"))
    with_migrations.close()
    return made
