"""The Curves sheet: rows that add up, where the axis ends, what the sentence may say, odd samples."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.model.extract import Sample, TimeUnit
from app.model.values import read_only
from app.review import LookDeclared, review_look
from app.sheets.axis import FEWEST_AT_RISK, display_unit, ticks_up_to, time_axis
from app.sheets.blocks import CurvesFigure, Sheet
from app.sheets.curves import MOST_STROKES, curves_sheet, rows_at_ticks
from app.survival import kaplan_meier
from app.views.closed import ClosedView, unmasked_view
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, answers, held, table_texts, text


def sample(
    control: list[tuple[float, bool]], experimental: list[tuple[float, bool]], unit: TimeUnit = "days"
) -> Sample:
    """(time, event) of each subject of each arm, in one stratum."""
    everyone = control + experimental
    return Sample(
        parameter="RELAPSE",
        subject=tuple(map(str, range(len(everyone)))),
        time=read_only([time for time, _ in everyone], np.float64),
        event=read_only([event for _, event in everyone], np.bool_),
        experimental=read_only([False] * len(control) + [True] * len(experimental), np.bool_),
        stratum=read_only(np.zeros(len(everyone)), np.int64),
        stratum_labels=("All subjects",),
        time_unit=unit,
    )


def view(of: Sample) -> ClosedView:
    under = plan()
    return unmasked_view(review_look(under, of, LookDeclared(1, "planned"), ()), under, A_IS_CONTROL)


def sheet(of: Sample) -> Sheet:
    return curves_sheet(view(of))


def figure(of: Sheet) -> CurvesFigure:
    assert isinstance(of.figure, CurvesFigure)
    return of.figure


def many(times: range, event: bool = True) -> list[tuple[float, bool]]:
    return [(float(time), event) for time in times]


# --- rows under the ticks -------------------------------------------------------------------------------


def test_at_each_tick_at_risk_events_and_censored_add_up_to_the_arm() -> None:
    for look in held():
        arms = look.view().arms
        for line, arm in zip(figure(curves_sheet(look.view())).lines, arms, strict=True):
            rows = line.rows
            assert [sum(row) for row in zip(rows.at_risk, rows.events, rows.censored, strict=True)] == [
                arm.counts.subjects
            ] * len(rows.at_risk)


@settings(max_examples=50)
@given(st.lists(st.tuples(st.integers(0, 400), st.booleans()), min_size=1, max_size=60))
def test_a_row_counts_who_is_left_just_before_its_tick(everyone: list[tuple[int, bool]]) -> None:
    """Counted anew, subject by subject."""
    time, event = np.array([t for t, _ in everyone], dtype=float), np.array([e for _, e in everyone])
    curve = kaplan_meier(time, event)
    axis = time_axis((curve,), "days")
    rows = rows_at_ticks(curve, len(everyone), axis)
    for index, tick in enumerate(axis.ticks):
        before = time < tick * 30.4375
        assert rows.at_risk[index] == (~before).sum()
        assert rows.events[index] == (before & event).sum()
        assert rows.censored[index] == (before & ~event).sum()


# --- where the axis ends --------------------------------------------------------------------------------


@pytest.mark.parametrize("unit", ["days", "as given"])
@pytest.mark.parametrize("longest", [1e6, 9e7, 4e9, 1e16, 1e300])
def test_the_axis_has_few_ticks_however_far_the_times_reach(longest: float, unit: TimeUnit) -> None:
    """Times in seconds, or one mistyped: a tick for every 120 months of 1e300 days would never be done."""
    curve = kaplan_meier(np.linspace(longest / 40, longest, 40), np.ones(40, dtype=bool))
    for axis in (time_axis((curve,), unit), time_axis((curve, curve), unit)):
        assert 2 <= len(axis.ticks) <= 9
        assert axis.end <= 2 * longest
    assert len(ticks_up_to(longest, "as given")) <= 8


@settings(max_examples=50)
@given(
    st.lists(st.integers(1, 3000), min_size=25, max_size=80),
    st.lists(st.integers(1, 3000), min_size=25, max_size=80),
)
def test_the_axis_ends_at_the_last_tick_with_twenty_at_risk_in_each_arm(a: list[int], b: list[int]) -> None:
    curves = tuple(kaplan_meier(np.array(times, float), np.ones(len(times), bool)) for times in (a, b))
    axis = time_axis(curves, "days")
    step = axis.ticks[1]

    def fewest_at(tick: float) -> int:
        return min(sum(time >= tick * 30.4375 for time in times) for times in (a, b))

    assert axis.ticks == tuple(step * index for index in range(len(axis.ticks)))
    assert len(axis.ticks) <= 8
    if axis.enough_at_risk:
        assert fewest_at(axis.end) >= FEWEST_AT_RISK
        assert fewest_at(axis.end + step) < FEWEST_AT_RISK
    else:
        assert fewest_at(1.0) < FEWEST_AT_RISK
        assert axis.end * 30.4375 >= max(a + b)
        assert (axis.end - step) * 30.4375 < max(a + b)


def test_the_rule_is_printed_as_it_applied() -> None:
    enough = sheet(sample(many(range(1, 400, 5)), many(range(2, 400, 5))))
    few = sheet(sample(many(range(1, 400, 40)), many(range(2, 400, 5))))
    assert "The axis ends at the last tick with 20 at risk in each arm." in text(enough.notes[0])
    assert "Fewer than 20 in an arm are at risk at the first tick: all follow-up is shown." in text(
        few.notes[0]
    )
    assert figure(few).ticks[-1] == 14.0  # 399 days are 13.1 months, by steps of 2


def test_an_early_end_of_twenty_at_risk_does_not_make_thirty_ticks() -> None:
    """Twenty at risk until day 20 only, one subject followed for three years."""
    crowd = [(20.0, False)] * 30
    shown = figure(sheet(sample([*crowd, (1095.0, False)], crowd)))
    assert len(shown.ticks) <= 8
    assert shown.ticks[-1] == 36.0


# --- what the sentence and the table may say ------------------------------------------------------------


def test_the_sentence_speaks_of_the_last_whole_year_shown() -> None:
    assert answers(curves_sheet(held()[3].view())) == [
        "At 12 months 64.5% on pelletol and 47.8% on syrupine were event-free."
    ]
    assert answers(curves_sheet(held()[3].view(A_IS_CONTROL))) == [
        "At 12 months 47.8% in arm A and 64.5% in arm B were event-free."
    ]


def test_the_sentence_is_the_curve_at_that_time() -> None:
    """By hand: of four subjects one has the event in the first month, so 75% are event-free at month 1."""
    arm = [(10.0, True), (40.0, False), (45.0, False), (50.0, False)]
    other = [(33.0, False)] * 4
    assert answers(sheet(sample(arm, other))) == [
        "At 1 month 100.0% on pelletol and 75.0% on syrupine were event-free."
    ]


def test_no_survival_is_quoted_after_the_last_observation() -> None:
    """Control is followed for 35 days and censored; experimental to 100: the sentence stays at month 1."""
    arm = [(10.0, True), (35.0, False)]
    longer = [(20.0, True), (100.0, False), (95.0, False), (90.0, False)]
    shown = sheet(sample(arm, longer))
    assert answers(shown) == ["At 1 month 75.0% on pelletol and 50.0% on syrupine were event-free."]
    rows = table_texts(shown, "The curves at the ticks")
    assert rows["2"][0] == "75.0"
    assert rows["2"][3] == "not estimable"
    assert rows["4"][0] == "not estimable"


def test_a_curve_that_has_fallen_to_zero_stays_there() -> None:
    """Nobody is left, and everybody's event is known."""
    shown = sheet(sample([(10.0, True), (35.0, True)], [(20.0, True), (100.0, False)]))
    assert table_texts(shown, "The curves at the ticks")["2"][3] == "0.0"


def test_a_median_that_is_not_reached_is_said_in_words() -> None:
    rows = table_texts(sheet(sample(many(range(1, 61), False), many(range(1, 61)))), "Estimates")
    assert rows["Median, months"][1] == "not reached"
    assert rows["Median, months"][0] == "1.0"  # 30.5 days


def test_intervals_carry_their_level_and_their_scale() -> None:
    under = replace(plan(), analysis=replace(plan().analysis, confidence=0.975))
    look = review_look(under, patients().at(CUTOFFS[1]).sample(), LookDeclared(1, "planned"), ())
    shown = curves_sheet(unmasked_view(look, under, A_IS_CONTROL))
    assert text(shown.tables[0].caption) == "Estimates with 97.5% intervals"
    assert "97.5% interval, not adjusted for looks" in table_texts(shown, "Hazard ratio")
    assert text(shown.notes[0]).startswith("Bands and intervals: log-log, pointwise.")


# --- small and odd samples ------------------------------------------------------------------------------

ODD = {
    "one subject an arm, events": ([(5.0, True)], [(7.0, True)]),
    "one subject an arm, censored": ([(5.0, False)], [(7.0, False)]),
    "all censored": (many(range(1, 90), False), many(range(1, 90), False)),
    "all at one time": ([(30.0, True)] * 5, [(30.0, True)] * 5),
    "all at time 0": ([(0.0, False)] * 3, [(0.0, True)] * 3),
    "one arm with few": ([(100.0, True)], many(range(1, 200))),
    "one arm without events": (many(range(1, 100)), many(range(1, 100), False)),
}


@pytest.mark.parametrize("odd", ODD)
@pytest.mark.parametrize("unit", ["days", "weeks", "months", "years", "as given"])
def test_odd_samples_give_a_sheet_without_nan(odd: str, unit: TimeUnit) -> None:
    shown = sheet(sample(*ODD[odd], unit))
    assert "nan" not in repr(shown)
    assert figure(shown).ticks[0] == 0.0
    assert len(figure(shown).ticks) >= 2
    assert [line.time[0] for line in figure(shown).lines] == [0.0, 0.0]


def test_all_censored_is_a_hundred_percent_without_interval_and_without_ratio() -> None:
    shown = sheet(sample(*ODD["all censored"]))
    assert answers(shown)[0].endswith("100.0% on pelletol and 100.0% on syrupine were event-free.")
    assert table_texts(shown, "Hazard ratio") == {"95% interval, not adjusted for looks": ["not estimable"]}


# --- units ----------------------------------------------------------------------------------------------


def test_days_are_shown_as_months_and_other_units_as_given() -> None:
    assert display_unit("days") == ("months", 30.4375)
    assert display_unit("weeks") == ("weeks", 1.0)
    assert display_unit("as given") == ("time units", 1.0)
    weeks = sheet(sample(many(range(1, 60)), many(range(1, 60)), "weeks"))
    assert figure(weeks).x_title == "Weeks since randomisation"
    assert "30.4375" not in text(weeks.notes[0])
    assert answers(weeks) == ["At 40 weeks 32.2% on pelletol and 32.2% on syrupine were event-free."]
    as_given = sheet(sample(many(range(1, 60)), many(range(1, 60)), "as given"))
    assert answers(as_given)[0].startswith("At 40 time units ")


def test_months_say_once_what_a_month_is() -> None:
    note = text(curves_sheet(held()[0].view()).notes[0])
    assert note.count("A month is 30.4375 days.") == 1


# --- strokes --------------------------------------------------------------------------------------------


def test_too_many_strokes_are_left_out_and_the_note_says_so() -> None:
    crowd = many(range(1, 2 * MOST_STROKES, 1), False)
    shown = sheet(sample(crowd, many(range(1, 600))))
    assert figure(shown).lines[1].censored_at == ()
    assert f"Censorings at more than {MOST_STROKES} times: not drawn." in text(shown.notes[0])


def test_strokes_beyond_the_axis_do_not_count() -> None:
    """300 censoring times, most of them where the axis has ended."""
    late = many(range(1, 301), False)
    shown = sheet(sample(late, many(range(1, 121))))
    assert len(figure(shown).lines[1].censored_at) < MOST_STROKES
    assert figure(shown).lines[1].censored_at != ()
    assert "Strokes: censored." in text(shown.notes[0])
