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


def append_only(table: str, key: str) -> tuple[str, ...]:
    """Triggers that leave nothing but appending; INSERT OR REPLACE meets the third before it can delete."""
    return (
        f"CREATE TRIGGER {table}_update BEFORE UPDATE ON {table}"
        f" BEGIN SELECT RAISE(ABORT, '{table} is never changed'); END",
        f"CREATE TRIGGER {table}_delete BEFORE DELETE ON {table}"
        f" BEGIN SELECT RAISE(ABORT, '{table} is never deleted from'); END",
        f"CREATE TRIGGER {table}_replace BEFORE INSERT ON {table}"
        f" WHEN EXISTS (SELECT 1 FROM {table} WHERE {key} = NEW.{key})"
        f" BEGIN SELECT RAISE(ABORT, '{table} is never replaced'); END",
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
    for table, key in (("migration", "number"), ("entry", "id"), ("content", "digest"), ("secret", "digest")):
        for trigger in append_only(table, key):
            run(trigger)
    run(
        "CREATE TRIGGER entry_follows BEFORE INSERT ON entry"
        " WHEN NEW.id IS NOT (SELECT coalesce(max(id), 0) + 1 FROM entry)"
        " OR NEW.previous IS NOT coalesce((SELECT digest FROM entry ORDER BY id DESC LIMIT 1),"
        " '0000000000000000000000000000000000000000000000000000000000000000')"
        " BEGIN SELECT RAISE(ABORT, 'entry follows the last one'); END"
    )


MIGRATIONS: tuple[Callable[[Run], None], ...] = (lay_out_entries_contents_and_secrets,)


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
        for name in sorted(found.keys() | made.keys())
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
