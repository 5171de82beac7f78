"""What the watched browser must notice, planted one by one: otherwise an empty list would prove nothing."""

from __future__ import annotations

from collections.abc import Iterator
from http.server import BaseHTTPRequestHandler, ThreadingHTTPServer
from threading import Thread

import pytest
from playwright.sync_api import Browser

from tests.browser.watched import obstacles, watched

POLICY = "default-src 'none'; script-src 'unsafe-inline'; img-src http:"
PAGES = {
    "/console": "<script>console.log('a word')</script>",
    "/error": "<script>nowhere()</script>",
    "/request": "<img alt='' src='http://127.0.0.1:9/picture.png'>",
    "/violation": "<style>p { color: red }</style>",
    "/obstacle": "<img src='/console'>",
}


class Planted(BaseHTTPRequestHandler):
    """Serves one fault a page."""

    def do_GET(self) -> None:
        body = f"<!doctype html><html lang='en'><title>t</title><main><h1>h</h1>{PAGES.get(self.path, '')}"
        self.send_response(200)
        self.send_header("Content-Type", "text/html")
        self.send_header("Content-Security-Policy", POLICY)
        self.end_headers()
        self.wfile.write(body.encode())

    def log_message(self, *_: object) -> None:
        """Say nothing."""


@pytest.fixture
def own() -> Iterator[str]:
    with ThreadingHTTPServer(("127.0.0.1", 0), Planted) as server:
        Thread(target=server.serve_forever, daemon=True).start()
        yield f"http://127.0.0.1:{server.server_port}"
        server.shutdown()


@pytest.mark.parametrize(
    ("path", "told"),
    [
        ("/console", "console log: a word"),
        ("/error", "nowhere is not defined"),
        ("/request", "request to http://127.0.0.1:9/picture.png"),
        ("/violation", "violation: style-src-elem"),
    ],
)
def test_a_planted_fault_is_noticed(chromium: Browser, own: str, path: str, told: str) -> None:
    with watched(chromium, own) as seen:
        page = seen.page()
        page.goto(own + path)
        page.wait_for_timeout(200)
        assert told in "\n".join(seen.noticed)


def test_a_clean_page_leaves_nothing_to_notice(chromium: Browser, own: str) -> None:
    with watched(chromium, own) as seen:
        page = seen.page()
        page.goto(own + "/clean")
        page.wait_for_timeout(200)
        assert seen.noticed == []


def test_a_picture_without_words_is_an_obstacle(chromium: Browser, own: str) -> None:
    with watched(chromium, own) as seen:
        page = seen.page()
        page.goto(own + "/obstacle")
        assert "image-alt" in "\n".join(obstacles(page))
