"""Walk the chain, hash every stored byte, compute every frozen look again, read every report's own record."""

from __future__ import annotations

import html
import re
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import islice
from typing import Any

from app.errors import AppError
from app.ledger.trial import Trial
from app.record.canonical import digest, parse_strict
from app.record.text import record_bytes
from app.settings import Limits
from app.verification.assembly import closed_view, compute, frozen_record
from app.verification.comparison import differences
from app.views.closed import full_view
from app.views.record import looks_record

MOST_NAMED = 5
RECORD_IN_REPORT = re.compile(rb'<pre[^>]*\bid="record"[^>]*>(.*?)</pre>', re.DOTALL)
DIGEST_IN_REPORT = re.compile(rb"<dt>Record</dt><dd>SHA-256 ([0-9a-f]{64})</dd>")


@dataclass(frozen=True)
class CheckLine:
    """One thing that was checked, in words."""

    ok: bool
    text: str


@dataclass(frozen=True)
class CheckReport:
    lines: tuple[CheckLine, ...]

    @property
    def ok(self) -> bool:
        return all(line.ok for line in self.lines)


def check_trial(trial: Trial, limits: Limits) -> Iterator[CheckLine]:
    """Everything that the trial file alone can prove, a line at a time."""
    problems = dict.fromkeys((*trial.damage, *trial.check_chain()))
    yield from (CheckLine(False, str(problem)) for problem in problems)
    if not problems:
        entries = trial.entries()
        yield CheckLine(
            True, f"The chain of {len(entries)} entries is whole, and every stored byte is as received."
        )
    try:
        frozen = [look.number for look in trial.state().frozen_looks]
    except AppError as unreadable:
        yield CheckLine(False, str(unreadable))
        return
    for number in frozen:
        yield from _check_look(trial, number, limits)


def _check_look(trial: Trial, number: int, limits: Limits) -> Iterator[CheckLine]:
    try:
        yield from _recomputed(trial, number, limits)
    except AppError as unreadable:
        yield CheckLine(False, f"Look {number} cannot be computed again: {unreadable}")


def _recomputed(trial: Trial, number: int, limits: Limits) -> Iterator[CheckLine]:
    """The frozen record and the report's own record, each against the look computed today."""
    stored = frozen_record(trial, number)
    assembled = compute(trial, number, limits)
    frozen = trial.state().frozen_look(number).body
    again = _as_read(looks_record("look", [full_view(assembled.result, assembled.plan)], run_at=""))
    yield from _compared(f"look {number}, frozen record", stored, again)
    view = closed_view(trial, trial.state(), assembled, unmasked=frozen.disclosure == "unmasked")
    shown = _as_read(looks_record("look", [view], run_at=""))
    report = record_in_report(trial.content(frozen.report_digest))
    yield from _compared(f"look {number}, record in its report", report, shown)


def _as_read(record: dict[str, Any]) -> Any:
    """The record as it reads back from its text, so that both sides went the same way."""
    return parse_strict(record_bytes(record))


def _compared(name: str, stored: Any, again: Any) -> Iterator[CheckLine]:
    found = list(differences(stored, again))
    if not found:
        yield CheckLine(
            True, f"{name[:1].upper()}{name[1:]}: every number agrees with the one computed again."
        )
    for difference in islice(found, MOST_NAMED):
        yield CheckLine(False, f"{name}, {difference}")
    if len(found) > MOST_NAMED:
        yield CheckLine(False, f"{name}: {len(found) - MOST_NAMED} more numbers differ")


def record_in_report(report: bytes) -> Any:
    """The record that a report carries."""
    text = record_text_in_report(report)
    return parse_strict(text, "the record in the report")


def record_text_in_report(report: bytes) -> bytes:
    match = RECORD_IN_REPORT.search(report)
    return html.unescape(match.group(1).decode("utf-8")).encode("utf-8") if match else b""


def check_report(report: bytes) -> Iterator[CheckLine]:
    """What a report alone can prove: that the record in it is the one whose digest it prints."""
    text, printed = record_text_in_report(report), DIGEST_IN_REPORT.search(report)
    if not text or printed is None:
        yield CheckLine(
            False, "This file carries no record of a look: it is not a closed report, or it was cut."
        )
        return
    if digest(text) == printed.group(1).decode():
        yield CheckLine(True, "The record in the report is the one whose SHA-256 the report prints.")
    else:
        yield CheckLine(False, "The record in the report is not the one whose SHA-256 the report prints.")
    yield CheckLine(
        True,
        f"SHA-256 of the report: {digest(report)}. Compare it with the freeze entry of the trial file; "
        "the report alone cannot prove that it is the one that was frozen.",
    )
