"""Every error a person can meet, each saying what, where, found, accepted and remedy.

AppError                 carries the five parts; str() is the sentence a person reads
├─ InputError            the user can mend it      exit code 2   ColumnMissing · ValueRejected · DesignInvalid
├─ NotEstimable          the data cannot answer    shown in place of the number
├─ AccuracyNotReached    numerics gave up          exit code 3
├─ LedgerError           history would be broken   exit code 4   LookAlreadyFrozen · LedgerChanged
└─ SetupError            the machine is not ready  exit code 5
"""

from __future__ import annotations

from typing import ClassVar


class AppError(Exception):
    """One thing that went wrong, told in five parts."""

    exit_code: ClassVar[int] = 2

    def __init__(
        self, what: str, *, where: str = "", found: str = "", accepted: str = "", remedy: str = ""
    ) -> None:
        self.what = what
        self.where = where
        self.found = found
        self.accepted = accepted
        self.remedy = remedy
        super().__init__(what, where, found, accepted, remedy)

    def __str__(self) -> str:
        return sentence(self.what, self.where, self.found, self.accepted, self.remedy)


def sentence(what: str, where: str = "", found: str = "", accepted: str = "", remedy: str = "") -> str:
    """`<What> in <where>. Found <found>. Accepted: <accepted>. <Remedy>.`, leaving out empty parts."""
    parts = [
        f"{what} in {where}" if where else what,
        f"Found {found}" if found else "",
        f"Accepted: {accepted}" if accepted else "",
        remedy,
    ]
    return " ".join(f"{part[0].upper()}{part[1:].rstrip('.')}." for part in parts if part)


class InputError(AppError):
    """The user can mend it."""


class ColumnMissing(InputError):
    """A column that the plan asks for is not in the extract."""


class ValueRejected(InputError):
    """A value lies outside its domain."""


class DesignInvalid(InputError):
    """The plan cannot be carried out as written."""


class NotEstimable(AppError):
    """The data cannot answer; `what` is the reason shown in place of the number."""


class AccuracyNotReached(AppError):
    """A numerical method stopped before its stated accuracy."""

    exit_code = 3


class LedgerError(AppError):
    """The act would break the history of the trial file."""

    exit_code = 4


class LookAlreadyFrozen(LedgerError):
    """A frozen look cannot change."""


class LedgerChanged(LedgerError):
    """The trial file no longer says what it said when it was written."""


class SetupError(AppError):
    """The machine or folder is not ready for the work."""

    exit_code = 5
