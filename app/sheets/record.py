"""Sheet 9, Record: what was shown, what was advised?"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

from app.ledger.bodies import (
    ArmsUnmasked,
    Backup,
    Body,
    Erratum,
    LookFrozen,
    PlanAmended,
    PlanLocked,
    Recommendation,
    RefusalRecorded,
    ReportWritten,
    ResultsOpened,
    SnapshotReceived,
    Verification,
)
from app.ledger.entries import Entry
from app.ledger.history import Look, State
from app.model.extract import Finding
from app.sheets.blocks import ActLink, Cell, Column, Line, Row, Sheet, Span, Table
from app.sheets.methods import methods
from app.sheets.plan_versions import plan_tables
from app.sheets.words import NO_BREAK, count, day_text, line, listed, moment

QUESTION = "What was shown, what was advised?"
NOT_A_SIGNATURE = "Names are recorded as they were given; this is not an electronic signature."


@dataclass(frozen=True)
class Freezing:
    """The freeze that a report is made for: it is not yet an entry when the report is set."""

    at: str
    by: str
    head_before: str
    disclosure: str


@dataclass(frozen=True)
class History:
    """The state of the trial file and its entries with their bodies; `freezing` while a report is set."""

    state: State
    entries: tuple[tuple[Entry, Body], ...]
    freezing: Freezing | None = None


def record_sheet(history: History, number: int, plan_doubts: Sequence[Finding] = ()) -> Sheet:
    look = history.state.look(number)
    return Sheet(
        key="record",
        number=9,
        name="Record",
        question=QUESTION,
        answer=(state_sentence(history, number),),
        tables=(_look_table(look, number, history.freezing), _file_table(history.state)),
        wide_tables=(*_advice_tables(history), *plan_tables(history.state), _history_table(history)),
        notes=(*(_plan_doubt(look, doubt) for doubt in plan_doubts), line(NOT_A_SIGNATURE)),
        methods=methods("chain"),
        acts=() if history.freezing else _acts(history.state, look, number),
    )


def _plan_doubt(look: Look, doubt: Finding) -> Line:
    return line(Span("Doubt", "doubt"), f" about plan version {look.plan.version}: {doubt}")


def state_sentence(history: History, number: int) -> Line:
    """ "Look 3 is open; looks 1 and 2 are frozen. The arms are masked." """
    state = history.state
    frozen = [str(look.number) for look in state.frozen_looks]
    arms = "The arms are unmasked." if state.unmasked else "The arms are masked."
    look = state.look(number)
    if history.freezing is not None:
        when = f"on {moment(history.freezing.at)}, by {history.freezing.by}"
        return line(f"Look{NO_BREAK}{number} was frozen {when}. {arms}")
    if look.frozen is not None:
        when = f"on {moment(look.frozen.at)}, by {look.frozen.body.by}"
        return line(f"Look{NO_BREAK}{number} was frozen {when}. {arms}")
    others = (
        f"; look{'s' if len(frozen) > 1 else ''}{NO_BREAK}{listed(frozen)} {_are(len(frozen))} frozen"
        if frozen
        else ""
    )
    return line(f"Look{NO_BREAK}{number} is open{others}. {arms}")


def _are(number: int) -> str:
    return "is" if number == 1 else "are"


def _look_table(look: Look, number: int, freezing: Freezing | None) -> Table:
    rows = [("Received", moment(look.received_at)), ("Received by", look.snapshot.by)]
    if freezing is not None:
        rows += _frozen_rows(freezing.at, freezing.by, freezing.disclosure, freezing.head_before)
    elif look.frozen is None:
        rows.append(("State", "open"))
    else:
        body = look.frozen.body
        rows += _frozen_rows(look.frozen.at, body.by, body.disclosure, body.head_before)
        rows += [
            ("Report, SHA-256", grouped(body.report_digest)),
            ("Record, SHA-256", grouped(body.record_digest)),
        ]
    return _words_table(f"Look {number}", rows)


def _frozen_rows(at: str, by: str, disclosure: str, head_before: str) -> list[tuple[str, str]]:
    return [
        ("Frozen", moment(at)),
        ("Frozen by", by),
        ("Arms in its report", disclosure),
        ("Head before the freeze", grouped(head_before)),
    ]


def _file_table(state: State) -> Table:
    rows = [
        ("Plan locked", f"{moment(state.locked_at)}, by {state.locked_by}"),
        *_amended_rows(state),
        ("Plan, SHA-256", grouped(state.plan_digest)),
        ("Entries", str(state.head.id)),
        ("Head", grouped(state.head.digest)),
    ]
    return _words_table("Trial file", rows)


def _amended_rows(state: State) -> list[tuple[str, str]]:
    versions = [version for version in state.plans if version.amended]
    return [(f"Version {each.version}", f"{moment(each.at)}, by {each.by}") for each in versions]


def _words_table(caption: str, rows: Sequence[tuple[str, str]]) -> Table:
    return Table(
        line(caption),
        (Column((), "words"),),
        tuple(Row(line(head), (Cell(line(text)),)) for head, text in rows),
    )


def grouped(digest: str) -> str:
    """The first and last digits of a digest, as a person compares them; the entry holds it whole."""
    return f"{digest[:4]} {digest[4:8]} … {digest[-4:]}"


def _advice_tables(history: History) -> tuple[Table, ...]:
    """Every recommendation of the committee; nothing while there is none."""
    rows = tuple(
        Row(
            line(f"Look{NO_BREAK}{body.look}"),
            tuple(
                Cell(line(text)) for text in (body.advice, iso_day_text(body.held_on), body.reason, body.by)
            ),
        )
        for _, body in history.entries
        if isinstance(body, Recommendation)
    )
    columns = tuple(
        Column(line(head), "words") for head in ("recommended", "committee met", "in words", "recorded by")
    )
    return (Table(line("What the committee recommended"), columns, rows, line("After")),) if rows else ()


def _history_table(history: History) -> Table:
    errata = _errata(history)
    doubts = {doubt.entry: doubt.before for doubt in history.state.clock_doubts}
    rows = tuple(
        Row(
            (count(entry.id),),
            (
                Cell(line(moment(entry.at)), _clock_doubt(doubts.get(entry.id))),
                Cell(line(said(body)), errata.get(entry.id, ())),
                Cell(line(getattr(body, "by", ""))),
            ),
        )
        for entry, body in history.entries
    )
    columns = (
        Column(line("when"), "words"),
        Column(line("what"), "words"),
        Column(line("recorded by"), "words"),
    )
    return Table(line("History"), columns, rows, line("Entry"))


def _errata(history: History) -> dict[int, Line]:
    """What stands under an entry that was corrected later."""
    found: dict[int, list[str]] = {}
    for entry, body in history.entries:
        if isinstance(body, Erratum):
            found.setdefault(body.entry, []).append(f"Entry {entry.id} corrects: {body.correction}")
    return {number: line(" ".join(words)) for number, words in found.items()}


def _clock_doubt(before: str | None) -> Line:
    return (Span(f"Doubt: the entry before has {moment(before)}", "doubt"),) if before else ()


def iso_day_text(day: str) -> str:
    """The day of an entry as it is read on a page."""
    return day_text(date.fromisoformat(day))


def said(body: Body) -> str:
    """One entry in words."""
    match body:
        case PlanLocked():
            held = body.looks_held_before
            before = f", with {held} look{'s' if held > 1 else ''} held before this file" if held else ""
            return f"Plan locked for trial {body.name}{before}"
        case SnapshotReceived():
            number = doubts_answered(body)
            doubts = f", {number} doubt{'s' if number > 1 else ''} answered" if number else ""
            cutoff = iso_day_text(body.cutoff)
            return f"Snapshot {body.number} received for a {body.kind} look, cutoff {cutoff}{doubts}"
        case ResultsOpened():
            return f"Comparative results of look {body.look} opened, {body.view}"
        case ArmsUnmasked():
            return f"Arms unmasked: {body.reason}"
        case LookFrozen():
            return f"Look {body.look} frozen, {body.disclosure}"
        case ReportWritten():
            return f"Report of look {body.look} written"
        case PlanAmended():
            keys = ", ".join(change.key for change in body.changes)
            return f"Plan amended to version {body.version}: {keys}"
        case RefusalRecorded():
            return _refusal_said(body)
        case Recommendation():
            return f"Recommended after look {body.look}: {body.advice}"
        case Erratum():
            return f"Entry {body.entry} corrected: {body.correction}"
        case Backup():
            return f"Backed up to {body.name}, SHA-256 {grouped(body.file_digest)}"
        case Verification():
            return f"Verified up to entry {body.entries}"
    return body.entry_kind


def doubts_answered(body: SnapshotReceived) -> int:
    """As the Data sheet counts them: one answer may be to the same doubt about several endpoints."""
    answered = {each.finding for each in body.acknowledgements}
    return sum(each.severity == "doubt" and each.id in answered for each in body.findings)


def _refusal_said(body: RefusalRecorded) -> str:
    files = listed([f"{file.name} (SHA-256 {grouped(file.digest)})" for file in body.files])
    blocking = " ".join(finding.sentence for finding in body.findings if finding.severity == "block")
    return f"Extract refused, cutoff {iso_day_text(body.cutoff)}: {files}. {blocking}"


def _acts(state: State, look: Look, number: int) -> tuple[ActLink, ...]:
    """What can be done from here, the irrevocable ones last."""
    acts = [ActLink("Receive the next extract", "receive")]
    if state.frozen_looks:
        acts.append(ActLink("Record a recommendation", "recommend"))
    acts += [
        ActLink("Amend the plan", "amend"),
        ActLink("Correct an entry", "erratum"),
        ActLink("Back up", "backup"),
        ActLink("Verify the trial file", "verify"),
    ]
    if look.frozen is not None:
        acts[:0] = [
            ActLink(f"Download the report of look {number}", f"looks/{number}/report"),
            ActLink("Download it with its verifier", f"looks/{number}/report.zip"),
        ]
    else:
        acts.append(ActLink(f"Freeze look {number}", f"looks/{number}/freeze"))
    if not state.unmasked:
        acts.append(ActLink("Unmask the arms", "unmask"))
    return tuple(acts)
