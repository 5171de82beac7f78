"""What holds for every curve."""

from __future__ import annotations

import math
from dataclasses import fields

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.model.survival import SurvivalCurve
from app.model.values import Absent, Estimate
from app.survival import follow_up_median, kaplan_meier, kaplan_meier_by_arm
from app.survival.intervals import KINDS
from tests import naive
from tests.strategies import TwoArmSample, two_arm_samples, whole_days

kinds = st.sampled_from(list(KINDS))
COLUMNS = ("survival", "std_error", "ci_low", "ci_high")


def curve_of(sample: TwoArmSample, **settings: object) -> SurvivalCurve:
    return kaplan_meier(sample.time, sample.event, **settings)  # type: ignore[arg-type]


def word_or_none(estimate: Estimate) -> float | None:
    return None if isinstance(estimate, Absent) else estimate


@given(two_arm_samples())
def test_curve_is_the_literal_one(sample: TwoArmSample) -> None:
    curve, rows = curve_of(sample), naive.kaplan_meier(sample.time.tolist(), sample.event.tolist())
    assert curve.time.tolist() == [row.time for row in rows]
    assert curve.at_risk.tolist() == [row.at_risk for row in rows]
    assert curve.events.tolist() == [row.events for row in rows]
    assert curve.censored.tolist() == [row.censored for row in rows]
    assert curve.survival.tolist() == pytest.approx([float(row.survival) for row in rows], rel=1e-13)
    errors = [
        math.nan if row.variance_of_log is None else float(row.survival) * math.sqrt(row.variance_of_log)
        for row in rows
    ]
    assert curve.std_error.tolist() == pytest.approx(errors, rel=1e-12, abs=1e-15, nan_ok=True)


@given(two_arm_samples(), st.booleans())
def test_curves_by_arm_are_those_of_each_arm_alone(sample: TwoArmSample, one_arm_is_empty: bool) -> None:
    arm = sample.experimental & (not one_arm_is_empty)
    together = kaplan_meier_by_arm(sample.time, sample.event, arm)
    for curve, rows in zip(together, (~arm, arm), strict=True):
        alone = curve_of(sample.rows(np.flatnonzero(rows)))
        for field in fields(SurvivalCurve):
            np.testing.assert_array_equal(getattr(curve, field.name), getattr(alone, field.name))


@given(two_arm_samples())
def test_medians_are_the_literal_ones(sample: TwoArmSample) -> None:
    time, event = sample.time.tolist(), sample.event.tolist()
    assert word_or_none(curve_of(sample).median) == naive.median(naive.kaplan_meier(time, event))
    assert word_or_none(follow_up_median(time, event)) == naive.follow_up_median(time, event)


@given(two_arm_samples())
def test_rows_add_up(sample: TwoArmSample) -> None:
    curve = curve_of(sample)
    leaving = curve.events + curve.censored
    assert curve.at_risk[0] == sample.size
    assert (np.append(curve.at_risk[1:], 0) == curve.at_risk - leaving).all()
    assert curve.events.sum() == sample.event.sum()


@given(two_arm_samples(), kinds, st.sampled_from([0.5, 0.9, 0.95, 0.999]))
def test_limits_enclose_the_curve_and_are_absent_exactly_at_0_and_1(
    sample: TwoArmSample, kind: str, level: float
) -> None:
    curve = curve_of(sample, interval=kind, level=level)
    inside = (curve.survival > 0) & (curve.survival < 1)
    assert (np.isfinite(curve.ci_low) == inside).all()
    assert (np.isfinite(curve.ci_high) == inside).all()
    low, survival, high = curve.ci_low[inside], curve.survival[inside], curve.ci_high[inside]
    assert ((low >= 0) & (low <= survival) & (survival <= high) & (high <= 1)).all()


@given(two_arm_samples(), kinds)
def test_a_higher_level_gives_wider_limits(sample: TwoArmSample, kind: str) -> None:
    narrow, wide = curve_of(sample, interval=kind, level=0.8), curve_of(sample, interval=kind, level=0.99)
    inside = np.isfinite(narrow.ci_low)
    assert (wide.ci_low[inside] <= narrow.ci_low[inside]).all()
    assert (wide.ci_high[inside] >= narrow.ci_high[inside]).all()


@given(two_arm_samples(), st.randoms(use_true_random=False))
def test_order_of_the_rows_does_not_matter(sample: TwoArmSample, random: object) -> None:
    order = np.array(random.sample(range(sample.size), sample.size))  # type: ignore[attr-defined]
    one, other = curve_of(sample), curve_of(sample.rows(order))
    assert (one.time == other.time).all()
    for column in COLUMNS:
        assert np.array_equal(getattr(one, column), getattr(other, column), equal_nan=True)


@given(two_arm_samples(whole_days), st.sampled_from([0.125, 0.5, 2.0, 30.4375]))
def test_another_unit_of_time_changes_only_the_times(sample: TwoArmSample, factor: float) -> None:
    # whole days are counted, other times sorted: both ways must give the same curve
    one, other = curve_of(sample), curve_of(sample.but(time=sample.time * factor))
    assert other.time.tolist() == (one.time * factor).tolist()
    for column in COLUMNS:
        assert np.array_equal(getattr(one, column), getattr(other, column), equal_nan=True)
    if isinstance(one.median, float):
        assert other.median == pytest.approx(one.median * factor, rel=1e-15)


@given(two_arm_samples())
def test_every_subject_twice_keeps_the_curve_and_divides_its_variance_by_two(sample: TwoArmSample) -> None:
    one, twice = curve_of(sample), curve_of(sample.rows(np.tile(np.arange(sample.size), 2)))
    assert twice.survival.tolist() == pytest.approx(one.survival.tolist(), rel=1e-13)
    halved = (one.std_error / math.sqrt(2)).tolist()
    assert twice.std_error.tolist() == pytest.approx(halved, rel=1e-12, abs=1e-15, nan_ok=True)


@given(two_arm_samples())
def test_without_censoring_the_curve_is_the_share_still_without_the_event(sample: TwoArmSample) -> None:
    curve = kaplan_meier(sample.time, np.ones(sample.size, dtype=bool))
    share = [(sample.time > at).mean() for at in curve.time]
    assert curve.survival.tolist() == pytest.approx(share, rel=1e-12, abs=1e-15)
