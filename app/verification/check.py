"""Walk the chain, hash every stored byte, compute every frozen look again, read every report's own record."""

from __future__ import annotations

import html
import re
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass
from itertools import islice
from typing import Any

from app.errors import AppError
from app.intake.amendment import plan_changes
from app.ledger.entries import Entry
from app.ledger.history import PlanVersion
from app.ledger.trial import Trial
from app.record.canonical import digest, parse_strict
from app.record.text import record_bytes
from app.settings import Limits
from app.verification.assembly import closed_view, compute, frozen_record, plan_under
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


@dataclass(frozen=True)
class Part:
    """One part of a verification: what it goes through, and the lines that come of it."""

    name: str
    check: Callable[[], Iterable[CheckLine]]


def parts_of_trial(trial: Trial, limits: Limits, heads: Sequence[str] = ()) -> tuple[Part, ...]:
    """Everything that the trial file can prove, and whether it holds the `heads` that were kept elsewhere."""
    chain = Part("the chain and every stored byte", lambda: _chain_lines(trial, heads))
    try:
        state = trial.state()
    except AppError as fault:
        unreadable = (CheckLine(False, str(fault)),)
        return chain, Part("what the history adds up to", lambda: unreadable)
    looks = [_look_part(trial, look.number, limits) for look in state.frozen_looks]
    plans = [_plan_part(trial, version, limits) for version in state.plans if version.amended]
    return chain, *plans, *looks


def _look_part(trial: Trial, number: int, limits: Limits) -> Part:
    return Part(
        f"look {number}, computed again", lambda: _told(f"look {number}", _recomputed, trial, number, limits)
    )


def _plan_part(trial: Trial, version: PlanVersion, limits: Limits) -> Part:
    name = f"plan version {version.version}"
    return Part(f"{name}, what it changed", lambda: _told(name, _compared_plans, trial, version, limits))


def _told(name: str, check: Callable[..., Iterator[CheckLine]], *given: Any) -> Iterator[CheckLine]:
    """The lines of a check, and a failed one where it could not go on."""
    try:
        yield from check(*given)
    except AppError as fault:
        yield CheckLine(False, f"{name[:1].upper()}{name[1:]} cannot be computed again: {fault}")


def _chain_lines(trial: Trial, heads: Sequence[str]) -> Iterator[CheckLine]:
    problems = dict.fromkeys((*trial.damage, *trial.check_chain(heads)))
    yield from (CheckLine(False, str(problem)) for problem in problems)
    if problems:
        return
    entries = trial.entries()
    yield CheckLine(
        True, f"The chain of {len(entries)} entries is whole, and every stored byte is as received."
    )
    for entry in entries:
        if entry.digest in heads:
            yield CheckLine(True, f"{_witnessed(entry)}; {len(entries) - entry.id} entries follow it.")
    yield from (CheckLine(True, f"Doubt: {doubt}") for doubt in trial.state().clock_doubts)


def _witnessed(entry: Entry) -> str:
    return (
        f"The head {entry.digest} is that of entry {entry.id}, written {entry.at}: "
        "the history up to there is as it was when the head was written down"
    )


def _compared_plans(trial: Trial, version: PlanVersion, limits: Limits) -> Iterator[CheckLine]:
    """What an amendment says it changed, against its plan and the one before."""
    plans = trial.state().plans
    before, after = (
        plan_under(trial, each.plan_digest, limits) for each in (plans[version.version - 2], version)
    )
    changes = [(each.key, each.before, each.after) for each in plan_changes(before, after)]
    said = (
        [(each.key, each.before, each.after) for each in version.amended.changes] if version.amended else []
    )
    name = f"Plan version {version.version}"
    if changes == said:
        yield CheckLine(True, f"{name} changes what its entry says: {', '.join(key for key, _, _ in said)}.")
    else:
        yield CheckLine(False, f"{name} changes other keys than its entry says: {changes} against {said}.")


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
