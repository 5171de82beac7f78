"""Receiving a snapshot: what was understood is shown first; nothing is stored before that is confirmed."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import date

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.receive import Incoming, Understanding, receive, understand
from app.errors import InputError, ValueRejected
from app.intake.answers import LOOK_KINDS, read_day, read_kind
from app.model.extract import LookKind
from app.web.forms import Submitted, SubmittedForm
from app.web.keys import random_word
from app.web.mending import Mend, missing
from app.web.routes.acts import missing_names
from app.web.sessions import Session, Upload
from app.web.site import SEE_OTHER, Site, TheSession, TheSite
from app.web.understood import understood_tables

router = APIRouter()

FORM = "/closed/receive"
CONFIRM = "/closed/receive/confirm"
BLANK = {"cutoff": "", "extracted": "", "kind": "planned"}
ASKED = tuple(BLANK)
REASON = "reason-"


@router.get(FORM)
def ask_for_files(site: TheSite, session: TheSession) -> Response:
    return show_form(site, BLANK, [])


@router.post(FORM)
def take_files(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Read what was sent; keep it in memory for this session when nothing in it blocks."""
    answers = {name: form.text(name) for name in ASKED}
    incoming = read_answers(form)
    if not isinstance(incoming, Incoming):
        return show_form(site, answers, incoming)
    try:
        understood = understand(site.desk, incoming)
    except InputError as error:
        return show_form(site, answers, [Mend.of(error, "files")])
    if understood.extract.blocking:
        mends = [Mend.of(finding, "files") for finding in understood.extract.blocking]
        return show_form(site, answers, mends, understood)
    token = random_word(site.settings.random_bytes)
    session.upload = Upload(token, incoming, understood)
    return RedirectResponse(CONFIRM, SEE_OTHER)


def show_form(
    site: Site, answers: Mapping[str, str], mends: list[Mend], understood: Understanding | None = None
) -> Response:
    return site.pages.show(
        "receive",
        status=422 if mends else 200,
        answers=answers,
        kinds=LOOK_KINDS,
        mends=mends,
        understood=understood,
        tables=understood_tables(understood) if understood else (),
    )


def read_answers(form: Submitted) -> Incoming | list[Mend]:
    """The upload as a whole, or everything about its fields that is to mend."""
    mends: list[Mend] = []
    if not form.files:
        accepted = "at least one file of the extract"
        mends.append(missing("no file was chosen", accepted=accepted, field="files"))
    cutoff = day(form.text("cutoff"), "cutoff", "Data cutoff", mends)
    extracted = (
        day(form.text("extracted"), "extracted", "Extract taken", mends) if form.text("extracted") else None
    )
    kind = kind_of_look(form.text("kind"), mends)
    if mends or cutoff is None or kind is None:
        return mends
    return Incoming(form.files, cutoff, extracted, kind)


def day(text: str, field: str, label: str, mends: list[Mend]) -> date | None:
    try:
        return read_day(text, where=label)
    except ValueRejected as error:
        mends.append(Mend.of(error, field))
        return None


def kind_of_look(text: str, mends: list[Mend]) -> LookKind | None:
    try:
        return read_kind(text, where="Kind of look")
    except ValueRejected as error:
        mends.append(Mend.of(error, "kind"))
        return None


@router.get(CONFIRM)
def show_understood(site: TheSite, session: TheSession) -> Response:
    upload = session.upload
    if upload is None:
        return RedirectResponse(FORM, SEE_OTHER)
    return show_upload(site, session, upload, {}, [])


@router.post(CONFIRM)
def receive_upload(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Store what was shown. A page of an earlier upload cannot confirm a later one."""
    upload = session.upload
    if upload is None or form.text("token") != upload.token:
        return RedirectResponse(CONFIRM if upload else FORM, SEE_OTHER)
    session.by = form.text("by")
    reasons = form.under(REASON)
    mends = unanswered(upload, reasons, form)
    if not mends:
        try:
            look = receive(
                site.desk,
                upload.incoming,
                acknowledgements=reasons,
                by=session.by,
                freeze_open=upload.understood.freezes is not None,
            )
        except InputError as error:
            mends.append(Mend.of(error, "files"))
        else:
            session.upload = None
            return RedirectResponse(f"/closed/looks/{look}/glance", SEE_OTHER)
    return show_upload(site, session, upload, reasons, mends)


def unanswered(upload: Upload, reasons: Mapping[str, str], form: Submitted) -> list[Mend]:
    """Doubts without a reason, a freeze that was not agreed to, nobody named."""
    mends = [
        missing(
            "a doubt has no reason",
            accepted="why the extract may be used all the same",
            field=REASON + doubt.id,
        )
        for doubt in upload.understood.extract.doubts
        if doubt.id not in reasons
    ]
    freezes = upload.understood.freezes
    if freezes is not None and not form.is_ticked("freeze"):
        what = f"look {freezes} is open, and freezing it was not agreed to"
        mends.append(
            Mend.of(InputError(what, remedy="Tick the box, or leave the new snapshot for later"), "freeze")
        )
    return mends + missing_names(form.text("by"))


def show_upload(
    site: Site, session: Session, upload: Upload, reasons: Mapping[str, str], mends: list[Mend]
) -> Response:
    return site.pages.show(
        "understood",
        status=422 if mends else 200,
        upload=upload,
        understood=upload.understood,
        tables=understood_tables(upload.understood),
        reasons=reasons,
        by=session.by,
        mends=mends,
    )
