"""Counts at risk: what is accepted, and that counting and sorting agree."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given

from app.survival.risk_table import RiskTable, risk_table, whole_days
from tests.strategies import TwoArmSample, two_arm_samples
from tests.strategies import whole_days as days


@pytest.mark.parametrize(
    ("arguments", "sentence"),
    [
        (([1.0, -2.0], [True, True]), r"time holds np\.float64\(-2\.0\); accepted: finite numbers >= 0"),
        (([1.0, np.nan], [True, True]), r"time holds np\.float64\(nan\); accepted: finite numbers >= 0"),
        (([1.0, np.inf], [True, True]), r"time holds np\.float64\(inf\); accepted: finite numbers >= 0"),
        (([[1.0]], [True]), r"time has shape \(1, 1\); accepted: \(n,\)"),
        (([1.0, 2.0], [True]), r"event has shape \(1,\); accepted: \(2,\), as time"),
        (([1.0, 2.0], [1, 2]), r"event holds np\.int64\(2\); accepted: True or False"),
        (([1.0, 2.0], [1.0, np.nan]), r"event holds np\.float64\(nan\); accepted: True or False"),
        (([1.0], [True], [-1]), r"group holds np\.int64\(-1\); accepted: integer codes from 0"),
        (([1.0], [True], [0.5]), r"group holds np\.float64\(0\.5\); accepted: integer codes from 0"),
        (([1.0], [True], None, [0, 1]), r"stratum has shape \(2,\); accepted: \(1,\), as time"),
    ],
)
def test_a_bug_in_the_caller_is_said_with_the_value_found(
    arguments: tuple[object, ...], sentence: str
) -> None:
    with pytest.raises(ValueError, match=sentence):
        risk_table(*arguments)  # type: ignore[arg-type]


def test_a_table_of_nobody_has_no_columns() -> None:
    table = risk_table([], [], np.array([], dtype=bool), [])
    assert table.time.size == 0
    assert table.at_risk.shape == (2, 0)
    assert list(table.strata()) == []
    assert table.subjects == 0


def test_an_arm_with_nobody_keeps_its_row_of_zeros() -> None:
    table = risk_table([1, 2], [True, True], np.array([False, False]))
    assert table.at_risk.tolist() == [[2, 1], [0, 0]]


def test_more_than_two_groups_have_a_row_each() -> None:
    table = risk_table([1, 1, 2, 2], [True, False, True, True], [0, 2, 1, 2])
    assert table.at_risk.tolist() == [[1, 0], [1, 1], [2, 1]]
    assert table.events.tolist() == [[1, 0], [0, 1], [0, 1]]
    assert table.censored.tolist() == [[0, 0], [0, 0], [1, 0]]


def test_strata_without_subjects_have_no_table() -> None:
    table = risk_table([1, 2, 3], [True] * 3, None, [4, 1, 4])
    assert [part.stratum.tolist() for part in table.strata()] == [[1], [4, 4]]
    assert [part.at_risk.tolist() for part in table.strata()] == [[[1]], [[2, 1]]]


def test_strata_told_by_flags_are_those_told_by_numbers() -> None:
    time, event, stratum = [300, 200, 300], [True, False, True], np.array([True, False, True])
    table = risk_table(time, event, None, stratum)  # days that a byte, such as a flag has, could not hold
    assert table.time.tolist() == [200.0, 300.0]
    assert table.stratum.tolist() == [0, 1]
    assert table.at_risk.tolist() == [[1, 2]]


@pytest.mark.parametrize(
    ("times", "strata", "counted"),
    [
        ([0.0, 3.0], 1, True),
        ([0.0, 3.5], 1, False),
        ([0.0, 4095.0], 1, True),
        ([0.0, 4096.0], 1, False),  # a grid of days larger than the sample is sorted instead
        ([0.0, 2047.0], 2, True),
        ([0.0, 2048.0], 2, False),
        ([0.0, 1e300], 1, False),
    ],
)
def test_whole_days_are_counted_while_the_grid_is_small(
    times: list[float], strata: int, counted: bool
) -> None:
    assert (whole_days(np.array(times), strata) is not None) is counted


@given(two_arm_samples(days))
def test_counting_and_sorting_give_the_same_table(sample: TwoArmSample) -> None:
    def table(time: object) -> RiskTable:
        return risk_table(time, sample.event, sample.experimental, sample.stratum)  # type: ignore[arg-type]

    counted, sorted_ = table(sample.time), table(sample.time + 0.5)
    assert sorted_.time.tolist() == (counted.time + 0.5).tolist()
    for column in ("stratum", "at_risk", "events", "censored"):
        assert getattr(sorted_, column).tolist() == getattr(counted, column).tolist()
