"""The frame around every sheet: the three dates, the spine, what the two sides may see on it."""

from __future__ import annotations

from datetime import date

from app.sheets.blocks import SpineLook
from app.sheets.frame import LookOnFile, Surroundings, closed_frame, spine, three_dates
from tests.unit.review.invented_trial import CUTOFFS, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, TWO_SIDED, book, held, surroundings

PLANNED = (0.07, 0.5, 1.0)


def on_file(number: int, fraction: float, planned: float | None, kind: str = "planned") -> LookOnFile:
    return LookOnFile(number, kind, fraction, round(fraction * 100), "open", planned)  # type: ignore[arg-type]


def around(*looks: LookOnFile) -> Surroundings:
    return Surroundings(looks, PLANNED, 100, 1, date(2027, 1, 1))


def still_planned(*looks: LookOnFile) -> list[tuple[int, float, int, str]]:
    shown = spine(around(*looks), 1, {}, {}).looks
    return [(look.number, look.fraction, look.events, look.kind) for look in shown if look.state == "planned"]


# --- dates ----------------------------------------------------------------------------------------------


def test_three_dates_with_the_days_between_them() -> None:
    marks = three_dates(date(2026, 12, 20), date(2027, 1, 3), date(2027, 1, 10))
    assert [(mark.name, mark.text.replace("\u00a0", " "), mark.days_since_previous) for mark in marks] == [
        ("Data cutoff", "20 Dec 2026", None),
        ("Extract", "3 Jan 2027", 14),
        ("Run", "10 Jan 2027", 7),
    ]
    assert [mark.iso for mark in marks] == ["2026-12-20", "2027-01-03", "2027-01-10"]


def test_a_date_that_was_not_stated_is_said_so_and_days_are_counted_over_it() -> None:
    marks = three_dates(date(2026, 12, 20), None, date(2027, 1, 10))
    assert [(mark.text.replace("\u00a0", " "), mark.days_since_previous) for mark in marks] == [
        ("20 Dec 2026", None),
        ("not stated", None),
        ("10 Jan 2027", 21),
    ]


# --- the spine ------------------------------------------------------------------------------------------


def test_looks_to_come_are_those_that_nobody_has_used_up_beyond_the_information_reached() -> None:
    assert still_planned(on_file(1, 0.1, 0.07)) == [(2, 0.5, 50, "planned"), (3, 1.0, 100, "final")]
    assert still_planned(on_file(1, 0.6, None, "unplanned")) == [(2, 1.0, 100, "final")]
    assert still_planned(on_file(1, 0.02, None, "safety"))[0] == (2, 0.07, 7, "planned")


def test_events_of_a_look_to_come_are_those_of_its_bound() -> None:
    """Seven of a hundred at 0.07, as `boundary` counts them, and not the eight of a careless ceiling."""
    assert still_planned(on_file(1, 0.01, None, "safety"))[0][2] == 7


def test_after_a_final_look_nothing_is_still_to_come() -> None:
    assert still_planned(on_file(1, 0.8, 1.0, "final")) == []
    assert still_planned(on_file(1, 1.2, 0.07)) == []


def crossings(letters: object = None, *, sides: int = 1) -> list[str]:
    looks = held(plan(*([TWO_SIDED] if sides == 2 else [])))
    view = looks[3].view(letters)  # type: ignore[arg-type]
    shown = closed_frame(view, surroundings(looks), ()).spine.looks
    return [look.crossed for look in shown if isinstance(look, SpineLook)]


def test_the_look_that_crossed_is_marked_in_either_view() -> None:
    assert crossings() == ["none", "none", "efficacy", "none"]
    assert crossings(A_IS_CONTROL) == ["none", "none", "efficacy", "none"]


def test_a_look_shown_after_others_came_in_marks_nothing_of_theirs() -> None:
    """The second look, opened when the third has crossed: what crossed later is not on its page."""
    looks = held()
    shown = closed_frame(looks[1].view(), surroundings(looks), ()).spine.looks
    assert [look.crossed for look in shown] == ["none"] * 4
    assert [look.shown for look in shown] == [False, True, False, False]


def test_every_page_names_look_kind_state_and_plan_version() -> None:
    frame = book(held(cutoffs=CUTOFFS[:1])).frame
    assert frame.colophon == ("Look 1, planned, open", "Plan version 1")
    assert (frame.side, frame.disclosure) == ("closed", "unmasked")
    assert [key for key, _, _ in frame.sheets] == [
        "glance",
        "data",
        "information",
        "curves",
        "boundary",
        "shape",
        "outlook",
        "record",
    ]
