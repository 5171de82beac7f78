"""A new trial file takes its name at the end, in one step, and never takes the place of another file."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from app.ledger.faults import TAKEN, disk_faults_told


@contextmanager
def created_whole(path: Path) -> Iterator[Path]:
    """A private, hidden file beside `path` that takes its name when the block ends well, else vanishes."""
    if os.path.lexists(path):
        raise TAKEN.at(path)
    with disk_faults_told(path):
        descriptor, name = tempfile.mkstemp(prefix=f".{path.name}.", suffix=".unfinished", dir=path.parent)
        os.close(descriptor)
    unfinished = Path(name)  # mkstemp made it readable and writable for its owner only
    try:
        yield unfinished
        with disk_faults_told(path):
            _take_name(unfinished, path)
            _sync_folder(path.parent)
    finally:
        for leftover in (unfinished, Path(f"{unfinished}-journal")):
            leftover.unlink(missing_ok=True)


def _take_name(unfinished: Path, path: Path) -> None:
    """A hard link refuses a name that is taken, which a rename would not."""
    try:
        os.link(unfinished, path)
    except FileExistsError:
        raise
    except OSError:  # a file system without hard links
        if os.path.lexists(path):
            raise
        unfinished.rename(path)


def _sync_folder(folder: Path) -> None:
    """Make the new name survive a loss of power."""
    descriptor = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
