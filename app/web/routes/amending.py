"""Amending the plan: what would change is shown key by key; nothing is recorded before that is confirmed."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.amend import Amendment, amend, understand_amendment
from app.actions.names import recorded_name, recorded_reason
from app.errors import AppError, InputError, LedgerError
from app.sheets.blocks import Cell, Column, Row, Table
from app.sheets.plan_versions import known_before
from app.sheets.words import line
from app.web.forms import SubmittedForm
from app.web.keys import random_word
from app.web.mending import Mend, missing, read_field
from app.web.routes.acts import show
from app.web.routes.record import to_record
from app.web.sessions import PlanUpload, Session
from app.web.site import SEE_OTHER, Site, TheSession, TheSite

router = APIRouter()

FORM, CONFIRM = "/closed/amend", "/closed/amend/confirm"


@router.get(FORM)
def ask_for_plan(site: TheSite, session: TheSession) -> Response:
    return show(site, session, "amend", [])


@router.post(FORM)
def take_plan(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Read the plan and keep it in memory for this session when it is an amendment."""
    if len(form.files) != 1:
        accepted = "one plan file"
        return show(site, session, "amend", [missing("no plan was chosen", accepted=accepted, field="plan")])
    (file,) = form.files
    try:
        understand_amendment(site.desk, plan_name=file.name, plan=file.content)
    except (InputError, LedgerError) as error:
        return show(site, session, "amend", [Mend.of(error, "plan")])
    session.plan = PlanUpload(random_word(site.settings.random_bytes), file)
    return RedirectResponse(CONFIRM, SEE_OTHER)


@router.get(CONFIRM)
def show_amendment(site: TheSite, session: TheSession) -> Response:
    plan = session.plan
    if plan is None:
        return RedirectResponse(FORM, SEE_OTHER)
    return show_plan(site, session, plan, {"reason": "", "decided_by": ""}, [])


@router.post(CONFIRM)
def record_amendment(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Record what was shown. A page of an earlier plan cannot confirm a later one."""
    plan = session.plan
    if plan is None or form.text("token") != plan.token:
        return RedirectResponse(CONFIRM if plan else FORM, SEE_OTHER)
    mends: list[Mend] = []
    session.by = form.text("by")
    answers = {name: form.text(name) for name in ("reason", "decided_by")}
    reason = read_field(answers["reason"], "reason", recorded_reason, mends)
    by = read_field(session.by, "by", recorded_name, mends)
    decided_by = answers["decided_by"] or session.by
    decided = read_field(decided_by, "decided_by", recorded_name, mends) if by is not None else None
    if reason is None or by is None or decided is None:
        return show_plan(site, session, plan, answers, mends)
    amend(
        site.desk,
        plan_name=plan.file.name,
        plan=plan.file.content,
        reason=reason,
        by=by,
        decided_by=decided,
    )
    session.plan = None
    return to_record(site)


def show_plan(
    site: Site, session: Session, plan: PlanUpload, answers: dict[str, str], mends: list[Mend]
) -> Response:
    try:
        amendment = understand_amendment(site.desk, plan_name=plan.file.name, plan=plan.file.content)
    except AppError:  # another amendment came first
        session.plan = None
        raise
    return show(
        site,
        session,
        "amendment",
        mends,
        amendment=amendment,
        changes=changes_table(amendment),
        known=known_before(amendment),
        token=plan.token,
        answers=answers,
        by=session.by,
    )


def changes_table(amendment: Amendment) -> Table:
    rows = tuple(
        Row(line(each.key), (Cell(line(each.before)), Cell(line(each.after)))) for each in amendment.changes
    )
    columns = (Column(line("in force"), "words"), Column(line("from then on"), "words"))
    return Table(line("What the amendment changes"), columns, rows, line("Key"))
