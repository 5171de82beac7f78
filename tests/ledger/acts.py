"""A short life of a trial, act by act, as the tests and the killed children live it."""

from __future__ import annotations

import random
from collections.abc import Callable, Mapping
from dataclasses import replace
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

from app.ledger.bodies import (
    ArmsUnmasked,
    Erratum,
    FileKept,
    FindingKept,
    KeyChanged,
    LookFrozen,
    PlanAmended,
    Recommendation,
    RefusalRecorded,
    ReportWritten,
    ResultsOpened,
    SnapshotReceived,
    Verification,
)
from app.ledger.trial import Act, Trial
from app.model.extract import Acknowledgement, Finding, ReceivedFile, Snapshot
from app.record.canonical import digest
from app.settings import Settings

PLAN = b'format = 1\n[trial]\nname = "Q17"\n'
DOUBT = Finding(
    "changed-event",
    "doubt",
    "An event reversed",
    "extract-2.csv",
    "1 row, row 3",
    "an event that stays",
    "ask",
    count=1,
)


def ticking_settings(seed: int = 17) -> Settings:
    """A clock that moves a minute at each look at it, and seeded randomness."""
    moments = (datetime(2026, 1, 15, 9, tzinfo=UTC) + timedelta(minutes=n) for n in range(10**6))
    return Settings(clock=lambda: next(moments), random_bytes=random.Random(seed).randbytes)


def start(path: Path, settings: Settings, *, masked: bool = True, looks_held_before: int = 0) -> Trial:
    return Trial.create(
        path,
        settings,
        name="Q17",
        plan=PLAN,
        by="M. Berg",
        masked=masked,
        looks_held_before=looks_held_before,
    )


def extract(number: int) -> bytes:
    return b"USUBJID,AVAL,CNSR\n" + b"".join(
        b"%05d,%d,%d\n" % (row, row * number, row % 2) for row in range(400)
    )


def snapshot(number: int, kind: str = "planned") -> Snapshot:
    files = (("adtte", extract(number)), ("adsl", b"USUBJID,REGION\n%d,North\n" % number))
    cutoff = date(2026, 1, 1) + timedelta(days=number - 1)
    return Snapshot(
        number=number,
        files=tuple(
            ReceivedFile(f"{name}-{number}.csv", content, digest(content)) for name, content in files
        ),
        kind=kind,
        cutoff=cutoff,
        extracted=None if number == 1 else cutoff + timedelta(days=1),
        received_at="",
        by="M. Berg",
        acknowledgements=(Acknowledgement(DOUBT.id, "Adjudicated again"),),
    )


def receive(act: Act, number: int) -> None:
    received = snapshot(number)
    for file in received.files:
        act.store(file.content)
    act.append(SnapshotReceived.of(received, [DOUBT]))


def open_results(act: Act, look: int, session: str = "first evening") -> None:
    act.append(ResultsOpened(look, session, "unmasked" if act.state.unmasked else "masked"))


def freeze(act: Act, look: int) -> None:
    record, report = b'{"look":%d}' % look, b"<html>Look %d</html>" % look
    act.append(
        LookFrozen(
            look=look,
            record_digest=act.store(record),
            report_digest=act.store(report),
            disclosure="masked",
            head_before=act.state.head.digest,
            environment={"python": "3.11"},
            by="M. Berg",
        )
    )


def write_report(act: Act, look: int) -> None:
    act.append(ReportWritten(look, act.state.frozen_look(look).body.report_digest))


def record_verification(act: Act) -> None:
    head = act.state.head
    act.append(Verification(head.digest, head.id, contents_hashed=1, looks_recomputed=()))


def amend(act: Act) -> None:
    state = act.state
    version = state.plan.version + 1
    act.append(
        PlanAmended(
            version=version,
            plan_digest=act.store(PLAN + b"# version %d\n" % version),
            changes=(KeyChanged("design.planned_events", "400", "520"),),
            reason="Fewer events than foreseen",
            decided_by="Steering committee",
            results_opened=state.results_opened,
            unmasked=state.unmasked,
            by="M. Berg",
        )
    )


def record_refusal(act: Act) -> None:
    files = (FileKept("adtte-9.csv", digest(extract(9))),)
    blocking = FindingKept.of(replace(DOUBT, severity="block"))
    act.append(RefusalRecorded("planned", "2026-01-09", None, files, (blocking,), "M. Berg"))


def recommend(act: Act, look: int) -> None:
    act.append(Recommendation(look, "continue", "No concern", "2026-01-20", "M. Berg"))


def correct(act: Act) -> None:
    act.append(Erratum(1, "The name is M. Bergh", "M. Berg"))


LIFE: dict[str, Callable[[Trial, Act], None]] = {
    "receive the first": lambda trial, act: receive(act, 1),
    "open results": lambda trial, act: open_results(act, 1),
    "freeze the first": lambda trial, act: freeze(act, 1),
    "write its report": lambda trial, act: write_report(act, 1),
    "unmask": lambda trial, act: act.append(
        ArmsUnmasked.of(trial.letter_key(), "Asked in session", "M. Berg")
    ),
    "receive the second": lambda trial, act: receive(act, 2),
    "record a verification": lambda trial, act: record_verification(act),
    "freeze the second": lambda trial, act: freeze(act, 2),
}
"""The kinds of act that schema 1 knew, in an order that history allows."""

LATER: dict[str, Callable[[Trial, Act], None]] = {
    "amend the plan": lambda trial, act: amend(act),
    "record a refusal": lambda trial, act: record_refusal(act),
    "recommend": lambda trial, act: recommend(act, 2),
    "correct an entry": lambda trial, act: correct(act),
}
"""What schema 2 brought, to follow on LIFE; but for the backup, which makes a file of its own."""


def live(trial: Trial, *, until: str | None = None) -> None:
    """Carry out the acts of LIFE, up to and without the one named."""
    carry_out(trial, LIFE, until=until)


def live_on(trial: Trial) -> None:
    """Carry out the acts of LATER, and back up."""
    carry_out(trial, LATER)
    trial.back_up(trial.path.with_suffix(".backup"), by="M. Berg")


def carry_out(
    trial: Trial, deeds: Mapping[str, Callable[[Trial, Act], None]], *, until: str | None = None
) -> None:
    for name, do in deeds.items():
        if name == until:
            return
        with trial.act() as act:
            do(trial, act)
