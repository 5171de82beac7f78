"""The demonstration: made as the trial would have come about, and sound in every way a real file is."""

from __future__ import annotations

from datetime import UTC, datetime
from pathlib import Path

import pytest

from app.actions.check import verify
from app.actions.demo import make_demo
from app.actions.desk import Desk
from app.actions.looks import closed_book, looks, open_book
from app.actions.report import report
from app.settings import Settings
from tests.unit.sheets.invented_looks import answers

NOW = Settings(clock=lambda: datetime(2026, 11, 2, 9, tzinfo=UTC))


@pytest.fixture(scope="module")
def demo(tmp_path_factory: pytest.TempPathFactory) -> Path:
    file = tmp_path_factory.mktemp("demo") / "demo.trial"
    make_demo(NOW, file)
    return file


def test_three_looks_are_received_and_two_frozen(demo: Path) -> None:
    with Desk.open(NOW, demo) as desk:
        assert looks(desk) == (1, 2, 3)
        assert [look.number for look in desk.trial.state().frozen_looks] == [1, 2]
        assert [len(look.snapshot.acknowledgements) for look in desk.trial.state().looks] == [0, 1, 1]


def test_it_verifies(demo: Path) -> None:
    assert [line.text for line in verify(NOW, demo).lines if not line.ok] == []


def test_every_sheet_of_either_side_has_its_answer(demo: Path) -> None:
    with Desk.open(NOW, demo) as desk:
        for look in looks(desk):
            for book in (closed_book(desk, look, session=None), open_book(desk, look)):
                for sheet in book.sheets:
                    assert all(len(answer) > 20 for answer in answers(sheet)), sheet.key


def test_the_arms_are_masked_and_no_report_names_them(demo: Path) -> None:
    """The title of the trial says tablet and placebo; which letter is which stands nowhere."""
    with Desk.open(NOW, demo) as desk:
        for look in (1, 2):
            html = report(desk, look).html
            assert b"PLACEBO" not in html
            assert b"TABLET" not in html
            assert "masked" in report(desk, look).stem
