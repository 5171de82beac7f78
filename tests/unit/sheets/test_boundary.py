"""The Boundary sheet: its sentence in every case, its figure, its tables, and what its note must say."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from datetime import date

import numpy as np
import pytest

from app.model.extract import LookKind
from app.model.plan import Plan
from app.model.values import Absent, read_only
from app.review import LookDeclared, review_look
from app.sheets.blocks import BoundaryFigure, Lane, LaneRow, Sheet
from app.sheets.boundary import boundary_sheet
from app.views.closed import ClosedView, Letters, masked_view, unmasked_view
from tests.unit.review.invented_trial import CUTOFFS, patients, plan
from tests.unit.sheets.invented_looks import A_IS_CONTROL, TWO_SIDED, answers, held, life, table_texts, text


def unmasked(*zs: float, sides: int = 1) -> Sheet:
    """The sheet of the last of these looks; bounds are 3.479, 2.552, 1.992 at 30, 52 and 82 events of 80."""
    return boundary_sheet(unmasked_view(life(*zs, sides=sides)[-1], under(sides), A_IS_CONTROL))


def masked(*zs: float, sides: int = 1, letters: Letters = A_IS_CONTROL) -> Sheet:
    return boundary_sheet(masked_view(life(*zs, sides=sides)[-1], under(sides), letters))


def under(sides: int) -> Plan:
    return plan(*([TWO_SIDED] if sides == 2 else []))


def of_kinds(*kinds: LookKind, cutoffs: Sequence[date] = CUTOFFS, letters: Letters | None = None) -> Sheet:
    return boundary_sheet(held(cutoffs=cutoffs[: len(kinds)], kinds=kinds)[-1].view(letters))


def without_events() -> ClosedView:
    sample = patients().at(CUTOFFS[0]).sample()
    sample = replace(sample, event=read_only(np.zeros(sample.time.size), np.bool_))
    look = review_look(plan(), sample, LookDeclared(1, "planned"), ())
    return unmasked_view(look, plan(), A_IS_CONTROL)


# --- the sentence, unmasked -----------------------------------------------------------------------------


def test_not_crossed() -> None:
    assert answers(unmasked(0.0, 1.87)) == ["The efficacy boundary was not crossed: z 1.870 against 2.552."]


def test_crossed() -> None:
    assert answers(unmasked(0.0, 2.6)) == ["The efficacy boundary was crossed: z 2.600 against 2.552."]


def test_a_bad_result_crosses_nothing_when_the_test_has_one_side() -> None:
    assert answers(unmasked(0.0, -4.0)) == [
        "The efficacy boundary was not crossed: z \u22124.000 against 2.552."
    ]


def test_crossed_on_the_side_of_control() -> None:
    assert answers(unmasked(0.0, -2.6, sides=2)) == [
        "The boundary in favour of syrupine was crossed: z \u22122.600 against \u22122.552."
    ]


def test_not_crossed_on_either_side() -> None:
    assert answers(unmasked(0.0, -1.2, sides=2)) == ["No boundary was crossed: z \u22121.200 against ±2.552."]


def test_a_safety_look() -> None:
    assert answers(of_kinds("planned", "safety")) == [
        "No efficacy boundary applies: z 2.419. A safety look has no efficacy bound and spends no alpha."
    ]


def test_no_new_information() -> None:
    again = (CUTOFFS[1], CUTOFFS[1])
    assert answers(of_kinds("planned", "unplanned", cutoffs=again)) == [
        "No efficacy boundary applies: z 2.419. "
        "No new information since the looks before: nothing is spent, no bound exists."
    ]


def test_a_final_look_without_new_information_is_descriptive() -> None:
    again = (CUTOFFS[1], CUTOFFS[1])
    assert answers(of_kinds("planned", "final", cutoffs=again)) == [
        "No efficacy boundary applies: z 2.419. "
        "No new information at the final look: no boundary exists and the result is descriptive."
    ]


def test_over_running() -> None:
    assert answers(unmasked(0.0, 4.0, 1.0)) == [
        "The boundary was crossed at look 2. This look is over-running: z 1.000, no second test."
    ]


def test_not_computable() -> None:
    assert answers(boundary_sheet(without_events())) == [
        "The test cannot be computed: no event was observed."
    ]


def test_where_z_and_bound_round_alike_digits_are_added_everywhere() -> None:
    """In the sentence, the table, under the lane and beside it."""
    bound = life(0.0, 0.0)[1].bound.efficacy_z
    assert not isinstance(bound, Absent)
    sheet = unmasked(0.0, bound - 0.00002)
    (answer,) = answers(sheet)
    z, _, shown_bound = answer.removeprefix("The efficacy boundary was not crossed: z ")[:-1].partition(
        " against "
    )
    assert z != shown_bound
    assert table_texts(sheet, "Look 2")["z"] == [z, shown_bound]
    assert table_texts(sheet, "The looks")["2, planned, shown"][2:4] == [z, shown_bound]
    now = lane(sheet, 2)
    assert (now.z and now.z.text, now.upper and now.upper.text) == (z, shown_bound)


def test_crossed_is_decided_on_stored_values() -> None:
    bound = life(0.0, 0.0)[1].bound.efficacy_z
    assert not isinstance(bound, Absent)
    assert answers(unmasked(0.0, bound))[0].startswith("The efficacy boundary was crossed")
    assert answers(unmasked(0.0, np.nextafter(bound, 0)))[0].startswith(
        "The efficacy boundary was not crossed"
    )


def test_the_lower_bound_gets_the_digits_of_its_z() -> None:
    bound = life(0.0, 0.0, sides=2)[1].bound.efficacy_z
    assert not isinstance(bound, Absent)
    (answer,) = answers(unmasked(0.0, -bound - 0.00002, sides=2))
    z, _, shown_bound = answer.partition(": z ")[2][:-1].partition(" against ")
    assert z != shown_bound
    assert len(z) == len(shown_bound)


# --- the sentences, masked ------------------------------------------------------------------------------


def test_masked_neither_reading_crosses() -> None:
    assert answers(masked(0.0, 1.87)) == [
        "If A is experimental: z \u22121.870, no boundary crossed.",
        "If B is experimental: z 1.870, no boundary crossed.",
    ]


def test_masked_one_reading_crosses() -> None:
    assert answers(masked(0.0, 2.6)) == [
        "If A is experimental: z \u22122.600, no boundary crossed.",
        "If B is experimental: z 2.600, efficacy bound 2.552 crossed.",
    ]


def test_masked_two_sided_both_readings_cross_on_their_own_side() -> None:
    assert answers(masked(0.0, 2.6, sides=2)) == [
        "If A is experimental: z \u22122.600, bound \u22122.552 in favour of B crossed.",
        "If B is experimental: z 2.600, efficacy bound 2.552 crossed.",
    ]


def test_masked_over_running_in_one_reading() -> None:
    assert answers(masked(0.0, 2.6, 1.0)) == [
        "If A is experimental: z \u22121.000, no boundary crossed.",
        "If B is experimental: z 1.000, the boundary was crossed at look 2; no second test.",
    ]


def test_masked_safety_look() -> None:
    assert answers(of_kinds("planned", "safety", letters=A_IS_CONTROL)) == [
        "If A is experimental: z \u22122.419, no efficacy boundary applies.",
        "If B is experimental: z 2.419, no efficacy boundary applies.",
    ]


# --- the figure -----------------------------------------------------------------------------------------


def figure(sheet: Sheet) -> BoundaryFigure:
    assert isinstance(sheet.figure, BoundaryFigure)
    return sheet.figure


def lane(sheet: Sheet, look: int) -> Lane:
    return next(each for each in figure(sheet).lanes if each.look == look)


def row(sheet: Sheet, head: str) -> list[str]:
    rows: tuple[LaneRow, ...] = figure(sheet).rows
    (found,) = [each for each in rows if text(each.head).startswith(head)]
    return ["" if cell is None else cell.text for cell in found.cells]


def bounds(sheet: Sheet, look: int) -> tuple[str | None, str | None]:
    shown = lane(sheet, look)
    return shown.upper and shown.upper.text, shown.lower and shown.lower.text


def test_the_lanes_are_the_looks_held_shown_and_to_come() -> None:
    sheet = unmasked(0.0, 1.87)
    assert [each.state for each in figure(sheet).lanes] == ["past", "now", "planned", "planned"]
    assert [each.final for each in figure(sheet).lanes] == [False, False, False, True]
    assert row(sheet, "z") == ["0.000", "1.870", "", ""]


def test_masked_and_one_sided_each_look_has_two_lanes_with_mirrored_bounds() -> None:
    sheet = masked(0.0, 1.87)
    assert figure(sheet).layout == "two lanes"
    assert bounds(sheet, 2) == ("2.552", "\u22122.552")


def test_two_sided_a_look_has_one_lane_with_both_bounds_masked_or_not() -> None:
    assert (
        figure(masked(0.0, 1.0, sides=2)).layout == figure(unmasked(0.0, 1.0, sides=2)).layout == "one lane"
    )
    assert bounds(unmasked(0.0, 1.0, sides=2), 2) == ("2.552", "\u22122.552")
    assert bounds(unmasked(0.0, 1.0), 2) == ("2.552", None)


def test_after_a_crossing_no_later_lane_has_a_bound() -> None:
    sheet = unmasked(0.0, 4.0, 1.0)
    assert [each.crossed for each in figure(sheet).lanes] == [False, True, False]
    assert bounds(sheet, 3) == (None, None)
    assert row(sheet, "Efficacy bound") == ["3.479", "2.552", "–"]


def test_masked_after_a_crossing_the_other_reading_keeps_its_bounds() -> None:
    """B crossed at look 2: A's lane (left, upper) is still tested."""
    sheet = masked(0.0, 4.0, 1.0)
    assert bounds(sheet, 2) == ("2.552", "\u22122.552")
    assert bounds(sheet, 3) == ("1.992", None)
    assert table_texts(sheet, "Look 3")["Efficacy bound"] == ["1.992", "–"]
    assert table_texts(sheet, "Look 3")["Crossed"] == ["none", "at look 2"]


def test_the_axis_says_whom_each_direction_favours() -> None:
    assert (figure(unmasked(0.0)).favours_up, figure(unmasked(0.0)).favours_down) == (
        "favours pelletol",
        "favours syrupine",
    )
    assert figure(masked(0.0)).favours_up == "favours arm\u00a0A"


# --- tables and note ------------------------------------------------------------------------------------


def test_what_was_observed_stands_beside_the_same_quantity_at_the_bound() -> None:
    """One precision for both p-values: two digits of the smaller, which is the tail beyond the bound."""
    rows = table_texts(unmasked(0.0, 1.87), "Look 2")
    assert rows["z"] == ["1.870", "2.552"]
    assert rows["p, one-sided"][1] == tail_beyond_the_bound() == "0.0053"
    assert set(rows) == {"z", "p, one-sided", "Hazard ratio"}


def tail_beyond_the_bound() -> str:
    bound = life(0.0, 0.0)[1].bound.efficacy_z
    assert not isinstance(bound, Absent)
    return f"{math.erfc(bound / math.sqrt(2)) / 2:.4f}"


def test_masked_p_stands_beside_the_p_of_the_bound_in_both_readings() -> None:
    rows = table_texts(masked(0.0, 1.87), "Look 2")
    assert rows["at the bound"] == [tail_beyond_the_bound()] * 2


def test_alpha_is_said_with_its_sides() -> None:
    heads = [text(each.head) for each in figure(unmasked(0.0)).rows + figure(unmasked(0.0, sides=2)).rows]
    assert "Alpha spent, one-sided" in heads
    assert "Alpha spent, each side" in heads


def test_the_note_explains_every_dash() -> None:
    note = text(of_kinds("safety", "planned").notes[0])
    assert "Look 1: a safety look has no efficacy bound and spends no alpha." in note
    assert "Look 1: bounds as used" not in note


def test_the_note_of_a_final_look_says_that_ending_early_releases_no_alpha() -> None:
    said = "ending early because of comparative results does not release it"
    assert said in text(of_kinds("planned", "final").notes[0])
    assert said not in text(of_kinds("planned", "planned").notes[0])


def test_the_note_names_the_events_that_the_bounds_ahead_are_for() -> None:
    assert "Look 3: if held at 60 events. Look 4: if held at 80 events." in text(unmasked(0.0, 1.0).notes[0])


def test_a_test_without_the_strata_is_called_descriptive() -> None:
    assert "z, not stratified, descriptive" in table_texts(unmasked(0.0), "Log-rank, pelletol")


@pytest.mark.parametrize("sides", [1, 2])
def test_observed_and_expected_add_up_over_the_strata(sides: int) -> None:
    sheet = boundary_sheet(held(plan(*([TWO_SIDED] if sides == 2 else [])), cutoffs=CUTOFFS[:2])[1].view())
    strata = table_texts(sheet, "Log-rank by stratum")
    total = strata.pop("All strata")
    assert set(strata) == {"North", "South"}
    for column in range(5):
        added = sum(float(cells[column]) for cells in strata.values())
        assert added == pytest.approx(float(total[column]), abs=0.011)
