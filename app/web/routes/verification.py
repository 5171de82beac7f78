"""The full verification: begun by opening its page, followed while it runs, recorded by name when sound."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.check import read_head, record_verification
from app.actions.names import recorded_name
from app.errors import AppError
from app.web.forms import SubmittedForm
from app.web.mending import Mend, read_field
from app.web.routes.looks import CLOSED
from app.web.sessions import Session
from app.web.site import SEE_OTHER, Site, TheSession, TheSite
from app.web.verifying import Run

router = APIRouter()

PAGE, RUNNING = "/closed/verify", "/closed/verify/running"
SECONDS_TO_WAIT = 2.0
"""A small file is verified by then, and its page needs no second look."""


@router.get(PAGE)
def verify_trial_file(site: TheSite, session: TheSession) -> Response:
    """Without the frame of a look: it must also come up when no look can be opened any more."""
    return show_run(site, session, site.verifying.begin(), [])


@router.post(PAGE)
def look_for_a_head(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Verify again, with a head from the minutes."""
    mends: list[Mend] = []
    head = read_field(form.text("head"), "head", read_head, mends)
    if head is None:
        return show_run(site, session, site.verifying.run or site.verifying.begin(), mends, form.text("head"))
    site.verifying.begin((head,))
    return RedirectResponse(RUNNING, SEE_OTHER)


@router.get(RUNNING)
def follow(site: TheSite, session: TheSession) -> Response:
    run = site.verifying.run
    return RedirectResponse(PAGE, SEE_OTHER) if run is None else show_run(site, session, run, [])


@router.post("/closed/verify/record")
def record(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Enter the last verification into the history; nothing is entered when it found something."""
    run = site.verifying.run
    if run is None or run.report is None:
        return RedirectResponse(PAGE, SEE_OTHER)
    mends: list[Mend] = []
    session.by = form.text("by")
    by = read_field(session.by, "by", recorded_name, mends)
    if by is None or not record_verification(site.desk, run.report, by=by, heads=run.heads):
        return show_run(site, session, run, mends)
    return RedirectResponse("/", SEE_OTHER)


def show_run(site: Site, session: Session, run: Run, mends: list[Mend], head: str = "") -> Response:
    """What came of it, or how far it is."""
    run.over.wait(SECONDS_TO_WAIT)
    if isinstance(run.error, AppError):
        raise run.error
    if run.report is None:
        return site.pages.show("verifying", base=CLOSED, progress=run.progress, file_name=site.desk.path.name)
    return site.pages.show(
        "verify",
        status=422 if mends else 200,
        base=CLOSED,
        report=run.report,
        file_name=site.desk.path.name,
        may_record=run.report.ok and site.desk.may_write,
        by=session.by,
        head=head,
        mends=mends,
    )
