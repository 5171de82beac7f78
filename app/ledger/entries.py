"""An entry of the history: its line, its digest, and what ties it to the one before."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import asdict, dataclass, replace
from typing import Any, NamedTuple

from app.errors import InputError, LedgerChanged
from app.ledger.bodies import BODIES, Body
from app.ledger.reading import read_as
from app.record.canonical import canonical_bytes, digest, parse_strict


class Head(NamedTuple):
    """The last entry. Whoever wrote its digest down can tell whether the history up to it was kept."""

    id: int
    digest: str


BEFORE_THE_FIRST = Head(0, "0" * 64)
"""What the first entry follows."""


@dataclass(frozen=True)
class Entry:
    """One line of the history. `at` is UTC; `body` is canonical JSON text; `digest` is taken of `line`."""

    id: int
    at: str
    kind: str
    body: str
    previous: str
    digest: str

    @property
    def line(self) -> bytes:
        """The canonical JSON of {at, body, id, kind, previous}: a line of the exported history.

        Spliced around the stored text of the body, so that what is hashed is what is stored.
        """
        at, kind, previous = (canonical_bytes(text) for text in (self.at, self.kind, self.previous))
        body = self.body.encode()
        return b'{"at":%b,"body":%b,"id":%d,"kind":%b,"previous":%b}' % (at, body, self.id, kind, previous)

    @property
    def head(self) -> Head:
        """What the history's head is while this entry is the last."""
        return Head(self.id, self.digest)

    @classmethod
    def following(cls, last: Head, at: str, body: Body) -> Entry:
        """The entry that puts `body` behind the last one."""
        text = canonical_bytes(asdict(body)).decode()
        unsealed = cls(last.id + 1, at, body.entry_kind, text, previous=last.digest, digest="")
        return replace(unsealed, digest=digest(unsealed.line))

    @classmethod
    def of_row(cls, row: Sequence[Any]) -> Entry:
        """An entry as SQLite gave it; LedgerChanged when a column holds what no entry holds."""
        try:
            number, *texts = row
            for text in texts:
                text.encode()
            return cls(read_as(int, number), *texts)
        except (AttributeError, ValueError) as fault:
            raise LedgerChanged("Columns that no entry can have", where=f"entry {row[0]!r}") from fault


def read_body(entry: Entry) -> Body:
    """The typed body of an entry; LedgerChanged when it does not read."""
    where = f"entry {entry.id}"
    if entry.kind not in BODIES:
        raise LedgerChanged(
            "An entry of an unknown kind", where=where, found=repr(entry.kind), accepted=", ".join(BODIES)
        )
    try:
        body: Body = read_as(BODIES[entry.kind], parse_strict(entry.body.encode(), where))
    except (ValueError, InputError) as fault:
        raise LedgerChanged("A body that no such entry has", where=where, found=str(fault)) from fault
    return body


def history_lines(entries: Iterable[Entry]) -> bytes:
    """The history for anyone to check: one canonical line an entry, without the letters or the contents.

    The SHA-256 of a line (without its line feed) is what the next line names as `previous`; that of the last
    line is the head.
    """
    return b"".join(entry.line + b"\n" for entry in entries)
