"""Copy the trial file whole, verify the copy, and record that it was made."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from app.actions.desk import Desk
from app.actions.names import recorded_name


@dataclass(frozen=True)
class BackupMade:
    """Where the copy lies, its SHA-256, and the head it ends with; `recorded` when the trial file says so."""

    path: Path
    digest: str
    head: str
    recorded: bool


def backup(desk: Desk, to: Path, *, by: str) -> BackupMade:
    """Back up to the file `to`, or into the folder `to` under a name that carries the time.

    A program that runs by the clock may do it, so nobody needs to be named.
    """
    name = recorded_name(by) if by else ""
    path = to / f"{desk.path.stem}-{desk.settings.clock():%Y%m%dT%H%M%SZ}.trial" if to.is_dir() else to
    made = desk.trial.back_up(path, by=name)
    return BackupMade(path, made.file_digest, made.head, recorded=desk.may_write)
