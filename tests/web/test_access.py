"""Every route of the real application, against who may not come in."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from fastapi.routing import iter_route_contexts

from app.web.headers import NOT_KEPT, STRICT
from tests.web.served import ADDRESS, KEYS, OWN, Served

EXAMPLES = {"{key}": "no-such-key", "{look}": "3", "{sheet}": "curves"}
FOREIGN_ORIGINS = ("http://evil.test", f"http://127.0.0.1:{ADDRESS.port + 1}", "null", None)


def routes(served: Served) -> Iterator[tuple[str, str]]:
    """Each method and address that the application knows; files under /static/ are the program's own."""
    for route in iter_route_contexts(served.app.routes):
        path = str(route.path)
        for name, example in EXAMPLES.items():
            path = path.replace(name, example)
        if path != "/static":
            yield from ((method, path) for method in sorted(route.methods or ()))


def assert_strict(response: Any) -> None:
    assert {name: response.headers.get(name) for name in STRICT} == STRICT
    assert response.headers["cache-control"] == NOT_KEPT


def test_no_route_answers_without_a_session(served: Served) -> None:
    walked = list(routes(served))
    for method, path in walked:
        response = served.client.request(method, path, headers=OWN, follow_redirects=False)
        print(method, path, response.status_code)
        assert response.status_code == 403, (method, path)
        assert_strict(response)
    assert len(walked) > 15
    assert ("GET", "/closed/looks/3/curves") in walked


def test_no_act_is_done_for_a_foreign_null_or_absent_origin(served: Served) -> None:
    served.enter()
    before = served.path.read_bytes()
    acts = [path for method, path in routes(served) if method == "POST"]
    for path in acts:
        for origin in FOREIGN_ORIGINS:
            headers = {} if origin is None else {"Origin": origin}
            response = served.client.post(path, data={"key": KEYS.closed, "by": "Mallory"}, headers=headers)
            assert response.status_code == 403, (path, origin)
            assert_strict(response)
    assert len(acts) >= 6
    assert served.path.read_bytes() == before


def test_no_route_answers_to_another_host_name(served: Served) -> None:
    served.enter()
    for method, path in routes(served):
        response = served.client.request(method, path, headers={"Host": "evil.test", **OWN})
        assert response.status_code == 400, (method, path)
        assert_strict(response)


def test_an_oversized_form_or_upload_is_refused_with_its_limit(served: Served) -> None:
    served.enter()
    limits = served.app.state.site.settings.limits
    form = served.client.post("/closed/unmask", content=b"x" * (limits.form_bytes + 1), headers=OWN)
    upload = served.client.post(
        "/closed/receive", headers={**OWN, "Content-Length": str(limits.upload_bytes + 1)}, content=b"x"
    )
    assert [form.status_code, upload.status_code] == [413, 413]
    assert "Accepted: up to 256 KiB" in form.text
    assert "Accepted: up to 64 MiB" in upload.text
    for response in (form, upload):
        assert_strict(response)


def test_the_open_session_reaches_no_closed_route(served: Served) -> None:
    served.enter("open")
    closed = [(method, path) for method, path in routes(served) if path.startswith("/closed")]
    for method, path in closed:
        response = served.client.request(method, path, headers=OWN, follow_redirects=False)
        assert response.status_code == 403, (method, path)
        assert "not part of what your key opens" in response.text
    assert len(closed) > 10


def test_a_link_is_looked_at_without_being_used_up(served: Served) -> None:
    for _ in range(3):
        page = served.get(f"/enter/{KEYS.closed}")
        assert (page.status_code, "set-cookie" in page.headers) == (200, False)
    assert "It opens the closed pages, the comparison included." in page.text


def test_a_key_is_exchanged_for_a_cookie_that_scripts_and_other_ports_cannot_use(served: Served) -> None:
    response = served.post("/enter", key=KEYS.open)
    cookie = response.headers["set-cookie"]
    assert (response.status_code, response.headers["location"]) == (303, "/")
    assert cookie.startswith(f"lookledger-{ADDRESS.port}=")
    assert {"HttpOnly", "Path=/", "SameSite=strict"} <= set(cookie.split("; "))
    assert KEYS.open not in cookie


@pytest.mark.parametrize("key", ["", "no-such-key", "the-closed-ke", "the-closed-key\x00"])
def test_a_key_that_does_not_fit_opens_nothing(served: Served, key: str) -> None:
    response = served.post("/enter", key=key)
    assert (response.status_code, "set-cookie" in response.headers) == (403, False)
    assert "This key opens nothing here." in response.text


def test_leaving_ends_the_session_in_the_server_too(served: Served) -> None:
    served.enter()
    kept = dict(served.client.cookies)
    assert "You have left." in served.post("/leave").text
    served.client.cookies.update(kept)
    assert served.get("/closed/looks/3/curves").status_code == 403
