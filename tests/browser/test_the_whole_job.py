"""The evening that the product is for, in a real browser against the real server, from link to report."""

from __future__ import annotations

import re
from collections.abc import Iterator
from pathlib import Path

import pytest
from playwright.sync_api import Browser, Page, expect

from app.assets import asset
from tests.browser.watched import Watched, obstacles, watched
from tests.cli.test_serving import Running, running

# each sheet by its name, its question, and a sentence that only it says
SHEETS = (
    ("At a glance", "What does look 3 show, in five lines?", "With 384 of 538 planned events"),
    ("1 Data", "Can we trust this extract?", "The extract holds 900 subjects and 384 events"),
    ("2 Information", "How much do we know?", "information fraction 0.714"),
    ("3 Curves", "What happened to the patients?", "event‑free"),
    ("4 Boundary", "Where does the test stand?", "If A is experimental:"),
    ("5 Shape", "Does one hazard ratio tell the story?", "No change of the hazard ratio with time is seen"),
    ("6 Outlook", "What if we go on?", "under the plan’s effect"),
    ("9 Record", "What was shown, what was advised?", "Look 3 is open; looks 1 and 2 are frozen."),
)
REASONS = {
    "Time 0": "Randomised on the day of the cutoff.",
    "Time that disagrees with its dates": "The data centre confirmed the dates.",
    "More than one study": "Digits exchanged in the study's name.",
}
NAME = "Jane Roe"


@pytest.fixture
def server(tmp_path: Path) -> Iterator[Running]:
    with running("demo", "--to", str(tmp_path / "demo.trial"), "--no-browser") as started:
        yield started


def spoken(text: str) -> re.Pattern[str]:
    """`text` with any of the spaces that pages set."""
    return re.compile(re.escape(text).replace("\\ ", r"[ \u00a0\u202f]"))


def recognise(page: Page, question: str, sentence: str) -> None:
    """Be on the page that asks this and says this, under the caution, with nothing in anybody's way."""
    expect(page.get_by_role("heading", level=1)).to_contain_text(spoken(question))
    expect(page.locator("main")).to_contain_text(spoken(sentence))
    expect(page.locator("body")).to_contain_text("A boundary is a guideline, not a rule")
    assert obstacles(page) == []


def origin(link: str) -> str:
    return link.partition("/enter/")[0]


def test_the_whole_job(chromium: Browser, server: Running, tmp_path: Path) -> None:
    with watched(chromium, origin(server.links["closed"])) as seen:
        page = enter(seen, server.links["closed"], "closed")
        turn_the_sheets(page)
        zoom_into_a_figure(page)
        upload_the_fourth_extract(page)
        answer_its_doubts(page)
        see_the_new_look(page)
        report = freeze_and_take_the_report(page, tmp_path)
        verify_and_leave(page)
        assert seen.noticed == []
    read_the_report_from_disk(chromium, report)


def enter(seen: Watched, link: str, side: str) -> Page:
    page = seen.page()
    page.goto(link)
    recognise(page, "What does this key open?", f"It opens the {side} pages")
    page.get_by_role("button", name=f"Enter the {side} pages").press("Enter")
    return page


def turn_the_sheets(page: Page) -> None:
    """Forwards by the right arrow key to the last sheet, and back by the left one."""
    for number, (name, question, sentence) in enumerate(SHEETS):
        if number:
            page.keyboard.press("ArrowRight")
        recognise(page, question, sentence)
        expect(page.locator(".sheets [aria-current]")).to_contain_text(name.split()[-1])
    for _, question, _ in SHEETS[-2::-1]:
        page.keyboard.press("ArrowLeft")
        expect(page.get_by_role("heading", level=1)).to_contain_text(spoken(question))


def zoom_into_a_figure(page: Page) -> None:
    """The chart takes the place of the drawing and offers to send nothing anywhere."""
    page.get_by_role("navigation", name="Sheets of look 3").get_by_role("link", name="Curves").press("Enter")
    page.get_by_role("button", name="Zoom and read values").press("Enter")
    expect(page.locator(".chart .main-svg").first).to_be_visible()
    assert obstacles(page) == []
    assert page.locator(".modebar-btn").count() > 0
    titles = page.locator(".modebar-btn").evaluate_all("all => all.map(each => each.dataset.title || '')")
    assert [title for title in titles if re.search(r"(?i)share|cloud|send|edit|plotly", title)] == []
    page.get_by_role("button", name="Back to the drawing").press("Enter")


def upload_the_fourth_extract(page: Page) -> None:
    page.get_by_role("link", name="Receive the next extract").first.press("Enter")
    recognise(page, "Which extract has arrived?", "It is read and shown to you before anything is stored.")
    page.get_by_label("Files of the extract").set_input_files(asset("demo_data", "extract-4.csv"))
    page.get_by_label("Data cutoff").fill("2026-10-09")
    page.get_by_label("Extract taken").fill("2026-10-23")
    page.get_by_role("radio", name="final").check()
    page.get_by_role("button", name="Read this extract").press("Enter")
    recognise(page, "Is this the extract you mean?", "It would open look 4, final. Nothing is stored yet.")


def answer_its_doubts(page: Page) -> None:
    expect(page.locator(".doubted")).to_have_count(len(REASONS))
    for doubt, reason in REASONS.items():
        page.locator(".doubted", has_text=doubt).get_by_label("Why it may stand").fill(reason)
    page.get_by_label("Freeze look 3 and receive this snapshot, in one act").check()
    page.get_by_label("Recorded by").fill(NAME)
    page.get_by_role("button", name="Receive this snapshot").press("Enter")


def see_the_new_look(page: Page) -> None:
    recognise(page, "What does look 4 show, in five lines?", "With 539 of 538 planned events")
    expect(page.get_by_role("navigation", name="Looks, on the scale of information")).to_contain_text(
        "539 events"
    )


def freeze_and_take_the_report(page: Page, folder: Path) -> Path:
    sheets = page.get_by_role("navigation", name="Sheets of look 4")
    sheets.get_by_role("link", name="Record").press("Enter")
    recognise(page, "What was shown, what was advised?", "Look 4 is open; looks 1, 2 and 3 are frozen.")
    page.get_by_role("link", name="Freeze look 4").press("Enter")
    recognise(page, "Is look 4 as the committee saw it?", "Freezing keeps look 4 as it is now, for good.")
    expect(page.get_by_label("Recorded by")).to_have_value(NAME)
    page.get_by_role("button", name="Freeze look 4").press("Enter")
    recognise(page, "What was shown, what was advised?", "Look 4 was frozen on")
    with page.expect_download() as started:
        page.get_by_role("link", name="Download the report of look 4").press("Enter")
    report = folder / started.value.suggested_filename
    started.value.save_as(report)
    assert report.name == "Q17-look-4-closed-masked.html"
    return report


def verify_and_leave(page: Page) -> None:
    page.get_by_role("link", name="Verify the trial file").press("Enter")
    recognise(page, "Does demo.trial still say what it said?", "Yes, as far as the file can show by itself.")
    page.get_by_role("button", name="Leave").press("Enter")
    recognise(page, "Is anybody inside?", "You have left.")


def read_the_report_from_disk(chromium: Browser, report: Path) -> None:
    """Without scripts and without the server: all sheets on one page, nothing asked of anybody."""
    with watched(chromium, report.as_uri(), java_script_enabled=False) as seen:
        page = seen.page()
        page.goto(report.as_uri())
        for _, question, _ in SHEETS[1:]:
            expect(page.locator("body")).to_contain_text(spoken(question))
        expect(page.locator("body")).to_contain_text(spoken("539 of 538 planned events"))
        expect(page.locator("body")).to_contain_text(NAME)
        assert page.locator("svg").count() >= 3
        assert page.locator("script:not([type='application/json'])").count() == 0
        assert seen.noticed == []
    with watched(chromium, report.as_uri()) as seen:  # axe itself is a script
        page = seen.page()
        page.goto(report.as_uri())
        assert obstacles(page) == []
        assert seen.noticed == []
