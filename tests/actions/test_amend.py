"""An amendment changes the future only: what was held stands as used, byte for byte and number by number."""

from __future__ import annotations

from math import e, log
from pathlib import Path

import pytest

from app.actions.amend import amend, understand_amendment
from app.actions.check import verify_desk
from app.actions.desk import Desk
from app.actions.freeze import freeze
from app.actions.looks import closed_book, open_book, record_of
from app.errors import InputError, LedgerError
from app.render.svg.lettering import plain
from app.sheets.blocks import Table
from tests.actions import given


def revise(desk: Desk) -> None:
    amend(desk, plan_name="plan-2.toml", plan=given.revised_plan(), reason="Slow accrual", by=given.BY)


def words(table: Table) -> list[list[str]]:
    """Head row and rows of a table, as plain text without unbreakable blanks."""
    heads = [plain(table.corner), *(plain(column.head) for column in table.columns)]
    rows = [[plain(row.head), *(plain(cell.line) for cell in row.cells)] for row in table.rows]
    return [[text.replace("\u00a0", " ") for text in row] for row in (heads, *rows)]


def frozen_bytes(desk: Desk) -> dict[str, bytes]:
    trial = desk.trial
    return {
        key: trial.content(key)
        for look in trial.state().frozen_looks
        if look.frozen
        for key in (look.frozen.body.record_digest, look.frozen.body.report_digest)
    }


def test_what_was_held_stands_as_used(desk: Desk) -> None:
    before, frozen = record_of(desk, 3), frozen_bytes(desk)
    revise(desk)
    assert frozen_bytes(desk) == frozen
    assert record_of(desk, 3)["looks"] == before["looks"]  # open, and held under the version it came under
    number = given.freeze_and_receive_the_fourth(desk)
    record = record_of(desk, number)["looks"][0]
    looks = {1: record_of(desk, 1), 2: record_of(desk, 2), 3: before}
    for held in record["history"]:
        (look,) = looks[held["number"]]["looks"]
        assert held["efficacy_z"] == look["boundary"]["efficacy_z"]
        assert held["alpha_spent"] == look["boundary"]["alpha_spent"]
        assert held["information"] == look["boundary"]["information"]
        assert held["fraction"] == look["information"]["fraction"]
    assert record["information"]["planned_events"] == 600
    assert record["information"]["fraction"] == 539 / 600


def test_the_amended_plan_governs_the_next_look_from_the_alpha_that_was_spent(desk: Desk) -> None:
    revise(desk)
    number = given.freeze_and_receive_the_fourth(desk)
    record = record_of(desk, number)["looks"][0]
    spent_before = record["history"][-1]["alpha_spent"]
    # Pocock-type spending at the new fraction: a log(1 + (e - 1)t) (Lan and DeMets 1983, from memory)
    assert record["boundary"]["alpha_spent"] == pytest.approx(0.025 * log(1 + (e - 1) * 539 / 600), rel=1e-12)
    assert record["boundary"]["alpha_spent_here"] == pytest.approx(
        record["boundary"]["alpha_spent"] - spent_before, rel=1e-9
    )


def test_the_version_of_each_look_stands_on_every_page(desk: Desk) -> None:
    revise(desk)
    assert closed_book(desk, 3, session=None).frame.colophon[1] == "Plan version 1"
    number = given.freeze_and_receive_the_fourth(desk)
    for book in (closed_book(desk, number, session=None), open_book(desk, number)):
        assert book.frame.colophon[1] == "Plan version 2 (looks 1, 2 and 3: version 1)"
    assert closed_book(desk, 1, session=None).frame.colophon[1] == "Plan version 1 (look 4: version 2)"


def test_a_doubt_about_a_plan_stands_on_the_record_sheet_of_the_looks_under_it(desk: Desk) -> None:
    fewer = given.plan_with((b"planned_events = 538", b"planned_events = 400"))
    amendment = amend(desk, plan_name="plan-2.toml", plan=fewer, reason="Slow accrual", by=given.BY)
    assert [doubt.id for doubt in amendment.doubts] == ["power-reached"]
    number = given.freeze_and_receive_the_fourth(desk)
    under_it, before = (closed_book(desk, look, session=None).sheet("record") for look in (number, 3))
    assert under_it is not None
    assert before is not None
    said = "Doubt about plan version 2: Hazard ratio, events and power disagree in the plan, [design]."
    assert plain(under_it.notes[0]).startswith(said)
    assert len(before.notes) == 1


def test_the_record_sheet_tells_what_changed_who_decided_and_what_was_known(desk: Desk) -> None:
    closed_book(desk, 3, session="an evening")
    revise(desk)
    sheet = closed_book(desk, 3, session=None).sheet("record")
    assert sheet is not None
    versions, changes, _ = sheet.wide_tables
    assert words(versions)[2] == [
        "2", "2 Nov 2026, 09:30 UTC", "none", "Slow accrual", given.BY,
        "results of look 3 had been opened, arms masked",
    ]  # fmt: skip
    assert words(changes)[1:] == [
        ["design.planned_events", "2", "538", "600"],
        ["design.looks", "2", "[0.25, 0.5, 0.75, 1.0]", "[0.3, 0.55, 0.8, 1.0]"],
        ["efficacy.spending", "2", '"O\'Brien-Fleming-type"', '"Pocock-type"'],
    ]


def test_an_amendment_is_understood_before_it_is_recorded(desk: Desk, path: Path) -> None:
    before = path.read_bytes()
    understood = understand_amendment(desk, plan_name="plan-2.toml", plan=given.revised_plan())
    assert (understood.version, understood.stays, understood.results_opened) == (2, 3, ())
    assert understood.changes[0].key == "design.planned_events"
    assert path.read_bytes() == before


def test_who_decided_may_be_another_than_who_records(desk: Desk) -> None:
    amend(
        desk,
        plan_name="plan-2.toml",
        plan=given.revised_plan(),
        reason="Slow accrual",
        by=given.BY,
        decided_by="Steering committee",
    )
    amended = desk.trial.state().plan.amended
    assert amended is not None
    assert (amended.decided_by, amended.by) == ("Steering committee", given.BY)


@pytest.mark.parametrize(
    ("plan", "error", "sentence"),
    [
        (given.PLAN, LedgerError, "An amendment that changes nothing in plan-2.toml. Found the keys of plan"),
        (given.PLAN + b"\n# a remark\n", LedgerError, "An amendment that changes nothing"),
        (given.plan_with((b"sides = 1", b"sides = 2")), InputError, "Design.sides cannot be amended"),
        (given.plan_with((b"alpha = 0.025", b"alpha = 2")), InputError, "Alpha outside its domain"),
        (b"format = 1", InputError, "Table [trial] missing"),
    ],
)
def test_what_is_no_amendment_leaves_the_file_as_it_was(
    desk: Desk, path: Path, plan: bytes, error: type[Exception], sentence: str
) -> None:
    before = path.read_bytes()
    with pytest.raises(error) as refused:
        amend(desk, plan_name="plan-2.toml", plan=plan, reason="Slow accrual", by=given.BY)
    assert str(refused.value).startswith(sentence)
    assert path.read_bytes() == before


def test_an_amended_trial_verifies_each_look_under_its_own_version(desk: Desk) -> None:
    revise(desk)
    given.freeze_and_receive_the_fourth(desk)
    freeze(desk, by=given.BY)
    report = verify_desk(desk)
    assert report.ok
    said = [line.text for line in report.lines]
    assert (
        "Plan version 2 changes what its entry says: design.planned_events, design.looks, efficacy.spending."
        in said
    )
    assert sum("every number agrees" in text for text in said) == 8  # four looks, two records each
    assert sum("it has the same bytes" in text for text in said) == 4
