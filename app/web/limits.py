"""How much a request may carry. A body that is too large is read to its end and thrown away, then answered.

A browser that is cut short while it sends shows its own "connection lost" page instead of our sentence; on
the loopback interface reading on costs next to nothing, and there is an end to it.
"""

from __future__ import annotations

from starlette.datastructures import Headers
from starlette.types import ASGIApp, Message, Receive, Scope, Send

from app.settings import Limits
from app.web.pages import Pages
from app.web.problems import answer, too_large

UPLOADS = ("/closed/receive",)
READ_ON_BYTES = 1024 * 1024 * 1024


class BodyTooLarge(Exception):
    """More came than the limit; caught by BodyLimit and nobody else."""


class BodyLimit:
    """Counts what comes in; the length that the request declares is only a reason to refuse earlier."""

    def __init__(self, app: ASGIApp, *, limits: Limits, pages: Pages) -> None:
        self.app = app
        self.limits = limits
        self.pages = pages

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        limit = self.limits.upload_bytes if scope["path"] in UPLOADS else self.limits.form_bytes
        body = Body(receive, limit)
        try:
            if declared_length(scope) > limit:
                raise BodyTooLarge
            await self.app(scope, body.receive, send)
        except BodyTooLarge:
            await body.read_on()
            await answer(self.pages, too_large(limit), scope["path"])(scope, receive, send)


def declared_length(scope: Scope) -> int:
    """The length that the request says it has; 0 when it does not say, or not in digits."""
    said = Headers(scope=scope).get("content-length", "")
    return int(said) if said.isdecimal() and len(said) < 20 else 0


class Body:
    """What comes in with one request, counted."""

    def __init__(self, receive: Receive, limit: int) -> None:
        self._receive = receive
        self._limit = limit
        self._seen = 0
        self._ended = False

    async def receive(self) -> Message:
        """The next message, until more than the limit has come."""
        message = await self._next()
        if self._seen > self._limit:
            raise BodyTooLarge
        return message

    async def read_on(self) -> None:
        """Read the rest and keep nothing."""
        while not self._ended and self._seen < READ_ON_BYTES:
            await self._next()

    async def _next(self) -> Message:
        message = await self._receive()
        self._seen += len(message.get("body", b""))
        self._ended = message["type"] != "http.request" or not message.get("more_body", False)
        return message
