"""What a person does on the closed side besides reading: freeze, take the report, unmask, verify."""

from __future__ import annotations

from urllib.parse import quote

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.acts import freeze, unmask
from app.actions.check import verify
from app.actions.looks import looks
from app.actions.report import report
from app.errors import LookAlreadyFrozen
from app.web.forms import SubmittedForm
from app.web.mending import Mend, missing
from app.web.routes.looks import closed_look, require_look
from app.web.site import SEE_OTHER, LookNumber, Site, TheSession, TheSite

router = APIRouter()

WHO = "the name of the person who does this, as the minutes will have it"
WHY = "the reason, in a sentence that can be read years later"


@router.get("/closed/looks/{look}/freeze")
def ask_to_freeze(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    require_open(site, look)
    return site.pages.show("freeze", look=look, by=session.by, mends=[])


@router.post("/closed/looks/{look}/freeze")
def freeze_look(site: TheSite, session: TheSession, look: LookNumber, form: SubmittedForm) -> Response:
    require_open(site, look)
    session.by = form.text("by")
    mends = missing_names(session.by)
    if not mends:
        freeze(site.desk, by=session.by)
        return RedirectResponse(f"/closed/looks/{look}/record", SEE_OTHER)
    return site.pages.show("freeze", status=422, look=look, by=session.by, mends=mends)


def require_open(site: Site, look: int) -> None:
    """Only the newest look can be open; a page of an older one that was left standing must not freeze it."""
    require_look(site, look)
    if look != looks(site.desk)[-1]:
        raise LookAlreadyFrozen(f"look {look} is frozen already", remedy="Its report is on its Record sheet")


@router.get("/closed/looks/{look}/report")
def download_report(site: TheSite, session: TheSession, look: LookNumber) -> Response:
    """The frozen bytes as a file. Should a browser open it here after all, the sandbox keeps it powerless."""
    closed_look(site, session, look)
    files = report(site.desk, look)
    headers = {
        "Content-Disposition": f"attachment; filename*=UTF-8''{quote(files.stem)}.html",
        "Content-Security-Policy": "sandbox",
    }
    return Response(files.html, media_type="text/html; charset=utf-8", headers=headers)


@router.get("/closed/unmask")
def ask_to_unmask(site: TheSite, session: TheSession) -> Response:
    return site.pages.show("unmask", by=session.by, reason="", mends=[])


@router.post("/closed/unmask")
def unmask_arms(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    session.by, reason = form.text("by"), form.text("reason")
    mends = [] if reason else [missing("the reason is missing", accepted=WHY, field="reason")]
    mends += missing_names(session.by)
    if not mends:
        unmask(site.desk, reason=reason, by=session.by)
        return RedirectResponse("/", SEE_OTHER)
    return site.pages.show("unmask", status=422, by=session.by, reason=reason, mends=mends)


@router.get("/closed/verify")
def verify_trial_file(site: TheSite) -> Response:
    return site.pages.show("verify", report=verify(site.settings, site.desk.path), path=site.desk.path.name)


def missing_names(by: str) -> list[Mend]:
    return [] if by else [missing("nobody is named", accepted=WHO, field="by")]
