"""The pages of the real application over the invented trial, without a browser."""

from __future__ import annotations

import csv
import html
import io
import json
import zipfile
from pathlib import Path
from typing import Any

import pytest

from app.actions.start import start
from app.assets import asset
from app.settings import Settings
from app.sheets.caution import CAUTION
from tests.web.served import Served, fourth_extract, serve_copy

QUESTIONS = {
    "glance": "in five lines?",
    "data": "Can we trust this extract?",
    "information": "How much do we know?",
    "curves": "What happened to the patients?",
    "boundary": "Where does the test stand?",
    "record": "What was shown, what was advised?",
}
OPEN_SHEETS = ("glance", "data", "information", "curves")


def words(response: Any) -> str:
    """The text of a page as a person reads it: spaces that do not break are spaces."""
    return html.unescape(response.text).replace("\u00a0", " ").replace("\u202f", " ")


@pytest.mark.parametrize("sheet", QUESTIONS)
@pytest.mark.parametrize("look", [1, 2, 3])
def test_each_closed_sheet_of_each_look_asks_its_question_under_the_caution(
    served: Served, look: int, sheet: str
) -> None:
    served.enter()
    page = served.get(f"/closed/looks/{look}/{sheet}")
    assert page.status_code == 200
    assert QUESTIONS[sheet] in words(page)
    assert CAUTION in words(page)


@pytest.mark.parametrize("sheet", OPEN_SHEETS)
def test_each_open_sheet_is_pooled(served: Served, sheet: str) -> None:
    served.enter("open")
    page = served.get(f"/open/looks/3/{sheet}")
    assert page.status_code == 200
    assert "pooled" in page.text
    assert CAUTION in words(page)
    for closed_word in ("Arm A", "arm A", "TABLET", "Placebo", "hazard ratio", "/closed/"):
        assert closed_word not in words(page)


def test_the_first_address_leads_to_the_newest_look_of_one_s_own_side(served: Served) -> None:
    served.enter("open")
    assert served.get("/").headers["location"] == "/open/looks/3/glance"
    served.enter("closed")
    assert served.get("/").headers["location"] == "/closed/looks/3/glance"


@pytest.mark.parametrize(
    "path",
    [
        "/closed/looks/4/glance",
        "/closed/looks/0/glance",
        "/closed/looks/x/glance",
        "/closed/looks/99999999999999999999/glance",
        "/closed/looks/3/weather",
        "/closed/looks/3/boundary/",
        "/open/looks/3/boundary",
        "/open/looks/3/record",
        "/open/looks/3/record.json",
        "/closed/looks/3/record/figure.json",
        "/closed/looks/9/record.json",
    ],
)
def test_what_does_not_exist_is_said_not_to_exist(served: Served, path: str) -> None:
    served.enter()
    response = served.get(path)
    assert response.status_code == 404
    told = response.json()["sentence"] if path.endswith(".json") else words(response)
    assert f"There is no page at this address. Found {path!r}." in told


def test_figures_and_records_are_json(served: Served) -> None:
    served.enter()
    for sheet in ("curves", "boundary", "information"):
        assert set(served.get(f"/closed/looks/3/{sheet}/figure.json").json()) == {"wide", "narrow"}
    for name in ("figure", "second-figure"):
        assert set(served.get(f"/closed/looks/3/shape/{name}.json").json()) == {"wide", "narrow"}
    assert served.get("/closed/looks/3/curves/second-figure.json").status_code == 404
    record = served.get("/closed/looks/3/record.json").json()
    assert (record["format"], record["looks"][0]["number"]) == (1, 3)
    assert record["orientation"] == {"of": "A", "against": "B"}


@pytest.mark.parametrize(
    ("path", "name", "first"),
    [
        ("/closed/looks/3/curves", "Q17-look-3-closed-masked-cutoff-2025-10-13-curves.zip", "curves-1.csv"),
        ("/open/looks/3/data", "Q17-look-3-open-pooled-cutoff-2025-10-13-data.zip", "data-1.csv"),
    ],
)
def test_tables_are_taken_away_as_csv_under_a_name_that_says_what_they_are(
    served: Served, path: str, name: str, first: str
) -> None:
    served.enter()
    assert f'href="{path}/tables.zip"' in served.get(path).text
    taken = served.get(f"{path}/tables.zip")
    assert taken.headers["content-disposition"].endswith(name)
    with zipfile.ZipFile(io.BytesIO(taken.content)) as files:
        assert files.namelist()[0] == first
        rows = list(csv.reader(io.StringIO(files.read(first).decode())))
    assert len({len(row) for row in rows}) == 1
    assert taken.content == served.get(f"{path}/tables.zip").content


def test_reading_a_record_counts_as_opening_its_results_once(served: Served) -> None:
    served.enter()
    for _ in range(2):
        served.get("/closed/looks/2/record.json")
    history = words(served.get("/closed/looks/3/record"))
    assert history.count("Comparative results of look 2 opened, masked") == 1


def test_an_upload_shows_what_was_understood_and_stores_nothing(served: Served) -> None:
    served.enter()
    before = served.path.read_bytes()
    sent = served.upload(fourth_extract())
    assert (sent.status_code, sent.headers["location"]) == (303, "/closed/receive/confirm")
    page = words(served.get("/closed/receive/confirm"))
    for told in ("It would open look 4, final.", "539 of 900", "Q17-0441", "SEX, AGEGR1", "Freeze look 3"):
        assert told in page
    assert page.count('class="doubt"') == 3
    assert served.path.read_bytes() == before


def confirm(served: Served, **answers: str) -> Any:
    page = served.get("/closed/receive/confirm").text
    token = page.partition('name="token" value="')[2].partition('"')[0]
    return served.post("/closed/receive/confirm", **{"token": token, **answers})


REASONS = {
    "reason-time-zero": "Randomised on the day of the cutoff.",
    "reason-time-disagrees-with-dates": "The data centre confirmed the dates.",
    "reason-study-differs": "Digits exchanged in the study's name.",
}


def test_a_confirmation_without_its_answers_lists_everything_to_mend(served: Served) -> None:
    served.enter()
    served.upload(fourth_extract())
    before = served.path.read_bytes()
    refused = confirm(served, **{"reason-time-zero": "Randomised on the day of the cutoff."})
    page = words(refused)
    assert refused.status_code == 422
    assert "Nothing was stored. 4 things to mend:" in page
    assert '<a href="#reason-study-differs">The reason is missing in the doubt' in page
    assert "Look 3 is still open" in page
    assert '<a href="#by">The name of who acts is missing</a>' in page
    assert 'value="Randomised on the day of the cutoff."' in page
    assert served.path.read_bytes() == before


def test_a_confirmation_freezes_the_open_look_and_opens_the_next_in_one_act(served: Served) -> None:
    served.enter()
    served.upload(fourth_extract())
    done = confirm(served, by="Jane Roe", freeze="yes", **REASONS)
    assert (done.status_code, done.headers["location"]) == (303, "/closed/looks/4/glance")
    history = words(served.get("/closed/looks/4/record"))
    assert "Look 3 frozen, masked" in history
    assert "Snapshot 4 received for a final look, cutoff 9 Oct 2026, 3 doubts answered" in history
    assert served.get("/closed/receive/confirm").headers["location"] == "/closed/receive"


def test_the_page_of_an_earlier_upload_cannot_confirm_a_later_one(served: Served) -> None:
    served.enter()
    served.upload(fourth_extract())
    before = served.path.read_bytes()
    stale = confirm(served, token="of-an-earlier-upload", by="Jane Roe", freeze="yes", **REASONS)
    assert (stale.status_code, stale.headers["location"]) == (303, "/closed/receive/confirm")
    assert served.path.read_bytes() == before


def test_who_acts_is_asked_once_and_remembered(served: Served) -> None:
    served.enter()
    assert "Not an electronic signature." in words(served.get("/closed/unmask"))
    served.post("/closed/unmask", by="Jane Roe")
    assert 'value="Jane Roe"' in served.get("/closed/looks/3/freeze").text


def test_where_a_final_look_is_chosen_an_early_end_is_said_to_release_no_alpha(served: Served) -> None:
    served.enter()
    said = (
        "it spends all alpha that is left, which ending early because of comparative results does not release"
    )
    assert said in words(served.get("/closed/receive"))


@pytest.mark.parametrize(
    ("answers", "sentence"),
    [
        ({"cutoff": ""}, "A date is missing in Data cutoff"),
        ({"cutoff": "2026-02-30"}, "There is no such date in Data cutoff"),
        ({"cutoff": "9 Oct 2026"}, "There is no such date in Data cutoff"),
        ({"cutoff": "2027-01-08"}, "A data cutoff in the future"),
        ({"cutoff": "2024-01-08"}, "A data cutoff before the last one"),
        ({"extracted": "2026-01-01"}, "An extract date that cannot be"),
        ({"kind": "finale"}, "This is no kind of look in Kind of look"),
    ],
)
def test_an_answer_that_cannot_be_is_told_at_its_field(
    served: Served, answers: dict[str, str], sentence: str
) -> None:
    served.enter()
    before = served.path.read_bytes()
    refused = served.upload(fourth_extract(), **answers)
    (field,) = answers
    assert refused.status_code == 422
    assert "Nothing was stored. 1 thing to mend:" in words(refused)
    assert f'<a href="#{field}">{sentence}</a>' in words(refused)
    assert served.path.read_bytes() == before


def test_an_extract_that_cannot_be_used_is_refused_with_its_findings(served: Served) -> None:
    served.enter()
    before = served.path.read_bytes()
    broken = fourth_extract().replace(b"PLACEBO", b"PLACEBOS", 1)
    refused = served.upload(broken)
    assert refused.status_code == 422
    assert "Nothing was stored. 1 thing to mend:" in words(refused)
    assert "'PLACEBOS'" in words(refused)
    assert served.path.read_bytes() == before
    assert served.get("/closed/receive/confirm").headers["location"] == "/closed/receive"


def test_freezing_is_confirmed_by_name_and_gives_a_report(served: Served) -> None:
    served.enter()
    nameless = served.post("/closed/looks/3/freeze", by=" ")
    assert (nameless.status_code, "Nothing was frozen. 1 thing to mend:" in words(nameless)) == (422, True)
    done = served.post("/closed/looks/3/freeze", by="Jane Roe")
    assert (done.status_code, done.headers["location"]) == (303, "/closed/looks/3/record")
    report = served.get("/closed/looks/3/report")
    assert report.headers["content-security-policy"] == "sandbox"
    assert report.headers["content-disposition"].endswith("Q17-look-3-closed-masked.html")
    assert report.content.startswith(b"<!doctype html>")


@pytest.mark.parametrize("look", [1, 3])
def test_a_frozen_look_cannot_be_frozen_again(served: Served, look: int) -> None:
    served.enter()
    served.post("/closed/looks/3/freeze", by="Jane Roe")
    before = served.path.read_bytes()
    again = served.post(f"/closed/looks/{look}/freeze", by="Jane Roe")
    assert again.status_code == 409
    assert "The history does not allow this." in words(again)
    assert served.path.read_bytes() == before


def test_the_report_of_an_open_look_does_not_exist_yet(served: Served) -> None:
    served.enter()
    response = served.get("/closed/looks/3/report")
    assert (response.status_code, "Look 3 is not frozen." in words(response)) == (409, True)


def test_unmasking_needs_a_reason_and_names_the_arms(served: Served) -> None:
    served.enter()
    assert "Arm A" in words(served.get("/closed/looks/3/curves"))
    refused = served.post("/closed/unmask", by="Jane Roe")
    assert "The arms stay masked. 1 thing to mend:" in words(refused)
    done = served.post("/closed/unmask", by="Jane Roe", reason="Asked for by the committee.")
    assert done.status_code == 303
    page = words(served.get("/closed/looks/3/curves"))
    assert ("Tablet" in page, "Arm A" in page) == (True, False)


def test_verifying_shows_each_line_of_the_check(served: Served) -> None:
    served.enter()
    page = words(served.verification())
    assert "Yes, as far as the file can show by itself." in page
    assert "Look 2, frozen record: every number agrees with the one computed again." in page


def test_before_the_first_snapshot_the_pages_say_so(tmp_path: Path) -> None:
    plan = asset("demo_data", "plan.toml")
    new = tmp_path / "new.trial"
    start(Settings(), plan_name=plan.name, plan=plan.read_bytes(), path=new, by="Jane Roe")
    served = serve_copy(new, tmp_path)
    with served.client, served.desk:
        served.enter()
        assert "No snapshot has been received yet." in words(served.get("/"))
        assert "Which extract has arrived?" in words(served.get("/closed/receive"))
        served.enter("open")
        assert "received on the closed side" in words(served.get("/"))


def test_every_error_for_a_program_has_one_form(served: Served) -> None:
    served.enter("open")
    for path in ("/closed/looks/3/record.json", "/open/looks/8/curves/figure.json"):
        body = json.loads(served.get(path).text)
        assert list(body) == ["status", "kind", "sentence", "what", "where", "found", "accepted", "remedy"]
