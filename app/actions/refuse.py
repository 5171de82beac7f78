"""Record that an extract was refused: its names, digests and sentences, and not one byte of it."""

from __future__ import annotations

from app.actions.desk import Desk
from app.actions.names import recorded_name
from app.actions.receive import Incoming, Understanding, understand
from app.errors import InputError
from app.ledger.bodies import FileKept, FindingKept, RefusalRecorded


def record_refusal(desk: Desk, incoming: Incoming, *, by: str) -> Understanding:
    """Record the findings that keep an extract out; InputError when none of them does."""
    name = recorded_name(by)
    understood = understand(desk, incoming)
    if not understood.extract.blocking:
        raise InputError(
            "An extract that can be used is not refused",
            found=f"{len(understood.extract.findings)} findings, none of which blocks",
            accepted="an extract with a finding that blocks",
            remedy="receive it, or say in an erratum why it is left out",
        )
    with desk.trial.act() as act:
        act.append(_body(understood, name))
    return understood


def _body(understood: Understanding, by: str) -> RefusalRecorded:
    delivery = understood.incoming.delivery
    return RefusalRecorded(
        kind=delivery.kind,
        cutoff=understood.incoming.cutoff.isoformat(),
        extracted=delivery.extracted.isoformat() if delivery.extracted else None,
        files=tuple(FileKept(file.name, file.digest) for file in delivery.files),
        findings=tuple(map(FindingKept.of, understood.extract.findings)),
        by=by,
    )
