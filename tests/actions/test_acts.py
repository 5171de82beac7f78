"""Refusals, recommendations, errata and backups as a person makes them."""

from __future__ import annotations

from dataclasses import replace
from datetime import date
from pathlib import Path

import pytest

from app.actions.amend import amend
from app.actions.backup import backup
from app.actions.correct import erratum
from app.actions.desk import Desk
from app.actions.looks import closed_book, open_book
from app.actions.receive import receive
from app.actions.recommend import ADVICE, ALPHA_STAYS, WITHOUT_A_CROSSING, read_advice, recommend
from app.actions.refuse import record_refusal
from app.actions.start import start
from app.errors import InputError, LedgerError, ValueRejected
from app.ledger.bodies import Backup, Erratum, Recommendation, RefusalRecorded
from app.ledger.entries import read_body
from app.record.canonical import digest
from app.render.svg.lettering import plain
from app.settings import Settings
from tests.actions import given

(BLOCKED,) = (file.content for file in given.BLOCKED.files)


def last(desk: Desk) -> object:
    return read_body(desk.trial.entries()[-1])


def history_said(desk: Desk) -> list[tuple[str, str, str]]:
    """What stands under "when" and "what" in the history, and what stands small under it."""
    sheet = closed_book(desk, 3, session=None).sheet("record")
    assert sheet is not None
    rows = sheet.wide_tables[-1].rows
    return [(plain(row.cells[1].line), plain(row.cells[1].below), plain(row.cells[0].below)) for row in rows]


# --- refusals -----------------------------------------------------------------------------------------


def test_a_blocked_extract_stores_nothing_until_its_refusal_is_recorded(desk: Desk, path: Path) -> None:
    before = path.read_bytes()
    with pytest.raises(InputError, match="'PLACEBOS'"):
        receive(desk, given.BLOCKED, acknowledgements={}, by=given.BY, freeze_open=True)
    assert path.read_bytes() == before
    record_refusal(desk, given.BLOCKED, by=given.BY)
    body = last(desk)
    assert isinstance(body, RefusalRecorded)
    assert [(file.name, file.digest) for file in body.files] == [("extract-4.csv", digest(BLOCKED))]
    assert (body.cutoff, body.extracted, body.kind, body.by) == (
        "2026-10-09", "2026-10-23", "planned", given.BY,
    )  # fmt: skip
    assert "'PLACEBOS'" in next(each.sentence for each in body.findings if each.severity == "block")
    assert BLOCKED.splitlines()[5] not in path.read_bytes()


def test_a_refusal_opens_no_look_and_is_told_on_the_record_sheet(desk: Desk) -> None:
    record_refusal(desk, given.BLOCKED, by=given.BY)
    assert desk.trial.state().next_number == 4
    what, _, _ = history_said(desk)[-1]
    assert what.startswith("Extract refused, cutoff 9\u00a0Oct\u00a02026: extract-4.csv (SHA-256 ")
    assert "'PLACEBOS'" in what


def test_an_extract_that_can_be_used_is_not_refused(desk: Desk, path: Path) -> None:
    before = path.read_bytes()
    with pytest.raises(InputError) as refused:
        record_refusal(desk, given.FOURTH, by=given.BY)
    assert str(refused.value) == (
        "An extract that can be used is not refused. Found 3 findings, none of which blocks. "
        "Accepted: an extract with a finding that blocks. "
        "Receive it, or say in an erratum why it is left out."
    )
    assert path.read_bytes() == before


# --- recommendations ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("advice", "told"),
    [
        ("continue", ()),
        ("continue with changes", ()),
        ("stop for benefit", (WITHOUT_A_CROSSING, ALPHA_STAYS)),
        ("stop for futility", (ALPHA_STAYS,)),
        ("stop for harm", (ALPHA_STAYS,)),
        ("stop for another reason", ()),
    ],
)
def test_a_recommendation_is_recorded_with_what_goes_with_it(
    desk: Desk, advice: str, told: tuple[str, ...]
) -> None:
    kept = read_advice(advice, where="ADVICE")
    assert recommend(desk, advice=kept, reason="In words", by=given.BY) == (2, told)
    assert last(desk) == Recommendation(2, kept, "In words", "2026-11-02", given.BY)


def test_every_recommendation_has_been_tried() -> None:
    assert len(ADVICE) == 6


def test_a_recommendation_names_its_look_and_its_day(desk: Desk) -> None:
    recommend(desk, advice="continue", reason="No concern", by=given.BY, look=1, held_on=date(2024, 9, 20))
    sheet = closed_book(desk, 3, session=None).sheet("record")
    assert sheet is not None
    table = sheet.wide_tables[0]
    assert plain(table.caption) == "What the committee recommended"
    (row,) = table.rows
    assert [plain(row.head), *(plain(cell.line) for cell in row.cells)] == [
        "Look\u00a01", "continue", "20\u00a0Sep\u00a02024", "No concern", given.BY,
    ]  # fmt: skip


def test_no_recommendation_before_its_look_is_frozen(desk: Desk) -> None:
    with pytest.raises(LedgerError, match="Look 3 is not frozen"):
        recommend(desk, advice="continue", reason="No concern", by=given.BY, look=3)


def test_no_recommendation_before_any_look_is_frozen(tmp_path: Path, settings: Settings) -> None:
    start(settings, plan_name="plan.toml", plan=given.PLAN, path=tmp_path / "new.trial", by=given.BY)
    with Desk.open(settings, tmp_path / "new.trial") as desk, pytest.raises(LedgerError) as refused:
        recommend(desk, advice="continue", reason="No concern", by=given.BY)
    assert str(refused.value).startswith("No look is frozen. Accepted: a recommendation on a frozen look")


def test_no_meeting_lies_in_the_future(desk: Desk) -> None:
    with pytest.raises(ValueRejected, match=r"A meeting in the future\. Found 2026-11-03\."):
        recommend(desk, advice="continue", reason="No", by=given.BY, held_on=date(2026, 11, 3))


def test_another_word_for_a_recommendation_is_told_the_nearest_one() -> None:
    with pytest.raises(ValueRejected, match="Write 'stop for harm' if that is meant"):
        read_advice("stop for harms", where="ADVICE")


# --- errata and backups -------------------------------------------------------------------------------


def test_an_erratum_stands_beside_the_entry_it_corrects(desk: Desk) -> None:
    erratum(desk, entry=2, correction="The cutoff was 2024-08-15", by=given.BY)
    assert last(desk) == Erratum(2, "The cutoff was 2024-08-15", given.BY)
    said = history_said(desk)
    number = len(said)
    assert said[1][1] == f"Entry {number} corrects: The cutoff was 2024-08-15"
    assert said[-1][0] == "Entry 2 corrected: The cutoff was 2024-08-15"


def test_an_erratum_to_no_entry_is_told(desk: Desk) -> None:
    with pytest.raises(LedgerError, match=r"An erratum to an entry that does not exist\. Found entry 99"):
        erratum(desk, entry=99, correction="No", by=given.BY)


def test_a_backup_takes_the_name_given_or_one_by_the_time(desk: Desk, tmp_path: Path) -> None:
    (tmp_path / "backups").mkdir()
    named = backup(desk, tmp_path / "copy.trial", by=given.BY)
    timed = backup(desk, tmp_path / "backups", by="")
    assert named.path == tmp_path / "copy.trial"
    assert timed.path == tmp_path / "backups" / "Q17-20261102T093000Z.trial"
    for made in (named, timed):
        assert made.recorded
        assert digest(made.path.read_bytes()) == made.digest
    body = last(desk)
    assert isinstance(body, Backup)
    assert (body.name, body.by) == ("Q17-20261102T093000Z.trial", "")


def test_a_clock_that_went_back_is_a_doubt_on_the_record_sheet(path: Path, settings: Settings) -> None:
    earlier = replace(settings, clock=lambda: settings.clock().replace(year=2025, month=1))
    with Desk.open(earlier, path) as desk:
        erratum(desk, entry=1, correction="Nothing", by=given.BY)
    with Desk.open(settings, path) as desk:
        moment = "30\u00a0Oct\u00a02025,\u00a008:45\u00a0UTC"
        assert history_said(desk)[-1][2] == f"Doubt: the entry before has {moment}"


def test_nothing_of_the_later_acts_reaches_the_open_side(desk: Desk) -> None:
    before = open_book(desk, 3)
    record_refusal(desk, given.BLOCKED, by=given.BY)
    recommend(desk, advice="stop for benefit", reason="In words", by=given.BY)
    erratum(desk, entry=2, correction="The cutoff was 2024-08-15", by=given.BY)
    amend(desk, plan_name="plan-2.toml", plan=given.revised_plan(), reason="Slow accrual", by=given.BY)
    assert open_book(desk, 3) == before
