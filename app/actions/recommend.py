"""Record what the committee recommended, and say what goes with a recommendation to stop."""

from __future__ import annotations

from datetime import date
from difflib import get_close_matches
from typing import get_args

from app.actions.desk import Desk
from app.actions.names import recorded_name, recorded_reason
from app.errors import LedgerError, ValueRejected
from app.ledger.bodies import Advice, Recommendation

ADVICE: tuple[Advice, ...] = get_args(Advice)
WITHOUT_A_CROSSING = (
    "Advising a stop for benefit without a crossing gives up the plan's error control; "
    "the Boundary sheet of the look says where the test stands."
)
ALPHA_STAYS = (
    "Ending early because of comparative results does not release the alpha that is left: "
    "a look held later is a final one only by its declaration or its information."
)


def read_advice(text: str, *, where: str) -> Advice:
    """What is recommended, in one of the words kept for it."""
    for advice in ADVICE:
        if text == advice:
            return advice
    nearest = get_close_matches(text, ADVICE, n=1)
    raise ValueRejected(
        "this is no recommendation that can be recorded" if text else "the recommendation is missing",
        where=where,
        found=repr(text[:40]) if text else "",
        accepted=", ".join(ADVICE),
        remedy=f"Write {nearest[0]!r} if that is meant" if nearest else "Name one of them",
    )


def recommend(
    desk: Desk,
    *,
    advice: Advice,
    reason: str,
    by: str,
    look: int | None = None,
    held_on: date | None = None,
) -> tuple[int, tuple[str, ...]]:
    """Record a recommendation on a frozen look (the last one by default); the look, and what goes with it.

    `held_on` is the day the committee met, today by default.
    """
    said, name = recorded_reason(reason), recorded_name(by)
    today = desk.settings.clock().date()
    if held_on is not None and held_on > today:
        raise ValueRejected(
            "A meeting in the future",
            found=str(held_on),
            accepted=f"a date up to {today}",
            remedy="correct it",
        )
    with desk.trial.act() as act:
        number = look if look is not None else last_frozen(desk)
        act.append(Recommendation(number, advice, said, (held_on or today).isoformat(), name))
    return number, what_goes_with(advice)


def last_frozen(desk: Desk) -> int:
    frozen = desk.trial.state().frozen_looks
    if not frozen:
        raise LedgerError(
            "No look is frozen",
            accepted="a recommendation on a frozen look, because it rests on what was shown",
            remedy="freeze the look first",
        )
    return frozen[-1].number


def what_goes_with(advice: Advice) -> tuple[str, ...]:
    """What a committee that recommends this is told."""
    if advice == "stop for benefit":
        return WITHOUT_A_CROSSING, ALPHA_STAYS
    return (ALPHA_STAYS,) if advice in ("stop for futility", "stop for harm") else ()
