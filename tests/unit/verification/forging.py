"""What someone who holds the file can do to it: change stored bytes, and redo every digest after that."""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from pathlib import Path
from typing import Any

from app.ledger.entries import BEFORE_THE_FIRST, Entry
from app.record.canonical import canonical_bytes, digest
from app.record.text import record_bytes


@contextmanager
def unguarded(file: Path) -> Iterator[sqlite3.Connection]:
    """The tables without their triggers, which stand again afterwards."""
    with closing(sqlite3.connect(file, isolation_level=None)) as tables:
        rules = tables.execute("SELECT name, sql FROM sqlite_master WHERE type = 'trigger'").fetchall()
        for name, _ in rules:
            tables.execute(f"DROP TRIGGER {name}")
        yield tables
        for _, rule in rules:
            tables.execute(rule)


def flip_a_byte(file: Path, key: str) -> None:
    """One bit of one stored content turned over."""
    with unguarded(file) as tables:
        (content,) = tables.execute("SELECT bytes FROM content WHERE digest = ?", (key,)).fetchone()
        middle = len(content) // 2
        changed = content[:middle] + bytes([content[middle] ^ 1]) + content[middle + 1 :]
        tables.execute("UPDATE content SET bytes = ? WHERE digest = ?", (changed, key))


def forge_record(file: Path, look: int, change: Callable[[dict[str, Any]], None]) -> None:
    """Change something inside the frozen record of a look, and redo its digest and the whole chain."""

    def forged(content: bytes) -> bytes:
        record = json.loads(content)
        change(record)
        return record_bytes(record)

    _forge(file, look, "record_digest", forged)


def forge_report(file: Path, look: int, old: bytes, new: bytes) -> None:
    """Exchange words of a frozen report, and redo its digest and the whole chain."""

    def forged(content: bytes) -> bytes:
        assert old in content
        return content.replace(old, new, 1)

    _forge(file, look, "report_digest", forged)


def _forge(file: Path, look: int, named: str, forged: Callable[[bytes], bytes]) -> None:
    with unguarded(file) as tables:
        rows = tables.execute("SELECT id, at, kind, body FROM entry ORDER BY id").fetchall()
        bodies = [json.loads(body) for *_, body in rows]
        freezes = [body for body, row in zip(bodies, rows, strict=True) if row[2] == "look frozen"]
        (frozen,) = [body for body in freezes if body["look"] == look]
        key = frozen[named]
        (content,) = tables.execute("SELECT bytes FROM content WHERE digest = ?", (key,)).fetchone()
        changed = forged(content)
        frozen[named] = digest(changed)
        tables.execute(
            "UPDATE content SET bytes = ?, digest = ? WHERE digest = ?", (changed, digest(changed), key)
        )
        _chain_again(tables, rows, bodies)


def _chain_again(
    tables: sqlite3.Connection, rows: list[tuple[int, str, str, str]], bodies: list[dict[str, Any]]
) -> None:
    head = BEFORE_THE_FIRST
    for (number, at, kind, _), body in zip(rows, bodies, strict=True):
        if "head_before" in body:
            body["head_before"] = head.digest
        text = canonical_bytes(body).decode()
        entry = Entry(number, at, kind, text, head.digest, "")
        key = digest(entry.line)
        tables.execute(
            "UPDATE entry SET body = ?, previous = ?, digest = ? WHERE id = ?",
            (text, head.digest, key, number),
        )
        head = head._replace(id=number, digest=key)
