"""Each command, run as a person runs it, on the invented trial."""

from __future__ import annotations

import json
import sqlite3
from datetime import UTC, datetime
from pathlib import Path

import pytest

from app.assets import asset
from app.cli import main
from app.cli.columns import aligned
from app.settings import Settings

PLAN = str(asset("demo_data", "plan.toml"))
REASONS = {
    "time-zero": "randomised on the day of the cutoff",
    "time-disagrees-with-dates": "the data centre confirmed the dates",
    "study-differs": "digits exchanged in the study's name",
}


def extract(number: int) -> str:
    return str(asset("demo_data", f"extract-{number}.csv"))


@pytest.fixture
def trial(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> str:
    """A trial file with its plan locked and its first extract received."""
    path = str(tmp_path / "Q17.trial")
    assert main(["start", PLAN, path, "--by", "Jane Roe"]) == 0
    assert receive(path, 1, "2024-08-16") == 0
    printed = capsys.readouterr().out
    assert "605 subjects, 140 events, information fraction 0.260" in printed
    assert printed.endswith("Received as look 1. It is open until it is frozen.\n")
    return path


def receive(path: str, number: int, cutoff: str, *more: str) -> int:
    return main(["receive", path, extract(number), "--cutoff", cutoff, "--by", "Jane Roe", *more])


def test_a_trial_goes_from_plan_to_verified_report(
    trial: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    reports = tmp_path / "reports"
    assert main(["freeze", trial, "--by", "Jane Roe"]) == 0
    assert main(["report", trial, "1", "--to", str(reports)]) == 0
    assert main(["verify", trial]) == 0
    assert main(["verify", str(reports / "Q17-look-1-closed-masked.html")]) == 0
    printed = capsys.readouterr()
    assert "Look 1 is frozen; it cannot change any more." in printed.out
    assert "FAILED" not in printed.out
    assert printed.err == ""
    assert {path.suffix for path in reports.iterdir()} == {".html", ".json", ".jsonl", ".py"}


def test_a_second_look_waits_until_the_first_is_frozen(
    trial: str, capsys: pytest.CaptureFixture[str]
) -> None:
    before = Path(trial).read_bytes()
    acknowledged = [f"time-disagrees-with-dates={REASONS['time-disagrees-with-dates']}"]
    assert receive(trial, 2, "2025-04-01", "--acknowledge", *acknowledged) == 4
    assert "Look 1 is still open." in capsys.readouterr().err
    assert Path(trial).read_bytes() == before


def test_a_doubt_waits_for_its_reason(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    main(["freeze", trial, "--by", "Jane Roe"])
    before = Path(trial).read_bytes()
    assert receive(trial, 2, "2025-04-01") == 2
    refused = capsys.readouterr().err
    assert "doubt time-disagrees-with-dates: Time that disagrees with its dates" in refused
    assert '--acknowledge "time-disagrees-with-dates=the reason"' in refused
    assert Path(trial).read_bytes() == before
    reason = f"time-disagrees-with-dates={REASONS['time-disagrees-with-dates']}"
    assert receive(trial, 2, "2025-04-01", "--acknowledge", reason) == 0


def test_an_extract_that_cannot_be_used_leaves_the_trial_file_as_it_was(
    trial: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    main(["freeze", trial, "--by", "Jane Roe"])
    before = Path(trial).read_bytes()
    broken = tmp_path / "extract-2.csv"
    broken.write_bytes(Path(extract(2)).read_bytes().replace(b"PLACEBO", b"PLACEBOS", 1))
    words = ["receive", trial, str(broken), "--cutoff", "2025-04-01", "--by", "Jane Roe"]
    assert main(words) == 2
    assert "'PLACEBOS'" in capsys.readouterr().err
    assert Path(trial).read_bytes() == before


def test_unmasking_is_recorded_once(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    words = ["unmask", trial, "--reason", "asked for by the committee", "--by", "Jane Roe"]
    assert [main(words), main(words)] == [0, 4]
    assert "The arms are unmasked from now on" in capsys.readouterr().out


def test_an_amendment_is_told_key_by_key(
    trial: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    plan = tmp_path / "plan-2.toml"
    plan.write_text(Path(PLAN).read_text().replace("planned_events = 538", "planned_events = 600"))
    words = ["amend", trial, str(plan), "--reason", "slow accrual", "--by", "Jane Roe"]
    assert main(words) == 0
    assert capsys.readouterr().out == (
        "Plan version 2 governs the looks received from now on. "
        "Look 1 is open and stays under the version before.\n"
        "  design.planned_events: 538 -> 600\n"
        "Comparative results opened before: none; arms masked. Looks held stay as they were.\n"
    )
    assert main(words) == 4
    assert "An amendment that changes nothing in plan-2.toml." in capsys.readouterr().err


def test_a_recommendation_an_erratum_and_a_backup_are_recorded_and_verified(
    trial: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    by = ["--by", "Jane Roe"]
    copy = str(tmp_path / "copy.trial")
    assert main(["freeze", trial, *by]) == 0
    capsys.readouterr()
    assert main(["recommend", trial, "stop for benefit", "--reason", "as minuted", *by]) == 0
    assert main(["erratum", trial, "2", "--reason", "the extract was taken a day later", *by]) == 0
    assert main(["backup", trial, copy, *by]) == 0
    assert main(["verify", trial, "--record", *by]) == 0
    said = capsys.readouterr().out
    for sentence in (
        "Recorded after look 1: stop for benefit.",
        "Advising a stop for benefit without a crossing gives up the plan's error control;",
        "The correction of entry 2 is recorded; the entry itself stays as it was.",
        f"Backed up and verified: {copy}",
        "The chain of 6 entries is whole",
        "Recorded.",
    ):
        assert sentence in said
    assert main(["verify", copy]) == 0


def test_a_refused_extract_is_recorded_by_a_command_of_its_own(
    trial: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    broken = tmp_path / "extract-2.csv"
    broken.write_bytes(Path(extract(2)).read_bytes().replace(b"PLACEBO", b"PLACEBOS", 1))
    words = ["refuse", trial, str(broken), "--cutoff", "2025-04-01", "--by", "Jane Roe"]
    assert main(words) == 0
    said = capsys.readouterr().out
    assert said.startswith(
        "The refusal is recorded: names, digests and these sentences, and nothing of the files."
    )
    assert "'PLACEBOS'" in said
    assert main(["refuse", trial, extract(1), "--cutoff", "2025-04-01", "--by", "Jane Roe"]) == 2


def test_a_head_kept_elsewhere_is_looked_for(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    main(["freeze", trial, "--by", "Jane Roe"])
    head = capsys.readouterr().out.split()[-1]
    assert main(["verify", trial, "--head", head]) == 0
    assert f"The head {head} is that of entry 3" in capsys.readouterr().out
    assert main(["verify", trial, "--head", "0" * 64]) == 3
    assert "FAILED  the head 000" in capsys.readouterr().out
    assert main(["verify", trial, "--head", "123"]) == 2
    assert "This is no head. Found '123'." in capsys.readouterr().err


def test_a_verification_is_recorded_under_a_name(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["verify", trial, "--record"]) == 2
    assert "Nobody is named in 'verify'. Accepted: --by NAME beside --record." in capsys.readouterr().err


def test_a_clock_that_went_back_is_told_after_the_act(
    trial: str, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    before = Settings(clock=lambda: datetime(2025, 1, 1, tzinfo=UTC))
    monkeypatch.setattr("app.cli.Settings", lambda: before)
    assert main(["freeze", trial, "--by", "Jane Roe"]) == 0
    assert capsys.readouterr().err.startswith(
        "doubt: The clock went back: entry 3 carries 2025-01-01T00:00:00Z"
    )


def test_a_damaged_file_says_so_and_takes_no_act(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    shell = sqlite3.connect(trial)
    shell.execute("DROP TRIGGER entry_update")
    shell.close()
    assert main(["freeze", trial, "--by", "Jane Roe"]) == 4
    told, refused = capsys.readouterr().err.splitlines()
    assert told.endswith("the rule or table 'entry_update' of the file: missing")
    assert refused.startswith("A damaged trial file is not written to in ")
    assert main(["verify", trial]) == 3


def test_nobody_acts_without_a_name(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["freeze", trial, "--by", "  "]) == 2
    assert "The name of who acts is missing." in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "code"),
    [
        (["serve", "nowhere.trial"], {2, 4, 5}),
        (["freeze", "nowhere.trial", "--by", "Jane Roe"], {2, 4, 5}),
        (["verify", "nowhere.trial"], {2}),
        (["boundary", "nowhere.toml"], {2}),
        (["evaluate", PLAN, "--look", "nowhere.csv"], {2}),
    ],
)
def test_a_file_that_is_not_there_is_named_in_one_sentence(
    words: list[str], code: set[int], capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(words) in code
    printed = capsys.readouterr().err
    assert "nowhere" in printed
    assert printed.count("\n") == 1


def test_a_plan_is_not_locked_over_a_file_that_exists(trial: str, capsys: pytest.CaptureFixture[str]) -> None:
    before = Path(trial).read_bytes()
    assert main(["start", PLAN, trial, "--by", "Jane Roe"]) == 2
    assert Path(trial).name in capsys.readouterr().err
    assert Path(trial).read_bytes() == before


def test_boundary_prints_the_numbers_of_its_record(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["boundary", PLAN, "--at", "0.35,0.7", "--final"]) == 0
    table = capsys.readouterr().out
    assert main(["boundary", PLAN, "--at", "0.35,0.7", "--final", "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    assert (record["kind"], record["sides"]) == ("boundary", 1)
    for look in record["looks"]:
        assert f"{look['efficacy_z']:.4f}" in table
        assert f"{look['efficacy_hazard_ratio']:.3f}" in table
    # O'Brien-Fleming-type spending of one-sided 0.025 at 0.35 and a final 0.7, computed independently
    assert [f"{look['efficacy_z']:.4f}" for look in record["looks"]] == ["3.6128", "1.9603"]
    assert "2 final" in table


def test_evaluate_prints_the_numbers_of_its_record(capsys: pytest.CaptureFixture[str]) -> None:
    words = ["evaluate", PLAN, "--look", extract(1), "--look", extract(2)]
    assert main(words) == 0
    printed = capsys.readouterr()
    assert main([*words, "--json"]) == 0
    record = json.loads(capsys.readouterr().out)
    second = record["looks"][1]
    assert "Look 2, planned: 276 of 538 planned events, information fraction 0.513" in printed.out
    for value in (second["logrank"]["z"], second["cox"]["hazard_ratio"], second["boundary"]["efficacy_z"]):
        assert f"{value:.3f}" in printed.out
    assert printed.err.startswith("doubt time-disagrees-with-dates: ")
    assert [finding["id"] for finding in record["findings"]] == ["time-disagrees-with-dates"]


def test_validate_agrees_with_every_publication(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["validate"]) == 0
    table = capsys.readouterr().out
    assert main(["validate", "--json"]) == 0
    rows = json.loads(capsys.readouterr().out)["rows"]
    assert f"{len(rows)} of {len(rows)} agree to the printed digits." in table
    assert [row["quantity"] for row in rows if not row["agrees"]] == []


def test_points_stand_in_line() -> None:
    rows = [("first", "0.25", "not reached"), ("second", "10.125", "7")]
    assert aligned(("Row", "Number", "Words"), rows).splitlines() == [
        "Row     Number        Words",
        "------  ------  -----------",
        "first    0.25   not reached",
        "second  10.125            7",
    ]
