"""Everything but hovering, zooming and the arrow keys, in a browser that runs no scripts."""

from __future__ import annotations

import re
from collections.abc import Iterator

import pytest
from playwright.sync_api import Browser, Page, expect

from app.assets import asset
from tests.browser.test_the_whole_job import NAME, REASONS, SHEETS, origin, spoken
from tests.browser.watched import Watched, watched
from tests.cli.test_serving import Running, running

FORMS = (
    "/closed/receive",
    "/closed/receive/confirm",
    "/closed/unmask",
    "/closed/looks/3/freeze",
    "/closed/recommend",
    "/closed/erratum",
    "/closed/amend",
    "/closed/backup",
    "/closed/verify",
)
NARROWEST = {"width": 320, "height": 640}


@pytest.fixture(scope="module")
def server(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Running]:
    with running(
        "demo", "--to", str(tmp_path_factory.mktemp("demo") / "demo.trial"), "--no-browser"
    ) as started:
        yield started


def enter(seen: Watched, link: str) -> Page:
    page = seen.page()
    page.goto(link)
    page.locator("button.button").click()
    return page


def upload(page: Page) -> None:
    page.get_by_role("link", name="Receive the next extract").first.click()
    page.get_by_label("Files of the extract").set_input_files(asset("demo_data", "extract-4.csv"))
    page.get_by_label("Data cutoff").fill("2026-10-09")
    page.get_by_role("radio", name="final").check()
    page.get_by_role("button", name="Read this extract").click()


def test_forms_fit_the_narrowest_screen(chromium: Browser, server: Running) -> None:
    own = origin(server.links["closed"])
    with watched(chromium, own) as seen:
        page = enter(seen, server.links["closed"])
        upload(page)
        page.set_viewport_size(NARROWEST)
        for path in FORMS:
            page.goto(own + path)
            expect(page.get_by_role("heading", level=1)).to_be_visible()
            width = page.evaluate("document.documentElement.scrollWidth")
            assert width <= NARROWEST["width"], path


def test_a_ratio_of_one_s_own_is_asked_about_from_the_keyboard(chromium: Browser, server: Running) -> None:
    """The address carries the ratio and nothing else; the sheet with its row still fits a laptop screen."""
    own = origin(server.links["closed"])
    with watched(chromium, own, java_script_enabled=False) as seen:
        page = enter(seen, server.links["closed"])
        page.goto(f"{own}/closed/looks/3/outlook")
        field = page.get_by_label("What if the hazard ratio were")
        field.focus()
        page.keyboard.type("0,8")
        page.keyboard.press("Enter")
        page.wait_for_url(f"{own}/closed/looks/3/outlook?hazard_ratio=0%2C8")
        row = page.get_by_role("row", name=re.compile(r"What if, not\sfrozen"))
        expect(row.get_by_role("cell").first).to_have_text("0.800")
        expect(field).to_have_value("0,8")
        page.set_viewport_size({"width": 1366, "height": 768})
        assert page.evaluate("document.documentElement.scrollHeight") <= 768
        field.fill("much less")
        page.get_by_role("button", name="Show the chances").press("Enter")
        expect(page.get_by_role("alert")).to_contain_text("Found 'much less'.")
        expect(field).to_have_value("much less")


def test_the_open_link_shows_pooled_pages_and_no_other(chromium: Browser, server: Running) -> None:
    own = origin(server.links["open"])
    with watched(chromium, own, java_script_enabled=False) as seen:
        page = enter(seen, server.links["open"])
        expect(page.locator(".label")).to_have_text("open pooled", use_inner_text=False)
        expect(page.locator("body")).not_to_contain_text(spoken("Arm A"))
        assert page.get_by_role("link", name="Boundary").count() == 0
        assert page.get_by_role("link", name="Receive").count() == 0
        assert seen.noticed == []
        page.goto(f"{own}/closed/looks/3/boundary")
        expect(page.locator("main")).to_contain_text("This page is not part of what your key opens.")


def test_the_job_needs_no_javascript(chromium: Browser, server: Running) -> None:
    with watched(chromium, origin(server.links["closed"]), java_script_enabled=False) as seen:
        page = enter(seen, server.links["closed"])
        for name, question, sentence in SHEETS:
            sheets = page.get_by_role("navigation", name="Sheets of look 3")
            sheets.get_by_role("link", name=name.lstrip("0123456789 ")).click()
            expect(page.get_by_role("heading", level=1)).to_contain_text(spoken(question))
            expect(page.locator("main")).to_contain_text(spoken(sentence))
        page.get_by_role("navigation", name="Looks, on the scale").get_by_role("link", name="Look 2").click()
        expect(page.locator("body")).to_contain_text(spoken("Look 2 was frozen on"))
        upload(page)
        for doubt, reason in REASONS.items():
            page.locator(".doubted", has_text=doubt).get_by_label("Why it may stand").fill(reason)
        page.get_by_label("Freeze look 3 and receive").check()
        page.get_by_label("Recorded by").fill(NAME)
        page.get_by_role("button", name="Receive this snapshot").click()
        expect(page.locator("main")).to_contain_text(spoken("With 539 of 538 planned events"))
        page.goto(f"{origin(server.links['closed'])}/closed/unmask")
        page.get_by_label("Reason").fill("Asked for by the committee.")
        page.get_by_role("button", name="Unmask the arms").click()
        expect(page.locator(".label")).to_contain_text("unmasked")
        assert seen.noticed == []
