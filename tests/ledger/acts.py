"""A short life of a trial, act by act, as the tests and the killed children live it."""

from __future__ import annotations

import random
from collections.abc import Callable
from datetime import UTC, date, datetime, timedelta
from pathlib import Path

from app.ledger.entries import (
    ArmsUnmasked,
    LookFrozen,
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


def start(path: Path, settings: Settings, *, masked: bool = True) -> Trial:
    return Trial.create(path, settings, name="Q17", plan=PLAN, by="M. Berg", masked=masked)


def extract(number: int) -> bytes:
    return b"USUBJID,AVAL,CNSR\n" + b"".join(
        b"%05d,%d,%d\n" % (row, row * number, row % 2) for row in range(400)
    )


def snapshot(number: int, kind: str = "planned") -> Snapshot:
    files = (("adtte", extract(number)), ("adsl", b"USUBJID,REGION\n%d,North\n" % number))
    return Snapshot(
        number=number,
        files=tuple(
            ReceivedFile(f"{name}-{number}.csv", content, digest(content)) for name, content in files
        ),
        kind=kind,
        cutoff=date(2026, 1, number),
        extracted=None if number == 1 else date(2026, 1, number + 1),
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
"""Every kind of act, in an order that history allows."""


def live(trial: Trial, *, until: str | None = None) -> None:
    """Carry out the acts of LIFE, up to and without the one named."""
    for name, do in LIFE.items():
        if name == until:
            return
        with trial.act() as act:
            do(trial, act)
