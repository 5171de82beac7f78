"""Numbers as they are said: the display rules, one by one."""

from __future__ import annotations

import math
from datetime import date

import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.model.values import Absent
from app.sheets.blocks import Span
from app.sheets.words import (
    alpha,
    arm_label,
    count,
    counted,
    day_text,
    decimal,
    interval,
    level_text,
    line,
    listed,
    moment,
    number,
    of_total,
    p_values,
    percent,
    z_number,
    z_places,
)
from tests.unit.sheets.invented_looks import text

MINUS, NO_BREAK = "\u2212", "\u00a0"
NOT_REACHED = Absent("not reached")


def texts(*spans: Span) -> list[str]:
    return [span.text for span in spans]


# --- z and its bound ------------------------------------------------------------------------------------


def test_a_minus_is_the_true_sign_and_zero_has_none() -> None:
    assert decimal(-1.2345, 3) == f"{MINUS}1.234"
    assert decimal(-0.0004, 3) == "0.000"
    assert decimal(-0.0, 3) == "0.000"


def test_z_has_three_places() -> None:
    assert z_number(2.12949).text == "2.129"
    assert z_places(2.129, 2.434) == 3


@pytest.mark.parametrize(
    ("z", "bound", "read"),
    [
        (2.129, 2.434, ["2.129", "2.434"]),
        (2.4344, 2.4336, ["2.4344", "2.4336"]),
        (2.43402, 2.43396, ["2.43402", "2.43396"]),
        (2.434000001, 2.434, ["2.434000001", "2.434000000"]),
    ],
)
def test_z_and_bound_get_digits_until_they_differ(z: float, bound: float, read: list[str]) -> None:
    places = z_places(z, bound)
    assert texts(z_number(z, places=places), z_number(bound, places=places)) == read


def test_on_the_lower_side_sizes_are_told_apart() -> None:
    """z -2.4340 against the mirrored bound of 2.4344: alike at three places."""
    assert z_places(-2.4340, 2.4344) == 4


def test_a_z_on_its_bound_needs_no_digits_to_differ() -> None:
    assert z_places(2.434, 2.434) == 3
    assert z_places(-2.434, 2.434) == 3


@given(st.floats(0.5, 6), st.integers(1, 40))
def test_two_different_doubles_always_read_differently(bound: float, steps: int) -> None:
    z = bound
    for _ in range(steps):
        z = math.nextafter(z, 10)
    places = z_places(z, bound)
    assert z_number(z, places=places).text != z_number(bound, places=places).text


# --- p and alpha ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("values", "read"),
    [
        ((0.016615, 0.0074), ["0.0166", "0.0074"]),
        ((0.5,), ["0.50"]),
        ((0.0074,), ["0.0074"]),
        ((0.996, 0.0099), ["0.9960", "0.0099"]),
        ((0.00996,), ["0.010"]),  # 0.00996 rounds to 0.010 with two digits
        ((0.000000543, 0.03), ["0.00000054", "0.03000000"]),
    ],
)
def test_p_values_share_a_precision_that_shows_two_digits_of_the_smallest(
    values: tuple[float, ...], read: list[str]
) -> None:
    assert texts(*p_values(*values)) == read


def test_a_p_too_small_for_eight_decimals_is_said_to_be_smaller() -> None:
    assert texts(*p_values(9e-9, 0.5)) == [f"<{NO_BREAK}0.00000001", "0.50000000"]
    assert p_values(0.0)[0].text == f"<{NO_BREAK}0.00000001"


def test_a_p_beside_no_bound_stands_alone() -> None:
    assert texts(*p_values(0.031, Absent("a safety look has no bound"))) == ["0.031", "not estimable"]


@pytest.mark.parametrize(
    ("value", "read"),
    [
        (0.025, "0.0250"),
        (0.0249999, "0.0250"),
        (0.000012345, "0.0000123"),
        (0.0009996, "0.00100"),
        (0.09999, "0.100"),
        (0.00000001234, "0.0000000123"),
        (5e-9, f"5.00e{MINUS}9"),
        (2.555e-13, f"2.56e{MINUS}13"),
        (0.0, "0"),
    ],
)
def test_alpha_has_three_significant_digits(value: float, read: str) -> None:
    assert alpha(value).text == read
    assert alpha(value).value == value


@given(st.floats(1e-300, 0.5))
def test_alpha_reads_to_three_digits_whatever_its_size(value: float) -> None:
    read = alpha(value).text.replace(MINUS, "-")
    assert float(read) == pytest.approx(value, rel=5.01e-3)
    assert len(read.partition("e")[0].replace(".", "").lstrip("0")) == 3


# --- other numbers --------------------------------------------------------------------------------------


def test_percent_has_one_place_and_carries_the_fraction() -> None:
    assert percent(0.57455) == Span("57.5", value=0.57455)


def test_what_is_not_reached_or_not_estimable_is_words() -> None:
    assert number(NOT_REACHED, 1).text == "not reached"
    assert number(Absent("no event was observed"), 3).text == "not estimable"
    assert number(NOT_REACHED, 1).value is None


def test_an_interval_says_its_ends_and_a_missing_one_once() -> None:
    assert text(interval(0.6576, 0.98349, 3)) == "0.658 to 0.983"
    assert text(interval(12.34, NOT_REACHED, 1)) == "12.3 to not reached"
    assert text(interval(NOT_REACHED, NOT_REACHED, 1)) == "not reached"
    assert text(interval(math.nan, math.nan, 1, scale=100)) == "not estimable"


def test_a_level_is_written_as_the_plan_has_it() -> None:
    assert [level_text(level) for level in (0.95, 0.9, 0.975, 0.999)] == ["95%", "90%", "97.5%", "99.9%"]


def test_counts_stand_beside_their_denominators_and_their_nouns() -> None:
    assert text(of_total(384, 538)) == "384 of 538"
    assert text(counted(1, "event")) == "1 event"
    assert text(counted(0, "event")) == "0 events"


def test_thousands_are_spaced_from_five_digits_on_and_never_broken() -> None:
    assert count(9999).text == "9999"
    assert count(1_234_567).text == f"1{NO_BREAK}234{NO_BREAK}567"


def test_a_number_is_not_broken_from_what_it_belongs_to() -> None:
    assert counted(5, "event")[1].text == f"{NO_BREAK}events"
    assert moment("2027-01-26T09:30:00Z") == f"26{NO_BREAK}Jan{NO_BREAK}2027,{NO_BREAK}09:30{NO_BREAK}UTC"


def test_a_date_is_read_as_a_person_says_it() -> None:
    assert day_text(date(2027, 1, 8)) == f"8{NO_BREAK}Jan{NO_BREAK}2027"


def test_lists_and_lines_read_on() -> None:
    assert [listed(list(words)) for words in ("", "A", "AB", "ABC")] == ["", "A", "A and B", "A, B and C"]
    assert line("z ", "", Span("2")) == (Span("z "), Span("2"))


def test_an_arm_is_its_letter_and_then_its_name_with_the_letter() -> None:
    masked, named = arm_label("A", "PLACEBO", masked=True), arm_label("A", "PLACEBO", masked=False)
    assert (masked.name, masked.in_sentence) == (f"Arm{NO_BREAK}A", f"arm{NO_BREAK}A")
    assert (named.name, named.in_sentence) == (f"Placebo{NO_BREAK}(A)", "placebo")
    assert arm_label("B", "6-MP", masked=False).in_sentence == "6-MP"
