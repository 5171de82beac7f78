"""A row of print can fail: its printed digits are its tolerance."""

from __future__ import annotations

import pytest

from app.validation.rows import PublishedRow


def row(expected: str, computed: float, **more: object) -> PublishedRow:
    return PublishedRow("a value", "a table", "printed", expected, lambda: computed, **more)  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("expected", "computed", "agrees"),
    [
        ("2.178", 2.17849, True),
        ("2.178", 2.17851, False),
        ("2.178", 2.17749, False),
        ("2.178", float("nan"), False),
        ("4.17e-05", 4.1749e-05, True),
        ("4.17e-05", 4.1751e-05, False),
        ("-1.572125", -1.5721251, True),
        ("21", 21.4, True),
        ("21", 21.6, False),
    ],
)
def test_half_a_unit_of_the_last_printed_digit_decides(expected: str, computed: float, agrees: bool) -> None:
    outcome = row(expected, computed).check()
    assert outcome.agrees is agrees
    assert outcome.computed == pytest.approx(computed, nan_ok=True)


def test_a_wider_tolerance_needs_a_note_saying_why() -> None:
    with pytest.raises(ValueError, match=r"a tolerance of 1\.5 units needs a note saying why"):
        row("2.178", 2.179, units=1.5)
    assert row("2.178", 2.179, units=1.5, note="last digit: 2.1790").check().agrees


def test_a_published_value_is_a_finite_number() -> None:
    with pytest.raises(ValueError, match="a published value is a finite number; found 'NaN'"):
        row("NaN", 1.0).check()
