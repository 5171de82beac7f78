"""What someone who holds the file can do to it with an SQL shell and a knowledge of the format."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path

from app.ledger.entries import BEFORE_THE_FIRST, Entry, Head
from app.record.canonical import canonical_bytes, digest

Shell = sqlite3.Connection


@contextmanager
def shell_without_triggers(path: Path) -> Iterator[Shell]:
    """An attacker with an SQL shell, who puts the triggers back afterwards."""
    shell = sqlite3.connect(path)
    triggers = shell.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
    for name, _ in triggers:
        shell.execute(f"DROP TRIGGER {name}")
    yield shell
    for _, statement in triggers:
        shell.execute(statement)
    shell.commit()
    shell.close()


def rechain(shell: Shell, *, forge_heads: bool = False) -> None:
    """Make every digest right again, as one would who knows how, and the heads that entries name if asked."""
    last = BEFORE_THE_FIRST
    for row in shell.execute("SELECT * FROM entry ORDER BY id").fetchall():
        entry = Entry(*row)
        body = named_heads_forged(entry, last) if forge_heads else entry.body
        unsealed = replace(entry, id=last.id + 1, body=body, previous=last.digest)
        sealed = replace(unsealed, digest=digest(unsealed.line))
        shell.execute("DELETE FROM entry WHERE id = ?", (row[0],))
        shell.execute(
            "INSERT INTO entry VALUES (?, ?, ?, ?, ?, ?)",
            (sealed.id, sealed.at, sealed.kind, sealed.body, sealed.previous, sealed.digest),
        )
        last = sealed.head


def named_heads_forged(entry: Entry, last: Head) -> str:
    """Freezes, backups and verifications name the head before them."""
    body = json.loads(entry.body)
    if entry.kind == "look frozen":
        body["head_before"] = last.digest
    if entry.kind in ("backup", "verification"):
        body["head"] = last.digest
    return canonical_bytes(body).decode()


def exchange_content(shell: Shell, old: str, content: bytes) -> str:
    """Other bytes in the place of stored ones, and their digest wherever an entry names it."""
    new = digest(content)
    shell.execute("INSERT INTO content VALUES (?, ?)", (new, content))
    shell.execute("DELETE FROM content WHERE digest = ?", (old,))
    shell.execute("UPDATE entry SET body = replace(body, ?, ?)", (old, new))
    return new
