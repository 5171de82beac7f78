"""Numbers as the record writes them."""

from __future__ import annotations

import numpy as np

from app.model.values import Absent
from app.record.numbers import NO_STANDARD_ERROR, column, estimate


def test_a_number_keeps_its_precision_and_a_reason_its_words() -> None:
    assert estimate(1 / 3) == 1 / 3
    assert estimate(Absent("not reached")) == {"not_estimable": "not reached"}
    assert estimate(None) is None


def test_numpy_numbers_become_plain_ones() -> None:
    assert type(estimate(np.float64(2.5))) is float
    assert [type(value) for value in column(np.array([1, 2]))] == [int, int]


def test_a_place_without_a_number_carries_the_reason_and_never_nan() -> None:
    assert column(np.array([0.5, np.nan])) == [0.5, {"not_estimable": NO_STANDARD_ERROR}]
