"""Verification of a trial file and of a report: what it confirms, and what it names when it was changed."""

from __future__ import annotations

import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from app.actions.check import record_verification, verify, verify_desk
from app.actions.freeze import freeze
from app.actions.looks import closed_book
from app.actions.report import report, write_report
from app.errors import AppError, InputError
from app.ledger.bodies import Verification
from app.ledger.entries import read_body
from app.verification.check import CheckReport
from tests.unit.actions.invented_file import BY, desk, held, settings
from tests.unit.review.invented_trial import CUTOFFS
from tests.unit.sheets.invented_looks import FURTHER, table_texts
from tests.unit.verification.forging import flip_a_byte, forge_record, forge_report

WHOLE = "is whole, and every stored byte is as received."


def verified(file: Path) -> CheckReport:
    return verify(settings(CUTOFFS[3]), file)


def faults(file: Path) -> list[str]:
    before = file.read_bytes()
    checked = verified(file)
    assert file.read_bytes() == before  # a verification writes nothing
    return [line.text for line in checked.lines if not line.ok]


@pytest.fixture
def file(tmp_path: Path) -> Path:
    """Two looks, both frozen."""
    return held(tmp_path, 2, frozen=2)


# --- sound ----------------------------------------------------------------------------------------------


def test_a_sound_file_is_confirmed_look_by_look(file: Path) -> None:
    checked = verified(file)
    texts = [line.text for line in checked.lines]
    assert checked.ok
    assert texts[0].startswith("The chain of 5 entries")
    assert texts[0].endswith(WHOLE)
    for look in (1, 2):
        assert f"Look {look}, frozen record: every number agrees with the one computed again." in texts
        assert f"Look {look}, record in its report: every number agrees with the one computed again." in texts
        assert f"Look {look}, closed report: set again from its snapshot, it has the same bytes." in texts
    assert "The committee's minutes" in texts[-1]


def test_a_sound_verification_is_entered_and_the_next_one_still_agrees(file: Path) -> None:
    with desk(file) as open_desk:
        record_verification(open_desk, verify_desk(open_desk))
        body = read_body(open_desk.trial.entries()[-1])
        assert isinstance(body, Verification)
        assert (body.entries, body.looks_recomputed) == (5, (1, 2))
    assert verified(file).ok


def test_a_report_of_another_machine_is_set_again_too(file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("app.actions.check.environment", lambda: {"machine": "another"})
    texts = [line.text for line in verified(file).lines if line.ok]
    assert "Look 1, closed report: set again from its snapshot, it has the same bytes." in texts


def test_other_bytes_of_another_machine_s_report_are_no_fault(
    file: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr("app.actions.check.environment", lambda: {"machine": "another"})
    monkeypatch.setattr("app.actions.check.closed_report", lambda *given: b"other bytes")
    report = verified(file)
    assert report.ok
    assert any("it has other bytes, as is to be expected" in line.text for line in report.lines)


def test_other_bytes_of_a_report_made_here_are_a_fault(file: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("app.actions.check.closed_report", lambda *given: b"other bytes")
    assert "Look 1, closed report: set again from its snapshot, it has other bytes." in faults(file)


# --- changed bytes --------------------------------------------------------------------------------------


def test_a_flipped_byte_in_a_stored_snapshot_names_that_snapshot(file: Path) -> None:
    with desk(file) as open_desk:
        key = open_desk.trial.snapshot(2).files[0].digest
    flip_a_byte(file, key)
    found = faults(file)
    assert found[0] == "snapshot 2, file adtte-2025-04-20.csv: bytes changed"
    assert not any(text.startswith("snapshot 1") for text in found)
    assert any(text.startswith("Look 2 cannot be computed again") for text in found)


def test_a_flipped_byte_in_a_frozen_report_names_that_report(file: Path) -> None:
    with desk(file) as open_desk:
        key = open_desk.trial.state().frozen_look(1).body.report_digest
    flip_a_byte(file, key)
    assert faults(file)[0] == "look 1, closed report: bytes changed"


def test_nothing_is_entered_into_a_damaged_file(file: Path) -> None:
    with desk(file) as open_desk:
        key = open_desk.trial.snapshot(2).files[0].digest
    flip_a_byte(file, key)
    before = file.read_bytes()
    with desk(file) as open_desk:
        record_verification(open_desk, verify_desk(open_desk))
    assert file.read_bytes() == before


# --- a number changed and every hash redone -------------------------------------------------------------


def look_of(record: dict[str, Any]) -> dict[str, Any]:
    look: dict[str, Any] = record["looks"][0]
    return look


def change_z_by_a_millionth(record: dict[str, Any]) -> None:
    look_of(record)["logrank"]["z"] *= 1 + 1e-6


def change_survival(record: dict[str, Any]) -> None:
    look_of(record)["curves"][1]["survival"][3] -= 0.001


def change_events(record: dict[str, Any]) -> None:
    look_of(record)["information"]["arms"][0]["events"] += 1


def change_verdict(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["crossed"] = "efficacy"


def change_alpha(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["alpha_spent"] *= 1.01


def change_a_residual(record: dict[str, Any]) -> None:
    look_of(record)["residuals"]["log_hazard_ratio"][4] += 1e-6


def change_a_limit_of_the_smooth(record: dict[str, Any]) -> None:
    look_of(record)["residuals"]["smooth"]["ci_high"][39] *= 1 + 1e-6


@pytest.mark.parametrize(
    ("change", "place"),
    [
        (change_z_by_a_millionth, "looks[0].logrank.z"),
        (change_survival, "looks[0].curves[1].survival[3]"),
        (change_events, "looks[0].information.arms[0].events"),
        (change_verdict, "looks[0].boundary.crossed"),
        (change_alpha, "looks[0].boundary.alpha_spent"),
        (change_a_residual, "looks[0].residuals.log_hazard_ratio[4]"),
        (change_a_limit_of_the_smooth, "looks[0].residuals.smooth.ci_high[39]"),
    ],
    ids=lambda value: getattr(value, "__name__", ""),
)
def test_a_number_changed_inside_a_frozen_look_is_named(
    file: Path, change: Callable[[dict[str, Any]], None], place: str
) -> None:
    """The chain is whole again, so only the number computed anew tells."""
    forge_record(file, 2, change)
    found = faults(file)
    assert found[0].startswith(f"look 2, frozen record, {place}: stored ")
    assert not any("chain" in text and "whole" not in text for text in found)


def change_a_bound_of_a_hypothesis(record: dict[str, Any]) -> None:
    look_of(record)["hypotheses"][0]["boundary"]["efficacy_z"] *= 1 + 1e-6


def change_z_of_harm(record: dict[str, Any]) -> None:
    look_of(record)["harm_endpoint"]["logrank"]["z"] *= 1 + 1e-6


@pytest.mark.parametrize(
    ("change", "place"),
    [
        (change_a_bound_of_a_hypothesis, "looks[0].hypotheses[0].boundary.efficacy_z"),
        (change_z_of_harm, "looks[0].harm_endpoint.logrank.z"),
    ],
    ids=lambda value: getattr(value, "__name__", ""),
)
def test_a_number_changed_in_a_further_endpoint_of_a_frozen_look_is_named(
    tmp_path: Path, change: Callable[[dict[str, Any]], None], place: str
) -> None:
    file = held(tmp_path, 2, frozen=2, changes=(FURTHER,))
    forge_record(file, 2, change)
    assert faults(file)[0].startswith(f"look 2, frozen record, {place}: stored ")


def without_hypotheses(record: dict[str, Any]) -> None:
    record["looks"][0]["hypotheses"] = None


def another_endpoint(record: dict[str, Any]) -> None:
    record["looks"][0]["hypotheses"][0]["parameter"] = "STROKE"


def hypothesis_twice(record: dict[str, Any]) -> None:
    record["looks"][0]["hypotheses"] *= 2


@pytest.mark.parametrize("change", [without_hypotheses, another_endpoint, hypothesis_twice])
def test_a_record_of_other_hypotheses_than_its_plan_s_is_told_in_words(
    tmp_path: Path, change: Callable[[dict[str, Any]], None]
) -> None:
    file = held(tmp_path, 2, frozen=2, changes=(FURTHER,))
    forge_record(file, 1, change)
    told = "A frozen record of other hypotheses than its plan's in look 1, frozen record."
    assert any(told in fault for fault in faults(file))
    with desk(file) as open_desk, pytest.raises(AppError, match="other hypotheses"):
        closed_book(open_desk, 1, session=None)


def test_a_z_that_no_test_gives_is_told_in_words(file: Path) -> None:
    def z_without_end(record: dict[str, Any]) -> None:
        record["looks"][0]["logrank"]["z"] = -1e308

    forge_record(file, 1, z_without_end)
    assert any("A frozen record with a z that no test gives" in fault for fault in faults(file))


def test_a_changed_number_that_later_bounds_rest_on_is_told_there_too(file: Path) -> None:
    forge_record(file, 1, change_alpha)
    found = faults(file)
    assert any(text.startswith("look 1, frozen record, looks[0].boundary.alpha_spent") for text in found)
    assert any(text.startswith("look 2, frozen record, looks[0].boundary.efficacy_z") for text in found)


def test_a_number_changed_in_a_report_s_record_is_named(file: Path) -> None:
    forge_report(file, 2, b"&#34;events&#34;: 52", b"&#34;events&#34;: 53")
    found = faults(file)
    assert found[0] == "look 2, record in its report, looks[0].information.events: stored 53, computed 52"


def test_a_word_changed_in_a_report_is_found_by_setting_it_again(file: Path) -> None:
    """The record is as it was, and so is every digest; only the page says something else."""
    forge_report(file, 2, b"no boundary crossed", b"all went very well")
    assert "Look 2, closed report: set again from its snapshot, it has other bytes." in faults(file)


def another_bound(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["efficacy_z"] = 3.141


def test_a_frozen_look_is_shown_with_its_bound_as_stored_and_never_recomputed(file: Path) -> None:
    """Whatever a later version would compute: on its own page, and on those of the looks after it."""
    forge_record(file, 1, another_bound)
    with desk(file) as open_desk:
        own, later = (closed_book(open_desk, look, session=None).sheet("boundary") for look in (1, 2))
    assert own is not None
    assert later is not None
    assert table_texts(own, "Look 1")["Efficacy bound"] == ["3.141", "3.141"]
    assert table_texts(later, "The looks")["1, held"][3] == "3.141"


def information_that_cannot_be(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["information"] = -5.0


def bound_that_cannot_be(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["efficacy_z"] = -1e300


def a_reason_for_a_number(record: dict[str, Any]) -> None:
    look_of(record)["boundary"]["alpha_spent"] = {"not_estimable": "gone"}


def no_look(record: dict[str, Any]) -> None:
    record["looks"] = []


def two_looks(record: dict[str, Any]) -> None:
    record["looks"] *= 2


def another_look(record: dict[str, Any]) -> None:
    look_of(record)["number"] = 7


def a_name_too_many(record: dict[str, Any]) -> None:
    look_of(record)["logrank"]["q"] = 1


@pytest.mark.parametrize(
    "change",
    [
        information_that_cannot_be, bound_that_cannot_be, a_reason_for_a_number, no_look, two_looks,
        another_look, a_name_too_many,
    ],
)  # fmt: skip
def test_a_record_made_to_say_what_cannot_be_is_told_in_words_and_no_look_is_left_out(
    file: Path, change: Callable[[dict[str, Any]], None]
) -> None:
    forge_record(file, 1, change)
    texts = [line.text for line in verified(file).lines]
    for look in (1, 2):
        assert any(text.lower().startswith(f"look {look}") for text in texts)
    assert any(text.lower().startswith("look 1") for text in faults(file))


def test_a_book_of_a_look_on_forged_ground_is_an_error_in_words(file: Path) -> None:
    """Opening the next look computes with the looks as used."""
    forge_record(file, 1, information_that_cannot_be)
    with pytest.raises(AppError) as told, desk(file) as open_desk:
        freeze(open_desk, by=BY)
    assert str(told.value)


# --- a report alone -------------------------------------------------------------------------------------


@pytest.fixture
def written(file: Path, tmp_path: Path) -> Path:
    with desk(file) as open_desk:
        return write_report(open_desk, 2, tmp_path / "report")[0]


def test_a_report_shows_that_its_record_is_the_one_it_prints(written: Path) -> None:
    checked = verified(written)
    assert checked.ok
    assert checked.lines[0].text == "The record in the report is the one whose SHA-256 the report prints."


def test_a_changed_record_in_a_report_is_found(written: Path) -> None:
    written.write_bytes(written.read_bytes().replace(b"&#34;events&#34;: 52", b"&#34;events&#34;: 53", 1))
    assert [line.text for line in verified(written).lines if not line.ok] == [
        "The record in the report is not the one whose SHA-256 the report prints."
    ]


def test_a_file_that_is_no_report_is_said_to_be_none(written: Path) -> None:
    written.write_bytes(b"<html><p>Hello</p></html>")
    assert not verified(written).ok


def test_a_folder_of_reports_is_verified_file_by_file(written: Path) -> None:
    shutil.copy(written, written.with_name("again.html"))
    files = [line.text.partition(": ")[0] for line in verified(written.parent).lines]
    assert set(files) == {"K4-look-2-closed-masked.html", "again.html"}


def test_what_is_nothing_to_verify_gets_a_sentence(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="Nothing to verify"):
        verified(tmp_path / "nowhere.trial")
    with pytest.raises(InputError, match="No report to verify"):
        verified(tmp_path)


def test_the_report_of_a_look_is_the_stored_one(file: Path) -> None:
    with desk(file) as open_desk:
        stored = open_desk.trial.content(open_desk.trial.state().frozen_look(2).body.report_digest)
        assert report(open_desk, 2).html == stored
