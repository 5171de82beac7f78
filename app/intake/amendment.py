"""What a new version of a plan changes, key by key, and which keys no amendment can change."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass
from datetime import date
from typing import Any

from app.errors import DesignInvalid
from app.intake.plan import PlanRefused
from app.model.plan import Hypothesis, Plan

NOT_SET = "not set"
TABLE_OF_FIELD = {"hypotheses": "hypothesis"}
KEY_OF_FIELD = {"harm.endpoint_parameter": "harm.parameter"}

ANOTHER_TRIAL = "start a new trial file: with this it is another trial"
FIXED: Mapping[str, str] = {
    "trial.name": ANOTHER_TRIAL,
    "arms.control": ANOTHER_TRIAL,
    "arms.experimental": ANOTHER_TRIAL,
    "arms.masked": "leave it as it was; unmasking is an act of its own, and masking again is none",
    "endpoint.parameter": ANOTHER_TRIAL,
    "endpoint.event_is": ANOTHER_TRIAL,
    "design.sides": "leave it as it was: alpha was spent on the sides of the plan in force",
    "design.information": "leave it as it was: looks were held by the information of the plan in force",
    "harm.parameter": "leave it as it was: looks were held with harm judged on that endpoint",
    "hypothesis.event_is": "leave it as it was, or drop this hypothesis: looks were held in that direction",
}
"""Keys on which looks already held rest, with what a person can do instead."""


@dataclass(frozen=True)
class PlanChange:
    """One key of a plan, as it was written and as it is now; `not set` where it was left out."""

    key: str
    before: str
    after: str


def plan_changes(before: Plan, after: Plan) -> tuple[PlanChange, ...]:
    """Every key that means something else now, in the order of the plan file; defaults count as written."""
    old, new = dict(_keys_of_plan(before)), dict(_keys_of_plan(after))
    return tuple(
        PlanChange(key, old.get(key, NOT_SET), new.get(key, NOT_SET))
        for key in dict.fromkeys((*old, *new))
        if old.get(key, NOT_SET) != new.get(key, NOT_SET)
    )


def refuse_fixed(changes: Sequence[PlanChange], name: str) -> None:
    """PlanRefused with a sentence for each change that looks already held do not allow."""
    whole = {_table(change) for change in changes if _comes_or_goes(change)}
    problems = [
        DesignInvalid(
            f"{change.key} cannot be amended",
            where=name,
            found=change.after,
            accepted=f"{change.before}, as it was locked",
            remedy=remedy,
        )
        for change in changes
        if (remedy := FIXED.get(_unnumbered(change.key), "")) and _table(change) not in whole
    ]
    problems += _held_problems(changes, name)
    if problems:
        raise PlanRefused(problems)


def _held_problems(changes: Sequence[PlanChange], name: str) -> Iterator[DesignInvalid]:
    """One sentence for all held looks, without a value: masked pages show none of their z."""
    keys = [change.key for change in changes if change.key.startswith("held[")]
    if keys:
        yield DesignInvalid(
            "Held looks cannot be amended, added or left out",
            where=f"{name}, [[held]]",
            found=f"another {', '.join(keys)} than was locked",
            accepted="the held looks as they were locked: they came before this file and are used as used",
            remedy="write them as they were; while nothing was received, a new trial file can take others",
        )


MAY_COME_AND_GO = ("harm.spending", "hypothesis.spending")
"""A required key of each table that may be added or dropped whole; with it every key of the table changes."""


def _table(change: PlanChange) -> str:
    return change.key.rpartition(".")[0].removesuffix(".efficacy")


def _comes_or_goes(change: PlanChange) -> bool:
    key = _unnumbered(change.key).replace(".efficacy", "")
    return key in MAY_COME_AND_GO and NOT_SET in (change.before, change.after)


def _unnumbered(key: str) -> str:
    """The key without what tells tables of one name apart."""
    return re.sub(r"\[.*\]", "", key)


def _keys_of_plan(plan: Plan) -> Iterator[tuple[str, str]]:
    for part in fields(plan):
        if part.name != "digest":
            table = TABLE_OF_FIELD.get(part.name, part.name)
            yield from _keys(table, getattr(plan, part.name))


def _keys(name: str, value: Any) -> Iterator[tuple[str, str]]:
    """A table's keys by their full names; what was left out does not appear."""
    if is_dataclass(value):
        for key in fields(value):
            yield from _keys(f"{name}.{key.name}", getattr(value, key.name))
    elif isinstance(value, tuple) and value and is_dataclass(value[0]):
        for number, item in enumerate(value, start=1):
            told_apart_by = item.parameter if isinstance(item, Hypothesis) else number
            yield from _keys(f"{name}[{told_apart_by}]", item)
    elif value is not None and value != ():
        yield KEY_OF_FIELD.get(name, name), written(value)


def written(value: Any) -> str:
    """A value as a plan file would have it."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, tuple):
        return f"[{', '.join(map(written, value))}]"
    if isinstance(value, date):
        return value.isoformat()
    return f'"{value}"' if isinstance(value, str) else repr(value)
