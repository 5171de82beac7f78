"""Every exception becomes an answer here; a person never meets a traceback, a log never holds a value."""

from __future__ import annotations

import logging
import traceback
from types import TracebackType

from fastapi import FastAPI, Request
from fastapi.exceptions import RequestValidationError
from starlette.exceptions import HTTPException
from starlette.responses import Response
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.errors import AppError
from app.settings import Settings
from app.web.pages import Pages
from app.web.problems import (
    Problem,
    answer,
    broke,
    no_such_page,
    not_for_the_open_side,
    not_understood,
    problem_of,
    wrong_method,
)
from app.web.sessions import Session

LOG = logging.getLogger("lookledger.web")

INCIDENT_BYTES = 4
OPEN = "/open/"
EXPECTED = (AppError, HTTPException, RequestValidationError)


def answer_errors(app: FastAPI, pages: Pages) -> None:
    """Tell the application which answer each expected exception becomes."""

    def respond(request: Request, error: Exception) -> Response:
        return answer(pages, problem_for(error, request), request.url.path)

    for kind in EXPECTED:
        app.add_exception_handler(kind, respond)


def problem_for(error: Exception, request: Request) -> Problem:
    if isinstance(error, AppError):
        return not_for_the_open_side(error) if is_open_side(request) else problem_of(error)
    if isinstance(error, HTTPException) and error.status_code == 405:
        return wrong_method(request.method)
    if isinstance(error, HTTPException) and error.status_code != 404:
        return not_understood(error.detail)
    # the only parts of a request that fastapi checks by itself are the numbers inside addresses
    return no_such_page(request.url.path)


def is_open_side(request: Request) -> bool:
    """Whether the answer goes to who may see pooled results only, or stands for a page of theirs."""
    session: Session | None = request.state.session
    return request.url.path.startswith(OPEN) or (session is not None and session.side == "open")


class UnexpectedErrors:
    """Turns what nobody expected into a page with an incident number, and logs where it happened."""

    def __init__(self, app: ASGIApp, *, settings: Settings, pages: Pages) -> None:
        self.app = app
        self.settings = settings
        self.pages = pages

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        started = False

        async def send_noticed(message: Message) -> None:
            nonlocal started
            started = True
            await send(message)

        try:
            await self.app(scope, receive, send_noticed)
        except Exception as error:  # noqa: BLE001 - the last place that can still answer
            incident = self.settings.random_bytes(INCIDENT_BYTES).hex()
            LOG.error("Incident %s: %s at %s", incident, type(error).__name__, places(error.__traceback__))
            if not started:
                response = answer(self.pages, broke(incident), scope["path"])
                await response(scope, receive, send)


def places(trace: TracebackType | None) -> str:
    """Where an exception passed, innermost last, without its message: messages may hold values."""
    frames = traceback.extract_tb(trace)[-6:]
    return " > ".join(f"{frame.filename.rpartition('/')[2]}:{frame.lineno} {frame.name}" for frame in frames)
