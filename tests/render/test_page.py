"""Pages: what stands around a sheet, where links lead, what hostile words can do (nothing)."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest
from jinja2 import Environment, UndefinedError

from app.assets import asset
from app.render.page import SheetMissing, page_environment, render_page, render_sheet
from app.render.spine import spine_marks
from app.sheets.blocks import LookBook, Sheet, Span, Spine, SpineLook
from app.sheets.caution import CAUTION, LEAD
from tests.render import invented_book as invented
from tests.render.drawn_figures import HOSTILE

STATES: tuple[invented.State, ...] = ("not crossed", "crossed", "masked")
KEYS = [sheet.key for sheet in invented.sheets("not crossed")]


@pytest.fixture(scope="module")
def environment() -> Environment:
    return page_environment(Path(asset("templates")))


def page(environment: Environment, key: str, state: invented.State = "not crossed") -> str:
    return render_sheet(environment, invented.book(state), key, base="/closed")


@pytest.mark.parametrize("key", KEYS)
@pytest.mark.parametrize("state", STATES)
def test_every_sheet_of_every_state_carries_the_caution(
    environment: Environment, key: str, state: invented.State
) -> None:
    html = page(environment, key, state)
    assert f"<b>{LEAD}</b> {CAUTION}" in html
    assert html == page(environment, key, state)


@pytest.mark.parametrize("key", KEYS)
def test_a_page_has_no_style_and_no_script_of_its_own(environment: Environment, key: str) -> None:
    html = page(environment, key)
    assert not re.search(r"\sstyle=|<style|\son\w+=|javascript:", html)
    assert re.findall(r"<script[^>]*>", html) == ['<script src="/static/lookledger.js" defer>']
    assert not re.search(r'(?:src|href|action)="(?!/|#)', html)


def test_solid_is_disclosed(environment: Environment) -> None:
    def label(state: invented.State) -> list[tuple[str, str]]:
        found = re.search(r'<p class="label">(.*?)</p>', page(environment, "curves", state))
        assert found is not None
        return re.findall(r"<span( class=\"solid\")?>(\w+)</span>", found.group(1))

    assert label("not crossed") == [(' class="solid"', "closed"), (' class="solid"', "unmasked")]
    assert label("masked") == [(' class="solid"', "closed"), ("", "masked")]


def test_the_sheets_that_exist_are_offered_and_the_current_one_said(environment: Environment) -> None:
    html = page(environment, "boundary")
    offered = re.findall(r'<a href="/closed/looks/3/([a-z-]+)" data-name', html)
    assert offered == KEYS
    assert re.findall(r'href="([^"]+)"[^>]*aria-current="page"', html) == ["/closed/looks/3/boundary"]


def test_the_spine_leads_to_the_same_sheet_of_each_look_held(environment: Environment) -> None:
    html = page(environment, "curves")
    links = re.findall(r'<a class="look-words t\d+" href="([^"]+)"', html)
    assert links == [f"/closed/looks/{look}/curves" for look in (1, 2, 3)]
    assert html.count('aria-current="true"') == 1


def test_what_a_listener_hears_of_a_look(environment: Environment) -> None:
    html = page(environment, "curves")
    item = re.search(r'<li class="t714 held shown">(.*?)</li>', html, re.DOTALL)
    assert item is not None
    heard = re.sub(r'<span[^>]*aria-hidden="true">.*?</span>', "", item.group(1))
    words = re.sub(r"\s+", " ", re.sub(r"<[^>]+>", " ", heard))
    assert words.strip() == "Look 3 information fraction 0.714 · 384 events , planned 0.75, open"


def test_neighbours_are_the_sheets_before_and_after(environment: Environment) -> None:
    beside = re.compile(r'<a class="(prev|next)" rel="\1" href="([^"]+)"')
    assert beside.findall(page(environment, "boundary")) == [
        ("prev", "/closed/looks/3/curves"),
        ("next", "/closed/looks/3/shape"),
    ]
    assert [rel for rel, _ in beside.findall(page(environment, "at-a-glance"))] == ["next"]
    assert [rel for rel, _ in beside.findall(page(environment, "record"))] == ["prev"]


def test_receiving_is_offered_on_the_closed_side_only(environment: Environment) -> None:
    assert 'href="/closed/receive"' in page(environment, "data")
    on_open_side = render_sheet(environment, invented.book("not crossed"), "data", base="/open")
    assert "Receive the next extract" not in on_open_side
    assert '<form method="post" action="/leave">' in on_open_side


def test_only_a_figure_that_can_be_zoomed_into_says_where_its_numbers_are(environment: Environment) -> None:
    assert 'data-figure="/closed/looks/3/boundary/figure.json"' in page(environment, "boundary")
    assert "data-figure" not in page(environment, "data")  # counts
    assert "Zoom and read values" not in page(environment, "boundary")  # the script offers it


def test_two_figures_stand_beside_each_other_with_their_tables_in_one_fold(environment: Environment) -> None:
    html = page(environment, "shape")
    assert re.findall(r'data-figure="([^"]+)"', html) == [
        "/closed/looks/3/shape/figure.json",
        "/closed/looks/3/shape/second-figure.json",
    ]
    assert html.count('viewBox="0 0 360 372"') == 2
    assert html.count('viewBox="0 0 343 290"') == 2
    assert html.count("<summary>The figures as tables</summary>") == 1
    assert "Smoothed hazard ratio, 95% limits" in html
    assert "The figures as tables" not in page(environment, "curves")


def test_numbers_of_a_column_agree_at_the_point(environment: Environment) -> None:
    html = page(environment, "boundary")
    assert "<td>2.434\u2007</td>" in html
    assert "<td>0.0075</td>" in html


def test_hostile_words_stay_words(environment: Environment) -> None:
    book = invented.book("not crossed")
    hostile = (Span(HOSTILE, "crossed"), Span(HOSTILE, "symbol"), Span(HOSTILE, href="javascript:alert(1)"))
    sheet = replace(book.sheets[3], question=HOSTILE, name=HOSTILE, answer=(hostile,), notes=(hostile,))
    frame = replace(book.frame, trial_name=HOSTILE, trial_title=HOSTILE, colophon=(HOSTILE,))
    html = render_sheet(environment, LookBook(frame, (sheet,)), "curves", base="/closed")
    assert "<script>" not in html
    assert "javascript:" not in html
    assert html.count("&lt;script&gt;alert(&#39;1&#39;)") >= 8


def test_a_sheet_that_a_look_lacks_is_said(environment: Environment) -> None:
    with pytest.raises(SheetMissing) as caught:
        page(environment, "astrology")
    assert str(caught.value) == (
        "No such sheet in look 3. Found 'astrology'. "
        "Accepted: at-a-glance, data, information, curves, boundary, shape, record."
    )


def test_a_page_without_a_look_has_no_look_around_it(environment: Environment) -> None:
    html = render_page(environment, "base.html", frame=None, base="/closed")
    assert "spine" not in html
    assert f"<b>{LEAD}</b> {CAUTION}" in html


def test_a_name_that_a_template_misspells_is_no_blank(environment: Environment) -> None:
    with pytest.raises(UndefinedError):
        environment.from_string("{{ sheets.nonesuch }}").render(sheets=invented.book().frame)


def test_a_sheet_without_figure_tables_or_methods_still_sets(environment: Environment) -> None:
    book = invented.book()
    bare = Sheet("data", 1, "Data", "Can we trust this extract?", ((Span("Nothing was received."),),))
    html = render_sheet(environment, LookBook(book.frame, (bare,)), "data", base="/closed")
    assert "Nothing was received." in html
    assert "<details>" not in html


# --- the spine ----------------------------------------------------------------------------------------------


def held(number: int, fraction: float, **more: object) -> SpineLook:
    return SpineLook(number, fraction, round(538 * fraction), "planned", "frozen", **more)  # type: ignore[arg-type]


def test_a_look_stands_where_its_information_is() -> None:
    marks = spine_marks(invented.frame("not crossed").spine)
    assert [mark.place for mark in marks.marks] == ["t266", "t506", "t714", "t1000"]
    assert [mark.bracket for mark in marks.marks] == ["t250", "t500", "t750", ""]
    assert marks.filled == "t714"
    assert [tick.text for tick in marks.ticks] == ["0", "0.25", "0.50", "0.75", "1"]


def test_looks_that_are_close_have_their_words_moved_apart_and_led_to() -> None:
    marks = spine_marks(Spine((held(1, 0.5), held(2, 0.51, shown=True)), (0.5, 1.0), 538)).marks
    assert [mark.place for mark in marks] == ["t500", "t510"]
    first, second = (int(mark.words_place[1:]) for mark in marks)
    assert second - first >= 63
    assert [mark.leader for mark in marks] == ["up", "down"]


def test_information_over_one_runs_on_by_the_same_scale() -> None:
    marks = spine_marks(Spine((held(1, 0.5), held(2, 1.25, shown=True)), (0.5, 1.0), 538))
    assert [mark.place for mark in marks.marks] == ["t400", "t1000"]
    assert [tick.place for tick in marks.ticks] == ["t000", "t400", "t800"]


def test_many_looks_keep_one_line_each() -> None:
    marks = spine_marks(Spine(tuple(held(n, n / 25) for n in range(1, 26)), (1.0,), 538))
    assert marks.dense
    assert len({mark.words_place for mark in marks.marks}) == 25
