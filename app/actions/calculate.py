"""Numbers without a trial file: a plan's boundary, looks evaluated in order, the published values."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date
from typing import Any

from app.actions.desk import UploadedFile
from app.errors import InputError
from app.intake.extract import received_file
from app.intake.plan import read_plan
from app.model.boundary import LookAsUsed
from app.model.extract import LookKind
from app.review import as_used
from app.review.feasibility import boundary_of, plan_doubts, power_doubts
from app.review.held import held_looks
from app.review.received import Delivery, review_delivery
from app.sequential.design import bounds_planned
from app.settings import Settings
from app.validation import published_rows
from app.validation.rows import RowOutcome
from app.views.closed import ClosedView, Letters, unmasked_view
from app.views.planned_record import boundary_record
from app.views.record import evaluation_record
from app.views.what_if import what_if


@dataclass(frozen=True)
class LookGiven:
    """One look for `evaluate`: its files, its cutoff when dates are to be checked, its kind (or planned)."""

    files: tuple[UploadedFile, ...]
    cutoff: date | None
    kind: LookKind | None

    @property
    def delivery(self) -> Delivery:
        files = tuple(received_file(file.name, file.content) for file in self.files)
        return Delivery(files, self.kind or "planned", self.cutoff)


def evaluate(
    settings: Settings,
    *,
    plan_name: str,
    plan: bytes,
    looks: Sequence[LookGiven],
    hazard_ratio: float | None = None,
) -> dict[str, Any]:
    """The record of these looks, held one after the other under the plan, each bound on those before.

    `hazard_ratio` is a chosen one, under which conditional power is given besides.
    """
    if not looks:
        raise InputError("No look to evaluate", accepted="the files of at least one look")
    read = read_plan(plan, name=plan_name, limits=settings.limits)
    held, compared = held_looks(read)
    past: list[LookAsUsed] = [*held]
    views: list[ClosedView] = []
    earlier: Delivery | None = None
    for number, given in enumerate(looks, start=len(held) + 1):
        delivery = given.delivery
        reviewed = review_delivery(
            read, delivery, earlier, past, number=number, limits=settings.limits, held=compared
        )
        views.append(unmasked_view(reviewed.result, read, Letters("A")))
        past.append(as_used(reviewed.result))
        earlier = delivery
    doubts = plan_doubts(read)
    asked = [None if hazard_ratio is None else what_if(view, hazard_ratio) for view in views]
    return evaluation_record(views, asked, run_at=_now(settings), plan_findings=doubts)


def boundary(
    settings: Settings, *, plan_name: str, plan: bytes, fractions: Sequence[float] | None, final: bool
) -> dict[str, Any]:
    """The record of a plan's bounds at its own looks or at these fractions."""
    read = read_plan(plan, name=plan_name, limits=settings.limits)
    planned = boundary_of(read, fractions, final=final)
    hypotheses = [
        (each, bounds_planned(read.for_hypothesis(each), fractions, final=final)) for each in read.hypotheses
    ]
    doubts = power_doubts(read, planned.feasibility)
    return boundary_record(planned, read, run_at=_now(settings), hypotheses=hypotheses, findings=doubts)


def validate() -> tuple[RowOutcome, ...]:
    """Every published value against what the program computes."""
    return tuple(row.check() for row in published_rows())


def _now(settings: Settings) -> str:
    return settings.clock().isoformat().replace("+00:00", "Z")
