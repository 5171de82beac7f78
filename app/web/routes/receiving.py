"""Receiving a snapshot: what was understood is shown first; nothing is stored before that is confirmed."""

from __future__ import annotations

from collections.abc import Mapping
from functools import partial

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.names import recorded_name, recorded_reason
from app.actions.receive import Incoming, Understanding, receive, understand
from app.errors import InputError, ValueRejected
from app.intake.answers import read_day, read_kind
from app.model.extract import Finding, LookKind, with_severity
from app.web.forms import Submitted, SubmittedForm
from app.web.keys import random_word
from app.web.mending import Mend, missing, read_field
from app.web.routes.acts import show
from app.web.sessions import Session, Upload
from app.web.site import SEE_OTHER, Site, TheSession, TheSite
from app.web.understood import declared_table, understood_tables

router = APIRouter()

FORM = "/closed/receive"
CONFIRM = "/closed/receive/confirm"
KINDS: tuple[tuple[LookKind, str], ...] = (
    ("planned", "one of the plan’s looks"),
    ("unplanned", "asked for in between; it spends the alpha that belongs to its information"),
    ("safety", "no efficacy bound; it spends nothing, or what the plan says"),
    (
        "final",
        "the last one; it spends all alpha that is left, which ending early because of comparative results "
        "does not release",
    ),
)
BLANK = {"cutoff": "", "extracted": "", "kind": "planned"}
ASKED = tuple(BLANK)
REASON = "reason-"


@router.get(FORM)
def ask_for_files(site: TheSite, session: TheSession) -> Response:
    return show_form(site, session, BLANK, [])


@router.post(FORM)
def take_files(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Read what was sent; keep it in memory for this session when nothing in it blocks."""
    answers = {name: form.text(name) for name in ASKED}
    incoming = read_answers(form)
    if not isinstance(incoming, Incoming):
        return show_form(site, session, answers, incoming)
    try:
        understood = understand(site.desk, incoming)
    except InputError as error:
        return show_form(site, session, answers, [Mend.of(error, field_of(error))])
    if understood.extract.blocking:
        session.refused = Upload(random_word(site.settings.random_bytes), incoming, understood)
        mends = [Mend.of(finding, "files") for finding in understood.extract.blocking]
        return show_form(site, session, answers, mends, understood)
    token = random_word(site.settings.random_bytes)
    session.upload = Upload(token, incoming, understood)
    return RedirectResponse(CONFIRM, SEE_OTHER)


def field_of(error: InputError) -> str:
    """Where to mend what only the trial file could refuse: one of the dates, else the files."""
    named = (("extract date", "extracted"), ("data cutoff", "cutoff"))
    return next((field for words, field in named if words in error.what), "files")


def show_form(
    site: Site,
    session: Session,
    answers: Mapping[str, str],
    mends: list[Mend],
    understood: Understanding | None = None,
) -> Response:
    """The form; after an extract that cannot be used also what was understood of it, and its doubts."""
    return show(
        site,
        session,
        "receive",
        mends,
        answers=answers,
        kinds=KINDS,
        tables=understood_tables(understood) if understood else None,
        doubts=understood.extract.doubts if understood else (),
        refused_token=session.refused.token if understood and session.refused else "",
        by=session.by,
    )


def read_answers(form: Submitted) -> Incoming | list[Mend]:
    """The upload as a whole, or everything about its fields that is to mend."""
    mends: list[Mend] = []
    if not form.files:
        mends.append(missing("no file was chosen", accepted="the files of one extract", field="files"))
    cutoff = read_field(form.text("cutoff"), "cutoff", partial(read_day, where="Data cutoff"), mends)
    kind = read_field(form.text("kind"), "kind", partial(read_kind, where="Kind of look"), mends)
    extracted = None
    if form.text("extracted"):
        extracted = read_field(form.text("extracted"), "extracted", partial(read_day, where="Extract"), mends)
    if mends or cutoff is None or kind is None:
        return mends
    return Incoming(form.files, cutoff, extracted, kind)


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
    session.by, reasons = form.text("by"), form.under(REASON)
    mends = unanswered(upload, reasons, form)
    by = read_field(session.by, "by", recorded_name, mends)
    if mends or by is None:
        return show_upload(site, session, upload, reasons, mends)
    look = receive(
        site.desk,
        upload.incoming,
        acknowledgements=reasons,
        by=by,
        freeze_open=form.is_ticked("freeze"),
    )
    session.upload = None
    return RedirectResponse(f"/closed/looks/{look}/glance", SEE_OTHER)


def unanswered(upload: Upload, reasons: Mapping[str, str], form: Submitted) -> list[Mend]:
    """Doubts without a reason, and a freeze that was not agreed to."""
    mends: list[Mend] = []
    for doubt, findings in doubts_by_id(upload).items():
        read = partial(reason_for, findings[0])
        read_field(reasons.get(doubt, ""), REASON + doubt, read, mends)
    freezes = upload.understood.freezes
    if freezes is not None and not form.is_ticked("freeze"):
        remedy = "Tick the box, or leave the new snapshot for later"
        mends.append(Mend.of(InputError(f"look {freezes} is still open", remedy=remedy), "freeze"))
    return mends


def reason_for(doubt: Finding, text: str) -> str:
    """The reason, or a refusal that says which doubt it is about."""
    try:
        return recorded_reason(text)
    except InputError as error:
        where = f"the doubt {doubt.what!r}"
        raise ValueRejected(error.what, where=where, accepted=error.accepted, remedy=error.remedy) from error


def doubts_by_id(upload: Upload) -> dict[str, list[Finding]]:
    """One reason answers all findings of one kind."""
    doubts: dict[str, list[Finding]] = {}
    for finding in upload.understood.extract.doubts:
        doubts.setdefault(finding.id, []).append(finding)
    return doubts


def show_upload(
    site: Site, session: Session, upload: Upload, reasons: Mapping[str, str], mends: list[Mend]
) -> Response:
    understood = upload.understood
    return show(
        site,
        session,
        "understood",
        mends,
        upload=upload,
        understood=understood,
        declared=declared_table(upload.incoming),
        tables=understood_tables(understood),
        notes=with_severity(understood.extract.findings, "note"),
        doubts=doubts_by_id(upload),
        reasons=reasons,
        by=session.by,
    )
