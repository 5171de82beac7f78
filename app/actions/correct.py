"""Correct in words what an earlier entry says; the entry itself stays for ever as it is."""

from __future__ import annotations

from app.actions.desk import Desk
from app.actions.names import LONGEST_REASON, recorded_name, said
from app.ledger.bodies import Erratum


def erratum(desk: Desk, *, entry: int, correction: str, by: str) -> None:
    """Record a correction to the entry of this number."""
    words = said(
        correction, "the correction", LONGEST_REASON, "say in a sentence what is wrong and what is right"
    )
    name = recorded_name(by)
    with desk.trial.act() as act:
        act.append(Erratum(entry, words, name))
