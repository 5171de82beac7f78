"""The pages as a browser sets them: places that never move, numbers in line, nothing lost on a small screen.

Answers come from memory with the headers that the program sends; no server runs.
"""

from __future__ import annotations

import json
import mimetypes
import re
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest
from playwright.sync_api import Browser, Page, Route

from app.assets import asset
from app.render.page import page_environment, render_sheet
from app.render.plotly_figures import plotly_figure
from app.render.report import render_report
from app.web.headers import CONTENT_SECURITY_POLICY
from tests.browser.watched import Watched, obstacles, watched
from tests.render import invented_book as invented
from tests.render.drawn_figures import with_harm
from tests.render.test_report import FACTS

ORIGIN = "http://lookledger.test"
STATES: dict[str, invented.State] = {"closed": "not crossed", "crossed": "crossed", "masked": "masked"}
KEYS = [sheet.key for sheet in invented.sheets("not crossed")]
ENVIRONMENT = page_environment(Path(asset("templates")))
mimetypes.add_type("font/woff2", ".woff2")


def answer(route: Route) -> None:
    """What the program would answer: a file of its own, a figure, or a sheet."""
    path = route.request.url.removeprefix(ORIGIN)
    headers = {"Content-Security-Policy": CONTENT_SECURITY_POLICY}
    if path.startswith("/static/"):
        file = Path(asset(*path.strip("/").split("/")))
        kind = mimetypes.guess_type(file.name)[0] or "text/plain"
        route.fulfill(body=file.read_bytes(), headers={**headers, "Content-Type": kind})
        return
    _, side, _, _, key, *figure = path.split("/")
    book = invented.book(STATES[side])
    if figure:
        sheet = book.sheet(key)
        assert sheet is not None
        shown = sheet.figures[{"figure.json": 0, "second-figure.json": 1}[figure[0]]]
        body = json.dumps(plotly_figure(shown, beside=len(sheet.figures) > 1))
        route.fulfill(body=body, content_type="application/json", headers=headers)
        return
    html = render_sheet(ENVIRONMENT, book, key, base=f"/{side}")
    route.fulfill(body=html, content_type="text/html; charset=utf-8", headers=headers)


@contextmanager
def opened(chromium: Browser, **options: Any) -> Iterator[tuple[Watched, Page]]:
    """A page that is watched; what was noticed must be nothing."""
    with watched(chromium, ORIGIN, **options) as seen:
        seen.context.route(f"{ORIGIN}/**", answer)
        yield seen, seen.page()
        assert seen.noticed == []


def go(page: Page, key: str, side: str = "closed") -> None:
    page.goto(f"{ORIGIN}/{side}/looks/3/{key}")
    page.evaluate("document.fonts.ready")


def test_what_stands_around_a_sheet_never_moves(chromium: Browser) -> None:
    """Label, trial, dates, spine, names of sheets, question, answer and caution stay while sheets turn."""
    constant = (
        ".label, .trial, .dates dt, .dates dd, .spine li, .spine .planned, .sheets li, .question, .answer"
    )
    places: dict[str, list[list[float]]] = {}
    with opened(chromium) as (_, page):
        for key in KEYS:
            go(page, key)
            places[key] = page.eval_on_selector_all(
                constant, "all => all.map(e => { const b = e.getBoundingClientRect(); return [b.x, b.y]; })"
            )
            foot = page.eval_on_selector(".foot", "e => e.getBoundingClientRect().y")
            places[key].append([foot])
    first, *others = places.values()
    assert all(other == first for other in others)


DRAWN_AT = {
    ".label": (24, 20),
    ".trial": (232, 20),
    ".rail": (24, 92),
    ".question": (232, 118),
    ".answer": (232, 142),
    ".drawing": (232, 192),
    ".side": (1004, 192),
}


def test_places_at_a_laptop_are_those_that_were_drawn(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        go(page, "boundary")
        for selector, place in DRAWN_AT.items():
            found = page.eval_on_selector(
                selector, "e => { const b = e.getBoundingClientRect(); return [b.x, b.y]; }"
            )
            assert found == pytest.approx(place, abs=1), selector


def test_every_sheet_fits_a_laptop_screen(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        for key in KEYS:
            go(page, key, "masked")
            assert page.evaluate("document.documentElement.scrollHeight") <= 768


def test_a_plan_with_futility_and_harm_fits_it_too(chromium: Browser) -> None:
    """Seven rows under two lanes a look, and a sentence for each reading."""
    book = invented.book("masked")
    sheets = tuple(
        replace(sheet, figure=with_harm("masked")) if sheet.key == "boundary" else sheet
        for sheet in book.sheets
    )
    html = render_sheet(ENVIRONMENT, replace(book, sheets=sheets), "boundary", base="/masked")
    with opened(chromium) as (seen, page):
        seen.context.route(
            f"{ORIGIN}/masked/looks/3/boundary",
            lambda route: route.fulfill(
                body=html,
                content_type="text/html; charset=utf-8",
                headers={"Content-Security-Policy": CONTENT_SECURITY_POLICY},
            ),
        )
        go(page, "boundary", "masked")
        assert page.locator(".drawing .wide text", has_text="Harm bound").count() == 1
        assert page.evaluate("document.documentElement.scrollHeight") <= 768


POINTS = """
table => {
  const columns = {};
  for (const cell of table.querySelectorAll("tbody td")) {
    const text = cell.firstChild;
    const at = text && text.nodeType === 3 ? text.data.indexOf(".") : -1;
    if (at < 0 || !/^[−±]?[0-9]+[.][0-9]+\\s*$/.test(text.data)) continue;
    const range = document.createRange();
    range.setStart(text, at);
    range.setEnd(text, at + 1);
    (columns[cell.cellIndex] ??= []).push(range.getBoundingClientRect().x);
  }
  return columns;
}
"""


def test_decimal_points_of_a_column_stand_in_line_as_measured(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        go(page, "boundary")
        page.eval_on_selector_all("details", "all => all.forEach(each => { each.open = true; })")
        columns = [
            places
            for table in page.query_selector_all(".table")
            for places in table.evaluate(POINTS).values()
        ]
    assert sum(len(places) for places in columns) > 20
    assert all(max(places) - min(places) < 0.75 for places in columns)


WIDTHS = (320, 375, 683, 1024, 1180, 1366, 2560)


@pytest.mark.parametrize("key", KEYS)
def test_nothing_needs_sideways_scrolling(chromium: Browser, key: str) -> None:
    """Also with the text spacing that WCAG 1.4.12 asks pages to bear."""
    spaced = ("line-height: 1.5", "letter-spacing: 0.12em", "word-spacing: 0.16em")
    spacing = "* { " + " ".join(f"{each} !important;" for each in spaced) + " }"
    with opened(chromium, bypass_csp=True) as (_, page):
        go(page, key)
        assert too_wide(page) == []
        page.add_style_tag(content=spacing)
        assert too_wide(page) == []


def too_wide(page: Page) -> list[int]:
    found = []
    for width in WIDTHS:
        page.set_viewport_size({"width": width, "height": 768})
        if page.evaluate("document.documentElement.scrollWidth") > width:
            found.append(width)
    return found


@pytest.mark.parametrize(
    ("key", "width"), [*((key, 1366) for key in KEYS), ("curves", 375), ("boundary", 375)]
)
def test_nobody_stumbles_on_a_sheet(chromium: Browser, key: str, width: int) -> None:
    """axe finds nothing, folds open, drawn and zoomed into."""
    with opened(chromium) as (_, page):
        page.set_viewport_size({"width": width, "height": 768})
        go(page, key)
        page.eval_on_selector_all("details", "all => all.forEach(each => { each.open = true; })")
        assert obstacles(page) == []
        if key == "curves":
            zoom(page)
            assert obstacles(page) == []


def zoom(page: Page) -> None:
    page.get_by_role("button", name="Zoom and read values").click()
    page.wait_for_selector(".chart .nsewdrag", state="attached")
    page.get_by_role("button", name="Back to the drawing").wait_for()


@pytest.mark.parametrize("key", ["information", "curves", "boundary"])
@pytest.mark.parametrize("width", [375, 1366, 1920])
def test_the_chart_takes_the_place_and_the_size_of_the_drawing(
    chromium: Browser, key: str, width: int
) -> None:
    box = "e => { const b = e.getBoundingClientRect(); return [b.x, b.y, b.width, b.height]; }"
    with opened(chromium) as (_, page):
        page.set_viewport_size({"width": width, "height": 1000})
        go(page, key, "masked")
        drawn = page.eval_on_selector(".drawing", box)
        zoom(page)
        assert page.eval_on_selector(".chart", box) == pytest.approx(drawn, abs=1)
        assert not page.locator(".drawing").is_visible()
        page.get_by_role("button", name="Back to the drawing").click()
        assert page.eval_on_selector(".drawing", box) == drawn
        assert page.locator(".chart").count() == 0


@pytest.mark.parametrize("width", [1366, 2560])
def test_marks_and_words_of_the_chart_stand_where_the_drawing_has_them(chromium: Browser, width: int) -> None:
    """z's of the looks and the bound's name: places and sizes, also where the page has grown."""
    round_marks = "all => all.map(e => { const b = e.getBoundingClientRect(); return [b.x, b.y, b.width]; })"
    place = "e => { const b = e.getBoundingClientRect(); return [b.x, b.y + b.height / 2]; }"
    with opened(chromium) as (_, page):
        page.set_viewport_size({"width": width, "height": 1440})
        go(page, "boundary")
        drawn = page.eval_on_selector_all(".drawing .wide circle[fill='#1A1A1E']", round_marks)
        name = page.locator(".drawing .wide text", has_text="efficacy").first.evaluate(place)
        zoom(page)
        marks = page.eval_on_selector_all(".chart .points path[d*='A']", round_marks)
        seen = [mark for mark in marks if any(abs(mark[0] - x) < 4 for x, _, _ in drawn)]
        diameters = sorted(w for _, _, w in drawn)
        assert len(drawn) == 3
        for diameter in diameters:
            assert any(w == pytest.approx(diameter, rel=0.3) for _, _, w in seen)
        words = page.locator(".chart .annotation-text", has_text="efficacy").first.evaluate(place)
        assert words == pytest.approx(name, abs=4)


@pytest.mark.parametrize("width", [375, 1366, 1920])
def test_each_of_two_figures_is_zoomed_into_in_its_own_place(chromium: Browser, width: int) -> None:
    box = (
        "all => all.map(e => { const b = e.getBoundingClientRect(); return [b.x, b.y, b.width, b.height]; })"
    )
    with opened(chromium) as (_, page):
        page.set_viewport_size({"width": width, "height": 1000})
        go(page, "shape", "masked")
        drawn = page.eval_on_selector_all(".drawing", box)
        for _ in drawn:
            page.get_by_role("button", name="Zoom and read values").first.click()
            page.get_by_role("button", name="Back to the drawing").first.wait_for()
        page.locator(".chart .nsewdrag").nth(1).wait_for(state="attached")
        charts = page.eval_on_selector_all(".chart", box)
        assert [place for chart in charts for place in chart] == pytest.approx(
            [place for drawing in drawn for place in drawing], abs=1
        )
        assert obstacles(page) == []


def test_two_figures_stand_in_a_row_until_there_is_no_room(chromium: Browser) -> None:
    box = "all => all.map(e => { const b = e.getBoundingClientRect(); return [b.x, b.y]; })"
    with opened(chromium) as (_, page):
        for width, in_a_row in ((1366, True), (700, True), (375, False)):
            page.set_viewport_size({"width": width, "height": 768})
            go(page, "shape")
            (left, top), (second_left, second_top) = page.eval_on_selector_all(".figure", box)
            assert (second_top == top, second_left > left) == (in_a_row, in_a_row)


def test_zooming_is_remembered_for_the_session_and_offers_no_way_to_send_anything(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        go(page, "curves")
        zoom(page)
        go(page, "boundary")
        page.wait_for_selector(".chart .nsewdrag", state="attached")
        titles = page.eval_on_selector_all(".modebar-btn", "all => all.map(e => e.dataset.title)")
        assert titles
        assert not [
            title for title in titles if re.search("cloud|share|edit|logo|plotly", title, re.IGNORECASE)
        ]


MIDDLES = """
all => all.slice(0, 6).map(e => { const b = e.getBoundingClientRect(); return b.x + b.width / 2; })
"""
CLOSER = "Plotly.relayout(document.querySelector('.chart'), {'xaxis.range': [0, 12]})"


def test_numbers_at_risk_follow_the_axis_when_it_is_zoomed(chromium: Browser) -> None:
    """Ticks stood every 6 months over 472 units from 408; of 12 months the second tick is the middle."""
    at_risk = ".chart .xy2 .textpoint text"
    with opened(chromium) as (_, page):
        go(page, "curves")
        zoom(page)
        ticks = page.eval_on_selector_all(".chart .xtick text", MIDDLES)
        assert page.eval_on_selector_all(at_risk, MIDDLES) == pytest.approx(ticks, abs=1.5)
        page.evaluate(CLOSER)
        zoomed = page.eval_on_selector_all(at_risk, MIDDLES)
        assert zoomed[:3] == pytest.approx([408, 408 + 472 / 2, 408 + 472], abs=1.5)


def test_without_its_script_a_page_lacks_nothing_but_zoom_and_arrow_keys(chromium: Browser) -> None:
    with opened(chromium, java_script_enabled=False) as (_, page):
        page.goto(f"{ORIGIN}/closed/looks/3/curves")
        assert page.locator(".drawing svg").first.is_visible()
        assert page.get_by_role("button", name="Zoom and read values").count() == 0
        assert not page.locator(".keys").is_visible()
        page.get_by_text("How this was computed").click()
        assert page.get_by_text("Lan and DeMets").is_visible()
        page.get_by_role("link", name="4 Boundary").first.click()
        assert page.url.endswith("/boundary")


def test_arrow_keys_turn_the_sheets_and_leave_fields_alone(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        go(page, "curves")
        page.keyboard.press("ArrowRight")
        page.wait_for_url("**/boundary")
        page.keyboard.press("ArrowLeft")
        page.wait_for_url("**/curves")
        page.evaluate("document.querySelector('main').append(document.createElement('input'))")
        page.locator("main input").focus()
        page.keyboard.press("ArrowRight")
        assert page.url.endswith("/curves")


def test_the_page_grows_with_the_room_it_has(chromium: Browser) -> None:
    size = "parseFloat(getComputedStyle(document.documentElement).fontSize)"
    with opened(chromium) as (_, page):
        sizes = []
        for width, height in ((1366, 768), (1600, 900), (1920, 1080), (2560, 1440)):
            page.set_viewport_size({"width": width, "height": height})
            go(page, "boundary")
            sizes.append(page.evaluate(size))
    assert sizes == [16, 18, 20, 24]


# --- paper --------------------------------------------------------------------------------------------------


def pages_of(pdf: bytes) -> int:
    return len(re.findall(rb"/Type\s*/Page\b", pdf))


def test_a_sheet_prints_on_one_leaf(chromium: Browser) -> None:
    with opened(chromium) as (_, page):
        for key in KEYS:
            go(page, key, "masked")
            pdf = page.pdf(prefer_css_page_size=True)
            assert pages_of(pdf) == 1
            assert re.search(
                rb"/MediaBox\s*\[\s*0 0 84[12]\S* 59[45]\S*\s*\]", pdf
            )  # A4 landscape, in points


@pytest.mark.parametrize("script", [True, False])
def test_a_report_opens_from_disk_in_its_own_faces(chromium: Browser, tmp_path: Path, script: bool) -> None:
    file = tmp_path / "report.html"
    file.write_bytes(render_report(ENVIRONMENT, invented.book("masked"), frozen=FACTS))
    with watched(chromium, "file://", java_script_enabled=script) as seen:
        page = seen.page()
        page.goto(file.as_uri())
        assert page.locator("#sheet-boundary .figure svg").is_visible()
        page.get_by_text("The record of this look, at full precision").click()
        assert page.locator("#record").text_content() == FACTS.record_json
        if script:
            faces = page.evaluate(
                "document.fonts.ready.then(f => [...f].filter(x => x.status === 'loaded').length)"
            )
            assert faces == 5
            assert obstacles(page) == []
        # each of the seven sheets starts a page; how it was computed and the record share one
        assert pages_of(page.pdf(prefer_css_page_size=True)) == 8
        assert seen.noticed == []
