"""What an extract holds once it has been read: findings, samples with arms, samples without."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from datetime import date
from typing import Literal

from app.errors import sentence
from app.model.values import Bools, Floats, Ints

Severity = Literal["block", "doubt", "note"]
TimeUnit = Literal["days", "weeks", "months", "years", "as given"]


@dataclass(frozen=True)
class Finding:
    """One thing noticed in an extract. `id` is stable for ever (it is how a doubt is acknowledged).

    `row` numbers count data rows of `file` from 1 (the header is not a row); `rows` holds the first five
    and `count` all of them. The five parts never hold a subject identifier.
    """

    id: str
    severity: Severity
    what: str
    where: str
    found: str
    accepted: str
    remedy: str
    rows: tuple[int, ...] = ()
    count: int = 0

    def __str__(self) -> str:
        return sentence(self.what, self.where, self.found, self.accepted, self.remedy)


@dataclass(frozen=True)
class ReceivedFile:
    """One file of a snapshot, byte for byte as it was received; `digest` is its SHA-256 in hex."""

    name: str
    content: bytes
    digest: str


@dataclass(frozen=True, eq=False)
class Sample:
    """One endpoint of one extract, a row per subject in the order received. Closed side only.

    `time` is in `time_unit`; `event` is True for an event at `time`, False for censored there; `stratum`
    indexes `stratum_labels`; `start_day` and `end_day` are days since 1970-01-01, or None when not read.
    """

    parameter: str
    subject: tuple[str, ...]
    time: Floats
    event: Bools
    experimental: Bools
    stratum: Ints
    stratum_labels: tuple[str, ...]
    time_unit: TimeUnit = "days"
    start_day: Ints | None = None
    end_day: Ints | None = None


@dataclass(frozen=True, eq=False)
class PooledSample:
    """The same endpoint read without the arm column: all the open side ever sees. No identifiers either."""

    parameter: str
    time: Floats
    event: Bools
    stratum: Ints
    stratum_labels: tuple[str, ...]
    time_unit: TimeUnit = "days"
    start_day: Ints | None = None
    end_day: Ints | None = None


@dataclass(frozen=True)
class ReadingOfFile:
    """What was understood of one file, shown before anything is stored."""

    name: str
    digest: str
    n_rows: int
    columns_read: tuple[str, ...]
    columns_left_out: tuple[str, ...]
    role: str


@dataclass(frozen=True, eq=False)
class Extract:
    """An extract as understood under a plan. `sample` is None exactly when a finding blocks.

    `further` holds the plan's further endpoints (`Plan.further_endpoints`, in that order), all of them or,
    when a finding blocks, none.
    """

    files: tuple[ReadingOfFile, ...]
    findings: tuple[Finding, ...]
    sample: Sample | None
    further: tuple[Sample, ...] = ()
    parameters: tuple[tuple[str, int, int], ...] = ()  # every endpoint in the extract: PARAMCD, rows, events

    @property
    def blocking(self) -> tuple[Finding, ...]:
        return with_severity(self.findings, "block")

    @property
    def doubts(self) -> tuple[Finding, ...]:
        return with_severity(self.findings, "doubt")


def with_severity(findings: Sequence[Finding], severity: Severity) -> tuple[Finding, ...]:
    return tuple(finding for finding in findings if finding.severity == severity)


@dataclass(frozen=True)
class Changes:
    """What differs from the previous snapshot, subject by subject; identifiers stay on the closed side.

    `n_common` is the denominator of events, arms and strata: subjects in both snapshots. Events now = events
    before + new_events + new_subjects_with_event - reversed_events - vanished_with_event.
    """

    n_common: int
    new_subjects: tuple[str, ...] = ()
    vanished_subjects: tuple[str, ...] = ()
    new_events: tuple[str, ...] = ()
    reversed_events: tuple[str, ...] = ()
    moved_events: tuple[str, ...] = ()
    changed_arm: tuple[str, ...] = ()
    changed_stratum: tuple[str, ...] = ()
    new_subjects_with_event: tuple[str, ...] = ()
    vanished_with_event: tuple[str, ...] = ()


@dataclass(frozen=True)
class Acknowledgement:
    """A doubt that a person has read and answered with a reason."""

    finding_id: str
    reason: str


LookKind = Literal["planned", "unplanned", "safety", "final"]


@dataclass(frozen=True)
class Snapshot:
    """A received extract as the trial file keeps it: bytes, dates, declared kind, answered doubts."""

    number: int
    files: tuple[ReceivedFile, ...]
    kind: LookKind
    cutoff: date
    extracted: date | None
    received_at: str
    by: str
    acknowledgements: tuple[Acknowledgement, ...] = field(default=())
