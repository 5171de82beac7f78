"""A trial file whose plan has looks held before it: their numbers, their past, and what each side sees."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import pytest

from app.actions.amend import amend, understand_amendment
from app.actions.check import verify
from app.actions.looks import assembled_look, closed_book, looks, open_book, pooled_look, record_of
from app.actions.receive import receive, understand
from app.actions.recommend import recommend
from app.actions.report import report
from app.errors import DesignInvalid, LedgerChanged, LedgerError
from app.ledger.trial import Trial
from app.record.schema import LOOKS_RECORD, differences
from app.render.spine import spine_marks
from app.sheets.blocks import LookBook
from app.verification.assembly import assemble, frozen_record
from tests.unit.actions.invented_file import BY, desk, held, incoming, settings, started
from tests.unit.review.invented_trial import CUTOFFS, FIRST_DAY, held_before, plan_text
from tests.unit.sheets.invented_looks import table_texts, text

TWO_BEFORE = held_before(1.234, -0.567)
UNMASKED = ("masked = true", "masked = false")
PLANNED = ("looks = [0.25, 0.5, 0.75, 1.0]", "looks = [0.125, 0.25, 0.375, 0.65, 1.0]")


@pytest.fixture
def file(tmp_path: Path) -> Path:
    """Looks 1 and 2 held before; 3 received and frozen, 4 open; masked."""
    return held(tmp_path, 2, changes=(TWO_BEFORE, PLANNED))


# --- numbers ------------------------------------------------------------------------------------------


def test_the_first_snapshot_is_that_of_the_look_after_those_held_before(file: Path) -> None:
    with desk(file, 2) as open_desk:
        assert looks(open_desk) == (3, 4)
        assert open_desk.trial.state().next_number == 5
        assert [look.plan.version for look in open_desk.trial.state().looks] == [1, 1]
        assert open_desk.trial.snapshot(3).number == 3
        assert report(open_desk, 3).stem == "K4-look-3-closed-masked"
        assert recommend(open_desk, advice="continue", reason="None", by=BY)[0] == 3


def test_the_first_snapshot_is_compared_with_none_and_the_next_with_it(tmp_path: Path) -> None:
    file = started(tmp_path, (TWO_BEFORE,))
    with desk(file, 1) as open_desk:
        first = understand(open_desk, incoming(CUTOFFS[0]))
    assert (first.look, first.changes) == (3, None)
    with desk(held(tmp_path, 1, changes=(TWO_BEFORE,), name="other.trial"), 2) as open_desk:
        second = understand(open_desk, incoming(CUTOFFS[1]))
    assert (second.look, second.freezes) == (4, 3)
    assert second.changes is not None
    assert len(second.changes.new_subjects) == 160 - 128


@pytest.mark.parametrize("number", [1, 2])
def test_a_look_held_before_has_no_sheets_and_a_sentence_says_so(file: Path, number: int) -> None:
    said = f"Look {number} was held before this trial file. Found no snapshot of it, and so no sheets"
    with desk(file, 2) as open_desk:
        for act in (
            lambda: closed_book(open_desk, number, session=None),
            lambda: open_book(open_desk, number),
            lambda: report(open_desk, number),
            lambda: recommend(open_desk, advice="continue", reason="None", by=BY, look=number),
        ):
            with pytest.raises(LedgerError) as refused:
                act()
            assert str(refused.value).startswith(said)


# --- the past -----------------------------------------------------------------------------------------


def test_bounds_rest_on_what_was_used_before_and_the_frozen_record_keeps_it(file: Path) -> None:
    with desk(file, 2) as open_desk:
        stored = frozen_record(open_desk.trial, 3)
        past = assembled_look(open_desk, 4).result.past
    assert list(differences(stored, LOOKS_RECORD)) == []
    assert [(look["number"], look["z"], look["efficacy_z"]) for look in stored["looks"][0]["history"]] == [
        (1, 1.234, 5.0),
        (2, -0.567, 4.33),
    ]
    assert [(look.number, look.kind, look.fraction) for look in past] == [
        (1, "planned", 10 / 80),
        (2, "planned", 20 / 80),
        (3, "planned", 30 / 80),
    ]
    spent = stored["looks"][0]["boundary"]
    assert spent["alpha_spent_here"] == pytest.approx(spent["alpha_spent"] - 0.00001, rel=1e-12)


def test_each_held_look_stands_beside_what_is_computed_for_it(file: Path) -> None:
    """After the first look as used, the second spends what the plan's function leaves it."""
    with desk(file, 2) as open_desk:
        first, second = record_of(open_desk, 4)["held"]
    assert (first["efficacy_z"], first["source"]) == (5.0, "Charter table 2")
    for each in (first, second):
        assert each["difference"] == each["efficacy_z"] - each["computed_efficacy_z"]
        assert each["alpha_difference"] == each["alpha_spent"] - each["computed_alpha_spent"]


def test_the_file_verifies_look_by_look_and_its_reports_are_set_again(tmp_path: Path) -> None:
    file = held(tmp_path, 3, frozen=3, changes=(TWO_BEFORE, PLANNED))
    checked = verify(settings(CUTOFFS[3]), file)
    assert checked.ok
    texts = [line.text for line in checked.lines]
    for number in (3, 4, 5):
        assert f"Look {number}, frozen record: every number agrees with the one computed again." in texts
        assert f"Look {number}, closed report: set again from its snapshot, it has the same bytes." in texts


def test_a_lock_that_counts_other_held_looks_than_its_plan_is_found(tmp_path: Path) -> None:
    file = tmp_path / "k4.trial"
    on = settings(FIRST_DAY)
    Trial.create(file, on, name="K4", plan=plan_text(TWO_BEFORE), by=BY, looks_held_before=1).close()
    with desk(file, 1) as open_desk:
        assert receive(open_desk, incoming(CUTOFFS[0]), acknowledgements={}, by=BY) == 2
        with pytest.raises(LedgerChanged) as refused:
            assemble(open_desk.trial, 2, open_desk.settings.limits)
    assert str(refused.value).startswith(
        "A lock that says other held looks than its plan in entry 1. Found 1 looks held before. Accepted: 2"
    )


# --- amendments ---------------------------------------------------------------------------------------


def amended(open_desk: Any, *changes: tuple[str, str]) -> None:
    amend(open_desk, plan_name="plan-2.toml", plan=plan_text(*changes), reason="Slow", by=BY)


@pytest.mark.parametrize("received", [0, 1])
@pytest.mark.parametrize("zs", [(1.5, -0.567), (1.234,), ()], ids=["changed", "one left out", "all left out"])
def test_no_amendment_changes_what_was_held_before(
    tmp_path: Path, received: int, zs: tuple[float, ...]
) -> None:
    file = held(tmp_path, received, frozen=received, changes=(TWO_BEFORE,))
    with desk(file, 1) as open_desk, pytest.raises(DesignInvalid) as refused:
        amended(open_desk, *([held_before(*zs)] if zs else []))
    (sentence,) = str(refused.value).splitlines()
    assert sentence.startswith("Held looks cannot be amended, added or left out in plan-2.toml, [[held]].")
    assert "1.234" not in sentence
    assert "-0.567" not in sentence


def test_none_is_added_by_an_amendment(tmp_path: Path) -> None:
    with desk(held(tmp_path, 1), 1) as open_desk, pytest.raises(DesignInvalid) as refused:
        understand_amendment(open_desk, plan_name="plan-2.toml", plan=plan_text(TWO_BEFORE))
    assert "while nothing was received, a new trial file can take others" in str(refused.value)


def test_a_total_revised_later_changes_no_number_of_what_was_held_before(tmp_path: Path) -> None:
    revised = ("planned_events = 80", "planned_events = 100")
    file = held(tmp_path, 1, frozen=1, changes=(TWO_BEFORE, PLANNED))
    with desk(file, 2) as open_desk:
        before = record_of(open_desk, 3)
        amended(open_desk, TWO_BEFORE, PLANNED, revised)
    with desk(file, 2) as open_desk:
        receive(open_desk, incoming(CUTOFFS[1]), acknowledgements={}, by=BY)
        after = record_of(open_desk, 4)
        book = closed_book(open_desk, 4, session=None)
    assert record_of_look(before, 3)["history"] == record_of_look(after, 4)["history"][:2]
    assert before["held"] == after["held"]
    assert [look.fraction for look in book.frame.spine.looks[:3]] == [0.1, 0.2, 0.3]  # one scale: of 100
    assert book.frame.colophon[1] == "Plan version 2 (look 3: version 1)"
    assert verify(settings(CUTOFFS[3]), file).ok


def record_of_look(record: dict[str, Any], number: int) -> dict[str, Any]:
    (look,) = [each for each in record["looks"] if each["number"] == number]
    found: dict[str, Any] = look
    return found


# --- pages --------------------------------------------------------------------------------------------


def spine_words(book: LookBook) -> list[tuple[str, str]]:
    marks = spine_marks(book.frame.spine).marks
    return [(mark.numbers, mark.further) for mark in marks if mark.is_held]


def test_the_spine_shows_them_filled_with_their_source_on_the_closed_side_only(file: Path) -> None:
    with desk(file, 2) as open_desk:
        closed, pooled = closed_book(open_desk, 4, session=None), open_book(open_desk, 4)
    assert spine_words(closed)[:2] == [
        ("0.125 · 10 events", ", planned 0.125, held before this file, Charter table 2"),
        ("0.250 · 20 events", ", planned 0.25, held before this file, Charter table 2"),
    ]
    assert spine_words(pooled)[:2] == [
        ("0.125 · 10 events", ", planned 0.125, held before this file"),
        ("0.250 · 20 events", ", planned 0.25, held before this file"),
    ]
    assert [look.planned for look in closed.frame.spine.looks] == [0.125, 0.25, 0.375, 0.65, 1.0]


def test_the_open_side_has_their_events_and_nothing_that_was_compared(tmp_path: Path, file: Path) -> None:
    other = held_before(-2.0, 3.9, source="Another charter, arms compared")
    with desk(file, 2) as open_desk:
        assert pooled_look(open_desk, 4).past == ((1, 0.125, 10), (2, 0.25, 20), (3, 0.375, 30))
        one = open_book(open_desk, 4)
    with desk(held(tmp_path, 2, changes=(other, PLANNED), name="other.trial"), 2) as open_desk:
        assert open_book(open_desk, 4) == one
    assert "Charter" not in repr(one)


def test_unmasked_the_boundary_sheet_shows_what_was_used_beside_what_is_computed(tmp_path: Path) -> None:
    with desk(held(tmp_path, 1, changes=(TWO_BEFORE, UNMASKED)), 1) as open_desk:
        sheet = closed_book(open_desk, 3, session=None).sheet("boundary")
    assert sheet is not None
    rows = table_texts(sheet, "Looks held before this file")
    assert rows["Look 1"][:3] == ["10", "1.234", "5.000"]
    assert rows["Look 2"][:3] == ["20", "−0.567", "4.330"]
    assert rows["Look 2"][-1] == "Charter table 2"
    assert table_texts(sheet, "The looks and their bounds")["1, held before"][2] == "1.234"
    assert "Looks 1 and 2: held before this file." in text(sheet.notes[0])


def test_masked_no_z_of_them_is_shown_or_recorded(file: Path) -> None:
    """The plan's z is of experimental against control: beside A against B it would name the letters."""
    with desk(file, 2) as open_desk:
        record, book = record_of(open_desk, 4), closed_book(open_desk, 4, session=None)
        frozen = report(open_desk, 3)
        full = frozen_record(open_desk.trial, 3)
    assert [each["z"] for each in record["held"]] == [None, None]
    assert [each["z"] for each in record["looks"][0]["history"][:2]] == [None, None]
    assert [each["z"] for each in full["held"]] == [1.234, -0.567]
    for shown in (repr(book), repr(record), *map(readable, frozen.by_name.values())):
        assert not re.search(r"(?<![\d.])(1\.234|0\.567)(?!\d)", shown)
    sheet = book.sheet("boundary")
    assert sheet is not None
    assert table_texts(sheet, "Looks held before this file")["Look 1"][:2] == ["10", "5.000"]
    assert "their z, known by arm, is not shown masked." in text(sheet.notes[0])


def readable(content: bytes) -> str:
    return re.sub(r"base64,[A-Za-z0-9+/=]+", "", content.decode("utf-8"))
