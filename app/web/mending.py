"""What a person is asked to mend, tied to the field where they can."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import TypeVar

from app.errors import AppError, InputError, sentence
from app.model.extract import Finding

T = TypeVar("T")


@dataclass(frozen=True)
class Mend:
    """One thing to mend: the clause that links to its field, the rest, and the words at the field."""

    field: str
    clause: str
    rest: str
    short: str

    @classmethod
    def of(cls, problem: AppError | Finding, field: str) -> Mend:
        whole, clause = str(problem), sentence(problem.what, problem.where).rstrip(".")
        if "\n" in whole or not whole.startswith(clause):  # several problems told at once
            return cls(field, whole, "", "See above")
        return cls(field, clause, whole[len(clause) :].lstrip(". "), sentence(problem.what).rstrip("."))


def read_field(text: str, field: str, read: Callable[[str], T], mends: list[Mend]) -> T | None:
    """What `read` makes of an answer; what it refuses is added to what is to mend."""
    try:
        return read(text)
    except InputError as error:
        mends.append(Mend.of(error, field))
        return None


def missing(what: str, *, accepted: str, field: str) -> Mend:
    """Something that was not given."""
    return Mend.of(InputError(what, accepted=accepted), field)


def first_at(mends: Sequence[Mend], field: str) -> Mend | None:
    """What stands at a field: the first thing to mend there."""
    return next((mend for mend in mends if mend.field == field), None)
