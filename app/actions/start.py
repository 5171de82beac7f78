"""Lock a plan into a new trial file."""

from __future__ import annotations

from pathlib import Path

from app.actions.names import recorded_name
from app.errors import DesignInvalid
from app.intake.plan import read_plan
from app.ledger.trial import Trial
from app.model.extract import Finding
from app.model.plan import Plan
from app.review.feasibility import plan_doubts
from app.review.held import held_looks
from app.settings import Settings


def refuse_telling_held_look(plan: Plan, plan_name: str) -> None:
    """Masked, a crossing before this file would say which of A and B is experimental."""
    past, _ = held_looks(plan)
    first = next((look.number for look in past if look.crossed != "none"), None)
    if plan.arms.masked and first is not None:
        raise DesignInvalid(
            "a held look that crossed its bound would give the arm letters away",
            where=f"{plan_name}, [[held]]",
            found=f"look {first} beyond its efficacy_z, and arms that start masked",
            accepted="masked = false in [arms], or held looks of which none crossed",
            remedy="write masked = false, or correct the held look",
        )


def start(settings: Settings, *, plan_name: str, plan: bytes, path: Path, by: str) -> tuple[Finding, ...]:
    """Read and check the plan, draw the arm letters, and write both into a new file; the plan's doubts."""
    read = read_plan(plan, name=plan_name, limits=settings.limits)
    refuse_telling_held_look(read, plan_name)
    doubts = plan_doubts(read)
    Trial.create(
        path,
        settings,
        name=read.trial.name,
        plan=plan,
        by=recorded_name(by),
        masked=read.arms.masked,
        looks_held_before=len(read.held),
    ).close()
    return doubts
