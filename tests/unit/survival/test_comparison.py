"""The log-rank test where the data hardly carry it, and the hazard ratio likewise."""

from __future__ import annotations

import math

import numpy as np
import pytest

from app.errors import AccuracyNotReached, NotEstimable
from app.survival import cox, cox_two_arms, logrank

ONE_ARM = "all subjects are in one arm"
NO_EVENT = "no event was observed"
NOT_TOLD_APART = "no event fell while both arms were at risk and would leave someone at risk"

UNDECIDED = {
    "nobody": ([], [], [], "no subjects"),
    "one subject": ([3], [1], [1], ONE_ARM),
    "one arm": ([1, 2, 3], [1, 1, 0], [0, 0, 0], ONE_ARM),
    "no event": ([1, 2, 3, 4], [0, 0, 0, 0], [0, 1, 0, 1], NO_EVENT),
    "one arm gone before the other's events": ([1, 2, 3, 4], [0, 0, 1, 1], [0, 0, 1, 1], NOT_TOLD_APART),
}


@pytest.mark.parametrize("case", UNDECIDED)
def test_reason_is_said_where_no_event_tells_the_arms_apart(case: str) -> None:
    time, event, experimental, reason = UNDECIDED[case]
    for estimate in (logrank, cox_two_arms):
        with pytest.raises(NotEstimable) as refused:
            estimate(time, event, experimental)
        assert refused.value.what == reason


def test_all_events_at_once_carry_no_variance_but_a_ratio() -> None:
    with pytest.raises(NotEstimable) as refused:
        logrank([2, 2, 2, 2], [1, 1, 1, 1], [0, 0, 1, 1])
    assert refused.value.what == NOT_TOLD_APART
    assert cox_two_arms([2, 2, 2, 2], [1, 1, 1, 1], [0, 0, 1, 1]).hazard_ratio == pytest.approx(
        1.0, abs=1e-12
    )


def test_strata_that_each_hold_one_arm_tell_nothing() -> None:
    with pytest.raises(NotEstimable) as refused:
        logrank([1, 2, 3, 4], [1, 1, 1, 1], [0, 1, 0, 1], stratum=[0, 1, 0, 1])
    assert refused.value.what == NOT_TOLD_APART


def test_a_stratum_without_one_arm_is_reported_and_adds_nothing() -> None:
    time, event, experimental = [1, 2, 3, 4, 5, 6], [1, 1, 1, 1, 1, 1], [0, 1, 0, 1, 1, 1]
    result = logrank(time, event, experimental, stratum=[0, 0, 0, 0, 2, 2])
    alone = logrank(time[:4], event[:4], experimental[:4])
    assert [(part.stratum, part.contributes) for part in result.strata] == [(0, True), (2, False)]
    assert (result.z, result.variance) == (pytest.approx(alone.z), alone.variance)


def test_one_event_is_enough_for_the_test() -> None:
    result = logrank([1, 2, 3, 4], [1, 0, 0, 0], [0, 0, 1, 1])
    assert (result.observed, result.expected, result.variance, result.z) == (0.0, 0.5, 0.25, 1.0)


def test_all_censored_in_one_arm() -> None:
    time, event, experimental = [1, 2, 3, 4], [1, 1, 0, 0], [0, 0, 1, 1]
    assert logrank(time, event, experimental).z > 0
    with pytest.raises(NotEstimable) as refused:
        cox_two_arms(time, event, experimental)
    assert refused.value.what == (
        "no finite estimate: every event with both arms at risk was in the control arm, "
        "so the likelihood rises as the hazard ratio goes to 0"
    )


def test_all_events_in_the_experimental_arm_have_a_ratio_that_goes_to_infinity() -> None:
    with pytest.raises(NotEstimable) as refused:
        cox_two_arms([1, 2, 3, 4], [1, 1, 0, 0], [1, 1, 0, 0])
    assert refused.value.what == (
        "no finite estimate: every event with both arms at risk was in the experimental arm, "
        "so the likelihood rises as the hazard ratio goes to infinity"
    )


def test_monotone_likelihood_is_seen_although_both_arms_have_events() -> None:
    # control dies first, 1 and 2; then only the experimental arm is left, whose events tell nothing
    with pytest.raises(NotEstimable, match="every event with both arms at risk was in the control arm"):
        cox_two_arms([1, 2, 3, 4], [1, 1, 1, 1], [0, 0, 1, 1])


def test_direction_says_whether_the_event_is_bad() -> None:
    arguments = ([1, 2, 3, 4], [1, 0, 0, 0], [0, 0, 1, 1])
    bad, good = logrank(*arguments), logrank(*arguments, direction=-1)
    assert (bad.z, good.z) == (1.0, -1.0)
    assert bad.p_one_sided == pytest.approx(0.15865525393145707, rel=1e-14)
    assert good.p_one_sided == pytest.approx(0.8413447460685429, rel=1e-14)
    with pytest.raises(ValueError, match="direction is 0; accepted: 1 or -1"):
        logrank(*arguments, direction=0)  # type: ignore[arg-type]


def test_a_difference_of_nothing_is_zero_without_a_sign() -> None:
    arguments = ([1, 1, 2, 2], [1, 1, 0, 0], [0, 1, 0, 1])
    for direction in (1, -1):
        assert math.copysign(1.0, logrank(*arguments, direction=direction).z) == 1.0  # type: ignore[arg-type]


def test_p_value_is_kept_far_into_the_tail() -> None:
    n = 200
    time = np.arange(2.0 * n)
    result = logrank(time, np.ones(2 * n, dtype=bool), time >= n)
    assert result.z > 20
    assert 0.0 < result.p_one_sided < 1e-90
    assert result.p_two_sided == 2 * result.p_one_sided


def test_unknown_ties_are_a_bug_of_the_caller() -> None:
    with pytest.raises(ValueError, match="ties is 'efron'; accepted: 'Efron', 'Breslow', 'exact'"):
        cox_two_arms([1, 2, 3], [1, 1, 1], [0, 1, 0], ties="efron")


def test_arms_are_flags() -> None:
    for estimate in (logrank, cox_two_arms):
        with pytest.raises(ValueError, match=r"experimental holds np\.int64\(2\); accepted: True or False"):
            estimate([1, 2, 3], [1, 1, 1], [0, 1, 2])


def test_unbalanced_arms_still_converge() -> None:
    # one experimental subject among ten thousand, second to have the event of all
    n = 10_000
    time = np.arange(1.0, n + 1)
    experimental = np.zeros(n, dtype=bool)
    experimental[1] = True
    result = cox_two_arms(time, np.ones(n, dtype=bool), experimental)
    theta = result.hazard_ratio
    # score: 1 = theta / (n - 1 + theta) + theta / (n - 2 + theta)
    assert theta / (n - 1 + theta) + theta / (n - 2 + theta) == pytest.approx(1.0, rel=1e-9)


def test_running_out_of_steps_is_told_apart_from_no_estimate(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(cox, "MOST_STEPS", 1)
    with pytest.raises(AccuracyNotReached) as refused:
        cox_two_arms([1, 2, 3, 4], [1, 1, 1, 1], [0, 1, 0, 1])
    assert str(refused.value).startswith("The hazard ratio was not found. Found a last step of ")


def test_a_ratio_that_the_data_hardly_bound_has_no_interval() -> None:
    # stratum 0: the control subject has the event among 300,000 experimental ones; stratum 1 the reverse.
    # The estimate is 1, its standard error 387, and exp(1.96 * 387) is not a double
    n = 300_000
    first = np.arange(n + 1) == 0
    time = np.tile(np.where(first, 1.0, 2.0), 2)
    experimental = np.concatenate([~first, first])
    with pytest.raises(NotEstimable) as refused:
        cox_two_arms(time, np.tile(first, 2), experimental, stratum=np.repeat([0, 1], n + 1))
    assert refused.value.what == "no finite confidence interval: the data hardly bound the hazard ratio"
