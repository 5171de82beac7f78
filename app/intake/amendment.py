"""What a new version of a plan changes, key by key, and which keys no amendment can change."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass, replace
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


def refuse_fixed(earlier: Sequence[Plan], amended: Plan, name: str) -> None:
    """PlanRefused with a sentence for each change that looks already held do not allow.

    `earlier` are all versions so far, the one in force last. A table that may come and go is held against the
    last version that had it, so that nothing turns round by being dropped and taken up again.
    """
    locked, new = _as_last_written(earlier), dict(_fixed_keys(amended))
    tables = {_table(key) for key in locked} & {_table(key) for key in new}
    problems = [
        DesignInvalid(
            f"{key} cannot be amended",
            where=name,
            found=new.get(key, NOT_SET),
            accepted=f"{locked.get(key, NOT_SET)}, as it was locked",
            remedy=FIXED[_unnumbered(key)],
        )
        for key in dict.fromkeys((*locked, *new))
        if _table(key) in tables and locked.get(key, NOT_SET) != new.get(key, NOT_SET)
    ]
    problems += _held_problems(plan_changes(earlier[-1], amended), name)
    if problems:
        raise PlanRefused(problems)


def _as_last_written(earlier: Sequence[Plan]) -> dict[str, str]:
    """The fixed keys of every table, as the last version that had the table has them."""
    locked: dict[str, str] = {}
    for plan in earlier:
        written_here = dict(_fixed_keys(plan))
        here = {_table(key) for key in written_here}
        locked = {key: value for key, value in locked.items() if _table(key) not in here} | written_here
    return locked


def _fixed_keys(plan: Plan) -> Iterator[tuple[str, str]]:
    """Harm that names no endpoint is judged on the plan's own, as if it had named that."""
    if plan.harm is not None and plan.harm.endpoint_parameter is None:
        plan = replace(plan, harm=replace(plan.harm, endpoint_parameter=plan.endpoint.parameter))
    return ((key, value) for key, value in _keys_of_plan(plan) if _unnumbered(key) in FIXED)


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


def _table(key: str) -> str:
    return key.rpartition(".")[0]


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
