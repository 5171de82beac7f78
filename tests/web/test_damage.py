"""A trial file with a changed byte: the closed side is told what and where, the open side no more."""

from __future__ import annotations

import html
import re
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
