"""The Shape sheet and its record: what the plan asks for, from either side, and words for missing numbers."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from app.model.values import Absent
from app.record.schema import LOOKS_RECORD, differences
from app.render.plotly_figures import plotly_figure
from app.sheets.axis import ticks_up_to
from app.sheets.blocks import LogLogFigure, ResidualFigure, Sheet, Span
from app.sheets.curves import curves_sheet
from app.sheets.shape import shape_sheet
from app.sheets.words import DESCRIPTIVE
from app.views.closed import ClosedView, Letters
from app.views.record import look_record, looks_record
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import (
    A_IS_CONTROL,
    A_IS_EXPERIMENTAL,
    Held,
    answers,
    held,
    parts,
    table_texts,
    text,
)

ASKED = (
    "[design]",
    "[analysis]\nrestricted_mean_at = 300\nlandmarks_at = [180, 360, 4000]\n"
    "weights = [[0, 0], [0, 1], [1, 1]]\n[design]",
)


@pytest.fixture(scope="module")
def look() -> Held:
    return held(plan(ASKED), cutoffs=CUTOFFS[-1:])[-1]


def numbers(value: Any) -> Iterator[float]:
    if isinstance(value, dict | list):
        for item in value.values() if isinstance(value, dict) else value:
            yield from numbers(item)
    elif isinstance(value, int | float) and not isinstance(value, bool):
        yield float(value)


def test_the_record_carries_every_name_of_the_design(look: Held) -> None:
    record = look_record(look.view())
    assert record["proportionality"].keys() == {"chi_square", "p", "transform"}
    assert record["restricted_mean"]["at"] == 300
    assert [(test["rho"], test["gamma"]) for test in record["weighted"]] == [(0, 0), (0, 1), (1, 1)]
    assert record["weighted"][0]["z"] == pytest.approx(record["logrank"]["z"], rel=1e-9)
    assert abs(record["weighted_maximum"]["z"]) == max(abs(test["z"]) for test in record["weighted"])
    assert [landmark["at"] for landmark in record["landmarks"]] == [180, 360, 4000]
    assert "nobody is followed to time 4000" in record["landmarks"][2]["difference"]["not_estimable"]
    whole = looks_record("look", [look.view()], run_at="2026-01-01T00:00:00Z")
    assert list(differences(whole, LOOKS_RECORD)) == []


def test_what_the_plan_does_not_ask_for_is_null_and_has_no_table() -> None:
    plain = held(cutoffs=CUTOFFS[-1:])[-1]
    record = look_record(plain.view())
    for name in ("restricted_mean", "weighted", "weighted_maximum", "landmarks"):
        assert record[name] is None
    assert isinstance(record["proportionality"]["p"], float)
    sheet = shape_sheet(plain.view())
    assert [text(table.caption) for table in (*sheet.tables, *sheet.folded)] == [
        f"Proportional hazards, {DESCRIPTIVE}"
    ]


def test_each_table_is_said_to_be_descriptive_and_each_number_is_in_the_record(look: Held) -> None:
    view = look.view()
    sheet, known = shape_sheet(view), set(numbers(look_record(view)))
    tables = (*sheet.tables, *sheet.folded)
    assert len(tables) == 3
    assert all(text(table.caption).endswith(DESCRIPTIVE) for table in tables)
    shown = [span.value for span in parts(sheet, Span) if span.value is not None]
    assert shown
    assert [value for value in shown if value not in known] == []


def test_the_sentence_states_the_low_power(look: Held) -> None:
    (said,) = answers(shape_sheet(look.view()))
    events = look.result.information.events
    assert said.startswith(
        ("No change of the hazard ratio with time is seen: p ", "The hazard ratio seems to")
    )
    assert f"from {events} events." in said


def with_p(view: ClosedView, p: float) -> Sheet:
    test = view.shape.proportionality
    assert not isinstance(test, Absent)
    return shape_sheet(replace(view, shape=replace(view.shape, proportionality=replace(test, p=p))))


def test_a_small_p_is_said_as_a_change_and_a_large_one_with_its_power(look: Held) -> None:
    assert answers(with_p(look.view(), 0.012))[0].startswith(
        "The hazard ratio seems to change with time: p 0.012"
    )
    assert answers(with_p(look.view(), 0.4))[0].endswith("events. Such a test has little power.")


def test_what_cannot_be_estimated_is_a_word(look: Held) -> None:
    none = Absent("no event was observed")
    view = look.view()
    shape = replace(
        view.shape,
        proportionality=none,
        restricted_mean=none,
        weighted=(none, none, none),
        weighted_maximum=none,
    )
    sheet = shape_sheet(replace(view, shape=shape))
    assert answers(sheet) == ["Whether the hazard ratio changes with time cannot be tested here."]
    words = [cell for table in (*sheet.tables, *sheet.folded) for row in table.rows for cell in row.cells]
    assert {text(cell.line) for cell in words} == {"not estimable"}


def test_masked_it_is_of_a_against_b_whichever_arm_that_is(look: Held) -> None:
    one, other = look_record(look.view(A_IS_EXPERIMENTAL)), look_record(look.view(A_IS_CONTROL))
    assert other["restricted_mean"]["difference"] == pytest.approx(-one["restricted_mean"]["difference"])
    assert other["weighted_maximum"]["z"] == pytest.approx(-one["weighted_maximum"]["z"])
    assert other["proportionality"]["chi_square"] == pytest.approx(
        one["proportionality"]["chi_square"], rel=1e-9
    )
    for record in (one, other):
        assert [arm["arm"] for arm in record["restricted_mean"]["arms"]] == ["A", "B"]
        means = [arm["mean"] for arm in record["restricted_mean"]["arms"]]
        assert record["restricted_mean"]["difference"] == pytest.approx(means[0] - means[1])
        shares = [arm["survival"] for arm in record["landmarks"][0]["arms"]]
        assert record["landmarks"][0]["difference"] == pytest.approx(shares[0] - shares[1])


def test_the_curves_sheet_shows_the_differences_at_the_landmarks(look: Held) -> None:
    sheet = curves_sheet(look.view())
    rows = table_texts(sheet, "Difference in event-free")
    assert list(rows) == ["At 5.9 months", "At 11.8 months", "At 131 months"] or len(rows) == 3
    assert list(rows.values())[2] == ["not estimable"]
    assert "Landmarks" in [method.term for method in sheet.methods]


def test_the_figure_draws_each_curve_where_it_has_a_place(look: Held) -> None:
    figure = shape_sheet(look.view()).figure
    assert isinstance(figure, LogLogFigure)
    for line, arm in zip(figure.lines, look.view().arms, strict=True):
        curve = arm.curve
        drawn = (curve.events > 0) & (curve.survival < 1) & (curve.survival > 0)
        assert len(line.log_time) == int(drawn.sum())
        first = float(curve.survival[drawn][0])
        assert line.log_minus_log[0] == pytest.approx(math.log(-math.log(first)))
    lows, highs = figure.y_ticks[0][0], figure.y_ticks[-1][0]
    assert lows <= min(min(line.log_minus_log) for line in figure.lines)
    assert highs >= max(max(line.log_minus_log) for line in figure.lines)
    zoomed = plotly_figure(figure)
    assert zoomed is not None
    assert {"wide", "narrow"} == zoomed.keys()


def test_without_log_log_curves_the_other_figure_stands_alone(look: Held) -> None:
    view = look.view()
    curve = view.of.curve
    bare = replace(view.of, curve=replace(curve, events=curve.events * 0))
    sheet = shape_sheet(replace(view, arms=(bare, view.against)))
    assert isinstance(sheet.figure, ResidualFigure)
    assert sheet.second_figure is None


# --- the hazard ratio over time -----------------------------------------------------------------------------


def drawn(view: ClosedView) -> ResidualFigure:
    figure = shape_sheet(view).second_figure
    assert isinstance(figure, ResidualFigure)
    return figure


@pytest.mark.parametrize("letters", [None, A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_every_mark_and_every_place_of_the_smooth_is_in_the_record(
    look: Held, letters: Letters | None
) -> None:
    view = look.view(letters)
    record, figure = look_record(view)["residuals"], drawn(view)
    smooth = record["smooth"]
    assert len(figure.points) == look.result.information.events
    assert [height for _, height in figure.points] == record["log_hazard_ratio"]
    assert [place.log_ratio for place in figure.smooth] == smooth["log_hazard_ratio"]
    months = [time / 30.4375 for time in record["time"]]
    assert [time for time, _ in figure.points] == pytest.approx(months, rel=1e-12)
    limits = [(math.exp(place.low), math.exp(place.high)) for place in figure.smooth]
    assert [low for low, _ in limits] == pytest.approx(smooth["ci_low"], rel=1e-12)
    assert [high for _, high in limits] == pytest.approx(smooth["ci_high"], rel=1e-12)
    assert figure.constant == look_record(view)["cox"]["log_hazard_ratio"]
    assert figure.constant_words.value == look_record(view)["cox"]["hazard_ratio"]
    assert (record["transform"], smooth["level"], smooth["events"][-1]) == ("km", 0.95, len(figure.points))


def test_the_residuals_average_to_the_one_ratio(look: Held) -> None:
    """Grambsch and Therneau (1994): they are the estimate plus scaled score residuals, whose sum is 0."""
    record = look_record(look.view())
    found = record["residuals"]["log_hazard_ratio"]
    assert sum(found) / len(found) == pytest.approx(record["cox"]["log_hazard_ratio"], abs=1e-8)


def test_seen_from_the_other_arm_every_mark_is_turned(look: Held) -> None:
    """Turned are heights and directions; the times are those of the events whichever arm is which."""
    one, other = (drawn(look.view(letters)) for letters in (A_IS_EXPERIMENTAL, A_IS_CONTROL))
    assert [time for time, _ in other.points] == [time for time, _ in one.points]
    turned = [place.log_ratio for place in other.smooth]
    assert turned == pytest.approx([-place.log_ratio for place in one.smooth], abs=1e-8)
    assert other.constant == pytest.approx(-one.constant, abs=1e-8)
    heights = sorted(height for _, height in other.points)
    assert heights == pytest.approx(sorted(-height for _, height in one.points), abs=1e-8)
    for figure in (one, other):
        assert figure.title.startswith("Hazard ratio over time, arm\u00a0A against arm\u00a0B")
        assert (figure.favours_up, figure.favours_down) == ("favours arm\u00a0B", "favours arm\u00a0A")


def test_what_a_ratio_above_1_favours_turns_with_what_an_event_is(look: Held) -> None:
    assert (drawn(look.view()).favours_up, drawn(look.view()).favours_down) == (
        "favours syrupine",
        "favours pelletol",
    )
    good = plan(('event_is = "bad"', 'event_is = "good"'), ("hazard_ratio = 0.5", "hazard_ratio = 2.0"))
    view = held(good, cutoffs=CUTOFFS[-1:])[-1].view()
    assert (drawn(view).favours_up, drawn(view).favours_down) == ("favours pelletol", "favours syrupine")


def test_the_smooth_is_said_at_a_few_times_with_the_events_up_to_each(look: Held) -> None:
    view = look.view()
    record = look_record(view)["residuals"]["smooth"]
    table = shape_sheet(view).second_figure_table
    assert table is not None
    assert text(table.caption) == (
        f"Smoothed hazard ratio, pelletol against syrupine, pointwise 95% limits, {DESCRIPTIVE}"
    )
    assert len(table.rows) == 5
    shown = [[span.value for span in parts(row, Span)] for row in table.rows]
    names = ("time", "events", "hazard_ratio", "ci_low", "ci_high")
    recorded = list(zip(*(record[name] for name in names), strict=True))
    found = [tuple(value for value in row if value is not None) for row in shown]
    assert set(found) <= set(recorded)
    assert (found[0], found[-1]) == (recorded[0], recorded[-1])


def test_the_axes_of_the_ratio_reach_from_the_first_day_to_the_last_event(look: Held) -> None:
    figure = drawn(look.view())
    last = max(time for time, _ in figure.points)
    assert figure.x_ticks[0] == (0.0, "0")
    assert all(0 <= at <= last for at, _ in figure.x_ticks)
    assert (0.0, "1") in figure.y_ticks
    assert all(math.exp(at) == pytest.approx(float(words)) for at, words in figure.y_ticks)
    heights = [height for _, height in figure.points]
    limits = [end for place in figure.smooth for end in (place.low, place.high)]
    assert all(min(*heights, *limits) <= at <= max(*heights, *limits) for at, _ in figure.y_ticks)


def test_few_events_leave_words_where_the_figure_would_be(look: Held) -> None:
    none = Absent("a smooth curve needs events spread over 5 times or more")
    view = look.view()
    view = replace(view, shape=replace(view.shape, ratio_over_time=none))
    sheet = shape_sheet(view)
    assert isinstance(sheet.figure, LogLogFigure)
    assert (sheet.second_figure, sheet.second_figure_table) == (None, None)
    assert f"The hazard ratio over time is not drawn: {none.reason}." in text(sheet.notes[0])
    assert look_record(view)["residuals"]["smooth"] == {"not_estimable": none.reason}


def test_an_arm_without_events_leaves_words_and_names_it_by_its_letter() -> None:
    people = patients()
    unhurt = replace(people, time=np.where(people.experimental, 1e6, people.time))
    look = held(people=unhurt, cutoffs=CUTOFFS[-1:])[-1]
    for letters in (None, A_IS_CONTROL):
        view = look.view(letters)
        sheet, record = shape_sheet(view), look_record(view)["residuals"]
        assert sheet.figures == ()
        assert f"The hazard ratio over time is not drawn: {record['not_estimable']}." in text(sheet.notes[0])
        arm = "the control arm" if letters is None else "arm A"
        assert record["not_estimable"].startswith(
            f"no finite estimate: every event with both arms at risk was in {arm}"
        )


def test_a_short_trial_has_its_last_event_for_a_tick() -> None:
    assert ticks_up_to(0.4, "months") == (0.0, 0.4)
    assert ticks_up_to(13.2, "months") == (0, 2, 4, 6, 8, 10, 12)
    assert ticks_up_to(12.0, "months") == (0, 2, 4, 6, 8, 10, 12)
