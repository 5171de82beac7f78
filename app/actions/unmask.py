"""Show which arm is which letter, from here on and for ever."""

from __future__ import annotations

from app.actions.desk import Desk
from app.actions.names import recorded_name, recorded_reason
from app.ledger.bodies import ArmsUnmasked


def unmask(desk: Desk, *, reason: str, by: str) -> None:
    """Record the unmasking with the key that the lock committed to."""
    said, name = recorded_reason(reason), recorded_name(by)
    with desk.trial.act() as act:
        act.append(ArmsUnmasked.of(desk.trial.letter_key(), said, name))
