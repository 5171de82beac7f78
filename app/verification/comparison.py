"""Two records of one look, compared number by number."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

RELATIVE = 1e-9
NOT_COMPARED = frozenset({"run_at", "program"})  # when and by which version: true of each record by itself


@dataclass(frozen=True)
class Difference:
    """One place of the record, what is stored there and what is computed today."""

    place: str
    stored: Any
    computed: Any

    def __str__(self) -> str:
        return f"{self.place}: stored {_said(self.stored)}, computed {_said(self.computed)}"


def _said(value: Any) -> str:
    return f"{type(value).__name__} of {len(value)}" if isinstance(value, dict | list) else repr(value)


def differences(stored: Any, computed: Any, place: str = "") -> Iterator[Difference]:
    """Numbers agree to 1e-9 relative (another processor's last bits differ); counts and words exactly.

    What is computed may hold more names than what was stored: the schema says which came later.
    """
    if isinstance(stored, dict) and isinstance(computed, dict) and stored.keys() <= computed.keys():
        for key in stored:
            if place or key not in NOT_COMPARED:
                yield from differences(stored[key], computed[key], f"{place}.{key}" if place else key)
    elif isinstance(stored, list) and isinstance(computed, list) and len(stored) == len(computed):
        for index, (left, right) in enumerate(zip(stored, computed, strict=True)):
            yield from differences(left, right, f"{place}[{index}]")
    elif not _agree(stored, computed):
        yield Difference(place, stored, computed)


def _agree(stored: Any, computed: Any) -> bool:
    if isinstance(stored, float) and isinstance(computed, float):
        return math.isclose(stored, computed, rel_tol=RELATIVE, abs_tol=1e-300)
    return type(stored) is type(computed) and bool(stored == computed)
