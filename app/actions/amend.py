"""Amend the plan: a new version for the looks to come; what was held stays held as it was."""

from __future__ import annotations

from dataclasses import dataclass

from app.actions.desk import Desk
from app.actions.names import recorded_name, recorded_reason
from app.errors import LedgerError
from app.intake.amendment import PlanChange, plan_changes, refuse_fixed
from app.intake.plan import read_plan
from app.ledger.bodies import KeyChanged, PlanAmended
from app.ledger.history import State
from app.model.extract import Finding
from app.review.feasibility import plan_doubts
from app.verification.assembly import plan_under


@dataclass(frozen=True)
class Amendment:
    """What an amendment would be, before it is recorded.

    `results_opened` are the looks whose comparative results had been seen; `stays` is the open look, which
    remains under the version in force when its snapshot came. `doubts` are about the new plan by itself.
    """

    version: int
    changes: tuple[PlanChange, ...]
    results_opened: tuple[int, ...]
    unmasked: bool
    stays: int | None
    doubts: tuple[Finding, ...]


def understand_amendment(desk: Desk, *, plan_name: str, plan: bytes) -> Amendment:
    """Read the new plan and compare it with the one in force; nothing is stored."""
    return _amendment(desk, desk.trial.state(), plan_name, plan)


def amend(
    desk: Desk, *, plan_name: str, plan: bytes, reason: str, by: str, decided_by: str | None = None
) -> Amendment:
    """Record a new version of the plan. `decided_by` is who decided it, when that is not who records it."""
    said, name = recorded_reason(reason), recorded_name(by)
    decided = recorded_name(decided_by) if decided_by else name
    with desk.trial.act() as act:
        amendment = _amendment(desk, act.state, plan_name, plan)
        act.append(
            PlanAmended(
                version=amendment.version,
                plan_digest=act.store(plan),
                changes=tuple(KeyChanged(each.key, each.before, each.after) for each in amendment.changes),
                reason=said,
                decided_by=decided,
                results_opened=amendment.results_opened,
                unmasked=amendment.unmasked,
                by=name,
            )
        )
    return amendment


def _amendment(desk: Desk, state: State, plan_name: str, plan: bytes) -> Amendment:
    limits = desk.settings.limits
    amended = read_plan(plan, name=plan_name, limits=limits)
    earlier = [plan_under(desk.trial, version.plan_digest, limits) for version in state.plans]
    changes = plan_changes(earlier[-1], amended)
    refuse_fixed(earlier, amended, plan_name)
    if not changes:
        raise LedgerError(
            "An amendment that changes nothing",
            where=plan_name,
            found=f"the keys of plan version {state.plan.version}",
            accepted="a plan in which at least one key means something else",
            remedy="change the plan, or leave it as it is",
        )
    return Amendment(
        version=state.plan.version + 1,
        changes=changes,
        results_opened=state.results_opened,
        unmasked=state.unmasked,
        stays=state.open_look.number if state.open_look else None,
        doubts=plan_doubts(amended),
    )
