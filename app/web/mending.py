"""What a person is asked to mend, tied to the field where they can."""

from __future__ import annotations

from dataclasses import dataclass

from app.errors import AppError, InputError, sentence
from app.model.extract import Finding


@dataclass(frozen=True)
class Mend:
    """One thing to mend: the clause that links to its field, and the rest of the sentence."""

    field: str
    clause: str
    rest: str

    @classmethod
    def of(cls, problem: AppError | Finding, field: str) -> Mend:
        whole, clause = str(problem), sentence(problem.what, problem.where).rstrip(".")
        if not whole.startswith(clause):  # several problems told at once
            return cls(field, whole, "")
        return cls(field, clause, whole[len(clause) :].lstrip(". "))


def missing(what: str, *, accepted: str, field: str) -> Mend:
    """A field that was left empty."""
    return Mend.of(InputError(what, accepted=accepted, remedy="Fill in the field"), field)


def by_field(mends: list[Mend]) -> dict[str, Mend]:
    """The first thing to mend at each field."""
    return {mend.field: mend for mend in reversed(mends)}
