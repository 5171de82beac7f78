"""One connection to one trial file, set up so that people can copy, lose power and share."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from threading import RLock
from typing import Any

from app.ledger.faults import DAMAGED, told

Row = tuple[Any, ...]

SAFEGUARDS = (
    "PRAGMA foreign_keys = ON",
    "PRAGMA trusted_schema = OFF",  # what a stranger wrote into the schema gets no functions to call
    "PRAGMA synchronous = EXTRA",  # the folder is synced too: an act told as done is done
    "PRAGMA cache_spill = OFF",  # pages reach the file at COMMIT only: a copy taken before it is whole
)

WAIT_SECONDS = 5.0
"""How long an act waits for another program's act to end."""

FORGET = "PRAGMA shrink_memory"
"""Pages are read anew in each transaction: SQLite would keep those of before when the file was overwritten in
place by another that was changed as often."""


class Database:
    """The connection; every statement goes through `run`, so every fault becomes a sentence here."""

    def __init__(
        self, path: Path, *, read_only: bool, wait_seconds: float, unfinished: Path | None = None
    ) -> None:
        """Open the file at `path`, or at `unfinished` while it is being made for that place."""
        self.path = path
        self.lock = RLock()  # a web server's threads take turns
        address = f"{(unfinished or path).absolute().as_uri()}?mode={'ro' if read_only else 'rw'}"
        try:
            self._connection = sqlite3.connect(
                address, uri=True, timeout=wait_seconds, isolation_level=None, check_same_thread=False
            )
        except sqlite3.Error as fault:
            raise told(fault, path) from fault
        self._connection.text_factory = _text
        try:
            for safeguard in SAFEGUARDS:
                self.run(safeguard)
        except BaseException:
            self.close()
            raise

    def keep_rollback_journal(self) -> None:
        """Out of the other mode, should someone have chosen it: there a copy of an open file can be empty."""
        self.run("PRAGMA journal_mode = DELETE")

    def run(self, statement: str, *values: Any) -> list[Row]:
        """The rows of one statement."""
        with self.lock:
            try:
                return self._connection.execute(statement, values).fetchall()
            except sqlite3.Error as fault:
                raise told(fault, self.path) from fault
            except UnicodeDecodeError as fault:  # in the name of a column, or in SQLite's own message
                raise DAMAGED.at(self.path, detail="names that are no text") from fault

    def value(self, statement: str, *values: Any) -> Any:
        """The first value of the first row, or None when there is no row."""
        rows = self.run(statement, *values)
        return rows[0][0] if rows else None

    @contextmanager
    def transaction(self, begin: str = "BEGIN IMMEDIATE", end: str = "COMMIT") -> Iterator[None]:
        """All of it or nothing: BEGIN and COMMIT written out, since Python's own handling left halves."""
        with self.lock:
            if self._connection.in_transaction:
                raise ValueError("an act within an act")
            self.run(FORGET)
            self.run(begin)
            try:
                yield
                self.run(end)
            finally:
                if self._connection.in_transaction:
                    self.run("ROLLBACK")

    @contextmanager
    def reading(self) -> Iterator[None]:
        """A view of the file that stands still while it is read; within an act, the act's own."""
        with self.lock:
            if self._connection.in_transaction:
                yield
                return
            with self.transaction("BEGIN", end="ROLLBACK"):
                yield

    def copy_to(self, other: Database) -> None:
        """Every page into another file, by SQLite's own interface for backups."""
        with self.lock, other.lock:
            try:
                self._connection.backup(other._connection)
            except sqlite3.Error as fault:
                raise told(fault, other.path) from fault

    def close(self) -> None:
        with self.lock:
            self._connection.close()


def _text(stored: bytes) -> str:
    """Text as stored; bytes that are no UTF-8 stay recognisable, so that damage is found where it is."""
    return stored.decode("utf-8", "surrogateescape")
