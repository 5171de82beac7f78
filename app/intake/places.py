"""Where in a plan file something stands, and how its values are quoted."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import date
from typing import Any

LONGEST_QUOTE = 60


@dataclass(frozen=True)
class Place:
    """`q17.toml, table [design], key alpha`, growing from left to right."""

    file: str
    steps: tuple[str, ...] = ()

    def table(self, name: str, *, number: int | None = None, repeated: bool = False) -> Place:
        heading = f"[[{name}]]" if repeated else f"[{name}]"
        return self._then(f"table {heading}" + (f" number {number}" if number else ""))

    def key(self, name: str) -> Place:
        return self._then(f"key {name}")

    def _then(self, step: str) -> Place:
        return replace(self, steps=(*self.steps, step))

    def __str__(self) -> str:
        return ", ".join((self.file, *self.steps))


def shown(value: Any) -> str:
    """A value as its writer would recognise it, cut where it is long."""
    if isinstance(value, bool):
        return "true" if value else "false"
    text = value.isoformat() if isinstance(value, date) else repr(value)
    return text if len(text) <= LONGEST_QUOTE else f"{text[:LONGEST_QUOTE]}..."
