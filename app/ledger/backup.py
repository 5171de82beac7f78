"""A verified copy of the trial file under a new name, whole or not at all."""

from __future__ import annotations

import hashlib
from pathlib import Path

from app.errors import LedgerChanged
from app.ledger.bodies import Backup
from app.ledger.check import full_check
from app.ledger.creation import created_whole
from app.ledger.database import WAIT_SECONDS, Database
from app.ledger.entries import Head
from app.ledger.faults import disk_faults_told
from app.ledger.rows import read_entries


def copied_whole(source: Path, last: Head, to: Path, *, by: str) -> Backup:
    """Copy the file at `source`, whose last entry is `last`, to `to`; the entry that says so.

    The copy takes its name only after every page, entry and stored byte of it was read again and found right.
    """
    with created_whole(to) as unfinished:
        _copy(source, to, unfinished)
        _verify(to, unfinished, last)
        with disk_faults_told(to), unfinished.open("rb") as copy:
            digest = hashlib.file_digest(copy, "sha256").hexdigest()
    return Backup(to.name, digest, last.digest, last.id, by)


def _copy(source: Path, to: Path, unfinished: Path) -> None:
    """By SQLite's own interface, through connections of their own: an act may be open meanwhile."""
    origin = Database(source, read_only=True, wait_seconds=WAIT_SECONDS)
    try:
        copy = Database(to, read_only=False, wait_seconds=WAIT_SECONDS, unfinished=unfinished)
        try:
            origin.copy_to(copy)
        finally:
            copy.close()
    finally:
        origin.close()


def _verify(to: Path, unfinished: Path, last: Head) -> None:
    copy = Database(to, read_only=True, wait_seconds=WAIT_SECONDS, unfinished=unfinished)
    try:
        problems = [str(problem) for problem in full_check(copy)]
        if not problems and [entry.head for entry in read_entries(copy, first=last.id)] != [last]:
            problems = [f"another last entry than {last.id}"]
    finally:
        copy.close()
    if problems:
        raise LedgerChanged(
            "The backup does not hold what the trial file holds",
            where=str(to),
            found="; ".join(problems[:5]),
            remedy="The backup was taken away again; verify the trial file, check the disk, then repeat",
        )
