"""Information counted in score variance: V, which needs the arms, on the closed side; events on the open."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from app.actions.amend import amend
from app.actions.check import verify
from app.actions.looks import assembled_look, closed_book, open_book, record_of
from app.actions.receive import receive, understand
from app.render.spine import spine_marks
from app.sheets.blocks import InformationStrip, LookBook
from tests.unit.actions.invented_file import BY, desk, held, incoming, settings
from tests.unit.review.invented_trial import CUTOFFS, Patients, patients, plan_text
from tests.unit.sheets.invented_looks import answers, parts, table_texts, text

PLANNED = 18.0
BY_VARIANCE = (
    "planned_events = 80",
    f'planned_events = 80\ninformation = "score variance"\nplanned_score_variance = {PLANNED}',
)


@pytest.fixture
def file(tmp_path: Path) -> Path:
    """Two looks, the first frozen."""
    return held(tmp_path, 2, changes=(BY_VARIANCE,))


def fractions(book: LookBook) -> list[float]:
    return [look.fraction for look in book.frame.spine.looks if look.state != "planned"]


@pytest.mark.parametrize("shown", [1, 2])
def test_the_closed_spine_is_drawn_to_the_scale_of_the_information_used(file: Path, shown: int) -> None:
    with desk(file, 2) as open_desk:
        book = closed_book(open_desk, shown, session=None)
        variances = [
            record_of(open_desk, look)["looks"][0]["information"]["score_variance"] for look in (1, 2)
        ]
        own = assembled_look(open_desk, shown).result.information.fraction
    assert fractions(book) == [variance / PLANNED for variance in variances]
    assert fractions(book)[shown - 1] == own
    marks = spine_marks(book.frame.spine)
    assert marks.by == " by score variance"
    assert marks.so_far.startswith(f"{own:.3f} · ")
    assert [mark.numbers for mark in marks.marks if not mark.is_held][-1] == "final, about 80 events"
    (strip,) = parts(book.sheet("glance"), InformationStrip)
    assert [fraction for fraction, _ in strip.held] == fractions(book)[:shown]
    assert strip.total.text == "planned"


def test_the_variance_stands_beside_the_plans_and_the_fraction_is_said_to_be_of_it(file: Path) -> None:
    with desk(file, 2) as open_desk:
        sheet = closed_book(open_desk, 2, session=None).sheet("information")
        variance = record_of(open_desk, 2)["looks"][0]["information"]["score_variance"]
    assert sheet is not None
    assert table_texts(sheet, "Both arms")["Log-rank variance of planned"] == [f"{variance:.2f} of 18.00"]
    assert text(sheet.methods[0].text).startswith("Fraction t = V / planned V")


def test_the_open_side_counts_events_and_says_so(file: Path) -> None:
    with desk(file, 2) as open_desk:
        book = open_book(open_desk, 2)
    assert fractions(book) == [30 / 80, 52 / 80]
    assert spine_marks(book.frame.spine).by == " by events"
    sheet = book.sheet("information")
    assert sheet is not None
    assert answers(sheet) == ["52 of 80 planned events: information fraction 0.650 by events, planned 0.50."]


def test_receiving_counts_events_and_says_so(tmp_path: Path) -> None:
    with desk(held(tmp_path, 1, frozen=1, changes=(BY_VARIANCE,)), 2) as open_desk:
        understood = understand(open_desk, incoming(CUTOFFS[1]))
    assert (understood.fraction, understood.by) == (0.65, "events")


def test_where_events_are_counted_nothing_is_said_of_it(tmp_path: Path) -> None:
    with desk(held(tmp_path, 2), 2) as open_desk:
        books = closed_book(open_desk, 2, session=None), open_book(open_desk, 2)
    for book in books:
        assert spine_marks(book.frame.spine).by == ""
        assert fractions(book) == [30 / 80, 52 / 80]


def other_arms(people: Patients) -> Patients:
    return replace(people, experimental=np.random.default_rng(9).random(people.time.size) < 0.3)


def test_the_open_side_is_the_same_whatever_v_is(tmp_path: Path) -> None:
    """Other arms, so another V and another closed spine; the same open book."""
    books = []
    for name, people in (("one", patients()), ("other", other_arms(patients()))):
        (tmp_path / name).mkdir()
        file = held(tmp_path / name, 2, changes=(BY_VARIANCE,), people=people)
        with desk(file, 2) as open_desk:
            books.append((open_book(open_desk, 2), closed_book(open_desk, 2, session=None)))
    (pooled, closed), (pooled_too, closed_too) = books
    assert pooled == pooled_too
    assert fractions(closed) != fractions(closed_too)


def test_frozen_looks_verify_and_an_amended_total_moves_the_whole_spine(file: Path) -> None:
    revised = (BY_VARIANCE[0], BY_VARIANCE[1].replace(str(PLANNED), "24.0"))
    with desk(file, 3) as open_desk:
        amend(open_desk, plan_name="plan-2.toml", plan=plan_text(revised), reason="Slow", by=BY)
        before = closed_book(open_desk, 2, session=None)
        receive(open_desk, incoming(CUTOFFS[2]), acknowledgements={}, by=BY, freeze_open=True)
        after = closed_book(open_desk, 3, session=None)
    assert fractions(after)[:2] == pytest.approx([PLANNED / 24.0 * each for each in fractions(before)])
    assert verify(settings(CUTOFFS[3]), file).ok
