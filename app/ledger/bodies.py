"""What an entry says, kind by kind. Kinds and fields are for ever.

A new kind is a class in BODIES, a rule in history.py, and a new schema version, so that an older program says
it is older. A new field of an old kind has a default, so that older entries still read.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import ClassVar, Literal, NamedTuple, Self

from app.ledger.letters import LetterKey, Letters
from app.model.extract import Finding, LookKind, Severity, Snapshot

Kind = Literal[
    "plan locked",
    "plan amended",
    "snapshot received",
    "refusal recorded",
    "results opened",
    "arms unmasked",
    "look frozen",
    "report written",
    "recommendation",
    "erratum",
    "backup",
    "verification",
]
View = Literal["masked", "unmasked"]
Advice = Literal[
    "continue",
    "continue with changes",
    "stop for benefit",
    "stop for futility",
    "stop for harm",
    "stop for another reason",
]
"""What a committee recommends; the reasons are in the words beside it."""


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
    """The first entry. `trial` is drawn at random and tells this trial file from every other.

    `looks_held_before` are the plan's [[held]] looks: the first snapshot is that of the look after them.
    """

    entry_kind: ClassVar[Kind] = "plan locked"
    name: str
    trial: str
    plan_digest: str
    letters_commitment: str
    by: str
    looks_held_before: int = 0

    def contents(self) -> Iterator[Named]:
        yield Named("the locked plan", self.plan_digest)

    def secrets(self) -> Iterator[Named]:
        yield Named("the sealed arm letters", self.letters_commitment)


@dataclass(frozen=True)
class KeyChanged:
    """One key of the plan, as it was and as it is from here on."""

    key: str
    before: str
    after: str


@dataclass(frozen=True)
class PlanAmended(Body):
    """A new version of the plan, for the looks whose snapshots are received from here on.

    `decided_by` is who decided it, `by` who recorded it. `results_opened` are the looks whose comparative
    results somebody had seen by then, and `unmasked` says whether the arms were known: the history itself
    says so too, and an amendment that states otherwise is refused.
    """

    entry_kind: ClassVar[Kind] = "plan amended"
    version: int
    plan_digest: str
    changes: tuple[KeyChanged, ...]
    reason: str
    decided_by: str
    results_opened: tuple[int, ...]
    unmasked: bool
    by: str

    def contents(self) -> Iterator[Named]:
        yield Named(f"plan version {self.version}", self.plan_digest)


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

    @classmethod
    def of(cls, finding: Finding) -> Self:
        return cls(finding.id, finding.severity, finding.count, str(finding))


@dataclass(frozen=True)
class DoubtAnswered:
    finding: str
    reason: str


@dataclass(frozen=True)
class SnapshotReceived(Body):
    """An extract as received. `kind` of look is declared here, before any result of it is opened.

    `number` is that of the look it opens, which counts looks held before this file too.
    """

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
            findings=tuple(map(FindingKept.of, findings)),
            acknowledgements=tuple(DoubtAnswered(a.finding_id, a.reason) for a in snapshot.acknowledgements),
            by=snapshot.by,
        )

    def contents(self) -> Iterator[Named]:
        for file in self.files:
            yield Named(f"snapshot {self.number}, file {file.name}", file.digest)


@dataclass(frozen=True)
class RefusalRecorded(Body):
    """An extract that could not be used, and why. Its files are named by digest; no byte of them is kept."""

    entry_kind: ClassVar[Kind] = "refusal recorded"
    kind: LookKind
    cutoff: str
    extracted: str | None
    files: tuple[FileKept, ...]
    findings: tuple[FindingKept, ...]
    by: str


@dataclass(frozen=True)
class ResultsOpened(Body):
    """The first sight of comparative results of a look in a session."""

    entry_kind: ClassVar[Kind] = "results opened"
    look: int
    session: str
    view: View
    by: str = ""


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
class Recommendation(Body):
    """What the committee recommended after a frozen look, on the day it met (`held_on`)."""

    entry_kind: ClassVar[Kind] = "recommendation"
    look: int
    advice: Advice
    reason: str
    held_on: str
    by: str


@dataclass(frozen=True)
class Erratum(Body):
    """A correction, in words, of what an earlier entry says. The entry itself stays as it is."""

    entry_kind: ClassVar[Kind] = "erratum"
    entry: int
    correction: str
    by: str


@dataclass(frozen=True)
class Backup(Body):
    """A verified copy of the trial file as it was at `head`. `name` is the copy's, without its folder."""

    entry_kind: ClassVar[Kind] = "backup"
    name: str
    file_digest: str
    head: str
    entries: int
    by: str


@dataclass(frozen=True)
class Verification(Body):
    """A verification that found nothing: `head` before it, and how much was gone through.

    `witnessed` are heads kept elsewhere that were looked for and found. A verification that finds something
    is not an entry, because nothing is written into a damaged file.
    """

    entry_kind: ClassVar[Kind] = "verification"
    head: str
    entries: int
    contents_hashed: int
    looks_recomputed: tuple[int, ...]
    witnessed: tuple[str, ...] = ()
    by: str = ""


BODIES: dict[str, type[Body]] = {
    body.entry_kind: body
    for body in (
        PlanLocked,
        PlanAmended,
        SnapshotReceived,
        RefusalRecorded,
        ResultsOpened,
        ArmsUnmasked,
        LookFrozen,
        ReportWritten,
        Recommendation,
        Erratum,
        Backup,
        Verification,
    )
}
