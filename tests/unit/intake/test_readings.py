"""One text as a number, a date or a censoring value; never a guess."""

from __future__ import annotations

import math
from datetime import date

import pytest

from app.intake import readings


@pytest.mark.parametrize(
    ("text", "value"),
    [("12", 12.0), (" 12.5 ", 12.5), ("-3", -3.0), ("+.5", 0.5), ("1e2", 100.0), ("0012", 12.0), ("5.", 5.0)],
)
def test_a_decimal_number_is_read(text, value):
    assert readings.number(text) == value


@pytest.mark.parametrize("text", ["", ".", "12,5", "1_000", "nan", "inf", "1e999", "0x1F", "12 days", "١٢"])
def test_anything_else_is_no_number(text):
    assert math.isnan(readings.number(text))


@pytest.mark.parametrize(("text", "value"), [("0", 0), (" 1 ", 1), ("2.0", 2), ("12", 12)])
def test_a_censoring_value_is_a_whole_number(text, value):
    assert readings.censor(text) == value


@pytest.mark.parametrize("text", ["", ".", "-1", "1.5", "Y", "true", "9" * 20])
def test_anything_else_is_no_censoring_value(text):
    assert readings.censor(text) == readings.NO_CENSOR


def test_a_day_counts_from_1970_and_back():
    assert readings.day("1970-01-01") == 0
    assert readings.day(" 2024-02-29 ") == (date(2024, 2, 29) - date(1970, 1, 1)).days
    assert readings.date_of(readings.day("2024-02-29")) == date(2024, 2, 29)


@pytest.mark.parametrize(
    "text", ["", "2024-02-30", "20240229", "2024-W09-4", "29FEB2024", "2024-02", "19725", "2024-02-29T10:00"]
)
def test_anything_else_is_no_day(text):
    assert readings.day(text) == readings.NO_DAY
