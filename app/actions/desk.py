"""The desk: one open trial file with its settings and its cache of looks."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from threading import Lock
from typing import Any, Self, TypeVar

from app.ledger.closing import Closing
from app.ledger.trial import Trial
from app.settings import Settings

T = TypeVar("T")
LOOKS_KEPT = 8
COUNTS_KEPT = 1000


@dataclass(frozen=True)
class UploadedFile:
    """A file as a person gave it: its own name and its bytes."""

    name: str
    content: bytes


class Cache:
    """The last few computed values by key. A look never changes under its key, so nothing is ever stale."""

    def __init__(self, kept: int = LOOKS_KEPT) -> None:
        self._kept = kept
        self._values: OrderedDict[Any, Any] = OrderedDict()
        self._lock = Lock()

    def get(self, key: Any, compute: Callable[[], T]) -> T:
        with self._lock:
            if key in self._values:
                self._values.move_to_end(key)
                found: T = self._values[key]
                return found
        value = compute()
        with self._lock:
            self._values[key] = value
            while len(self._values) > self._kept:
                self._values.popitem(last=False)
        return value


class Desk(Closing):
    """What every action on a trial file needs; the open side's looks are cached apart from the closed's."""

    def __init__(self, settings: Settings, trial: Trial) -> None:
        self.settings = settings
        self.trial = trial
        self.closed_looks = Cache()
        self.open_looks = Cache()
        self.open_counts = Cache(COUNTS_KEPT)

    @classmethod
    def open(cls, settings: Settings, path: Path) -> Self:
        return cls(settings, Trial.open(path, settings))

    @property
    def path(self) -> Path:
        return self.trial.path

    @property
    def read_only(self) -> bool:
        return self.trial.read_only

    @property
    def may_write(self) -> bool:
        """False for a file that may only be read, and for one in which damage was found."""
        return not (self.trial.read_only or self.trial.damage)

    def close(self) -> None:
        self.trial.close()
