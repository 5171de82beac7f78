"""The open view of a look: pooled, computed from types that have no arm."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from app.model.look import PooledResult


@dataclass(frozen=True, eq=False)
class OpenView:
    """What may be said outside the closed session. `planned` are the plan's information fractions.

    Fractions are by events; `by` says so where the plan counts information in another way.
    """

    trial_name: str
    trial_title: str
    planned: tuple[float, ...]
    planned_subjects: int | None
    look: PooledResult
    by: Literal["", "events"] = ""
