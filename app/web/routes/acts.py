"""What a person does on the closed side besides reading: freeze, take the report, unmask."""

from __future__ import annotations

from typing import Any

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.freeze import freeze
from app.actions.looks import looks
from app.actions.names import recorded_name, recorded_reason
from app.actions.report import report
from app.actions.unmask import unmask
from app.errors import LookAlreadyFrozen
from app.web.files import archive, attachment
from app.web.forms import SubmittedForm
from app.web.mending import Mend, read_field
from app.web.routes.looks import CLOSED, closed_look, newest_frame, require_look
from app.web.sessions import Session
from app.web.site import SEE_OTHER, LookNumber, Site, TheSession, TheSite

router = APIRouter()


@router.get("/closed/looks/{look}/freeze")
def ask_to_freeze(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    require_open(site, look)
    return show(site, session, "freeze", [], look=look, by=session.by)


@router.post("/closed/looks/{look}/freeze")
def freeze_look(site: TheSite, session: TheSession, look: LookNumber, form: SubmittedForm) -> Response:
    require_open(site, look)
    mends: list[Mend] = []
    session.by = form.text("by")
    by = read_field(session.by, "by", recorded_name, mends)
    if by is None:
        return show(site, session, "freeze", mends, look=look, by=session.by)
    freeze(site.desk, by=by)
    return RedirectResponse(f"/closed/looks/{look}/record", SEE_OTHER)


def require_open(site: Site, look: int) -> None:
    """Only the newest look can be open; a page of an older one that was left standing must not freeze it."""
    require_look(site, look)
    if look != looks(site.desk)[-1]:
        raise LookAlreadyFrozen(f"look {look} is frozen already", remedy="its report is on its Record sheet")


@router.get("/closed/looks/{look}/report")
def download_report(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    """The frozen bytes, as they were stored."""
    closed_look(site, session, look)
    files = report(site.desk, look)
    return attachment(files.html, f"{files.stem}.html", "text/html; charset=utf-8")


@router.get("/closed/looks/{look}/report.zip")
def download_folder(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    """The report with its record, the history up to its freeze, and the program that checks them."""
    closed_look(site, session, look)
    files = report(site.desk, look)
    return attachment(archive(tuple(files.by_name.items())), f"{files.stem}.zip", "application/zip")


@router.get("/closed/unmask")
def ask_to_unmask(site: TheSite, session: TheSession) -> Response:
    return show(site, session, "unmask", [], by=session.by, reason="")


@router.post("/closed/unmask")
def unmask_arms(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    mends: list[Mend] = []
    session.by = form.text("by")
    reason = read_field(form.text("reason"), "reason", recorded_reason, mends)
    by = read_field(session.by, "by", recorded_name, mends)
    if reason is None or by is None:
        return show(site, session, "unmask", mends, by=session.by, reason=form.text("reason"))
    unmask(site.desk, reason=reason, by=by)
    return RedirectResponse("/", SEE_OTHER)


def show(site: Site, session: Session, form: str, mends: list[Mend], **context: Any) -> Response:
    """A form of the closed side, as it is first shown or with what is to mend."""
    status = 422 if mends else 200
    frame = newest_frame(site, session)
    return site.pages.show(
        form, status=status, frame=frame, base=CLOSED, mends=mends, damage=site.damage, **context
    )
