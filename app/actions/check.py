"""Verify a trial file or a report: what matches, number by number."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path

from app.actions.desk import Desk
from app.actions.environment import environment
from app.actions.freeze import closed_report
from app.actions.looks import history_of
from app.actions.names import recorded_name
from app.errors import AppError, InputError, ValueRejected
from app.ledger.bodies import Verification
from app.ledger.entries import read_body
from app.ledger.history import Frozen, fold
from app.ledger.trial import Trial
from app.settings import Settings
from app.sheets.record import Freezing
from app.verification.check import CheckLine, CheckReport, Part, check_report, parts_of_trial
from app.verification.third_party import check_folder

SQLITE_HEADER = b"SQLite format 3\x00"
WHAT_IT_CANNOT = (
    "What this cannot prove: a whole file rewritten by someone who holds it. "
    "The committee's minutes, which name the head printed in each report, are the witness."
)


@dataclass(frozen=True)
class Progress:
    """How many parts of a verification are done, and the part that comes next."""

    done: int
    total: int
    part: str


Tell = Callable[[Progress], object]


def quietly(progress: Progress) -> None:
    """Tell nobody."""


def verify(settings: Settings, path: Path, *, heads: Sequence[str] = (), tell: Tell = quietly) -> CheckReport:
    """Check a trial file, a closed report, or every closed report in a folder.

    `heads` are heads kept elsewhere, which the history must hold.
    """
    if path.is_dir():
        return CheckReport(tuple(_folder_lines(path, heads)))
    if not path.is_file():
        raise InputError(
            "Nothing to verify", where=str(path), accepted="a trial file, a report or a folder of reports"
        )
    if path.suffix == ".html" and not (report := _read(path)).startswith(SQLITE_HEADER):
        return CheckReport((*check_report(report), *_heads_not_sought(heads)))
    with Trial.open(path, settings, read_only=True) as trial:
        return verify_desk(Desk(settings, trial), heads=heads, tell=tell)


def _read(path: Path) -> bytes:
    try:
        return path.read_bytes()
    except OSError as fault:
        raise _unreadable(path, fault) from fault


def _unreadable(path: Path, fault: OSError) -> InputError:
    return InputError(
        "A report that cannot be read",
        where=str(path),
        found=fault.strerror or type(fault).__name__,
        accepted="a file that can be read",
    )


def _heads_not_sought(heads: Sequence[str]) -> Iterator[CheckLine]:
    if heads:
        yield CheckLine(False, "A report alone holds no history in which a head could be found.")


def _folder_lines(folder: Path, heads: Sequence[str]) -> Iterator[CheckLine]:
    try:
        lines = [CheckLine(passed, f"{name}: {words}") for name, passed, words in check_folder(folder, heads)]
    except OSError as fault:
        raise _unreadable(Path(fault.filename or folder), fault) from fault
    if not lines:
        raise InputError(
            "No report to verify", where=str(folder), accepted="a folder that holds closed reports (.html)"
        )
    yield from lines


def read_head(text: str) -> str:
    """A head as a report prints it; blanks between its digits do not matter."""
    head = "".join(text.split()).lower()
    if re.fullmatch("[0-9a-f]{64}", head):
        return head
    raise ValueRejected(
        "this is no head",
        found=repr(text[:80]),
        accepted="the 64 digits (0-9, a-f) that a closed report prints as its chain head",
        remedy="copy it from the minutes or from a report, whole",
    )


def verify_desk(desk: Desk, *, heads: Sequence[str] = (), tell: Tell = quietly) -> CheckReport:
    """The full check of an open trial file, part by part."""
    parts = (*parts_of_trial(desk.trial, desk.settings.limits, heads), *_report_parts(desk))
    lines: list[CheckLine] = []
    for done, part in enumerate(parts):
        tell(Progress(done, len(parts), part.name))
        lines += part.check()
    return CheckReport((*lines, CheckLine(True, WHAT_IT_CANNOT)))


def _report_parts(desk: Desk) -> Iterator[Part]:
    """Each closed report set again from its point of the history: the same bytes where it was made here."""
    try:
        looks = desk.trial.state().frozen_looks
    except AppError:  # told where the history itself is checked
        return
    for look in looks:
        if look.frozen:
            yield _report_part(desk, look.frozen)


def _report_part(desk: Desk, frozen: Frozen) -> Part:
    def check() -> Iterator[CheckLine]:
        try:
            yield _report_again(desk, frozen)
        except AppError as fault:
            name = f"Look {frozen.body.look}, closed report"
            yield CheckLine(False, f"{name}: it cannot be set again: {fault}")

    return Part(f"the report of look {frozen.body.look}, set again", check)


def _report_again(desk: Desk, frozen: Frozen) -> CheckLine:
    body = frozen.body
    name = f"Look {body.look}, closed report"
    before = [entry for entry in desk.trial.entries() if entry.id < frozen.head.id]
    freezing = Freezing(frozen.at, body.by, body.head_before, body.disclosure)
    again = closed_report(desk, body.look, history_of(fold(before), before, freezing))
    if again == desk.trial.content(body.report_digest):
        return CheckLine(True, f"{name}: set again from its snapshot, it has the same bytes.")
    if body.environment != environment():
        made_by = f"program {body.environment.get('program')}, Python {body.environment.get('python')}"
        return CheckLine(
            True,
            f"{name}: set again here, it has other bytes, as is to be expected: it was made by {made_by} "
            "or on another machine. Its own bytes are those that the freeze entry names.",
        )
    return CheckLine(False, f"{name}: set again from its snapshot, it has other bytes.")


def record_verification(desk: Desk, checked: CheckReport, *, by: str = "", heads: Sequence[str] = ()) -> bool:
    """Enter a verification that found nothing, and say whether that could be done.

    Nothing is written into a damaged or read-only file.
    """
    if not (checked.ok and desk.may_write):
        return False
    name = recorded_name(by) if by else ""
    with desk.trial.act() as act:
        entries = desk.trial.entries()
        hashed = len({named.digest for entry in entries for named in read_body(entry).contents()})
        recomputed = tuple(look.number for look in act.state.frozen_looks)
        head = act.state.head
        act.append(Verification(head.digest, head.id, hashed, recomputed, tuple(heads), name))
    return True
