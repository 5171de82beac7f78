"""A hazard ratio asked about on the Outlook sheet: its row, its refusal, and that nothing of it is left."""

from __future__ import annotations

import html
import re
from pathlib import Path
from typing import Any

import pytest

from app.actions.freeze import freeze
from app.actions.report import report
from tests.web.served import Served, serve_copy

OUTLOOK = "/closed/looks/3/outlook"
ROW = re.compile(r'<tr class="apart">(.*?)</tr>', re.DOTALL)
CELL = re.compile(r"<td[^>]*>\s*([−\d.]+)")


def words(response: Any) -> str:
    return html.unescape(response.text).replace("\u00a0", " ")


def cells(page: Any, row: str) -> list[str]:
    """The numbers of the row of a table that begins so."""
    head = re.compile(rf'<th scope="row"[^>]*>(<span[^>]*>)?{row}<')
    (found,) = [part for part in page.text.replace("\u00a0", " ").split("<tr") if head.search(part)][:1]
    return CELL.findall(found.partition("</tr>")[0])


@pytest.fixture
def asked(served: Served) -> Served:
    served.enter()
    return served


def test_the_sheet_asks_for_a_ratio_and_has_no_row_until_one_is_given(asked: Served) -> None:
    page = asked.get(OUTLOOK)
    assert '<form class="what-if field" method="get" action="/closed/looks/3/outlook">' in page.text
    assert 'name="hazard_ratio"' in page.text
    assert "in each reading experimental / control, from 0.05 to 20; never kept" in words(page)
    assert not ROW.search(page.text)
    assert page.text == asked.get(f"{OUTLOOK}?hazard_ratio=").text


@pytest.mark.parametrize("entered", ["0.8", "0,8", "0%2C80"])
def test_a_ratio_gets_its_row_visibly_not_frozen(asked: Served, entered: str) -> None:
    page = asked.get(f"{OUTLOOK}?hazard_ratio={entered}")
    assert page.status_code == 200
    assert "What if</span>, not frozen" in words(page)
    numbers = cells(page, "What if")
    assert numbers[0] == numbers[3] == "0.800"
    assert len(numbers) == 6
    assert f'value="{entered.replace("%2C", ",")}"' in page.text


def test_the_plan_s_ratio_gives_the_row_of_the_plan(asked: Served) -> None:
    page = asked.get(f"{OUTLOOK}?hazard_ratio=0.75")
    assert cells(page, "What if") == cells(page, "The plan’s ratio")


def test_bad_input_gets_one_sentence_at_the_field_and_keeps_what_was_entered(asked: Served) -> None:
    page = asked.get(f"{OUTLOOK}?hazard_ratio=%22%3E30")
    assert page.status_code == 422
    assert (
        "This is no hazard ratio in the what-if question. Found '\">30'. Accepted: a number from 0.05 to 20, "
        "experimental / control, such as 0.8. Write one number, with a decimal point or comma."
    ) in words(page)
    assert 'value="&#34;&gt;30"' in page.text
    assert 'aria-invalid="true"' in page.text
    assert not ROW.search(page.text)
    assert "What if we go on?" in words(page)


def test_other_sheets_and_other_answers_do_not_know_the_ratio(asked: Served) -> None:
    for path in ("/closed/looks/3/boundary", "/closed/looks/3/record.json", f"{OUTLOOK}/tables.zip"):
        assert asked.get(f"{path}?hazard_ratio=0.8123").content == asked.get(path).content


def test_the_open_side_has_no_such_page(served: Served) -> None:
    served.enter("open")
    assert served.get("/open/looks/3/outlook?hazard_ratio=0.8").status_code == 404
    assert served.get(f"{OUTLOOK}?hazard_ratio=0.8").status_code == 403


def test_asking_leaves_no_trace_in_the_trial_file(asked: Served) -> None:
    asked.get(OUTLOOK)
    before = asked.path.read_bytes()
    for entered in ("0.8123", "1.2345", "no-ratio"):
        asked.get(f"{OUTLOOK}?hazard_ratio={entered}")
    assert asked.path.read_bytes() == before


def test_that_results_were_opened_is_recorded_once_by_asking_as_by_reading(served: Served) -> None:
    served.enter()
    opened = len(served.desk.trial.entries())
    served.get("/closed/looks/2/outlook?hazard_ratio=0.8")
    served.get("/closed/looks/2/outlook?hazard_ratio=0.9")
    assert len(served.desk.trial.entries()) == opened + 1


def test_a_look_frozen_after_asking_is_frozen_as_if_nobody_had_asked(
    asked: Served, demo_trial: Path, tmp_path: Path
) -> None:
    page = asked.get(f"{OUTLOOK}?hazard_ratio=0.8123456")
    assert cells(page, "What if")[0] == "0.812"
    freeze(asked.desk, by="M. Berg")
    record, html = record_and_report(asked)
    for content in (record, html, asked.path.read_bytes()):
        for trace in (b"0.8123456", b'"chosen"', b"What if</span>", b"hazard_ratio=0", b"what-if"):
            assert trace not in content
    assert "every number agrees with the one computed again" in words(asked.verification())
    (tmp_path / "not-asked").mkdir()
    other = serve_copy(demo_trial, tmp_path / "not-asked")
    with other.client, other.desk:
        freeze(other.desk, by="M. Berg")
        assert record_and_report(other)[0] == record


def record_and_report(served: Served) -> tuple[bytes, bytes]:
    body = served.desk.trial.state().frozen_look(3).body
    return served.desk.trial.content(body.record_digest), report(served.desk, 3).html
