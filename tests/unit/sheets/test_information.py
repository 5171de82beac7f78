"""The Information sheet: denominators, person-time, the variance ratio and its doubt, the calendar."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.model.values import Absent
from app.sheets.blocks import CalendarFigure, Sheet
from app.sheets.information import (
    information_sentence,
    information_sheet,
    person_time,
    person_time_name,
    plan_fraction,
)
from app.views.closed import ClosedView
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, answers, held, table_texts, text


@pytest.fixture(scope="module")
def second() -> ClosedView:
    return held(cutoffs=CUTOFFS[:2])[1].view()


def shown(view: ClosedView) -> Sheet:
    return information_sheet(view, 0.5)


def test_the_answer_counts_events_against_the_plan(second: ClosedView) -> None:
    assert answers(shown(second)) == ["52 of 80 planned events: information fraction 0.650, planned 0.50."]
    assert answers(information_sheet(second, None)) == [
        "52 of 80 planned events: information fraction 0.650."
    ]


def test_a_planned_fraction_is_read_as_the_plan_writes_it() -> None:
    assert [plan_fraction(value).text for value in (0.5, 0.75, 0.125, 1.0)] == ["0.50", "0.75", "0.125", "1"]


def test_events_stand_beside_their_subjects_by_arm_and_stratum(second: ClosedView) -> None:
    """Counted from the patients themselves."""
    seen = patients().at(CUTOFFS[1])
    arm = [seen.experimental, ~seen.experimental]
    by_arm = [f"{int((seen.event & each).sum())} of {int(each.sum())}" for each in arm]
    assert table_texts(shown(second), "By arm")["Events of subjects"] == by_arm
    for index, label in enumerate(("North", "South")):
        here = seen.region == index
        cells = [f"{int((seen.event & each & here).sum())} of {int((each & here).sum())}" for each in arm]
        whole = f"{int((seen.event & here).sum())} of {int(here.sum())}"
        assert table_texts(shown(second), "Events of subjects, by stratum")[label] == [*cells, whole]


def test_person_time_is_the_sum_of_the_days_in_years(second: ClosedView) -> None:
    seen = patients().at(CUTOFFS[1])
    years = [seen.time[each].sum() / 365.25 for each in (seen.experimental, ~seen.experimental)]
    assert table_texts(shown(second), "By arm")["Person-years"] == [f"{value:.1f}" for value in years]


def test_person_time_in_another_unit_keeps_it() -> None:
    assert (person_time(1461.0, "days").text, person_time(1461.0, "weeks").text) == ("4.0", "1461.0")
    assert [person_time_name(unit) for unit in ("days", "weeks", "months", "years", "as given")] == [
        "Person-years",
        "Person-weeks",
        "Person-months",
        "Person-years",
        "Person-time",
    ]


def test_the_variance_is_shown_over_events_and_shares(second: ClosedView) -> None:
    """V / (d p q) with equal shares is 4 V / d."""
    variance = second.look.information.score_variance
    assert not isinstance(variance, Absent)
    rows = table_texts(shown(second), "Both arms")
    assert rows["Log-rank variance"] == [f"{variance:.2f}"]
    assert rows["over events × shares"] == [f"{4 * variance / 52:.3f}"]
    assert rows["Subjects of planned"] == ["160 of 160"]


@pytest.mark.parametrize(
    ("ratio", "said"), [(0.8999, "0.900, doubt"), (0.9, "0.900"), (0.85, "0.850, doubt")]
)
def test_below_nine_tenths_the_variance_ratio_is_a_doubt(second: ClosedView, ratio: float, said: str) -> None:
    information = replace(second.look.information, variance_ratio=ratio)
    sheet = shown(replace(second, look=replace(second.look, information=information)))
    assert table_texts(sheet, "Both arms")["over events × shares"] == [said]
    notes = " ".join(text(note) for note in sheet.notes)
    assert ("events overstate the information" in notes) == said.endswith("doubt")


def test_without_planned_subjects_no_denominator_is_made_up() -> None:
    view = held(plan(("[enrolment]\nplanned_subjects = 160", "")), cutoffs=CUTOFFS[:1])[0].view()
    assert "Subjects of planned" not in table_texts(shown(view), "Both arms")


def test_the_calendar_grows_to_all_subjects_and_all_events(second: ClosedView) -> None:
    figure = shown(second).figure
    assert isinstance(figure, CalendarFigure)
    assert [series.count[-1] for series in figure.series] == [160, 52]
    assert all(list(series.count) == sorted(series.count) for series in figure.series)
    assert [day for day, _ in figure.marks] == [second.look.cutoff_day]
    assert figure.planned is not None
    assert figure.planned[0] == 80.0


def test_an_extract_without_dates_has_no_calendar(second: ClosedView) -> None:
    sheet = shown(replace(second, look=replace(second.look, calendar=None)))
    assert sheet.figure is None
    assert sheet.figure_table is None


def test_masked_follow_up_and_counts_are_by_letter() -> None:
    sheet = shown(held(cutoffs=CUTOFFS[:2])[1].view(A_IS_CONTROL))
    (table,) = [each for each in sheet.tables if text(each.caption) == "By arm"]
    assert [text(column.head) for column in table.columns] == ["Arm A", "Arm B"]


def test_information_counted_in_score_variance_is_said_so() -> None:
    said = information_sentence(384, 538, 0.7, 0.75, by="score variance")
    assert text(said) == (
        "384 of 538 planned events: information fraction 0.700 by score variance, planned 0.75."
    )
