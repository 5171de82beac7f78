"""Lock a plan into a new trial file."""

from __future__ import annotations

from pathlib import Path

from app.actions.names import recorded_name
from app.errors import DesignInvalid
from app.intake.plan import read_plan
from app.ledger.trial import Trial
from app.model.plan import Plan
from app.settings import Settings


def refuse_held_looks(plan: Plan, plan_name: str) -> None:
    """A trial file numbers its looks from 1, and each has its snapshot."""
    if plan.held:
        raise DesignInvalid(
            "held looks have no snapshot in a trial file",
            where=f"{plan_name}, [[held]]",
            found=f"{len(plan.held)} of them",
            accepted="[[held]] with the command evaluate only",
            remedy="take the tables out and receive the extracts of those looks, or use evaluate",
        )


def start(settings: Settings, *, plan_name: str, plan: bytes, path: Path, by: str) -> None:
    """Read and check the plan, draw the arm letters, and write both into a new file."""
    read = read_plan(plan, name=plan_name, limits=settings.limits)
    refuse_held_looks(read, plan_name)
    Trial.create(
        path, settings, name=read.trial.name, plan=plan, by=recorded_name(by), masked=read.arms.masked
    ).close()
