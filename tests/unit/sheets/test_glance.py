"""At a glance: five lines, each the sentence of its sheet, and an answer for every case."""

from __future__ import annotations

import math

import pytest

from app.model.values import Absent
from app.sheets.blocks import IntervalStrip, Sheet, ZStrip
from app.sheets.glance import glance_sheet
from app.views.closed import unmasked_view
from tests.unit.review.invented_trial import CUTOFFS, plan
from tests.unit.sheets.invented_looks import (
    A_IS_CONTROL,
    TWO_SIDED,
    answers,
    book,
    held,
    life,
    parts,
    surroundings,
    text,
)


def unmasked(*zs: float, sides: int = 1) -> Sheet:
    under = plan(*([TWO_SIDED] if sides == 2 else []))
    looks = held(under, cutoffs=CUTOFFS[: len(zs)])
    view = unmasked_view(life(*zs, sides=sides)[-1], under, A_IS_CONTROL)
    return glance_sheet(view, surroundings(looks), ())


def of_kind(kind: str, letters: object = None) -> str:
    looks = held(cutoffs=CUTOFFS[:2], kinds=("planned", kind))  # type: ignore[arg-type]
    (answer,) = answers(book(looks, letters).sheets[0])  # type: ignore[arg-type]
    return answer


@pytest.mark.parametrize(
    ("zs", "sides", "said"),
    [
        ((0.0, 1.0), 1, "With 52 of 80 planned events, no boundary was crossed."),
        ((0.0, 2.6), 1, "With 52 of 80 planned events, the efficacy boundary was crossed."),
        ((0.0, -2.6), 2, "With 52 of 80 planned events, the boundary in favour of control was crossed."),
        ((0.0, 2.6, 1.0), 1, "With 82 of 80 planned events, the boundary had been crossed at look 2."),
    ],
)
def test_unmasked_the_answer_says_what_was_crossed(zs: tuple[float, ...], sides: int, said: str) -> None:
    assert answers(unmasked(*zs, sides=sides)) == [said]


def test_masked_the_answer_names_the_reading_that_crosses() -> None:
    looks = held()
    assert answers(book(looks[:2], A_IS_CONTROL).sheets[0]) == [
        "With 52 of 80 planned events, no boundary was crossed in either reading."
    ]
    assert answers(book(looks[:3], A_IS_CONTROL).sheets[0]) == [
        "With 82 of 80 planned events, the boundary was crossed if B is experimental, and not otherwise."
    ]
    assert answers(book(looks, A_IS_CONTROL).sheets[0]) == [
        "With 107 of 80 planned events, "
        "the boundary was crossed at look 3 if B is experimental, and not otherwise."
    ]


@pytest.mark.parametrize("letters", [None, A_IS_CONTROL])
def test_at_a_look_without_a_bound_nothing_is_said_to_be_crossed_or_not(letters: object) -> None:
    said = "With 52 of 80 planned events, no efficacy boundary applies at this look."
    assert of_kind("safety", letters) == said


def test_the_five_lines_are_the_sentences_of_the_sheets() -> None:
    whole = book(held()[:2])
    glance = whole.sheets[0]
    assert [(row.number, row.sheet) for row in glance.glance] == [
        (1, "data"),
        (2, "information"),
        (3, "curves"),
        (4, "boundary"),
        (9, "record"),
    ]
    for row in glance.glance:
        sheet = whole.sheet(row.sheet)
        assert sheet is not None
        assert text(row.sentence).startswith(text(sheet.answer[0]))


def test_the_boundary_line_names_what_the_next_look_needs() -> None:
    """z and exp(-z / sqrt(I)) with I = 60 events at equal shares, 15."""
    needed = life(0.0, 1.0)[1].planned[0].efficacy_z
    assert not isinstance(needed, Absent)
    ratio = math.exp(-needed / math.sqrt(15))
    said = f" At look 3 z {needed:.3f} is needed, a hazard ratio of {ratio:.3f} or less."
    assert said in text(unmasked(0.0, 1.0).glance[3].sentence)
    assert "is needed" not in text(unmasked(0.0, 2.6).glance[3].sentence)


def test_when_the_event_is_good_the_next_look_needs_a_ratio_above_one() -> None:
    good = plan(('event_is = "bad"', 'event_is = "good"'), ("hazard_ratio = 0.5", "hazard_ratio = 2.0"))
    looks = held(good, cutoffs=CUTOFFS[:1])
    said = text(book(looks).sheets[0].glance[3].sentence)
    assert said.endswith("or more.")
    assert float(said.split()[-3]) > 1


def test_an_interval_on_the_strip_is_marked_for_each_arm_that_was_followed() -> None:
    for look in range(1, 5):
        (strip,) = parts(book(held()[:look]).sheets[0], IntervalStrip)
        assert len(strip.marks) == 2


def test_the_z_strip_is_the_gauge_of_this_look() -> None:
    (strip,) = parts(unmasked(0.0, 2.6), ZStrip)
    assert (strip.z and strip.z.text, strip.upper and strip.upper.text, strip.crossed) == (
        "2.600",
        "2.552",
        True,
    )
