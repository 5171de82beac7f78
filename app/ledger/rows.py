"""Rows of the tables as typed values, in and out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import astuple
from typing import Any, Literal

from app.errors import LedgerChanged
from app.ledger.database import Database
from app.ledger.entries import Entry
from app.record.canonical import digest

Table = Literal["content", "secret"]


def entry_rows(database: Database, first: int = 1) -> Sequence[tuple[Any, ...]]:
    """Entries from the id `first` on, as they lie there."""
    return database.run(
        "SELECT id, at, kind, body, previous, digest FROM entry WHERE id >= ? ORDER BY id", first
    )


def read_entries(database: Database, first: int = 1) -> tuple[Entry, ...]:
    """Entries from the id `first` on; LedgerChanged when one does not read."""
    return tuple(Entry.of_row(row) for row in entry_rows(database, first))


def insert_entry(database: Database, entry: Entry) -> None:
    database.run(
        "INSERT INTO entry (id, at, kind, body, previous, digest) VALUES (?, ?, ?, ?, ?, ?)", *astuple(entry)
    )


def is_kept(database: Database, table: Table, key: str) -> bool:
    return bool(database.run(f"SELECT 1 FROM {table} WHERE digest = ?", key))


def kept_digests(database: Database, table: Table) -> tuple[str, ...]:
    return tuple(key for (key,) in database.run(f"SELECT digest FROM {table} ORDER BY digest"))


def kept_bytes(database: Database, table: Table, key: str) -> bytes:
    """The bytes of this digest; LedgerChanged when they are gone or other bytes lie there."""
    stored = database.value(f"SELECT bytes FROM {table} WHERE digest = ?", key)
    if stored is None:
        raise _changed(database, "bytes missing", f"none with the digest {key}")
    if type(stored) is not bytes or digest(stored) != key:
        raise _changed(database, "bytes changed", f"others than the digest {key} was taken of")
    return stored


def _changed(database: Database, what: str, found: str) -> LedgerChanged:
    remedy = "keep this file as it is, verify it, and go on from a verified backup"
    return LedgerChanged(what, where=str(database.path), found=found, remedy=remedy)


def keep_bytes(database: Database, table: Table, content: bytes) -> tuple[str, bool]:
    """Store these bytes unless they are there already; their digest, and whether they are new."""
    key = digest(content)
    if is_kept(database, table, key):
        kept_bytes(database, table, key)  # tells when other bytes lie there
        return key, False
    database.run(f"INSERT INTO {table} (digest, bytes) VALUES (?, ?)", key, content)
    return key, True
