"""Verify a trial file or a report: what matches, number by number."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

from app.actions.desk import Desk
from app.actions.environment import environment
from app.actions.freeze import closed_report
from app.actions.looks import history_of
from app.errors import AppError, InputError
from app.ledger.bodies import Verification
from app.ledger.entries import read_body
from app.ledger.history import Frozen, fold
from app.ledger.trial import Trial
from app.settings import Settings
from app.sheets.record import Freezing
from app.verification.check import CheckLine, CheckReport, check_report, check_trial

SQLITE_HEADER = b"SQLite format 3\x00"
WHAT_IT_CANNOT = (
    "What this cannot prove: a whole file rewritten by someone who holds it. "
    "The committee's minutes, which name the head printed in each report, are the witness."
)


def verify(settings: Settings, path: Path) -> CheckReport:
    """Check a trial file, a closed report, or every closed report in a folder."""
    if path.is_dir():
        return CheckReport(tuple(_folder_lines(path)))
    if not path.is_file():
        raise InputError(
            "Nothing to verify", where=str(path), accepted="a trial file, a report or a folder of reports"
        )
    if path.suffix == ".html" and not (report := _read(path)).startswith(SQLITE_HEADER):
        return CheckReport(tuple(check_report(report)))
    with Trial.open(path, settings, read_only=True) as trial:
        return verify_desk(Desk(settings, trial))


def _read(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as fault:
        raise InputError(
            "A report that cannot be read",
            where=str(path),
            found=fault.strerror or type(fault).__name__,
            accepted="a file that can be read",
        ) from fault


def _folder_lines(folder: Path) -> Iterator[CheckLine]:
    reports = sorted(folder.glob("*.html"))
    if not reports:
        raise InputError(
            "No report to verify", where=str(folder), accepted="a folder that holds closed reports (.html)"
        )
    for path in reports:
        yield from (CheckLine(line.ok, f"{path.name}: {line.text}") for line in check_report(_read(path)))


def verify_desk(desk: Desk) -> CheckReport:
    """The full check of an open trial file."""
    lines = (*check_trial(desk.trial, desk.settings.limits), *_reports_again(desk))
    return CheckReport((*lines, CheckLine(True, WHAT_IT_CANNOT)))


def _reports_again(desk: Desk) -> Iterator[CheckLine]:
    """Each closed report set again from its point of the history: the same bytes where it was made here."""
    try:
        frozen = [look.frozen for look in desk.trial.state().frozen_looks if look.frozen]
    except AppError as unreadable:
        yield CheckLine(False, f"The reports cannot be set again: {unreadable}")
        return
    for each in frozen:
        try:
            yield _report_again(desk, each)
        except AppError as unreadable:
            yield CheckLine(
                False, f"Look {each.body.look}, closed report: it cannot be set again: {unreadable}"
            )


def _report_again(desk: Desk, frozen: Frozen) -> CheckLine:
    body = frozen.body
    name = f"Look {body.look}, closed report"
    if body.environment != environment():
        return CheckLine(
            True, f"{name}: made by another version or machine; its digest and its record were checked."
        )
    before = [entry for entry in desk.trial.entries() if entry.id < frozen.head.id]
    freezing = Freezing(frozen.at, body.by, body.head_before, body.disclosure)
    again = closed_report(desk, body.look, history_of(fold(before), before, freezing))
    if again == desk.trial.content(body.report_digest):
        return CheckLine(True, f"{name}: set again from its snapshot, it has the same bytes.")
    return CheckLine(False, f"{name}: set again from its snapshot, it has other bytes.")


def record_verification(desk: Desk, checked: CheckReport) -> None:
    """Enter a verification that found nothing; nothing is written into a damaged or read-only file."""
    if not (checked.ok and desk.may_write):
        return
    with desk.trial.act() as act:
        entries = desk.trial.entries()
        hashed = len({named.digest for entry in entries for named in read_body(entry).contents()})
        recomputed = tuple(look.number for look in act.state.frozen_looks)
        act.append(Verification(act.state.head.digest, len(entries), hashed, recomputed))
