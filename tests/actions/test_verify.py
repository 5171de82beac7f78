"""Verification: part by part, told as it goes, with heads kept elsewhere; entered when nothing is found."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from app.actions.amend import amend
from app.actions.check import Progress, read_head, record_verification, verify, verify_desk
from app.actions.correct import erratum
from app.actions.desk import Desk
from app.actions.freeze import freeze
from app.errors import LedgerChanged, ValueRejected
from app.ledger.bodies import Verification
from app.ledger.entries import read_body
from app.settings import Settings
from tests.actions import given
from tests.ledger.attacks import rechain, shell_without_triggers


def test_each_part_is_told_before_it_begins(path: Path, settings: Settings) -> None:
    told: list[Progress] = []
    assert verify(settings, path, tell=told.append).ok
    assert [progress.done for progress in told] == list(range(5))
    assert {progress.total for progress in told} == {5}
    assert [progress.part for progress in told] == [
        "the chain and every stored byte",
        "look 1, computed again",
        "look 2, computed again",
        "the report of look 1, set again",
        "the report of look 2, set again",
    ]


def test_a_witnessed_head_is_told_with_its_entry(path: Path, settings: Settings) -> None:
    with Desk.open(settings, path) as desk:
        entries = desk.trial.entries()
    report = verify(settings, path, heads=(entries[2].digest,))
    assert report.ok
    assert (
        f"The head {entries[2].digest} is that of entry 3, written {entries[2].at}: the history up to there "
        f"is as it was when the head was written down; {len(entries) - 3} entries follow it."
    ) in [line.text for line in report.lines]


@pytest.mark.parametrize("text", ["", "abcd", "g" * 64, "a" * 63, "a" * 65])
def test_what_is_no_head_is_told(text: str) -> None:
    with pytest.raises(ValueRejected, match="This is no head"):
        read_head(text)


def test_a_head_may_be_written_in_groups_and_capitals() -> None:
    assert read_head(" ".join(["ABCD"] * 16)) == "abcd" * 16


def test_a_verification_that_found_nothing_is_entered(desk: Desk) -> None:
    head = desk.trial.state().head
    report = verify_desk(desk, heads=(head.digest,))
    assert record_verification(desk, report, by=given.BY, heads=(head.digest,))
    assert read_body(desk.trial.entries()[-1]) == Verification(
        head.digest, head.id, 8, (1, 2), (head.digest,), given.BY
    )


def test_a_verification_that_found_something_is_not(desk: Desk, path: Path) -> None:
    report = verify_desk(desk)
    before = path.read_bytes()
    failed = replace(report, lines=(replace(report.lines[0], ok=False),))
    assert not record_verification(desk, failed, by=given.BY)
    assert path.read_bytes() == before


def test_before_a_freeze_the_history_is_verified_quickly(desk: Desk, path: Path) -> None:
    with shell_without_triggers(path) as shell:
        shell.execute("UPDATE entry SET at = '2024-01-01T00:00:00Z' WHERE id = 2")
    before = path.read_bytes()
    with pytest.raises(LedgerChanged, match="entry 2: changed: its digest is of something else"):
        freeze(desk, by=given.BY)
    assert path.read_bytes() == before


def test_a_clock_that_went_back_is_a_doubt_and_no_failure(path: Path, settings: Settings) -> None:
    earlier = replace(settings, clock=lambda: settings.clock().replace(year=2025, month=1))
    with Desk.open(earlier, path) as desk:
        erratum(desk, entry=1, correction="Nothing", by=given.BY)
    report = verify(settings, path)
    assert report.ok
    (doubt,) = [line.text for line in report.lines if line.text.startswith("Doubt: ")]
    assert doubt.startswith("Doubt: The clock went back: entry ")


def test_an_amendment_that_hides_a_change_is_found(path: Path, settings: Settings) -> None:
    with Desk.open(settings, path) as desk:
        amend(desk, plan_name="plan-2.toml", plan=given.revised_plan(), reason="Accrual", by=given.BY)
    with shell_without_triggers(path) as shell:
        hidden = '{"after":"600","before":"538","key":"design.planned_events"},'
        shell.execute("UPDATE entry SET body = replace(body, ?, '')", (hidden,))
        rechain(shell, forge_heads=True)
    found = [line.text for line in verify(settings, path).lines if not line.ok]
    assert found[0].startswith("Plan version 2 changes other keys than its entry says: ")


def test_a_damaged_file_says_what_and_where_and_is_read_only(path: Path, settings: Settings) -> None:
    content = bytearray(path.read_bytes())
    with Desk.open(settings, path) as desk:
        kind = desk.trial.entries()[4].body.encode()[:40]
    content[content.index(kind)] ^= 1
    path.write_bytes(content)
    with Desk.open(settings, path) as desk:
        assert not desk.may_write
        assert [str(problem) for problem in desk.trial.damage] == [
            "entry 5: changed: its digest is of something else"
        ]
    assert path.read_bytes() == content
