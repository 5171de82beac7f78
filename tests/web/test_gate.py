"""The gate, the sessions, the limits and the headers, around a small application that knows none of them."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from itertools import count

import pytest
from fastapi import FastAPI, Request
from fastapi.testclient import TestClient
from starlette.middleware import Middleware
from starlette.responses import HTMLResponse, PlainTextResponse, Response

from app.settings import Limits, Settings
from app.web.application import NO_TELEMETRY, Application
from app.web.errors import UnexpectedErrors, answer_errors
from app.web.gate import Address, Gate
from app.web.headers import NOT_KEPT, STRICT
from app.web.keys import Keys
from app.web.limits import BodyLimit
from app.web.sessions import Sessions

PORT = 8123
ADDRESS = Address(PORT)
OWN = f"http://127.0.0.1:{PORT}"
LIMITS = Limits(upload_bytes=4096, form_bytes=256, session_idle_seconds=60 * 60, session_seconds=12 * 60 * 60)


class Clock:
    """A clock that a test sets."""

    def __init__(self) -> None:
        self.now = datetime(2027, 1, 26, 9, 30, tzinfo=UTC)

    def __call__(self) -> datetime:
        return self.now

    def pass_seconds(self, seconds: int) -> None:
        self.now += timedelta(seconds=seconds)


class Counted:
    """Bytes that differ each time and are the same in every run."""

    def __init__(self) -> None:
        self.numbers = count(1)

    def __call__(self, n_bytes: int) -> bytes:
        return next(self.numbers).to_bytes(n_bytes, "big")


class PlainPages:
    """Shows what a page would be given, without templates."""

    def show(self, form: str, *, status: int = 200, **context: object) -> Response:
        problem = context.get("problem")
        return HTMLResponse(
            f"{form}: {getattr(problem, 'heading', '')} {getattr(problem, 'error', '')}", status
        )


class Surroundings:
    """One guarded application with a client, its clock, and a way in."""

    def __init__(self) -> None:
        self.clock = Clock()
        self.settings = Settings(clock=self.clock, random_bytes=Counted(), limits=LIMITS)
        self.sessions = Sessions(self.settings)
        self.client = TestClient(self.application(), base_url=OWN, raise_server_exceptions=False)

    def application(self) -> FastAPI:
        pages = PlainPages()
        app = Application(
            docs_url=None,
            redoc_url=None,
            openapi_url=None,
            telemetry=NO_TELEMETRY,
            middleware=[
                Middleware(UnexpectedErrors, settings=self.settings, pages=pages),
                Middleware(Gate, address=ADDRESS, sessions=self.sessions, pages=pages),
                Middleware(BodyLimit, limits=LIMITS, pages=pages),
            ],
        )
        answer_errors(app, pages)  # type: ignore[arg-type]
        add_routes(app)
        return app

    def enter(self, side: str) -> None:
        self.client.cookies.set(ADDRESS.cookie_name, self.sessions.begin(side))  # type: ignore[arg-type]


def add_routes(app: FastAPI) -> None:
    @app.get("/closed/figure")
    @app.get("/open/figure")
    @app.get("/static/figure")
    def figure() -> Response:
        return PlainTextResponse("seen")

    @app.post("/closed/receive")
    @app.post("/closed/unmask")
    async def act(request: Request) -> Response:
        return PlainTextResponse(f"took {len(await request.body())}")

    @app.get("/closed/broken")
    def broken() -> Response:
        raise ValueError("subject 01-017 has a secret")


@pytest.fixture
def site() -> Iterator[Surroundings]:
    surroundings = Surroundings()
    with surroundings.client:
        yield surroundings


def assert_strict(response: Response) -> None:
    for name, value in STRICT.items():
        assert response.headers[name] == value
    assert response.headers["cache-control"] == NOT_KEPT


@pytest.mark.parametrize(
    "path", ["/", "/closed/figure", "/open/figure", "/nowhere", "/docs", "/openapi.json"]
)
def test_without_a_session_nothing_is_reached(site: Surroundings, path: str) -> None:
    response = site.client.get(path)
    assert response.status_code == 403
    assert "these pages open with a key" in response.text.lower()
    assert_strict(response)


@pytest.mark.parametrize(
    "host",
    [
        "example.test",
        "127.0.0.1",
        f"127.0.0.1:{PORT + 1}",
        f"evil.test:{PORT}",
        f"127.0.0.1.evil.test:{PORT}",
    ],
)
def test_another_host_name_is_answered_by_400(site: Surroundings, host: str) -> None:
    site.enter("closed")
    response = site.client.get("/closed/figure", headers={"Host": host})
    assert response.status_code == 400
    assert "does not answer to that name" in response.text
    assert_strict(response)


def test_localhost_is_the_same_server(site: Surroundings) -> None:
    cookie = site.sessions.begin("closed")
    headers = {"Host": f"localhost:{PORT}", "Cookie": f"{ADDRESS.cookie_name}={cookie}"}
    assert site.client.get("/closed/figure", headers=headers).text == "seen"


FOREIGN = (
    {},
    {"Origin": "null"},
    {"Origin": "null", "Sec-Fetch-Site": "same-origin"},
    {"Origin": "http://evil.test"},
    {"Origin": f"http://127.0.0.1:{PORT + 1}"},
    {"Origin": f"https://127.0.0.1:{PORT}"},
    {"Origin": f"http://127.0.0.1:{PORT}.evil.test"},
    {"Origin": f"http://localhost:{PORT}"},
    {"Origin": OWN, "Sec-Fetch-Site": "cross-site"},
    {"Origin": OWN, "Sec-Fetch-Site": "same-site"},
    {"Sec-Fetch-Site": "same-site"},
    {"Sec-Fetch-Site": "cross-site"},
    {"Sec-Fetch-Site": "none"},
)


@pytest.mark.parametrize("headers", FOREIGN, ids=str)
def test_an_act_that_comes_from_elsewhere_is_refused(site: Surroundings, headers: dict[str, str]) -> None:
    site.enter("closed")
    response = site.client.post("/closed/unmask", headers=headers)
    assert response.status_code == 403
    assert "does not come from these pages" in response.text
    assert_strict(response)


@pytest.mark.parametrize(
    "headers",
    [{"Origin": OWN}, {"Sec-Fetch-Site": "same-origin"}, {"Origin": OWN, "Sec-Fetch-Site": "same-origin"}],
)
def test_an_act_from_these_pages_is_let_through(site: Surroundings, headers: dict[str, str]) -> None:
    site.enter("closed")
    assert site.client.post("/closed/unmask", headers=headers).text == "took 0"


@pytest.mark.parametrize("where", ["cross-site", "same-site"])
def test_a_script_or_picture_of_another_page_reads_nothing(site: Surroundings, where: str) -> None:
    site.enter("closed")
    taken = site.client.get("/closed/figure", headers={"Sec-Fetch-Site": where, "Sec-Fetch-Mode": "no-cors"})
    visited = site.client.get(
        "/closed/figure", headers={"Sec-Fetch-Site": where, "Sec-Fetch-Mode": "navigate"}
    )
    assert (taken.status_code, visited.text) == (403, "seen")


def test_the_open_side_sees_its_own_pages_only(site: Surroundings) -> None:
    site.enter("open")
    refused = site.client.get("/closed/figure")
    assert (site.client.get("/open/figure").text, refused.status_code) == ("seen", 403)
    assert "not part of what your key opens" in refused.text
    assert site.client.post("/closed/unmask", headers={"Origin": OWN}).status_code == 403


def test_the_closed_side_sees_both(site: Surroundings) -> None:
    site.enter("closed")
    assert [site.client.get(f"/{side}/figure").text for side in ("closed", "open")] == ["seen", "seen"]


def test_a_session_ends_when_it_is_not_used(site: Surroundings) -> None:
    site.enter("closed")
    site.clock.pass_seconds(LIMITS.session_idle_seconds)
    assert site.client.get("/closed/figure").status_code == 200
    site.clock.pass_seconds(LIMITS.session_idle_seconds + 1)
    assert site.client.get("/closed/figure").status_code == 403


def test_a_session_ends_at_its_time_however_much_it_is_used(site: Surroundings) -> None:
    site.enter("closed")
    for _ in range(LIMITS.session_seconds // LIMITS.session_idle_seconds):
        site.clock.pass_seconds(LIMITS.session_idle_seconds)
        assert site.client.get("/closed/figure").status_code == 200
    site.clock.pass_seconds(1)
    assert site.client.get("/closed/figure").status_code == 403


def test_a_cookie_that_was_never_given_out_opens_nothing(site: Surroundings) -> None:
    site.client.cookies.set(ADDRESS.cookie_name, "A" * 43)
    assert site.client.get("/closed/figure").status_code == 403


def test_the_cookie_of_another_port_opens_nothing(site: Surroundings) -> None:
    site.client.cookies.set(Address(PORT + 1).cookie_name, site.sessions.begin("closed"))
    assert site.client.get("/closed/figure").status_code == 403


OWN_ORIGIN = {"Origin": OWN}


def test_a_declared_length_beyond_the_limit_is_answered_by_413(site: Surroundings) -> None:
    site.enter("closed")
    response = site.client.post("/closed/unmask", content=b"x" * 257, headers=OWN_ORIGIN)
    assert response.status_code == 413
    assert "Accepted: up to 256 bytes" in response.text
    assert_strict(response)


def test_a_body_without_a_length_is_counted(site: Surroundings) -> None:
    site.enter("closed")

    def pieces(number: int) -> Iterator[bytes]:
        yield from (b"x" * 64 for _ in range(number))

    assert site.client.post("/closed/unmask", content=pieces(4), headers=OWN_ORIGIN).text == "took 256"
    response = site.client.post("/closed/unmask", content=pieces(5), headers=OWN_ORIGIN)
    assert response.status_code == 413
    assert_strict(response)


def test_an_upload_may_be_larger_than_a_form(site: Surroundings) -> None:
    site.enter("closed")
    taken = site.client.post("/closed/receive", content=b"x" * 4096, headers=OWN_ORIGIN)
    refused = site.client.post("/closed/receive", content=b"x" * 4097, headers=OWN_ORIGIN)
    assert (taken.text, refused.status_code) == ("took 4096", 413)
    assert "up to 4 KiB" in refused.text


def test_what_nobody_expected_becomes_a_page_with_an_incident(
    site: Surroundings, caplog: pytest.LogCaptureFixture
) -> None:
    site.enter("closed")
    response = site.client.get("/closed/broken")
    assert response.status_code == 500
    assert "something in the program broke" in response.text.lower()
    assert_strict(response)
    (logged,) = [record.getMessage() for record in caplog.records if record.name == "lookledger.web"]
    assert "ValueError" in logged
    assert "broken" in logged
    assert "01-017" not in logged + response.text
    assert "Traceback" not in response.text


def test_static_files_may_be_kept_for_a_short_while(site: Surroundings) -> None:
    assert site.client.get("/static/figure").headers["cache-control"] == "private, max-age=300"


def test_a_method_that_an_address_does_not_take_is_named(site: Surroundings) -> None:
    site.enter("closed")
    response = site.client.delete("/closed/figure", headers=OWN_ORIGIN)
    assert response.status_code == 405
    assert "'DELETE'" in response.text
    assert_strict(response)


def test_an_unknown_address_for_a_program_is_answered_in_one_json_form(site: Surroundings) -> None:
    site.enter("closed")
    response = site.client.get("/closed/nowhere.json")
    assert response.status_code == 404
    assert response.json() == {
        "status": 404,
        "kind": "Refused",
        "sentence": response.json()["sentence"],
        "what": "there is no page at this address",
        "where": "",
        "found": "'/closed/nowhere.json'",
        "accepted": "the addresses that the pages link to",
        "remedy": "Go back to the newest look",
    }


def test_keys_open_their_own_side_and_are_not_shown() -> None:
    keys = Keys.made_from(Counted())
    assert (keys.side_of(keys.closed), keys.side_of(keys.open)) == ("closed", "open")
    assert [keys.side_of(key) for key in ("", "\udc80", "é", keys.closed[:-1], keys.closed + "A")] == [
        None
    ] * 5
    assert keys.closed not in repr(keys)
    assert keys.open not in repr(keys)
    assert keys != replace(keys, open=keys.closed)


def test_a_session_s_identity_says_nothing_about_its_cookie(site: Surroundings) -> None:
    cookie = site.sessions.begin("closed")
    session = site.sessions.find(cookie)
    assert session is not None
    assert session.id not in cookie
