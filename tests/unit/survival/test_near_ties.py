"""Times that differ by rounding only; the expected values are R's survival 3.5-3 (computed independently)."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.survival import logrank, merge_near_ties
from tests import naive

near_times = st.tuples(st.integers(0, 20), st.integers(-3, 3)).map(lambda p: max(0.0, p[0] / 4 + p[1] * 7e-9))


def test_rounding_errors_are_merged_into_the_smallest() -> None:
    assert merge_near_ties([0.1 + 0.2, 0.3, 1.0, 0.1 * 3]).tolist() == [0.3, 0.3, 1.0, 0.3]


def test_distinct_times_are_left_alone() -> None:
    time = np.array([3.0, 1.0, 2.0, 2.0])
    assert merge_near_ties(time).tolist() == time.tolist()
    assert merge_near_ties([]).tolist() == []


def test_tolerance_is_relative_to_the_mean_distinct_time() -> None:
    # the distinct times have mean 333.67: gaps up to 4.972e-6 are ties
    assert merge_near_ties([1.0, 1.0 + 4.9e-6, 999.0, 999.0]).tolist() == [1.0, 1.0, 999.0, 999.0]
    assert merge_near_ties([1.0, 1.0 + 5.0e-6, 999.0, 999.0]).tolist() == [1.0, 1.0 + 5.0e-6, 999.0, 999.0]


def test_ties_chain() -> None:
    assert merge_near_ties([1.0, 1.0 + 1e-8, 1.0 + 2e-8, 1.0 + 3e-8]).tolist() == [1.0] * 4


@given(st.lists(near_times, max_size=30))
def test_merging_is_the_literal_one(time: list[float]) -> None:
    assert merge_near_ties(time).tolist() == naive.merge_near_ties(time)


def test_merging_decides_a_test() -> None:
    # 0.1 + 0.2 and 0.3 are one time: both arms have the event there, and nothing tells them apart
    time, event, experimental = [0.1 + 0.2, 0.3, 1.0, 1.0], [1, 1, 0, 0], [0, 1, 0, 1]
    assert logrank(time, event, experimental).z != 0
    assert logrank(merge_near_ties(time), event, experimental).z == 0


def test_times_are_checked() -> None:
    with pytest.raises(ValueError, match="accepted: finite numbers >= 0"):
        merge_near_ties([1.0, -1.0])
