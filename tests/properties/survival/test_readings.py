"""What holds for every reading of a curve: hazards, landmarks, quantiles, restricted means, incidence."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import NotEstimable
from app.model.values import Absent
from app.survival import (
    compare_landmarks,
    compare_restricted_means,
    completeness,
    counts_at,
    cumulative_incidence,
    gray_test,
    kaplan_meier,
    kaplan_meier_by_arm,
    landmark,
    nelson_aalen,
    quantile,
    restricted_mean,
)
from tests import naive
from tests.strategies import TwoArmSample, two_arm_samples

CLOSE = {"rel": 1e-11, "abs": 1e-13}
moments = st.floats(0.25, 16.0).map(lambda value: round(value * 8) / 8)


@given(two_arm_samples())
def test_cumulative_hazard_is_the_literal_one(sample: TwoArmSample) -> None:
    ours = nelson_aalen(sample.time, sample.event)
    theirs = naive.cumulative_hazard(sample.time.tolist(), sample.event.tolist())
    assert ours.hazard.tolist() == pytest.approx([float(h) for h, _ in theirs], **CLOSE)
    assert ours.std_error.tolist() == pytest.approx([math.sqrt(v) for _, v in theirs], **CLOSE)


@given(two_arm_samples(), moments)
def test_landmark_is_the_literal_survival(sample: TwoArmSample, at: float) -> None:
    found = landmark(kaplan_meier(sample.time, sample.event), at)
    rows = naive.kaplan_meier(sample.time.tolist(), sample.event.tolist())
    known = at <= rows[-1].time or rows[-1].survival == 0
    assert isinstance(found.survival, float) is known
    if known:
        assert found.survival == pytest.approx(float(naive.survival_at(rows, at)), **CLOSE)


@given(two_arm_samples(), moments)
def test_restricted_mean_is_the_literal_area(sample: TwoArmSample, at: float) -> None:
    curve = kaplan_meier(sample.time, sample.event)
    if isinstance(landmark(curve, at).survival, Absent):
        with pytest.raises(NotEstimable, match="Not estimable: nobody is followed to time"):
            restricted_mean(curve, at)
        return
    mean, variance = naive.restricted_mean(sample.time.tolist(), sample.event.tolist(), at)
    ours = restricted_mean(curve, at)
    assert [ours.mean, ours.std_error**2] == pytest.approx([mean, variance], rel=1e-10, abs=1e-12)


@given(two_arm_samples(), moments)
def test_swapping_the_arms_turns_differences_and_inverts_ratios(sample: TwoArmSample, at: float) -> None:
    one, other = kaplan_meier_by_arm(sample.time, sample.event, sample.experimental)
    try:
        means, turned = compare_restricted_means(one, other, at), compare_restricted_means(other, one, at)
        landmarks, mirrored = compare_landmarks(one, other, at), compare_landmarks(other, one, at)
    except NotEstimable:
        return
    assert turned.difference == -means.difference
    assert [turned.ci_low, turned.ci_high] == pytest.approx([-means.ci_high, -means.ci_low], **CLOSE)
    if not isinstance(means.ratio, Absent):
        assert not isinstance(turned.ratio, Absent)
        assert turned.ratio.ratio == pytest.approx(1 / means.ratio.ratio, rel=1e-12)
    assert not isinstance(landmarks.difference, Absent)
    assert mirrored.difference == -landmarks.difference
    assert [test.chi_square for test in mirrored.tests] == [test.chi_square for test in landmarks.tests]


@given(two_arm_samples(), st.lists(moments, min_size=1, max_size=5))
def test_counts_at_any_times_add_up_to_the_subjects(sample: TwoArmSample, times: list[float]) -> None:
    counts = counts_at(kaplan_meier(sample.time, sample.event), times)
    assert (counts.at_risk + counts.events + counts.censored == sample.size).all()
    assert counts.at_risk.tolist() == [(sample.time >= at).sum() for at in times]


@given(two_arm_samples())
def test_quantiles_come_in_order_and_one_half_is_the_median(sample: TwoArmSample) -> None:
    curve = kaplan_meier(sample.time, sample.event)
    found = [quantile(curve, share) for share in (0.1, 0.5, 0.9)]
    known = [one.time for one in found if isinstance(one.time, float)]
    assert known == sorted(known)
    assert (found[1].time, found[1].ci_low, found[1].ci_high) == (
        curve.median,
        curve.median_ci_low,
        curve.median_ci_high,
    )


@given(two_arm_samples())
def test_follow_up_to_the_end_is_complete_and_less_is_less(sample: TwoArmSample) -> None:
    if sample.time.any():
        assert completeness(sample.time, sample.event, sample.time).share == 1.0
        longer = completeness(sample.time, sample.event, sample.time + 1.0)
        assert longer.share <= 1.0
        assert (longer.share < 1.0) is bool((~sample.event).any())


@given(two_arm_samples(), st.sampled_from([1, 2]))
def test_incidence_is_the_literal_one_and_causes_add_up(sample: TwoArmSample, of: int) -> None:
    cause = np.where(sample.event, 1 + sample.experimental, 0)
    ours = cumulative_incidence(sample.time, cause, of=of)
    theirs = naive.cumulative_incidence(sample.time.tolist(), cause.tolist(), of)
    assert ours.time.tolist() == [at for at, _ in theirs]
    assert ours.incidence.tolist() == pytest.approx([float(value) for _, value in theirs], **CLOSE)
    both = cumulative_incidence(sample.time, cause, of=3 - of)
    survival = kaplan_meier(sample.time, sample.event)
    at = np.searchsorted(survival.time, ours.time)
    left = 1 - ours.incidence - both.incidence
    assert left.tolist() == pytest.approx(survival.survival[at].tolist(), abs=1e-12)


@given(two_arm_samples())
def test_without_other_causes_incidence_is_one_minus_the_curve(sample: TwoArmSample) -> None:
    incidence = cumulative_incidence(sample.time, sample.event.astype(int))
    curve = kaplan_meier(sample.time, sample.event)
    at = np.searchsorted(curve.time, incidence.time)
    assert incidence.incidence.tolist() == pytest.approx((1 - curve.survival[at]).tolist(), abs=1e-12)
    inside = curve.survival[at] > 0
    assert incidence.std_error[inside].tolist() == pytest.approx(
        curve.std_error[at][inside].tolist(), rel=1e-6, abs=1e-9
    )


@given(two_arm_samples())
def test_gray_s_test_does_not_mind_the_names_of_the_groups(sample: TwoArmSample) -> None:
    cause = np.where(sample.event, 1 + (sample.stratum == 1), 0)
    group = sample.experimental.astype(int)
    try:
        one = gray_test(sample.time, cause, group)
    except NotEstimable:
        return
    other = gray_test(sample.time, cause, 1 - group)
    assert other.chi_square == pytest.approx(one.chi_square, rel=1e-8, abs=1e-10)
    assert one.score.sum() == pytest.approx(0.0, abs=1e-9)
