"""What a person answers - dates, the kind of look, a hazard ratio - read once for pages and commands."""

from __future__ import annotations

import re
from datetime import date
from difflib import get_close_matches
from typing import get_args

from app.errors import ValueRejected
from app.model.extract import LookKind

LOWEST_RATIO, HIGHEST_RATIO = 0.05, 20.0
LOOK_KINDS: tuple[LookKind, ...] = get_args(LookKind)


def read_day(text: str, *, where: str) -> date:
    """A date written yyyy-mm-dd; `where` is the field or option, as sentences name it."""
    try:
        # fromisoformat alone also takes 20270108 and 2027-W01-5, which nobody means
        return (
            date.fromisoformat(text) if re.fullmatch(r"\d{4}-\d\d-\d\d", text) else _refuse_day(text, where)
        )
    except ValueError:
        return _refuse_day(text, where)


def _refuse_day(text: str, where: str) -> date:
    raise ValueRejected(
        "there is no such date" if text else "a date is missing",
        where=where,
        found=repr(text[:40]) if text else "",
        accepted="a date of the calendar written yyyy-mm-dd, such as 2027-01-08",
        remedy="Write the date in this form",
    )


def read_kind(text: str, *, where: str) -> LookKind:
    """The declared kind of a look."""
    if text in LOOK_KINDS:
        return text
    nearest = get_close_matches(text, LOOK_KINDS, n=1)
    raise ValueRejected(
        "this is no kind of look" if text else "the kind of look is missing",
        where=where,
        found=repr(text[:40]) if text else "",
        accepted=", ".join(LOOK_KINDS),
        remedy=f"Write {nearest[0]!r} if that is meant" if nearest else "Name one of them",
    )


def read_hazard_ratio(text: str, *, where: str) -> float:
    """A hazard ratio, experimental / control, written with a decimal point or a decimal comma."""
    written = text.strip()
    ratio = float(written.replace(",", ".")) if re.fullmatch(r"[0-9]{0,3}[.,]?[0-9]{1,17}", written) else None
    if ratio is not None and LOWEST_RATIO <= ratio <= HIGHEST_RATIO:
        return ratio
    raise ValueRejected(
        "a hazard ratio lies out of bounds" if ratio is not None else "this is no hazard ratio",
        where=where,
        found=repr(text[:40]),
        accepted=f"a number from {LOWEST_RATIO:g} to {HIGHEST_RATIO:g}, experimental / control, such as 0.8",
        remedy="Write one number, with a decimal point or comma",
    )
