"""Who may come in: what is not asked for from here, by a session, on its own side, is refused before routing.

A cookie of 127.0.0.1 reaches every port of the machine, and pages of other ports count as the same site: so a
cookie alone is believed for reading only when the browser says that the request comes from these pages, and
for an act only when the browser names these pages as its origin.
"""

from __future__ import annotations

from dataclasses import dataclass

from starlette.requests import HTTPConnection, Request
from starlette.types import ASGIApp, Receive, Scope, Send

from app.web.pages import Pages
from app.web.problems import Problem, Refused, answer
from app.web.sessions import Session, Sessions

SAFE_METHODS = frozenset({"GET", "HEAD", "OPTIONS"})
WITHOUT_SESSION = ("/enter", "/enter/", "/static/")
OPEN_SIDE = ("/", "/open/", "/leave")


@dataclass(frozen=True)
class Address:
    """Where the server listens: the loopback interface, one port."""

    port: int

    @property
    def hosts(self) -> tuple[str, str]:
        return f"127.0.0.1:{self.port}", f"localhost:{self.port}"

    @property
    def url(self) -> str:
        return f"http://{self.hosts[0]}"

    @property
    def cookie_name(self) -> str:
        """Named after the port, since every server on this machine is sent the cookies of all others."""
        return f"lookledger-{self.port}"


class Gate:
    """Answers what may not pass, and hands everything else on with its session."""

    def __init__(self, app: ASGIApp, *, address: Address, sessions: Sessions, pages: Pages) -> None:
        self.app = app
        self.address = address
        self.sessions = sessions
        self.pages = pages

    async def __call__(self, scope: Scope, receive: Receive, send: Send) -> None:
        if scope["type"] == "websocket":
            await send({"type": "websocket.close", "code": 1008})
            return
        if scope["type"] != "http":
            await self.app(scope, receive, send)
            return
        request = Request(scope)
        session = self.sessions.find(request.cookies.get(self.address.cookie_name, ""))
        problem = self.problem_with(request, session)
        if problem is not None:
            await answer(self.pages, problem, request.url.path)(scope, receive, send)
            return
        scope.setdefault("state", {})["session"] = session
        await self.app(scope, receive, send)

    def problem_with(self, request: Request, session: Session | None) -> Problem | None:
        """Why `request` may not pass, or None."""
        if not is_for_us(request, self.address):
            return wrong_host(self.address)
        if not is_from_us(request):
            return came_from_elsewhere()
        if matches(request.scope["path"], WITHOUT_SESSION):
            return None
        if session is None:
            return no_session()
        if session.side == "open" and not matches(request.scope["path"], OPEN_SIDE):
            return other_side()
        return None


def matches(path: str, places: tuple[str, ...]) -> bool:
    """Whether `path` is one of `places`, or lies under one that ends in a slash; "/" is itself only."""
    return any(
        path == place or (len(place) > 1 and place[-1] == "/" and path.startswith(place)) for place in places
    )


def is_for_us(request: HTTPConnection, address: Address) -> bool:
    """Whether the host asked for is ours: a foreign name that was made to point here is not."""
    return request.headers.getlist("host") in [[host] for host in address.hosts]


def is_from_us(request: Request) -> bool:
    """Whether the browser says that this comes from our pages, as far as its method needs it to say so."""
    origin = request.headers.get("origin")
    site = request.headers.get("sec-fetch-site")
    if request.method in SAFE_METHODS:
        # a person may come from anywhere; a script, picture or frame of another page may not
        is_visit = request.headers.get("sec-fetch-mode") == "navigate"
        return site in (None, "none", "same-origin") or is_visit
    if origin is not None:
        return origin == f"http://{request.headers['host']}" and site not in ("cross-site", "same-site")
    return site == "same-origin"


def wrong_host(address: Address) -> Problem:
    error = Refused(
        "this server does not answer to that name",
        accepted=" or ".join(address.hosts),
        remedy="Use the link that the program printed when it started",
    )
    return Problem(400, "This server has another name.", error, ways_on=())


def came_from_elsewhere() -> Problem:
    error = Refused(
        "the request does not come from these pages",
        accepted="links and buttons of these pages, in a browser that says where a request comes from",
        remedy="Nothing was done; open the page here and use its own button",
    )
    return Problem(403, "This came from somewhere else.", error, ways_on=())


def no_session() -> Problem:
    error = Refused(
        "these pages open with a key, and this browser has not shown one, or it was shown too long ago",
        accepted="the link that the program printed when it started, or one that was handed to you",
        remedy="Open that link and press its button",
    )
    return Problem(403, "A key is needed here.", error, ways_on=())


def wrong_key() -> Problem:
    error = Refused(
        "this key opens nothing here",
        accepted="a key of the running program; each start makes new ones",
        remedy="Use the link that it printed when it was last started",
    )
    return Problem(403, "This key does not fit.", error, ways_on=())


def other_side() -> Problem:
    error = Refused(
        "this page is not part of what your key opens",
        accepted="the open, pooled pages",
        remedy="Go back to the newest look",
    )
    return Problem(403, "This page is closed to you.", error)
