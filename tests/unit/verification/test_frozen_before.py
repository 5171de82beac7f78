"""A record frozen by an earlier version still is one: it reads, it verifies, and later bounds rest on it."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from app.record.canonical import parse_strict
from app.record.schema import LOOKS_RECORD
from app.record.schema import differences as differences_from
from app.review import as_used, as_used_of_record
from app.verification.comparison import differences
from app.views.closed import full_view
from app.views.record import looks_record
from tests.unit.review.invented_trial import patients, plan
from tests.unit.sheets.invented_looks import Held, held

SMALL = (("planned_events = 80", "planned_events = 20"), ("planned_subjects = 160", "planned_subjects = 40"))
FOLDER = Path(__file__).parent / "frozen_before"
VERSIONS = sorted(file.stem.removeprefix("record_") for file in FOLDER.glob("record_*.json"))


def frozen_by(version: str) -> dict[str, Any]:
    """The full record of look 2 of the small invented trial, as this version wrote it."""
    record: dict[str, Any] = parse_strict((FOLDER / f"record_{version}.json").read_bytes(), version)
    assert record["program"]["version"] == version
    return record


def second_look() -> Held:
    return held(plan(*SMALL), patients(size=40))[1]


@pytest.mark.parametrize("version", VERSIONS)
def test_an_earlier_record_keeps_to_the_names_and_verifies_number_by_number(version: str) -> None:
    stored, look = frozen_by(version), second_look()
    assert list(differences_from(stored, LOOKS_RECORD)) == []
    computed = looks_record("look", [full_view(look.result, look.plan)], run_at="")
    assert list(map(str, differences(stored, computed))) == []


@pytest.mark.parametrize("version", VERSIONS)
def test_later_bounds_rest_on_an_earlier_record_as_on_one_of_today(version: str) -> None:
    used, today = as_used_of_record(frozen_by(version)["looks"][0]), as_used(second_look().result)
    assert used.efficacy_z == pytest.approx(today.efficacy_z, rel=1e-9)
    assert used.z == pytest.approx(today.z, rel=1e-9)
    assert (used.number, used.events, used.further, used.harm_information) == (2, today.events, (), None)


def test_there_is_a_record_of_an_earlier_version() -> None:
    assert "0.1.0" in VERSIONS


def test_a_name_that_always_was_may_not_be_lacking() -> None:
    stored = frozen_by("0.1.0")
    del stored["looks"][0]["cox"]
    assert list(differences_from(stored, LOOKS_RECORD)) == ["record.looks[0].cox: missing"]


def test_a_number_that_was_changed_is_found_in_an_earlier_record_too() -> None:
    stored, look = frozen_by("0.1.0"), second_look()
    stored["looks"][0]["logrank"]["z"] += 1e-6
    computed = looks_record("look", [full_view(look.result, look.plan)], run_at="")
    assert [each.place for each in differences(stored, computed)] == ["looks[0].logrank.z"]
