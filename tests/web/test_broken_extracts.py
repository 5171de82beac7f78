"""Each broken extract on the page: every sentence of its findings, and a trial file that nothing touched."""

from __future__ import annotations

import html
import re
from collections.abc import Iterator

import pytest

from app.actions.start import start
from app.settings import Settings
from tests.broken.test_broken_extracts import BROKEN, EXPECTED, FINDINGS, FOLDER
from tests.web.served import Served, serve_copy


@pytest.fixture(scope="module")
def waiting(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Served]:
    """A trial that waits for its first extract."""
    folder = tmp_path_factory.mktemp("broken")
    plan = FOLDER / "plan.toml"
    new = folder / "new.trial"
    start(Settings(), plan_name=plan.name, plan=plan.read_bytes(), path=new, by="Jane Roe")
    served = serve_copy(new, folder)
    with served.client, served.desk:
        served.enter()
        yield served


def said(page: str) -> str:
    """What a page says, without its tags."""
    return " ".join(html.unescape(re.sub(r"<[^>]+>", "", page)).split())


@pytest.mark.parametrize("name", BROKEN)
def test_each_finding_is_told_and_nothing_is_stored(waiting: Served, name: str) -> None:
    before = waiting.path.read_bytes()
    cutoff = EXPECTED["cutoff"].isoformat()
    sent = waiting.upload(
        (FOLDER / name).read_bytes(), name=name, cutoff=cutoff, extracted="", kind="planned"
    )
    blocks = any(finding["severity"] == "block" for finding in FINDINGS[name])
    assert sent.status_code == (422 if blocks else 303)
    page = said(sent.text if blocks else waiting.get("/closed/receive/confirm").text)
    for finding in FINDINGS[name]:
        assert " ".join(finding["sentence"].split()) in page
    assert waiting.path.read_bytes() == before
