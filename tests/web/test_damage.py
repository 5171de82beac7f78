"""A trial file with a changed byte: the closed side is told what and where, the open side no more."""

from __future__ import annotations

import html
import re
import sqlite3
from collections.abc import Iterator
from pathlib import Path

import pytest

from app.actions.demo import make_demo
from app.settings import Settings
from tests.web.served import Served, serve_copy


@pytest.fixture
def damaged(tmp_path: Path) -> Iterator[Served]:
    """One letter of one stored extract is another one."""
    whole = tmp_path / "whole.trial"
    make_demo(Settings(), whole)
    content = whole.read_bytes()
    at = content.rindex(b",TABLET,")
    whole.write_bytes(content[:at] + b",TABLES," + content[at + 8 :])
    served = serve_copy(whole, tmp_path)
    with served.client, served.desk:
        yield served


def test_the_closed_side_is_told_and_led_to_the_check(damaged: Served) -> None:
    damaged.enter()
    answers = [damaged.get(f"/closed/looks/{look}/glance") for look in (1, 2, 3)]
    refused = next(answer for answer in answers if answer.status_code == 409)
    assert "The trial file is not as it was written." in refused.text
    assert 'href="/closed/verify"' in refused.text
    checked = html.unescape(damaged.verification().text)
    assert re.search(r"No: \d of \d checks failed\.", checked)
    assert re.search(r"snapshot \d", checked)


def test_the_open_side_is_told_no_digest_path_or_row(damaged: Served) -> None:
    damaged.enter("open")
    paths = ["/", *(f"/open/looks/{look}/data" for look in (1, 2, 3))]
    answers = [damaged.get(path) for path in paths]
    refused = [answer for answer in answers if answer.status_code == 409]
    assert refused
    for answer in refused:
        assert "This page cannot be shown at present." in answer.text
        assert not re.search(r"[0-9a-f]{16}|\.trial|digest|snapshot", answer.text)


def test_damage_that_lets_pages_open_is_told_on_each_of_the_closed_side(
    demo_trial: Path, tmp_path: Path
) -> None:
    weakened = tmp_path / "weakened.trial"
    weakened.write_bytes(demo_trial.read_bytes())
    shell = sqlite3.connect(weakened)
    shell.execute("DROP TRIGGER entry_update")
    shell.close()
    served = serve_copy(weakened, tmp_path)
    told = "only read: the rule or table 'entry_update' of the file: missing."
    with served.client, served.desk:
        served.enter()
        for path in ("/closed/looks/3/curves", "/closed/looks/1/record", "/closed/unmask"):
            response = served.get(path)
            assert (response.status_code, told in html.unescape(response.text)) == (200, True)
        refused = served.post("/closed/unmask", by="Jane Roe", reason="Asked for.")
        assert (refused.status_code, "not written to" in refused.text) == (409, True)
        served.enter("open")
        assert "only read" not in served.get("/open/looks/3/data").text
