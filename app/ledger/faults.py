"""Faults of SQLite and of the disk as sentences: the one place where they are told."""

from __future__ import annotations

import errno
import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path

from app.errors import AppError, LedgerChanged, LedgerError, SetupError, ValueRejected

NOT_STORED = "Nothing of this act was stored"
A_TRIAL_FILE = "a trial file that this program made"


@dataclass(frozen=True)
class Fault:
    """How one kind of fault is told."""

    error: type[AppError]
    what: str
    found: str = ""
    accepted: str = ""
    remedy: str = ""

    def at(self, path: Path, detail: str = "") -> AppError:
        return self.error(
            self.what,
            where=str(path),
            found=self.found or detail,
            accepted=self.accepted,
            remedy=self.remedy,
        )


NOT_A_TRIAL_FILE = Fault(
    ValueRejected,
    "There is no trial",
    found="a file of another kind",
    accepted=A_TRIAL_FILE,
    remedy="name the right file, or start a new one",
)
MISSING = Fault(
    ValueRejected,
    "There is no trial file",
    found="no file of that name",
    accepted="the path of a trial file",
    remedy="name the right file, or start a new one",
)
NO_FOLDER = Fault(
    ValueRejected,
    "No new trial file can be made",
    found="no such folder",
    accepted="a path in a folder that exists",
    remedy="make the folder first, or choose another",
)
TAKEN = Fault(
    ValueRejected,
    "No new trial file can be made",
    found="a file of that name already",
    accepted="a new name",
    remedy="choose another name; nothing was overwritten",
)
UNWRITABLE = Fault(
    SetupError,
    "No permission to write",
    accepted="a file and a folder that may be written",
    remedy=f"{NOT_STORED}; give the permission, or copy the file to a folder of your own",
)
FULL = Fault(
    SetupError,
    "No room is left for writing",
    accepted="free space of twice the files received",
    remedy=f"{NOT_STORED}; make room and repeat it",
)
DISK = Fault(
    SetupError,
    "The disk failed to read or write",
    remedy=f"{NOT_STORED}; check the disk and the connection to it, then repeat",
)
DAMAGED = Fault(
    LedgerChanged,
    "damaged pages",
    remedy="Nothing was written; keep this file as it is, verify it, and go back to a backup",
)
UNKNOWN = Fault(LedgerError, "SQLite could not do its work", remedy=f"{NOT_STORED}; verify the file")

BY_RESULT = {
    "SQLITE_NOTADB": NOT_A_TRIAL_FILE,
    "SQLITE_BUSY": Fault(
        LedgerError,
        "Another program is in the middle of an act",
        found="a lock that did not open in time",
        remedy=f"{NOT_STORED}; let the other finish or end it, then repeat",
    ),
    "SQLITE_READONLY": UNWRITABLE,
    "SQLITE_READONLY_DBMOVED": Fault(
        LedgerError,
        "The opened trial file is no longer found",
        found="a file that was moved, removed or replaced since it was opened",
        accepted="the file that was opened",
        remedy=f"{NOT_STORED}; put the file back, or open it in its new place",
    ),
    "SQLITE_READONLY_ROLLBACK": Fault(
        SetupError,
        "An act that was cut off waits to be undone",
        found="its journal, in a place that may not be written",
        accepted="a file and a folder that may be written",
        remedy="copy the file together with its journal to a folder of your own and open it there",
    ),
    "SQLITE_FULL": FULL,
    "SQLITE_IOERR": DISK,
    "SQLITE_CANTOPEN": Fault(
        SetupError,
        "No access to the trial file or to the journal beside it",
        accepted="a file and a folder that may be read and written",
        remedy=f"{NOT_STORED}; check that both are there and yours",
    ),
    "SQLITE_PERM": UNWRITABLE,
    "SQLITE_CORRUPT": DAMAGED,
    "SQLITE_ERROR": DAMAGED,  # our statements are fixed, so one that does not run met other tables
    "SQLITE_CONSTRAINT": Fault(
        LedgerError,
        "The history is only ever appended to",
        remedy=f"{NOT_STORED}; verify the file",
    ),
    "SQLITE_TOOBIG": Fault(
        ValueRejected,
        "A file is too large to be stored",
        accepted="files below 1 GB",
        remedy=f"{NOT_STORED}; leave out what is not needed",
    ),
}
"""By the longest beginning of SQLite's result name that is listed."""

BY_NUMBER = {
    errno.ENOENT: NO_FOLDER,
    errno.ENOTDIR: NO_FOLDER,
    errno.EEXIST: TAKEN,
    errno.EACCES: UNWRITABLE,
    errno.EPERM: UNWRITABLE,
    errno.EROFS: UNWRITABLE,
    errno.ENOSPC: FULL,
    errno.EDQUOT: FULL,
}


def told(fault: sqlite3.Error, path: Path) -> AppError:
    """The sentence for what SQLite reported."""
    name: str = getattr(fault, "sqlite_errorname", "")
    while name and name not in BY_RESULT:
        name = name.rpartition("_")[0]
    return BY_RESULT.get(name, UNKNOWN).at(path, detail=str(fault))


@contextmanager
def disk_faults_told(path: Path) -> Iterator[None]:
    """Turn what the operating system reports into a sentence about `path`."""
    try:
        yield
    except OSError as fault:
        raise BY_NUMBER.get(fault.errno or 0, DISK).at(path, detail=str(fault.strerror)) from fault
