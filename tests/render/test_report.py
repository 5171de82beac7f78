"""The frozen report: one file, no script, no request, the same bytes each time, the record inside."""

from __future__ import annotations

import base64
import hashlib
import json
import re
from dataclasses import replace
from html import unescape
from pathlib import Path

import pytest
from jinja2 import Environment

from app.assets import asset
from app.render.page import page_environment
from app.render.report import ReportFacts, css_text, numbered_tables, render_report
from app.sheets.blocks import LookBook
from app.sheets.caution import CAUTION
from tests.render import invented_book as invented
from tests.render.drawn_figures import HOSTILE

RECORD = json.dumps(
    {"format": 1, "note": "<b>5 < 7 & \"8\"</b> '</pre>'", "z": 2.128735921}, ensure_ascii=False
)
FACTS = ReportFacts(
    frozen_at="26\u00a0Jan\u00a02027, 14:05\u00a0UTC",
    by="A. Statistician",
    head_before="8c4177d0" + "0" * 52 + "19e2",
    plan_digest="a" * 64,
    snapshot_digests=("b" * 64, "c" * 64),
    record_json=RECORD,
    record_digest="d" * 64,
    program="Lookledger 0.1.0",
)


@pytest.fixture(scope="module")
def environment() -> Environment:
    return page_environment(Path(asset("templates")))


@pytest.fixture(scope="module")
def report(environment: Environment) -> str:
    return render_report(environment, invented.book(), frozen=FACTS).decode()


def test_the_head_says_once_which_look_it_is_and_when_it_was_frozen(report: str) -> None:
    said = "Look 3, planned, frozen 26\u00a0Jan\u00a02027, 14:05\u00a0UTC. Plan version 2."
    assert f'<p class="frozen">{said} Chain head' in report


def test_the_same_book_and_facts_give_the_same_bytes(report: str) -> None:
    afresh = page_environment(Path(asset("templates")))
    assert render_report(afresh, invented.book(), frozen=FACTS).decode() == report


def test_a_report_runs_nothing_and_asks_for_nothing(report: str) -> None:
    assert not re.search(
        r"<script|<iframe|<object|<embed|<link|<img|<form|javascript:|\son\w+=|\sstyle=", report
    )
    assert not re.search(r'(?:src|href|action)="(?!#)', report)
    assert re.findall(r'url\("?([a-z]+:)', report) == ["data:"] * 5
    assert "http" not in report.replace("http://www.w3.org/2000/svg", "").replace("http-equiv", "")
    assert "@import" not in report


def test_its_one_style_is_the_one_its_policy_allows(report: str) -> None:
    styles = re.findall(r"<style>(.*?)</style>", report, re.DOTALL)
    assert len(styles) == 1
    digest = base64.b64encode(hashlib.sha256(styles[0].encode()).digest()).decode()
    assert f"content=\"default-src 'none'; style-src 'sha256-{digest}'; font-src data:" in report


def test_the_record_comes_out_as_it_went_in(report: str) -> None:
    found = re.search(r'<pre id="record">(.*?)</pre>', report, re.DOTALL)
    assert found is not None
    assert unescape(found.group(1)) == RECORD


def test_what_a_report_is_bound_to_is_printed_in_it(report: str) -> None:
    for fact in (
        FACTS.head_before,
        FACTS.plan_digest,
        *FACTS.snapshot_digests,
        FACTS.record_digest,
        FACTS.program,
        FACTS.by,
    ):
        assert fact in report
    assert "It is not an electronic signature" in report
    assert "8c41 77d0 \\2026  19e2" in report  # at the foot of every page


def test_every_sheet_is_in_it_in_order_and_how_it_was_computed_is_open(report: str) -> None:
    assert re.findall(r'<section id="([a-z-]+)">', report) == [
        *(f"sheet-{sheet.key}" for sheet in invented.book().sheets),
        "computed",
        "the-record",
    ]
    assert report.count("<details>") == 1  # the record; methods are never folded here
    assert report.count("Lan and DeMets (1983)") == 1  # each entry once
    assert CAUTION in unescape(report)


def test_only_places_in_use_are_carried(report: str) -> None:
    places = re.findall(r"^\.(t\d+) \{", report, re.MULTILINE)
    assert places == ["t000", "t1000", "t250", "t266", "t500", "t506", "t714", "t750"]


def test_tables_are_numbered_by_their_sheet_in_the_order_they_stand() -> None:
    boundary = invented.book().sheet("boundary")
    assert boundary is not None
    numbered = numbered_tables(boundary)
    assert [number for number, _ in numbered.narrow] == ["4.1", "4.2", "4.3"]
    assert [number for number, _ in numbered.wide] == ["4.4"]


@pytest.mark.parametrize(("state", "ground"), [("not crossed", "#1A1A1E"), ("masked", "#FFFFFF")])
def test_the_label_at_the_head_of_a_page_is_solid_where_disclosed(
    environment: Environment, state: invented.State, ground: str
) -> None:
    html = render_report(environment, invented.book(state), frozen=FACTS).decode()
    left, middle = re.findall(r"content: \"([A-Z]+)\"; width: 20mm.*?background: (#\w+);", html, re.DOTALL)
    assert left == ("CLOSED", "#1A1A1E")
    assert middle == ("MASKED" if state == "masked" else "UNMASKED", ground)


def test_hostile_words_cannot_leave_the_style_or_the_text(environment: Environment) -> None:
    hostile = f'</style>{HOSTILE}"; }} body {{ display: none'
    book = invented.book()
    frame = replace(book.frame, trial_name=hostile, trial_title=hostile, colophon=(hostile,))
    html = render_report(
        environment, LookBook(frame, book.sheets), frozen=replace(FACTS, by=hostile)
    ).decode()
    assert html.count("</style>") == 1
    assert "<script>" not in html
    assert "body { display: none" not in html.split("<style>")[1].split("</style>")[0]


def test_text_for_css_is_escaped_by_code_point() -> None:
    """CSS Syntax Level 3, section 4.3.7: a backslash, hexadecimal digits, one space that belongs to them."""
    assert css_text('Q17 "a"\n\\</style>') == "Q17 \\22 a\\22 \\a \\5c \\3c \\2f style\\3e "
