"""Weighted tests, landmarks, restricted means, models, incidence: where the data hardly carry them."""

from __future__ import annotations

import math
import sys
from dataclasses import replace

import numpy as np
import pytest

from app.errors import AccuracyNotReached, NotEstimable
from app.model.survival import RatioOverTime
from app.model.values import Absent
from app.survival import (
    baseline_hazard,
    cause_specific_ratio,
    compare_landmarks,
    compare_restricted_means,
    completeness,
    cox_regression,
    cox_two_arms,
    cumulative_incidence,
    fleming_harrington,
    gray_test,
    groups_logrank,
    hazard_ratio_over_time,
    interaction,
    kaplan_meier,
    kaplan_meier_by_arm,
    landmark,
    largest_common_time,
    log_log_curve,
    logrank,
    nelson_aalen,
    period_ratios,
    permutation,
    permutation_logrank,
    pike_ratio,
    proportionality,
    quantile,
    restricted_mean,
    scaled_residuals,
    trend_logrank,
    weighted_logrank,
    weighted_maximum,
)

ONE_ARM = "all subjects are in one arm"
NO_EVENT = "no event was observed"
LATE = fleming_harrington(0, 1)


def reason_of(estimate: object, *arguments: object, **settings: object) -> str:
    with pytest.raises(NotEstimable) as refused:
        estimate(*arguments, **settings)  # type: ignore[operator]
    return refused.value.what


UNDECIDED = {
    "nobody": ([], [], [], "no subjects"),
    "one subject": ([3], [1], [1], ONE_ARM),
    "no event": ([1, 2, 3, 4], [0, 0, 0, 0], [0, 1, 0, 1], NO_EVENT),
}


@pytest.mark.parametrize("case", UNDECIDED)
def test_the_same_reason_is_said_by_every_comparison(case: str) -> None:
    time, event, arm, reason = UNDECIDED[case]
    assert reason_of(weighted_logrank, time, event, arm, weight=LATE) == reason
    assert reason_of(weighted_maximum, time, event, arm, weights=[LATE]) == reason
    assert reason_of(proportionality, time, event, arm) == reason
    assert reason_of(permutation_logrank, time, event, arm, random=np.random.default_rng(1)) == reason


def test_a_late_weight_says_nothing_where_only_the_first_event_tells_the_arms_apart() -> None:
    arguments = ([1, 2, 3, 4], [1, 0, 0, 0], [0, 0, 1, 1])
    assert reason_of(weighted_logrank, *arguments, weight=LATE) == (
        "the Fleming-Harrington (0, 1) weight is 0 at every event that tells the arms apart"
    )


@pytest.mark.parametrize("wrong", [-0.5, math.inf, math.nan])
def test_exponents_of_a_weight_are_not_negative(wrong: float) -> None:
    with pytest.raises(ValueError, match=r"gamma is .+; accepted: a number >= 0"):
        fleming_harrington(0, wrong)


def test_groups_that_no_event_tells_apart() -> None:
    assert reason_of(groups_logrank, [1, 2], [0, 0], [0, 1]) == "no event tells two groups apart"
    assert reason_of(trend_logrank, [1, 2, 3, 4], [1, 1, 0, 0], [0, 1, 0, 1], scores=[2, 2]) == (
        "no event tells groups of different scores apart"
    )
    with pytest.raises(ValueError, match=r"scores has shape \(3,\); accepted: \(2,\), one for each group"):
        trend_logrank([1, 2, 3], [1, 1, 1], [0, 1, 0], scores=[1, 2, 3])


def test_a_group_that_nobody_is_in_takes_no_degree_of_freedom() -> None:
    time, event = [1, 2, 3, 4, 5, 6], [1] * 6
    two, with_a_gap = groups_logrank(time, event, [0, 1] * 3), groups_logrank(time, event, [0, 3] * 3)
    assert with_a_gap.degrees_of_freedom == 1
    assert with_a_gap.chi_square == pytest.approx(two.chi_square)
    assert with_a_gap.expected.tolist()[1:3] == [0.0, 0.0]


def test_a_landmark_beyond_the_end_of_a_curve_is_not_known_unless_nobody_was_left() -> None:
    ended = kaplan_meier([1, 2, 3], [1, 1, 1])
    assert landmark(ended, 9).survival == 0.0
    assert isinstance(landmark(ended, 9).ci_low, Absent)
    open_ended = kaplan_meier([1, 2, 3], [1, 1, 0])
    assert landmark(open_ended, 9).survival == Absent(
        "not estimable: nobody is followed to time 9, and the curve ends above 0 at 3"
    )
    assert landmark(open_ended, 3).survival == pytest.approx(1 / 3)


def test_a_landmark_before_the_first_event_is_1_without_limits() -> None:
    found = landmark(kaplan_meier([2, 3], [1, 0]), 1)
    assert (found.survival, found.std_error) == (1.0, 0.0)
    assert isinstance(found.ci_high, Absent)
    assert landmark(kaplan_meier([], []), 1).survival == Absent("no subjects")


def test_landmarks_compare_on_each_scale_that_exists() -> None:
    control, experimental = kaplan_meier([1, 2, 3, 4], [1, 1, 0, 0]), kaplan_meier([3, 3, 4, 5], [1, 0, 0, 0])
    found = compare_landmarks(control, experimental, 2)
    assert found.difference == 0.5
    assert [isinstance(test.chi_square, float) for test in found.tests] == [True, False, False, False, False]
    alike = compare_landmarks(control, control, 0.5)
    assert isinstance(alike.std_error, Absent)
    assert isinstance(alike.ci_low, Absent)
    gone = compare_landmarks(kaplan_meier([1], [1]), experimental, 3)
    assert gone.difference == 0.75
    assert all(isinstance(test.p_two_sided, Absent) for test in gone.tests)
    beyond = compare_landmarks(control, experimental, 9)
    assert isinstance(beyond.difference, Absent)
    assert beyond.difference.reason.startswith("not estimable: nobody is followed to time 9")
    assert beyond.difference == beyond.ci_low == beyond.tests[0].chi_square


def test_limits_of_a_difference_stay_between_minus_1_and_1() -> None:
    few, more = kaplan_meier([1, 2], [1, 0]), kaplan_meier([1, 3, 3, 3], [1, 0, 0, 0])
    found = compare_landmarks(few, more, 1)
    assert (found.ci_low, found.ci_high) == (pytest.approx(-0.562, abs=1e-3), 1.0)


def test_a_restricted_mean_needs_follow_up_so_far() -> None:
    curve = kaplan_meier([1, 2, 3], [1, 1, 0])
    assert restricted_mean(curve, 3).mean == pytest.approx(1 + 2 / 3 + 1 / 3)
    assert "nobody is followed to time 3.5" in reason_of(restricted_mean, curve, 3.5)
    ended = kaplan_meier([1, 2], [1, 1])
    assert restricted_mean(ended, 10).mean == 1.5
    with pytest.raises(ValueError, match=r"at is 0; accepted: a finite number > 0"):
        restricted_mean(curve, 0)


def test_restricted_means_without_an_event_have_no_error_to_compare_by() -> None:
    curve = kaplan_meier([5, 6], [0, 0])
    assert reason_of(compare_restricted_means, curve, curve, 4) == (
        "no event that leaves someone at risk fell before time 4 in either arm"
    )
    assert largest_common_time(curve, kaplan_meier([2, 3], [1, 0])) == 3.0
    assert largest_common_time(curve, kaplan_meier([], [])) == Absent("no subjects")


def test_a_mean_of_0_has_no_ratio() -> None:
    found = compare_restricted_means(kaplan_meier([0, 0], [1, 1]), kaplan_meier([1, 5], [1, 0]), 4)
    assert found.ratio == Absent("not estimable: one of the means is 0")
    assert not isinstance(found.ratio_of_time_lost, Absent)


def test_the_hazard_before_the_first_event_is_0_without_limits() -> None:
    hazard = nelson_aalen([1, 2, 3], [0, 1, 1])
    assert hazard.hazard.tolist() == [0.0, 0.5, 1.5]
    assert np.isnan(hazard.ci_low).tolist() == [True, False, False]
    plain = nelson_aalen([1, 2, 3], [0, 1, 1], interval="plain")
    assert plain.ci_low.tolist()[1:] == [0.0, 0.0]
    assert nelson_aalen([], []).hazard.size == 0


def test_quantiles_and_log_log_points_are_only_where_they_exist() -> None:
    curve = kaplan_meier([0, 1, 2, 3], [1, 1, 0, 1])
    assert quantile(curve, 0.25).time == 0.5  # the curve is 0.75 from 0 until the event at 1
    assert quantile(kaplan_meier([1, 2], [0, 0]), 0.5).time == Absent("not reached")
    assert log_log_curve(curve).time.tolist() == [1.0]  # time 0 has no logarithm, survival 0 neither
    with pytest.raises(ValueError, match=r"share is 1\.0; accepted: a number between 0 and 1"):
        quantile(curve, 1.0)


def test_completeness_by_hand() -> None:
    # events are complete at 10; of 8 and 6 possible, 4 and 6 were seen
    found = completeness([10, 4, 6], [1, 0, 0], [20, 8, 6])
    assert (found.observed, found.potential, found.share) == (20.0, 24.0, 20 / 24)
    assert reason_of(completeness, [], [], []) == "no subjects"
    assert reason_of(completeness, [0.0], [1], [3.0]) == "no follow-up: every time is 0"
    with pytest.raises(ValueError, match=r"potential holds np\.float64\(3\.0\) at time np\.float64\(4\.0\)"):
        completeness([4], [0], [3])


def test_a_ratio_of_observed_to_expected_needs_an_event_in_each_arm() -> None:
    test = logrank([1, 2, 3, 4], [1, 1, 0, 0], [0, 0, 1, 1])
    assert reason_of(pike_ratio, test) == "no event in one of the arms"


def test_all_allocations_of_a_small_trial_are_listed() -> None:
    # of the 6 ways to choose two of four subjects, the one observed is the most favourable alone
    found = permutation_logrank([1, 2, 3, 4], [1, 1, 1, 1], [0, 0, 1, 1], random=np.random.default_rng(1))
    assert (found.p_one_sided, found.p_two_sided) == (1 / 6, 2 / 6)
    assert (found.seen, found.listed_all, found.error_two_sided) == (6, True, 0.0)


def test_drawn_allocations_come_near_the_listed_and_repeat_with_their_seed(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    time = np.array([1.0, 2, 3, 4, 5, 6, 7, 8, 9, 10])
    event, arm = time % 4 > 0, time % 3 == 0
    listed = permutation_logrank(time, event, arm, random=np.random.default_rng(1))
    monkeypatch.setattr(permutation, "MOST_LISTED", 0)
    drawn, again = (
        permutation_logrank(time, event, arm, random=np.random.default_rng(7), permutations=4000)
        for _ in range(2)
    )
    assert drawn == again
    assert abs(drawn.p_two_sided - listed.p_two_sided) < 4 * drawn.error_two_sided
    unequal = permutation_logrank(
        time, event, arm, random=np.random.default_rng(7), follow_up="unequal", permutations=400
    )
    assert 0.0 < unequal.p_two_sided <= 1.0


def test_a_covariate_that_cannot_be_told_from_others_is_named() -> None:
    time, event = [1, 2, 3, 4, 5], [1, 1, 1, 0, 1]
    assert reason_of(cox_regression, time, event, [2.0] * 5) == (
        "covariate 0 is the same for all who are at risk together at any event"
    )
    x = np.array([1.0, 3, 2, 5, 4])
    assert reason_of(cox_regression, time, event, np.column_stack([x, 2 * x + 1])) == (
        "a covariate follows from the others among those at risk"
    )
    assert reason_of(cox_regression, [1, 2], [0, 0], [1, 2]) == NO_EVENT
    assert reason_of(cox_regression, [], [], np.empty((0, 1))) == "no subjects"


@pytest.mark.parametrize(
    ("covariates", "sentence"),
    [
        ([1.0], r"covariates has shape \(1, 1\); accepted: \(2, p\), a row as time"),
        ([1.0, math.nan], r"covariates holds np\.float64\(nan\); accepted: finite numbers"),
    ],
)
def test_covariates_are_checked(covariates: list[float], sentence: str) -> None:
    with pytest.raises(ValueError, match=sentence):
        cox_regression([1, 2], [1, 0], covariates)


@pytest.mark.parametrize("ties", ["Efron", "Breslow", "exact"])
def test_a_likelihood_that_keeps_rising_keeps_its_other_tests(ties: str) -> None:
    time, event, arm = [1, 2, 3, 4, 5], [1, 1, 0, 0, 0], [1, 1, 0, 0, 0]
    model = cox_regression(time, event, np.column_stack([arm, [1.0, 2, 3, 1, 2]]), ties=ties)
    assert isinstance(model.estimate, Absent)
    assert model.estimate.reason.startswith("no finite estimate: the likelihood keeps rising")
    assert isinstance(model.wald, Absent)
    assert math.isfinite(model.likelihood_ratio.chi_square)
    assert model.score.p < 1.0


def test_running_out_of_steps_is_not_said_to_be_without_estimate(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys.modules["app.survival.cox_regression"], "MOST_STEPS", 1)
    with pytest.raises(AccuracyNotReached, match="coefficients were not found"):
        cox_regression([1, 2, 3, 4], [1, 1, 1, 1], [0.0, 1.0, 0.5, 0.7])


def test_exact_ties_are_refused_above_their_size_and_not_below() -> None:
    n = 3000
    x = np.arange(2.0 * n) % 7
    time = np.concatenate([np.ones(n), np.arange(2.0, n + 2)])
    assert reason_of(cox_regression, time, np.ones(2 * n), x, ties="exact") == (
        "exact ties take too long with 6,000 subjects and up to 3,000 events at one time "
        "(at most 20,000 subjects and 2,000,000 sums); take Efron's treatment"
    )
    assert math.isfinite(cox_two_arms(time, np.ones(2 * n), x > 3, ties="exact").log_hazard_ratio)


def test_a_huge_effect_neither_overflows_nor_warns() -> None:
    x = np.array([800.0, 900, -700, 850, -900, 20, 30, -40])
    event = np.array([1, 1, 1, 0, 1, 1, 1, 0])
    model = cox_regression(np.arange(1.0, 9.0), event, x)
    assert not isinstance(model.estimate, Absent)
    hazard = baseline_hazard(np.arange(1.0, 9.0), event, x, model.estimate.coefficients)
    assert np.isfinite(hazard.cumulative).all()


def test_nothing_changes_with_time_where_events_fall_at_one_time() -> None:
    assert reason_of(proportionality, [1, 1, 2, 2], [1, 1, 0, 0], [0, 1, 0, 1]) == (
        "all events that tell the arms apart fell at one time, so nothing can change with time"
    )
    arguments = ([0, 1, 2, 3, 4, 5], [1, 1, 1, 1, 0, 0], [0, 1, 0, 1, 0, 1])
    assert reason_of(proportionality, *arguments, transform="log") == (
        "an event at time 0 has no place on the log scale of time"
    )
    with pytest.raises(ValueError, match="transform is 'KM'; accepted: 'identity', 'log', 'rank', 'km'"):
        proportionality(*arguments, transform="KM")


def test_few_event_times_have_residuals_but_no_smooth() -> None:
    found = scaled_residuals([1, 2, 3, 4, 5, 6], [1, 1, 1, 0, 0, 0], [0, 1, 0, 1, 0, 1])
    assert found.residuals.shape == (3, 1)
    assert found.smooth == (Absent("a smooth curve needs events spread over 5 times or more"),)


def ratio_of(event: list[int], arm: list[int], **settings: float) -> RatioOverTime:
    return hazard_ratio_over_time(scaled_residuals(range(1, len(event) + 1), event, arm), **settings)


def test_the_ratio_over_time_is_the_smooth_with_its_limits() -> None:
    event, arm = [1, 1, 0, 1, 1, 1, 0, 1, 1, 1], [0, 1, 0, 1, 0, 0, 1, 1, 0, 1]
    found = scaled_residuals(range(1, 11), event, arm)
    smooth, ratio = found.smooth[0], ratio_of(event, arm, level=0.9)
    assert not isinstance(smooth, Absent)
    assert ratio.log_hazard_ratio.tolist() == smooth.value.tolist()
    assert ratio.hazard_ratio == pytest.approx(np.exp(smooth.value), rel=1e-14)
    # 1.6448536269514722 is the 95th percentile of the normal distribution
    assert ratio.ci_low == pytest.approx(np.exp(smooth.value - 1.6448536269514722 * smooth.std_error))
    assert ratio.ci_high == pytest.approx(np.exp(smooth.value + 1.6448536269514722 * smooth.std_error))
    assert ratio.level == 0.9


def test_the_ratio_over_time_runs_from_the_first_event_to_the_last_and_counts_them() -> None:
    event, arm = [1, 1, 0, 1, 1, 1, 0, 1, 1, 1], [0, 1, 0, 1, 0, 0, 1, 1, 0, 1]
    ratio = ratio_of(event, arm)
    assert (ratio.time[0], ratio.time[-1]) == (1, 10)
    assert (ratio.events[0], ratio.events[-1]) == (1, 8)
    times = [time for time, happened in enumerate(event, 1) if happened]
    assert ratio.events.tolist() == [sum(time <= at for time in times) for at in ratio.time]


def test_a_place_between_two_events_lies_between_their_times_as_on_the_scale() -> None:
    event, arm = [1, 1, 0, 1, 1, 1, 0, 1, 1, 1], [0, 1, 0, 1, 0, 0, 1, 1, 0, 1]
    found = scaled_residuals(range(1, 11), event, arm)
    smooth = found.smooth[0]
    assert not isinstance(smooth, Absent)
    for place, time in zip(smooth.on_scale, smooth.time, strict=True):
        after = int(np.searchsorted(found.on_scale, place))
        if after == 0 or found.on_scale[after] == place:
            assert time == pytest.approx(found.time[after])
            continue
        low, high = found.on_scale[after - 1], found.on_scale[after]
        share = (place - low) / (high - low)
        start, end = found.time[after - 1], found.time[after]
        assert time == pytest.approx(start + share * (end - start))


def test_the_other_arm_sees_the_same_curve_turned() -> None:
    event, arm = [1, 1, 0, 1, 1, 1, 0, 1, 1, 1], [0, 1, 0, 1, 0, 0, 1, 1, 0, 1]
    one, other = ratio_of(event, arm), ratio_of(event, [1 - of for of in arm])
    assert other.log_hazard_ratio == pytest.approx(-one.log_hazard_ratio, abs=1e-12)
    assert other.ci_low == pytest.approx(1 / one.ci_high, rel=1e-12)
    assert other.time.tolist() == one.time.tolist()


def test_without_a_smooth_there_is_no_ratio_over_time() -> None:
    found = scaled_residuals([1, 2, 3, 4, 5, 6], [1, 1, 1, 0, 0, 0], [0, 1, 0, 1, 0, 1])
    assert reason_of(hazard_ratio_over_time, found) == (
        "a smooth curve needs events spread over 5 times or more"
    )


def test_limits_that_no_number_can_hold_are_said() -> None:
    found = scaled_residuals(range(1, 9), [1] * 8, [0, 1, 0, 1, 1, 0, 1, 0])
    smooth = found.smooth[0]
    assert not isinstance(smooth, Absent)
    wide = replace(found, smooth=(replace(smooth, std_error=smooth.std_error + 400),))
    assert reason_of(hazard_ratio_over_time, wide) == (
        "the limits of the smooth curve are wider than numbers go"
    )
    with pytest.raises(ValueError, match="level is 1"):
        hazard_ratio_over_time(found, level=1)


def test_events_heaped_at_one_time_have_residuals_but_no_smooth() -> None:
    time = [1, 2, 3, 4, 5, 5, 5, 5, 5, 5, 6, 7]
    found = scaled_residuals(time, [1] * 10 + [0, 0], [0, 1] * 6)
    assert found.smooth == (Absent("a smooth curve needs events spread over 5 times or more"),)


def test_a_period_without_estimate_says_so_and_others_stand() -> None:
    time, event, arm = [1, 2, 3, 4, 5, 6], [1, 1, 1, 1, 0, 0], [0, 1, 0, 1, 0, 1]
    early, late = period_ratios(time, event, arm, cuts=[4.0])
    assert (early.events, late.events) == (4, 0)
    assert not isinstance(early.ratio, Absent)
    assert late.ratio == Absent(NO_EVENT)
    with pytest.raises(ValueError, match=r"cuts is \[3, 2\]; accepted: increasing times > 0"):
        period_ratios(time, event, arm, cuts=[3, 2])


def test_an_interaction_needs_two_subgroups() -> None:
    arguments = ([1, 2, 3, 4], [1, 1, 1, 0], [0, 1, 0, 1])
    assert reason_of(interaction, *arguments, [2, 2, 2, 2]) == "there are not two subgroups to compare"


def test_a_cause_that_nobody_has_has_an_incidence_of_0() -> None:
    found = cumulative_incidence([1, 2, 3], [1, 1, 0], of=2)
    assert found.incidence.tolist() == [0.0, 0.0]
    assert np.isnan(found.ci_low).all()
    everybody = cumulative_incidence([1, 2], [1, 1])
    assert everybody.incidence.tolist() == [0.5, 1.0]
    assert np.isnan(everybody.ci_high).tolist() == [False, True]
    assert cumulative_incidence([], []).time.size == 0
    with pytest.raises(ValueError, match="of is 0; accepted: a cause from 1"):
        cumulative_incidence([1], [1], of=0)


def test_one_cause_against_another_by_group() -> None:
    assert reason_of(gray_test, [1, 2], [0, 0], [0, 1]) == "no event of the cause tells two groups apart"
    assert reason_of(gray_test, [], [], []) == "no subjects"
    time, cause, arm = [1, 2, 3, 4, 5, 6], [1, 2, 1, 2, 1, 0], [0, 0, 1, 1, 0, 1]
    as_censored = cox_two_arms(time, [c == 1 for c in cause], arm)
    assert cause_specific_ratio(time, cause, arm) == as_censored
    assert kaplan_meier_by_arm(time, [c > 0 for c in cause], arm)[1].at_risk[0] == 3
