"""`demo` and `serve` as processes: what they print, whom they let in, how they stop."""

from __future__ import annotations

import os
import re
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from http.cookiejar import CookieJar
from pathlib import Path
from urllib.error import HTTPError
from urllib.parse import urlencode
from urllib.request import HTTPCookieProcessor, Request, build_opener

import pytest

from app.bootstrap.environment import ROOT

LINK = re.compile(r"^  (closed|open) +(http://127\.0\.0\.1:\d+/enter/\S+)$", re.MULTILINE)
SECONDS_TO_STOP = 10


@dataclass
class Running:
    """A server process and the links that it printed."""

    process: subprocess.Popen[str]
    printed: str
    links: dict[str, str]

    def stop(self) -> tuple[int, str, str]:
        """Press Ctrl-C; the exit code and what was printed since the links."""
        self.process.send_signal(signal.SIGINT)
        out, err = self.process.communicate(timeout=SECONDS_TO_STOP)
        return self.process.returncode, out, err


@contextmanager
def running(*words: str, surroundings: Mapping[str, str] | None = None) -> Iterator[Running]:
    process = subprocess.Popen(
        [sys.executable, "app", *words],
        cwd=ROOT,
        env={**os.environ, **(surroundings or {})},
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    try:
        printed = ""
        while len(links := dict(LINK.findall(printed))) < 2:
            line = process.stdout.readline()
            assert line, f"the server ended: {process.stderr.read()}"
            printed += line
        yield Running(process, printed, links)
    finally:
        if process.poll() is None:
            process.kill()
        process.communicate()


class Visitor:
    """A browser of the plainest kind."""

    def __init__(self) -> None:
        self.opener = build_opener(HTTPCookieProcessor(CookieJar()))

    def read(self, url: str, fields: Mapping[str, str] | None = None) -> str:
        origin = re.match(r"http://[^/]+", url)[0]
        body = urlencode(fields).encode() if fields else None
        with self.opener.open(Request(url, body, headers={"Origin": origin})) as answer:
            return answer.read().decode()

    def enter(self, link: str) -> str:
        """Press the button behind a link; the page that follows."""
        origin, key = link.split("/enter/")
        return self.read(f"{origin}/enter", {"key": key})


def test_the_demo_lets_in_by_its_links_and_stops_at_ctrl_c(tmp_path: Path) -> None:
    with running("demo", "--to", str(tmp_path / "demo.trial"), "--no-browser") as server:
        assert "data cutoff 2026-10-09, extract taken 2026-10-23, a final look" in server.printed
        assert "Enter the closed pages" in Visitor().read(server.links["closed"])
        assert "in five lines?" in Visitor().enter(server.links["closed"])
        assert "show to the open side?" in Visitor().enter(server.links["open"])
        code, out, err = server.stop()
    assert (code, err) == (0, "")
    assert out.endswith("Stopped. Sessions and keys of this start are void.\n")


def test_a_trial_file_is_served_again_with_new_keys_and_nothing_is_logged(tmp_path: Path) -> None:
    trial = str(tmp_path / "demo.trial")
    with running("demo", "--to", trial, "--no-browser") as first:
        first.stop()
    with running("serve", trial, "--no-browser") as second:
        assert second.links.keys() == {"closed", "open"}
        assert not set(map(key_of, first.links.values())) & set(map(key_of, second.links.values()))
        with pytest.raises(HTTPError, match="403"):
            Visitor().read(f"{second.links['closed'][:-4]}xxxx")
        _, out, err = second.stop()
    assert err == ""
    assert "/enter/" not in out


def key_of(link: str) -> str:
    return link.rpartition("/")[2]


def test_a_port_that_is_taken_is_named(tmp_path: Path) -> None:
    with socket.socket() as other:
        other.bind(("127.0.0.1", 0))
        other.listen()
        port = str(other.getsockname()[1])
        command = [sys.executable, "app", "demo", "--to", str(tmp_path / "d.trial"), "--port", port]
        ended = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, timeout=60, check=False)
    assert ended.returncode == 5
    assert ended.stderr.startswith(f"The port cannot be used in 127.0.0.1. Found {port} (")
    assert ended.stderr.count("\n") == 1


def test_the_browser_is_opened_by_a_private_file_that_holds_the_link(tmp_path: Path) -> None:
    seen = tmp_path / "seen"
    browser = tmp_path / "browser"
    browser.write_text(f'#!/bin/sh\necho "$1" > {seen}.part\nmv {seen}.part {seen}\n')
    browser.chmod(0o700)
    display = {"DISPLAY": ":0", "BROWSER": f"{browser} %s"}
    with running("demo", "--to", str(tmp_path / "demo.trial"), surroundings=display) as server:
        deadline = time.monotonic() + SECONDS_TO_STOP
        while not seen.exists() and time.monotonic() < deadline:
            time.sleep(0.05)
        page = Path(seen.read_text().strip().removeprefix("file://"))
        assert server.links["closed"] in page.read_text()
        assert page.stat().st_mode & 0o077 == 0
        server.stop()
    assert not page.exists()


def test_no_browser_is_opened_where_there_is_no_display(tmp_path: Path) -> None:
    seen = tmp_path / "seen"
    nowhere = {"DISPLAY": "", "WAYLAND_DISPLAY": "", "BROWSER": f"touch {seen} %s"}
    with running("demo", "--to", str(tmp_path / "demo.trial"), surroundings=nowhere) as server:
        assert "in five lines?" in Visitor().enter(server.links["closed"])
        server.stop()
    assert not seen.exists()


@pytest.mark.bench
def test_the_second_start_reaches_the_first_page_in_under_two_seconds(tmp_path: Path) -> None:
    times = []
    for start in range(3):
        began = time.perf_counter()
        with running("demo", "--to", str(tmp_path / f"{start}.trial"), "--no-browser") as server:
            assert "in five lines?" in Visitor().enter(server.links["closed"])
            times.append(time.perf_counter() - began)
            server.stop()
    print(f"\nfrom the command to the first page: {min(times[1:]):.2f} s")
    assert min(times[1:]) < 2
