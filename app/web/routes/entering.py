"""Coming in by a key, going to the newest look, and leaving."""

from __future__ import annotations

from fastapi import APIRouter
from starlette.requests import Request
from starlette.responses import RedirectResponse, Response

from app.actions.looks import looks
from app.actions.names import recorded_name
from app.web.forms import SubmittedForm
from app.web.gate import wrong_key
from app.web.mending import read_field
from app.web.problems import answer
from app.web.site import SEE_OTHER, TheSession, TheSite

router = APIRouter()


@router.get("/enter/{key}")
def ask_to_enter(site: TheSite, request: Request, key: str) -> Response:
    """A page with one button: the cookie that a link from a file or mail would set is not sent back at once,
    and a program that looks ahead at links must not use up anything."""
    side = site.keys.side_of(key)
    if side is None:
        return answer(site.pages, wrong_key(), request.url.path)
    return site.pages.show("enter", side=side, key=key)


@router.post("/enter")
def enter(site: TheSite, request: Request, form: SubmittedForm) -> Response:
    """Exchange a key for the cookie of a new session."""
    side = site.keys.side_of(form.fields.get("key", ""))
    if side is None:
        return answer(site.pages, wrong_key(), request.url.path)
    by = read_field(form.text("by"), "by", recorded_name, []) or ""  # asked again where it is needed
    response = RedirectResponse("/", SEE_OTHER)
    response.set_cookie(
        site.address.cookie_name,
        site.sessions.begin(side, by=by),
        httponly=True,
        samesite="strict",
        path="/",
    )
    return response


@router.post("/leave")
def leave(site: TheSite, request: Request) -> Response:
    """End the session here and in the browser."""
    name = site.address.cookie_name
    site.sessions.end(request.cookies.get(name, ""))
    response = site.pages.show("left")
    response.delete_cookie(name, httponly=True, samesite="strict", path="/")
    return response


@router.get("/")
def newest(site: TheSite, session: TheSession) -> Response:
    """The newest look at a glance, on the side of who asks."""
    numbers = looks(site.desk)
    if not numbers:
        return site.pages.show("no_look", base=f"/{session.side}")
    return RedirectResponse(f"/{session.side}/looks/{numbers[-1]}/glance", SEE_OTHER)
