"""Lock a plan into a new trial file."""

from __future__ import annotations

from pathlib import Path

from app.actions.names import recorded_name
from app.intake.plan import read_plan
from app.ledger.trial import Trial
from app.settings import Settings


def start(settings: Settings, *, plan_name: str, plan: bytes, path: Path, by: str) -> None:
    """Read and check the plan, draw the arm letters, and write both into a new file."""
    read = read_plan(plan, name=plan_name, limits=settings.limits)
    Trial.create(
        path, settings, name=read.trial.name, plan=plan, by=recorded_name(by), masked=read.arms.masked
    ).close()
