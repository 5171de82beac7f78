"""What the outside passes in: the clock, randomness and limits. Built once by cli, never fetched."""

from __future__ import annotations

import secrets
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import UTC, datetime


def utc_now() -> datetime:
    """The time now, in UTC, to the second: entries and reports carry no finer time."""
    return datetime.now(UTC).replace(microsecond=0)


@dataclass(frozen=True)
class Limits:
    """How much is accepted before a sentence says no."""

    upload_bytes: int = 64 * 1024 * 1024
    form_bytes: int = 256 * 1024
    rows: int = 2_000_000
    plan_bytes: int = 256 * 1024
    findings_shown: int = 5
    session_idle_seconds: int = 60 * 60
    session_seconds: int = 12 * 60 * 60


@dataclass(frozen=True)
class Settings:
    """Everything the program takes from its surroundings."""

    clock: Callable[[], datetime] = utc_now
    random_bytes: Callable[[int], bytes] = secrets.token_bytes
    limits: Limits = field(default_factory=Limits)
