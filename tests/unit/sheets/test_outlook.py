"""The Outlook sheet, and futility and harm on the Boundary sheet, masked and unmasked."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.model.plan import Plan
from app.review import LookDeclared, as_used, review_look
from app.sheets.blocks import BoundaryFigure, Chance, ChancesFigure, Lane, Sheet
from app.sheets.boundary import boundary_sheet
from app.sheets.outlook import outlook_sheet
from app.views.closed import full_view, masked_view, unmasked_view
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import (
    A_IS_CONTROL,
    A_IS_EXPERIMENTAL,
    answers,
    life,
    table_texts,
    text,
    with_z,
)

SPENDING_LINE = 'spending = "O\'Brien-Fleming-type"\n'
BELOW = """\
[futility]
spending = "Hwang-Shih-DeCani"
parameter = -3
[harm]
spending = "Pocock-type"
alpha = 0.025
"""
PRIOR = "prior_hazard_ratio = 0.8\nprior_std_error = 0.3\n"


def under(prior: bool = False) -> Plan:
    analysis = f"[analysis]\n{PRIOR}" if prior else ""
    return plan((SPENDING_LINE, f"{SPENDING_LINE}{BELOW}{analysis}"))


def outlook_of(*zs: float, masked: bool = False) -> Sheet:
    look, view = life(*zs)[-1], masked_view if masked else unmasked_view
    return outlook_sheet(view(look, plan(), A_IS_CONTROL))


def seen(z: float, of: Plan, sheet: object, masked: bool = False, letters: object = A_IS_CONTROL) -> Sheet:
    """A sheet of the first look with this z, under a plan with futility and harm."""
    look = review_look(of, patients().at(CUTOFFS[0]).sample(), LookDeclared(1, "planned"), ())
    view = masked_view if masked else unmasked_view
    return sheet(view(with_z(look, z), of, letters))  # type: ignore[operator, arg-type, no-any-return]


def lane_now(sheet: Sheet) -> Lane:
    assert isinstance(sheet.figure, BoundaryFigure)
    return next(lane for lane in sheet.figure.lanes if lane.state == "now")


def captions(sheet: Sheet) -> list[str]:
    return [text(table.caption) for table in (*sheet.tables, *sheet.wide_tables, *sheet.folded)]


def test_the_answer_gives_the_chance_under_the_plan_s_effect_and_the_trend() -> None:
    (answer,) = answers(outlook_of(0.0))
    assert answer.startswith("The chance of crossing at a look to come is ")
    assert answer.endswith("% under the trend.")


def test_masked_the_answer_has_a_line_for_each_reading() -> None:
    first, second = answers(outlook_of(0.0, masked=True))
    assert first.startswith("If A is experimental: ")
    assert second.startswith("If B is experimental: ")


def test_each_effect_has_its_row_and_each_conditional_power_its_column() -> None:
    (table,) = outlook_of(0.0).wide_tables
    assert [text(row.head) for row in table.rows] == [
        "The plan’s ratio",
        "The trend so far",
        "less favourable",
        "more favourable",
        "No effect",
    ]
    assert [text(column.head) for column in table.columns] == [
        "hazard ratio",
        "final look only",
        "along the looks",
    ]
    obeyed = seen(0.0, under(), outlook_sheet).wide_tables[0]
    assert text(obeyed.columns[-1].head) == "futility obeyed"


def chances(sheet: Sheet) -> tuple[Chance, ...]:
    assert isinstance(sheet.figure, ChancesFigure)
    return sheet.figure.chances


def test_the_figure_has_a_strip_for_each_effect_with_the_trend_s_limits_about_it() -> None:
    design, trend, null = chances(outlook_of(0.0))
    assert [each.effect for each in (design, trend, null)] == [
        "The plan’s ratio",
        "The trend so far",
        "No effect",
    ]
    assert trend.low is not None
    assert trend.high is not None
    assert trend.low.value < trend.percent.value < trend.high.value  # type: ignore[operator]
    assert design.low is None
    assert null.high is None


def test_masked_both_readings_of_an_effect_stand_together() -> None:
    shown = chances(outlook_of(0.5, masked=True))
    assert [each.reading for each in shown] == ["if A", "if B"] * 3
    assert [each.effect for each in shown[:2]] == ["The plan’s ratio"] * 2


def test_the_figure_as_a_table_says_the_same_numbers() -> None:
    sheet = outlook_of(0.5, masked=True)
    rows = table_texts(sheet, "Conditional power along")
    assert list(rows)[:2] == ["The plan’s ratio, if A", "The plan’s ratio, if B"]
    first = next(each for each in chances(sheet) if each.low is not None)
    assert first.low is not None
    assert first.high is not None
    assert rows["The trend so far, if A"] == [first.percent.text, first.low.text, first.high.text]


def test_the_next_look_says_what_the_new_events_alone_must_show() -> None:
    found = captions(outlook_of(0.0))
    assert found[0].startswith("Needed at look 2, if held at ")
    assert "Predictive power at the final look, percent" in found


def test_a_prior_of_the_plan_has_its_predictive_power() -> None:
    (table,) = [
        table
        for table in seen(0.0, under(prior=True), outlook_sheet).tables
        if text(table.caption).startswith("Predictive power")
    ]
    assert [text(row.head) for row in table.rows] == ["Flat prior", "The plan’s prior"]


def test_at_the_last_look_nothing_is_to_come_and_the_end_is_told() -> None:
    sheet = outlook_of(0.0, 0.5, 1.0)
    assert answers(sheet) == ["No planned look is to come."]
    assert captions(sheet) == ["As if stopped here"]
    assert sheet.figure is None


def test_a_crossing_ends_the_outlook_and_tells_the_end_adjusted_for_looks() -> None:
    sheet = outlook_of(0.0, 2.6)
    assert answers(sheet) == ["The boundary was crossed at look 2: no later test."]
    heads = [text(row.head) for row in sheet.tables[0].rows]
    assert heads[:3] == ["p, one-sided", "Median-unbiased ratio", "95% interval"]


def test_masked_the_end_of_one_reading_stands_behind_a_fold_while_the_other_goes_on() -> None:
    sheet = outlook_of(0.0, 2.6, masked=True)
    assert [text(table.caption) for table in sheet.folded] == ["As if stopped here, if B is experimental"]
    assert len(sheet.wide_tables) == 1


def test_after_a_crossing_of_harm_the_trial_may_go_on_and_its_end_stands_behind_a_fold() -> None:
    sheet = seen(-3.0, under(), outlook_sheet)
    assert [text(table.caption) for table in sheet.folded] == ["As if stopped here"]
    assert len(sheet.wide_tables) == 1


@pytest.mark.parametrize(
    ("z", "said"),
    [
        (-0.8, "The futility boundary was crossed: z −0.800 against −0.2"),
        (-3.0, "The harm boundary was crossed: z −3.000 against −2.2"),
    ],
)
def test_a_crossing_below_is_said_with_its_bound(z: float, said: str) -> None:
    (answer,) = answers(seen(z, under(), boundary_sheet))
    assert answer.startswith(said)
    assert answer.endswith("; it does not bind." if z > -1 else ".")


def test_a_boundary_that_is_not_crossed_below_is_said_as_before() -> None:
    (answer,) = answers(seen(0.5, under(), boundary_sheet))
    assert answer.startswith("The efficacy boundary was not crossed: z 0.500 against ")


def test_the_figure_draws_futility_and_harm_and_names_both_in_its_rows() -> None:
    sheet = seen(0.5, under(), boundary_sheet)
    lane = lane_now(sheet)
    assert lane.futility is not None
    assert lane.harm is not None
    assert isinstance(sheet.figure, BoundaryFigure)
    assert {"Futility bound", "Harm bound"} <= {text(row.head) for row in sheet.figure.rows}
    last = next(lane for lane in sheet.figure.lanes if lane.final)
    assert last.futility is None
    assert "Hatched: futility, not binding." in text(sheet.notes[0])


def test_the_note_says_what_grey_is_where_there_is_harm() -> None:
    (unmasked,) = seen(0.5, under(), boundary_sheet).notes
    (masked,) = seen(0.5, under(), boundary_sheet, masked=True).notes
    assert "Grey: beyond efficacy; below, harm." in text(unmasked)
    assert (
        "Left lanes: if A is experimental; right: if B. Grey: beyond efficacy; at the other end, harm."
        in text(masked)
    )


def test_a_look_held_that_crossed_below_in_any_reading_is_marked_so() -> None:
    of = under()
    first = review_look(of, patients().at(CUTOFFS[0]).sample(), LookDeclared(1, "planned"), ())
    for z in (3.0, -3.0):  # masked, one of the readings has crossed harm
        turned = with_z(first, z)
        past = [as_used(replace(turned, verdict=full_view(turned, of).readings[0].verdict))]
        second = review_look(of, patients().at(CUTOFFS[1]).sample(), LookDeclared(2, "planned"), past)
        for letters in (A_IS_CONTROL, A_IS_EXPERIMENTAL):
            figure = boundary_sheet(masked_view(second, of, letters)).figure
            assert isinstance(figure, BoundaryFigure)
            assert figure.lanes[0].crossed


@pytest.mark.parametrize("letters", [A_IS_CONTROL, A_IS_EXPERIMENTAL])
def test_masked_each_reading_says_what_it_crosses(letters: object) -> None:
    shown = answers(seen(3.0, under(), boundary_sheet, masked=True, letters=letters))
    below = [answer for answer in shown if "harm bound" in answer]
    assert len(below) == 1
    assert below[0].endswith("crossed.")
    letter = "B" if letters is A_IS_EXPERIMENTAL else "A"
    assert below[0].startswith(f"If {letter} is experimental")


def test_looks_under_futility_leave_their_bounds_to_the_looks_after() -> None:
    of = under()
    first = review_look(of, patients().at(CUTOFFS[0]).sample(), LookDeclared(1, "planned"), ())
    second = review_look(of, patients().at(CUTOFFS[1]).sample(), LookDeclared(2, "planned"), [as_used(first)])
    assert second.past[0].futility_z == first.bound.futility_z
    assert second.past[0].harm_z == first.bound.harm_z
    figure = boundary_sheet(unmasked_view(second, of, A_IS_CONTROL)).figure
    assert isinstance(figure, BoundaryFigure)
    assert figure.lanes[0].futility is not None
