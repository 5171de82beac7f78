"""A trial file opened for a command; what was noticed meanwhile is said when the command is done."""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from app.actions.desk import Desk
from app.settings import Settings


@contextmanager
def at_desk(settings: Settings, path: Path) -> Iterator[Desk]:
    """The desk with this trial file; damage and doubts about the clock are told on standard error."""
    with Desk.open(settings, path) as desk:
        for problem in desk.trial.damage:
            print(f"damaged, and opened for reading only: {problem}", file=sys.stderr)
        yield desk
        for doubt in desk.trial.take_clock_doubts():
            print(f"doubt: {doubt}", file=sys.stderr)
