"""Answers that a person types: a hazard ratio of their own."""

from __future__ import annotations

import pytest

from app.errors import ValueRejected
from app.intake.answers import read_hazard_ratio


@pytest.mark.parametrize(
    ("written", "ratio"),
    [
        ("0.8", 0.8),
        ("0,8", 0.8),
        (".8", 0.8),
        (" 1 ", 1.0),
        ("0.05", 0.05),
        ("20", 20.0),
        ("0.66667", 0.66667),
    ],
)
def test_a_ratio_may_have_a_decimal_point_or_a_comma(written: str, ratio: float) -> None:
    assert read_hazard_ratio(written, where="here") == ratio


@pytest.mark.parametrize("written", ["0.0499", "0", "20.1", "999"])
def test_a_ratio_out_of_bounds_is_told_the_bounds(written: str) -> None:
    with pytest.raises(ValueRejected) as refusal:
        read_hazard_ratio(written, where="--hazard-ratio")
    assert str(refusal.value) == (
        f"A hazard ratio lies out of bounds in --hazard-ratio. Found {written!r}. Accepted: a number from "
        "0.05 to 20, experimental / control, such as 0.8. Write one number, with a decimal point or comma."
    )


@pytest.mark.parametrize(
    "written",
    ["", "abc", "-0.8", "+0.8", "1e0", "0.8.1", "0,8,1", "nan", "inf", "0x1", "٠.٨", "0.8;0.9", "1,000.5"],
)
def test_what_is_no_number_is_refused_and_shown(written: str) -> None:
    with pytest.raises(ValueRejected, match="This is no hazard ratio in here"):
        read_hazard_ratio(written, where="here")


def test_a_long_answer_is_shown_by_its_beginning() -> None:
    with pytest.raises(ValueRejected) as refusal:
        read_hazard_ratio("x" * 5000, where="here")
    assert len(str(refusal.value)) < 300
