"""The chain: each entry names the digest of the one before it, and carries its own."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass

from app.ledger.entries import BEFORE_THE_FIRST, Entry, Head
from app.record.canonical import digest


@dataclass(frozen=True)
class Problem:
    """One thing in the trial file that is not as it was written: where, and what."""

    where: str
    what: str

    def __str__(self) -> str:
        return f"{self.where}: {self.what}"


def chain_problems(entries: Iterable[Entry], last: Head = BEFORE_THE_FIRST) -> Iterator[Problem]:
    """Every broken link, each told once: the walk goes on from each entry as it stands."""
    for entry in entries:
        yield from link_problems(entry, last)
        last = entry.head


def link_problems(entry: Entry, last: Head) -> Iterator[Problem]:
    """Why `entry` cannot be the one written after `last`; nothing when it can."""
    where = f"entry {entry.id}"
    if entry.id != last.id + 1:
        yield Problem(where, f"follows entry {last.id}, entries between them are missing")
    elif entry.previous != last.digest:
        yield Problem(where, f"does not follow entry {last.id} as that stands now")
    if digest(entry.line) != entry.digest:
        yield Problem(where, "changed: its digest is of something else")
