"""What a person adds to the record beside looks: recommendations, corrections, backups, refusals."""

from __future__ import annotations

from functools import partial

from fastapi import APIRouter
from starlette.responses import RedirectResponse, Response

from app.actions.backup import backup
from app.actions.correct import erratum
from app.actions.looks import looks
from app.actions.names import recorded_name, recorded_reason
from app.actions.recommend import ADVICE, ALPHA_STAYS, WITHOUT_A_CROSSING, last_frozen, read_advice, recommend
from app.actions.refuse import record_refusal
from app.errors import InputError, ValueRejected
from app.intake.answers import read_day
from app.ledger.bodies import Advice
from app.web.forms import SubmittedForm
from app.web.mending import Mend, read_field
from app.web.routes.acts import show
from app.web.sessions import Session
from app.web.site import SEE_OTHER, Site, TheSession, TheSite

router = APIRouter()

MEANINGS: dict[Advice, str] = {
    "continue": "the trial goes on as it is",
    "continue with changes": "it goes on, with what the words below ask for",
    "stop for benefit": "the experimental arm is better, in the committee's judgement",
    "stop for futility": "going on is not worth while",
    "stop for harm": "subjects are harmed by going on",
    "stop for another reason": "as the words below say",
}


@router.get("/closed/recommend")
def ask_for_advice(site: TheSite, session: TheSession) -> Response:
    today = site.settings.clock().date().isoformat()
    answers = {"advice": "continue", "look": str(last_frozen(site.desk)), "held_on": today, "reason": ""}
    return show_advice(site, session, answers, [])


@router.post("/closed/recommend")
def record_advice(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    mends: list[Mend] = []
    session.by = form.text("by")
    answers = {name: form.text(name) for name in ("advice", "look", "held_on", "reason")}
    advice = read_field(answers["advice"], "advice", partial(read_advice, where="Recommendation"), mends)
    look = read_field(answers["look"], "look", partial(read_number, what="look"), mends)
    held_on = read_field(answers["held_on"], "held_on", partial(read_day, where="Committee met"), mends)
    reason = read_field(answers["reason"], "reason", recorded_reason, mends)
    by = read_field(session.by, "by", recorded_name, mends)
    if mends or not (advice and look and held_on and reason and by):
        return show_advice(site, session, answers, mends)
    try:
        recommend(site.desk, advice=advice, reason=reason, by=by, look=look, held_on=held_on)
    except InputError as error:
        return show_advice(site, session, answers, [Mend.of(error, "held_on")])
    return to_record(site)


def show_advice(site: Site, session: Session, answers: dict[str, str], mends: list[Mend]) -> Response:
    return show(
        site,
        session,
        "recommend",
        mends,
        advice=[(advice, MEANINGS[advice]) for advice in ADVICE],
        what_goes_with=(WITHOUT_A_CROSSING, ALPHA_STAYS),
        answers=answers,
        by=session.by,
    )


def read_number(text: str, *, what: str) -> int:
    """The number of a look or an entry, as the pages show it."""
    if text.isascii() and text.isdecimal() and len(text) <= 9 and int(text) > 0:
        return int(text)
    raise ValueRejected(
        f"this is no number of {'an' if what[0] in 'aeiou' else 'a'} {what}",
        found=repr(text[:40]),
        accepted="a number as the pages show it, such as 2",
    )


@router.get("/closed/erratum")
def ask_for_correction(site: TheSite, session: TheSession) -> Response:
    return show(site, session, "erratum", [], answers={"entry": "", "correction": ""}, by=session.by)


@router.post("/closed/erratum")
def record_correction(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    mends: list[Mend] = []
    session.by = form.text("by")
    answers = {name: form.text(name) for name in ("entry", "correction")}
    entry = read_field(answers["entry"], "entry", partial(read_number, what="entry"), mends)
    correction = read_field(answers["correction"], "correction", recorded_reason, mends)
    by = read_field(session.by, "by", recorded_name, mends)
    if entry is None or correction is None or by is None:
        return show(site, session, "erratum", mends, answers=answers, by=session.by)
    erratum(site.desk, entry=entry, correction=correction, by=by)
    return to_record(site)


@router.get("/closed/backup")
def ask_for_backup(site: TheSite, session: TheSession) -> Response:
    return show(site, session, "backup", [], made=None, by=session.by)


@router.post("/closed/backup")
def make_backup(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Beside the trial file and nowhere else: a page names no folders."""
    mends: list[Mend] = []
    session.by = form.text("by")
    by = read_field(session.by, "by", recorded_name, mends)
    made = None if by is None else backup(site.desk, site.desk.path.parent, by=by)
    return show(site, session, "backup", mends, made=made, by=session.by)


@router.post("/closed/receive/refusal")
def record_refused(site: TheSite, session: TheSession, form: SubmittedForm) -> Response:
    """Record that the extract of the last form was refused; a page of an earlier one cannot do it."""
    refused = session.refused
    mends: list[Mend] = []
    session.by = form.text("by")
    by = read_field(session.by, "by", recorded_name, mends)
    if refused is None or by is None or form.text("token") != refused.token:
        return RedirectResponse("/closed/receive", SEE_OTHER)
    record_refusal(site.desk, refused.incoming, by=by)
    session.refused = None
    return to_record(site)


def to_record(site: Site) -> Response:
    """Where the history shows what was just recorded."""
    numbers = looks(site.desk)
    return RedirectResponse(f"/closed/looks/{numbers[-1]}/record" if numbers else "/", SEE_OTHER)
