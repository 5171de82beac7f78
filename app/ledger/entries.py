"""What an entry of the history holds, kind by kind. Kinds and fields are for ever.

Reserved for later, with the names they will have: 'plan amended', 'refusal recorded', 'recommendation',
'erratum', 'backup'. A new kind is a class in BODIES, a rule in history.py, and a new schema version, so that
an older program says it is older. A new field of an old kind has a default, so that older entries still read.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import asdict, dataclass, replace
from typing import Any, ClassVar, Literal, NamedTuple, Self

from app.errors import InputError, LedgerChanged
from app.ledger.letters import LetterKey, Letters
from app.ledger.reading import read_as
from app.model.extract import Finding, LookKind, Severity, Snapshot
from app.record.canonical import canonical_bytes, digest, parse_strict

Kind = Literal[
    "plan locked",
    "snapshot received",
    "results opened",
    "arms unmasked",
    "look frozen",
    "report written",
    "verification",
]
View = Literal["masked", "unmasked"]


class Head(NamedTuple):
    """The last entry. Whoever wrote its digest down can tell whether the history up to it was kept."""

    id: int
    digest: str


BEFORE_THE_FIRST = Head(0, "0" * 64)
"""What the first entry follows."""


class Named(NamedTuple):
    """A stored content as an entry names it: where a person would look for it, and its digest."""

    place: str
    digest: str


@dataclass(frozen=True)
class Body:
    """What one kind of entry says."""

    entry_kind: ClassVar[Kind]

    def contents(self) -> Iterable[Named]:
        """The stored bytes that this entry stands for."""
        return ()

    def secrets(self) -> Iterable[Named]:
        """The stored bytes that this entry commits to without showing them."""
        return ()


@dataclass(frozen=True)
class PlanLocked(Body):
    """The first entry. `trial` is drawn at random and tells this trial file from every other."""

    entry_kind: ClassVar[Kind] = "plan locked"
    name: str
    trial: str
    plan_digest: str
    letters_commitment: str
    by: str

    def contents(self) -> Iterator[Named]:
        yield Named("the locked plan", self.plan_digest)

    def secrets(self) -> Iterator[Named]:
        yield Named("the sealed arm letters", self.letters_commitment)


@dataclass(frozen=True)
class FileKept:
    name: str
    digest: str


@dataclass(frozen=True)
class FindingKept:
    id: str
    severity: Severity
    count: int
    sentence: str


@dataclass(frozen=True)
class DoubtAnswered:
    finding: str
    reason: str


@dataclass(frozen=True)
class SnapshotReceived(Body):
    """An extract as received. `kind` of look is declared here, before any result of it is opened."""

    entry_kind: ClassVar[Kind] = "snapshot received"
    number: int
    kind: LookKind
    cutoff: str
    extracted: str | None
    files: tuple[FileKept, ...]
    findings: tuple[FindingKept, ...]
    acknowledgements: tuple[DoubtAnswered, ...]
    by: str

    @classmethod
    def of(cls, snapshot: Snapshot, findings: Sequence[Finding]) -> Self:
        """The entry for a snapshot and what was found in it."""
        return cls(
            number=snapshot.number,
            kind=snapshot.kind,
            cutoff=snapshot.cutoff.isoformat(),
            extracted=snapshot.extracted.isoformat() if snapshot.extracted else None,
            files=tuple(FileKept(file.name, file.digest) for file in snapshot.files),
            findings=tuple(FindingKept(f.id, f.severity, f.count, str(f)) for f in findings),
            acknowledgements=tuple(DoubtAnswered(a.finding_id, a.reason) for a in snapshot.acknowledgements),
            by=snapshot.by,
        )

    def contents(self) -> Iterator[Named]:
        for file in self.files:
            yield Named(f"snapshot {self.number}, file {file.name}", file.digest)


@dataclass(frozen=True)
class ResultsOpened(Body):
    """The first sight of comparative results of a look in a session."""

    entry_kind: ClassVar[Kind] = "results opened"
    look: int
    session: str
    view: View


@dataclass(frozen=True)
class ArmsUnmasked(Body):
    """The letters and the salt that the lock committed to, shown from here on."""

    entry_kind: ClassVar[Kind] = "arms unmasked"
    reason: str
    letters: Letters
    salt: str
    by: str

    @classmethod
    def of(cls, key: LetterKey, reason: str, by: str) -> Self:
        return cls(reason, key.letters, key.salt, by)

    @property
    def key(self) -> LetterKey:
        return LetterKey(self.letters, self.salt)


@dataclass(frozen=True)
class LookFrozen(Body):
    """What was shown at a look. `head_before` is the head that the closed report prints."""

    entry_kind: ClassVar[Kind] = "look frozen"
    look: int
    record_digest: str
    report_digest: str
    disclosure: View
    head_before: str
    environment: dict[str, str]
    by: str

    def contents(self) -> Iterator[Named]:
        yield Named(f"look {self.look}, frozen record", self.record_digest)
        yield Named(f"look {self.look}, closed report", self.report_digest)


@dataclass(frozen=True)
class ReportWritten(Body):
    """The closed report of a frozen look was written to a folder."""

    entry_kind: ClassVar[Kind] = "report written"
    look: int
    report_digest: str

    def contents(self) -> Iterator[Named]:
        yield Named(f"look {self.look}, written report", self.report_digest)


@dataclass(frozen=True)
class Verification(Body):
    """A verification that found nothing: `head` before it, and how much was gone through.

    One that finds something is not an entry, because nothing is written into a damaged file.
    """

    entry_kind: ClassVar[Kind] = "verification"
    head: str
    entries: int
    contents_hashed: int
    looks_recomputed: tuple[int, ...]


BODIES: dict[str, type[Body]] = {
    body.entry_kind: body
    for body in (
        PlanLocked,
        SnapshotReceived,
        ResultsOpened,
        ArmsUnmasked,
        LookFrozen,
        ReportWritten,
        Verification,
    )
}


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
