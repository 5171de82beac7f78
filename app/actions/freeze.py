"""Freeze a look: record, bounds as used and closed report enter the trial file in one transaction."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime

from app import __version__
from app.actions.desk import Desk
from app.actions.environment import environment
from app.actions.looks import assembled_look, closed_book_of, history_of
from app.actions.names import recorded_name
from app.assets import asset
from app.errors import LedgerError
from app.ledger.bodies import LookFrozen, View
from app.ledger.trial import Act
from app.record.canonical import digest
from app.record.text import record_bytes
from app.render.page import page_environment
from app.render.report import ReportFacts, render_report
from app.sheets.record import Freezing, History
from app.sheets.words import moment_text
from app.verification.assembly import closed_view
from app.views.closed import full_view
from app.views.record import looks_record


@dataclass(frozen=True)
class FrozenLook:
    """What a freeze left: the report's digest, and the head that the freeze became."""

    look: int
    report_digest: str
    head: str


def freeze(desk: Desk, *, by: str) -> FrozenLook:
    """Freeze the open look. It cannot be changed or taken back."""
    name = recorded_name(by)
    with desk.trial.act() as act:
        return freeze_within(desk, act, by=name)


def freeze_within(desk: Desk, act: Act, *, by: str) -> FrozenLook:
    """The freeze as part of a larger act, after a quick verification of all that came before."""
    desk.trial.check_quickly()
    look = act.state.open_look
    if look is None:
        raise LedgerError("No look is open", remedy="receive a snapshot first: it opens the next look")
    disclosure: View = "unmasked" if act.state.unmasked else "masked"
    head_before = act.state.head.digest
    history = history_of(act.state, desk.trial.entries(), Freezing(act.at, by, head_before, disclosure))
    assembled = assembled_look(desk, look.number)
    record = record_bytes(looks_record("look", [full_view(assembled.result, assembled.plan)], run_at=act.at))
    report = closed_report(desk, look.number, history)
    entry = act.append(
        LookFrozen(
            look=look.number,
            record_digest=act.store(record),
            report_digest=act.store(report),
            disclosure=disclosure,
            head_before=head_before,
            environment=environment(),
            by=by,
        )
    )
    return FrozenLook(look.number, digest(report), entry.digest)


def closed_report(desk: Desk, number: int, history: History) -> bytes:
    """The closed report of a look as it is frozen at this point of the history: same point, same bytes."""
    freezing = history.freezing
    assert freezing is not None, "a report is set for a freeze"
    frozen_at = datetime.fromisoformat(freezing.at)
    assembled = assembled_look(desk, number)
    view = closed_view(desk.trial, history.state, assembled)
    record = record_bytes(looks_record("look", [view], run_at=freezing.at))
    facts = ReportFacts(
        frozen_at=moment_text(frozen_at),
        by=freezing.by,
        head_before=freezing.head_before,
        plan_digest=assembled.result.plan_digest,
        snapshot_digests=assembled.result.snapshot_digests,
        record_json=record.decode("utf-8"),
        record_digest=digest(record),
        program=f"Lookledger {__version__}",
    )
    book = closed_book_of(desk, number, history, frozen_at.date())
    return render_report(page_environment(asset("templates")), book, frozen=facts)
