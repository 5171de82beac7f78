"""What is added to the record through pages: advice, correction, backup, amendment, refusal, verification."""

from __future__ import annotations

import html
import io
import re
import subprocess
import sys
import time
import zipfile
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from app.actions import check
from app.ledger.bodies import (
    Backup,
    Body,
    Erratum,
    PlanAmended,
    Recommendation,
    RefusalRecorded,
    ResultsOpened,
    Verification,
)
from app.ledger.entries import read_body
from app.record.canonical import digest
from tests.actions import given
from tests.web.served import KEYS, OWN, TODAY, Served, fourth_extract

BY = "Jane Roe"
REFUSED = "Nothing was recorded."


def words(response: Any) -> str:
    """A page as it is read, on one line."""
    return " ".join(html.unescape(re.sub(r"<[^>]+>", " ", response.text)).replace("\u00a0", " ").split())


def last(served: Served) -> Body:
    return read_body(served.desk.trial.entries()[-1])


def record_sheet(served: Served) -> str:
    return words(served.get("/closed/looks/3/record"))


def test_the_record_sheet_leads_to_every_act(served: Served) -> None:
    served.enter()
    page = served.get("/closed/looks/3/record").text
    for path in ("receive", "recommend", "amend", "erratum", "backup", "verify", "looks/3/freeze", "unmask"):
        assert f'href="/closed/{path}"' in page
        assert served.get(f"/closed/{path}").status_code == 200


def test_who_acts_may_be_said_at_the_door_and_stands_beside_what_is_opened(served: Served) -> None:
    assert "asked once for this session" in words(served.get(f"/enter/{KEYS.closed}"))
    served.post("/enter", key=KEYS.closed, by=BY)
    served.get("/closed/looks/3/curves")
    opened = last(served)
    assert isinstance(opened, ResultsOpened)
    assert opened.by == BY
    assert f'value="{BY}"' in served.get("/closed/unmask").text


def test_nobody_is_named_on_the_open_side(served: Served) -> None:
    assert 'name="by"' not in served.get(f"/enter/{KEYS.open}").text


# --- recommendation -----------------------------------------------------------------------------------

ADVICE = {
    "advice": "stop for benefit",
    "look": "2",
    "held_on": "2026-10-30",
    "reason": "As minuted.",
    "by": BY,
}


def test_a_recommendation_is_recorded_and_shown(served: Served) -> None:
    served.enter()
    form = words(served.get("/closed/recommend"))
    assert "Advising a stop for benefit without a crossing gives up the plan's error control;" in form
    assert served.post("/closed/recommend", **ADVICE).headers["location"] == "/closed/looks/3/record"
    assert last(served) == Recommendation(2, "stop for benefit", "As minuted.", "2026-10-30", BY)
    assert "What the committee recommended" in record_sheet(served)


@pytest.mark.parametrize(
    ("field", "text", "sentence"),
    [
        ("advice", "go on", "This is no recommendation that can be recorded in Recommendation"),
        ("look", "two", "This is no number of a look"),
        ("held_on", "yesterday", "There is no such date in Committee met"),
        ("held_on", "2026-12-24", "A meeting in the future"),
        ("reason", " ", "The reason is missing"),
        ("by", "", "The name of who acts is missing"),
    ],
)
def test_what_is_no_recommendation_is_told_at_its_field(
    served: Served, field: str, text: str, sentence: str
) -> None:
    served.enter()
    before = served.path.read_bytes()
    response = served.post("/closed/recommend", **{**ADVICE, field: text})
    assert response.status_code == 422
    assert f'<a href="#{field}">{sentence}' in html.unescape(response.text)
    assert served.path.read_bytes() == before


def test_a_recommendation_on_an_open_look_is_refused(served: Served) -> None:
    served.enter()
    response = served.post("/closed/recommend", **{**ADVICE, "look": "3"})
    assert (response.status_code, "Look 3 is not frozen." in words(response)) == (409, True)


# --- correction and backup ----------------------------------------------------------------------------


def test_a_correction_is_recorded_and_stands_beside_its_entry(served: Served) -> None:
    served.enter()
    answers = {"entry": "2", "correction": "The cutoff was 15 August.", "by": BY}
    assert served.post("/closed/erratum", **answers).status_code == 303
    assert last(served) == Erratum(2, "The cutoff was 15 August.", BY)
    number = len(served.desk.trial.entries())
    assert f"Entry {number} corrects: The cutoff was 15 August." in record_sheet(served)
    assert served.post("/closed/erratum", **{**answers, "entry": "99"}).status_code == 409
    assert served.post("/closed/erratum", **{**answers, "entry": "²"}).status_code == 422


def test_a_backup_lies_beside_the_trial_file(served: Served) -> None:
    served.enter()
    page = words(served.post("/closed/backup", by=BY))
    body = last(served)
    assert isinstance(body, Backup)
    copy = served.path.parent / body.name
    assert digest(copy.read_bytes()) == body.file_digest
    assert f"{body.name} lies beside the trial file, and was verified." in page
    assert f"SHA-256 of the copy: {body.file_digest}" in page
    assert str(served.path.parent) not in page


# --- amendment ----------------------------------------------------------------------------------------


def upload_plan(served: Served, plan: bytes) -> Any:
    files = [("plan", ("plan-2.toml", plan, "application/toml"))]
    return served.client.post("/closed/amend", files=files, headers=OWN, follow_redirects=False)


def token_on(page: str) -> str:
    return re.search(r'name="token" value="([^"]+)"', page)[1]


def test_an_amendment_is_shown_key_by_key_and_recorded_when_confirmed(served: Served) -> None:
    served.enter()
    before = served.path.read_bytes()
    assert upload_plan(served, given.revised_plan()).headers["location"] == "/closed/amend/confirm"
    response = served.get("/closed/amend/confirm")
    page = words(response)
    for sentence in (
        "It would be plan version 2. Nothing is recorded yet.",
        "design.planned_events 538 600",
        "Results of look 3 had been opened, arms masked. This is recorded with the amendment.",
        "Look 3 is open and stays under the version in force.",
    ):
        assert sentence in page
    assert served.path.read_bytes() == before
    token = token_on(response.text)
    answers = {"token": token, "reason": "Slow accrual.", "decided_by": "Steering committee", "by": BY}
    assert served.post("/closed/amend/confirm", **answers).headers["location"] == "/closed/looks/3/record"
    body = last(served)
    assert isinstance(body, PlanAmended)
    assert (body.decided_by, body.by, body.results_opened) == ("Steering committee", BY, (3,))
    assert "Plan versions" in record_sheet(served)
    assert "What the amendments changed" in record_sheet(served)
    assert served.post("/closed/amend/confirm", **answers).headers["location"] == "/closed/amend"  # once


def test_a_power_that_the_amended_events_do_not_have_is_told_before_and_blocks_nothing(
    served: Served,
) -> None:
    served.enter()
    fewer = given.plan_with((b"planned_events = 538", b"planned_events = 400"))
    assert "disagree" not in record_sheet(served)
    assert upload_plan(served, fewer).status_code == 303
    response = served.get("/closed/amend/confirm")
    assert "Doubt Hazard ratio, events and power disagree in the plan, [design]. Found 81.3%" in words(
        response
    )
    token = token_on(response.text)
    served.post("/closed/amend/confirm", token=token, reason="Fewer.", by=BY)
    assert isinstance(last(served), PlanAmended)


def test_who_records_an_amendment_decided_it_when_nobody_else_did(served: Served) -> None:
    served.enter()
    upload_plan(served, given.revised_plan())
    token = token_on(served.get("/closed/amend/confirm").text)
    served.post("/closed/amend/confirm", token=token, reason="Slow accrual.", by=BY)
    body = last(served)
    assert isinstance(body, PlanAmended)
    assert body.decided_by == BY


@pytest.mark.parametrize(
    ("plan", "sentence"),
    [
        (given.PLAN, "An amendment that changes nothing in plan-2.toml"),
        (b"\xff", "The plan file is not UTF-8"),
        (given.plan_with((b"sides = 1", b"sides = 2")), "Design.sides cannot be amended in plan-2.toml"),
    ],
)
def test_what_is_no_amendment_is_told(served: Served, plan: bytes, sentence: str) -> None:
    served.enter()
    response = upload_plan(served, plan)
    assert response.status_code == 422
    assert "The plan stays as it is. 1 thing to mend:" in words(response)
    assert sentence in words(response)


def test_an_amendment_needs_its_plan_its_reason_and_a_name(served: Served) -> None:
    served.enter()
    assert "No plan was chosen" in words(served.post("/closed/amend"))
    assert served.get("/closed/amend/confirm").headers["location"] == "/closed/amend"
    upload_plan(served, given.revised_plan())
    token = token_on(served.get("/closed/amend/confirm").text)
    page = words(served.post("/closed/amend/confirm", token=token, decided_by="Steering committee"))
    assert "The plan stays as it is. 2 things to mend:" in page
    assert served.post("/closed/amend/confirm", token="another", reason="x", by=BY).status_code == 303
    assert served.desk.trial.state().plan.version == 1


# --- refusal ------------------------------------------------------------------------------------------


def test_the_refusal_of_a_blocked_extract_is_recorded_by_a_button_of_its_own(served: Served) -> None:
    served.enter()
    before = served.path.read_bytes()
    blocked = fourth_extract().replace(b"PLACEBO", b"PLACEBOS", 1)
    response = served.upload(blocked)
    assert (response.status_code, "Record this refusal" in response.text) == (422, True)
    assert served.path.read_bytes() == before
    token = token_on(response.text)
    assert served.post("/closed/receive/refusal", token="another", by=BY).status_code == 303
    assert served.post("/closed/receive/refusal", token=token).status_code == 303
    assert served.path.read_bytes() == before
    assert served.post("/closed/receive/refusal", token=token, by=BY).status_code == 303
    body = last(served)
    assert isinstance(body, RefusalRecorded)
    assert body.files[0].digest == digest(blocked)
    assert "Extract refused, cutoff 9 Oct 2026" in record_sheet(served)


# --- verification -------------------------------------------------------------------------------------


def test_a_verification_says_how_far_it_is_until_it_is_done(
    served: Served, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("app.web.routes.verification.SECONDS_TO_WAIT", 0.0)
    served.enter()
    response = served.get("/closed/verify")
    assert '<meta http-equiv="refresh" content="1; url=/closed/verify/running">' in response.text
    assert "It is being verified: 0 of " in words(response)
    page = words(served.verification(response))
    assert "Yes, as far as the file can show by itself." in page
    assert "Look 2, frozen record: every number agrees with the one computed again." in page


def test_a_head_from_the_minutes_is_looked_for(served: Served) -> None:
    served.enter()
    head = served.desk.trial.entries()[1].digest
    page = words(served.verification(served.post("/closed/verify", head=head)))
    assert f"The head {head} is that of entry 2" in page
    page = words(served.verification(served.post("/closed/verify", head="0" * 64)))
    assert "No: 1 of " in page
    assert "no entry has it: the end was cut off, or the history rewritten" in page
    assert served.desk.may_write  # a mistyped head is no damage


def test_what_is_no_head_is_told_at_its_field(served: Served) -> None:
    served.enter()
    words(served.verification())
    response = served.post("/closed/verify", head="12")
    assert (response.status_code, '<a href="#head">This is no head' in response.text) == (422, True)


def test_a_sound_verification_is_recorded_under_a_name(served: Served) -> None:
    served.enter()
    assert served.post("/closed/verify/record", by=BY).headers["location"] == "/closed/verify"
    words(served.verification())
    assert served.post("/closed/verify/record").status_code == 422
    assert served.post("/closed/verify/record", by=BY).status_code == 303
    body = last(served)
    assert isinstance(body, Verification)
    assert (body.by, body.looks_recomputed) == (BY, (1, 2))


def test_damage_that_a_verification_finds_ends_all_writing(served: Served) -> None:
    served.enter()
    content = bytearray(served.path.read_bytes())
    rows = served.desk.trial.snapshot(1).files[0].content.splitlines()
    content[content.index(next(row for row in rows if content.count(row) == 1))] ^= 1
    with served.path.open("r+b") as file:
        file.write(content)
    page = words(served.verification())
    assert "snapshot 1, file extract-1.csv: bytes changed" in page
    assert "Record this verification" not in page
    response = served.post("/closed/unmask", by=BY, reason="Asked for.")
    assert (response.status_code, "A damaged trial file is not written to" in words(response)) == (409, True)


def test_a_file_that_is_gone_is_told(served: Served, tmp_path: Path) -> None:
    served.enter()
    served.path.rename(tmp_path / "elsewhere")
    response = served.get("/closed/verify")
    assert (response.status_code, "Nothing to verify" in words(response)) == (422, True)


def test_one_verification_runs_at_a_time(served: Served, monkeypatch: pytest.MonkeyPatch) -> None:
    served.enter()
    begun: list[object] = []

    def counted(*given: object, **options: object) -> check.CheckReport:
        begun.append(given)
        time.sleep(0.2)
        return check.verify(*given, **options)

    monkeypatch.setattr("app.web.verifying.verify", counted)
    monkeypatch.setattr("app.web.routes.verification.SECONDS_TO_WAIT", 0.0)
    for _ in range(3):
        response = served.get("/closed/verify")
    assert len(begun) == 1
    words(served.verification(response))


# --- the folder of a report, and the clock ------------------------------------------------------------


def test_the_folder_of_a_report_is_taken_away_whole_and_checks_itself(served: Served, tmp_path: Path) -> None:
    served.enter()
    assert 'href="/closed/looks/2/report.zip"' in served.get("/closed/looks/2/record").text
    response = served.get("/closed/looks/2/report.zip")
    assert "Q17-look-2-closed-masked.zip" in response.headers["content-disposition"]
    with zipfile.ZipFile(io.BytesIO(response.content)) as archive:
        archive.extractall(tmp_path / "folder")
    verifier = [sys.executable, "-I", "-S", str(tmp_path / "folder" / "verify_report.py")]
    done = subprocess.run(verifier, capture_output=True, text=True, check=True)
    assert "Its last entry is the freeze of this report, by the report's SHA-256." in done.stdout
    assert served.get("/closed/looks/3/report.zip").status_code == 409


def test_a_clock_that_went_back_is_told_on_the_next_page_once(served: Served) -> None:
    served.enter()
    earlier = replace(served.desk.settings, clock=lambda: TODAY.replace(year=2025, month=1))
    served.desk.trial._settings = earlier
    served.post("/closed/unmask", by=BY, reason="Asked for.")
    served.enter("open")
    assert "The clock went back" not in served.get("/open/looks/3/data").text
    served.enter()  # opens the newest look, which tells it
    assert "The clock went back" not in served.get("/closed/looks/2/data").text
    assert "Doubt: the entry before has" in record_sheet(served)


def test_the_page_after_the_act_tells_the_clock_s_doubt(served: Served) -> None:
    served.enter()
    served.desk.trial._settings = replace(
        served.desk.settings, clock=lambda: TODAY.replace(year=2025, month=1)
    )
    served.post("/closed/unmask", by=BY, reason="Asked for.")
    assert "Doubt The clock went back: entry" in words(served.get("/closed/looks/3/glance"))
