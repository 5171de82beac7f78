"""Files that a command names, read whole."""

from __future__ import annotations

from pathlib import Path

from app.actions.desk import UploadedFile
from app.errors import InputError


def read_file(path: Path) -> bytes:
    """The bytes of a file, or one sentence why they cannot be had."""
    try:
        return path.read_bytes()
    except OSError as refusal:
        raise InputError(
            "the file cannot be read",
            where=str(path),
            found=refusal.strerror or type(refusal).__name__,
            accepted="a file that this user may read",
        ) from refusal


def uploaded(path: Path) -> UploadedFile:
    """A file of an extract as it is received: its own name without folders, and its bytes."""
    return UploadedFile(name=path.name, content=read_file(path))
