"""Curves of few subjects, medians at one half, and what is said where a number does not exist.

The medians and limits at survival 0.5 are those that R's survival 3.5-3 prints (computed independently).
"""

from __future__ import annotations

import numpy as np
import pytest

from app.model.values import Absent
from app.survival import follow_up_median, kaplan_meier
from app.survival.curve import NO_INTERVAL, NO_SUBJECTS, NOT_REACHED


def test_nobody_gives_a_curve_without_rows() -> None:
    curve = kaplan_meier([], [])
    assert curve.time.size == curve.survival.size == curve.ci_low.size == 0
    assert curve.median == curve.median_ci_low == curve.median_ci_high == Absent("no subjects")
    assert follow_up_median([], []) == NO_SUBJECTS


def test_one_subject_with_the_event() -> None:
    curve = kaplan_meier([4.0], [True])
    assert (curve.survival.tolist(), curve.at_risk.tolist(), curve.median) == ([0.0], [1], 4.0)
    assert np.isnan([curve.std_error[0], curve.ci_low[0], curve.ci_high[0]]).all()
    assert curve.median_ci_low == curve.median_ci_high == NO_INTERVAL
    assert follow_up_median([4.0], [True]) == NOT_REACHED


def test_one_subject_censored() -> None:
    curve = kaplan_meier([4.0], [False])
    assert (curve.survival.tolist(), curve.std_error.tolist()) == ([1.0], [0.0])
    assert curve.median == curve.median_ci_low == curve.median_ci_high == NOT_REACHED
    assert follow_up_median([4.0], [False]) == 4.0


def test_no_event_at_all() -> None:
    curve = kaplan_meier([1, 2, 3], [False] * 3)
    assert curve.survival.tolist() == [1.0] * 3
    assert np.isnan(curve.ci_low).all()
    assert curve.median == NOT_REACHED


def test_everybody_at_once_at_time_zero() -> None:
    curve = kaplan_meier([0.0, 0.0, 0.0], [True] * 3)
    assert (curve.time.tolist(), curve.survival.tolist(), curve.median) == ([0.0], [0.0], 0.0)
    assert curve.median_ci_low == NO_INTERVAL


def test_an_event_at_time_zero_counts() -> None:
    curve = kaplan_meier([0, 0, 1, 2], [True, False, True, True])
    assert curve.at_risk.tolist() == [4, 2, 1]
    assert curve.survival.tolist() == [0.75, 0.375, 0.0]


def test_at_one_time_the_event_comes_before_the_censoring() -> None:
    assert kaplan_meier([1, 1], [True, False]).survival.tolist() == [0.5]


def test_last_observation_censored_leaves_the_curve_above_zero() -> None:
    curve = kaplan_meier([1, 2, 3], [True, True, False])
    assert curve.survival.tolist() == pytest.approx([2 / 3, 1 / 3, 1 / 3])
    assert np.isfinite(curve.ci_low).all()
    assert np.isfinite(curve.std_error).all()


@pytest.mark.parametrize(
    ("time", "event", "median"),
    [
        ([1, 2, 3, 4], [1, 1, 1, 1], 2.5),  # 0.5 from 2 until the event at 3
        ([1, 2, 2.5, 3, 4], [1, 0, 0, 1, 1], 3.0),
        ([1, 2, 3, 4], [1, 1, 0, 1], 3.0),  # 0.5 from 2 until the event at 4, past the censoring
        ([1, 2, 3, 4], [1, 1, 0, 0], 2.0),  # 0.5 from 2 to the end, which is not known
        ([1, 2], [1, 1], 1.5),
        ([1, 2, 3], [1, 1, 1], 2.0),
    ],
)
def test_median_where_the_curve_is_flat_at_one_half(
    time: list[float], event: list[int], median: float
) -> None:
    assert kaplan_meier(time, event).median == median


def test_one_half_is_recognised_through_rounding() -> None:
    # 2/3 * 3/4 after rounding need not be 0.5: three of six leave in two steps and rounding must not matter
    for n in range(2, 400, 2):
        time = np.arange(1.0, n + 1)
        assert kaplan_meier(time, np.ones(n, dtype=bool)).median == n / 2 + 0.5


def test_unknown_kind_of_interval_is_a_bug_of_the_caller() -> None:
    with pytest.raises(
        ValueError,
        match="interval is 'loglog'; accepted: 'plain', 'log', 'log-log', 'logit', 'arcsine-square-root'",
    ):
        kaplan_meier([1.0], [True], interval="loglog")


@pytest.mark.parametrize("level", [0.0, 1.0, 95.0, float("nan")])
def test_level_is_a_number_between_0_and_1(level: float) -> None:
    with pytest.raises(ValueError, match=r"level is .+; accepted: a number between 0 and 1"):
        kaplan_meier([1.0, 2.0], [True, True], level=level)


def test_arrays_of_the_curve_refuse_writing() -> None:
    curve = kaplan_meier([1.0, 2.0], [True, False])
    for name in ("time", "at_risk", "events", "censored", "survival", "std_error", "ci_low", "ci_high"):
        with pytest.raises(ValueError, match="read-only"):
            getattr(curve, name)[0] = 0


def test_the_caller_keeps_arrays_that_can_be_written() -> None:
    time, event = np.array([1.5, 2.5]), np.array([True, False])
    kaplan_meier(time, event)
    time[0], event[0] = 3.0, False
    assert time.tolist() == [3.0, 2.5]
