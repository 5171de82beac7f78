"""What holds for every weighted test, for the largest of several and for several groups."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.errors import NotEstimable
from app.model.survival import WeightedResult
from app.survival import (
    GEHAN_BRESLOW,
    LOG_RANK,
    PETO_PETO,
    TARONE_WARE,
    Weight,
    fleming_harrington,
    groups_logrank,
    logrank,
    logrank_steps,
    trend_logrank,
    two_arm_events,
    weighted_logrank,
    weighted_maximum,
)
from tests import naive
from tests.strategies import TwoArmSample, two_arm_samples

CLOSE = {"rel": 1e-11, "abs": 1e-11}

LITERAL: dict[str, tuple[Weight, Callable[..., float]]] = {
    "log-rank": (LOG_RANK, lambda n, d, before: 1.0),
    "Gehan-Breslow": (GEHAN_BRESLOW, lambda n, d, before: float(n)),
    "Tarone-Ware": (TARONE_WARE, lambda n, d, before: math.sqrt(n)),
    "early": (fleming_harrington(1, 0), lambda n, d, before: float(before)),
    "late": (fleming_harrington(0, 1), lambda n, d, before: float(1 - before)),
    "middle": (
        fleming_harrington(0.5, 2),
        lambda n, d, before: float(before) ** 0.5 * float(1 - before) ** 2,
    ),
}
weights = st.sampled_from([weight for weight, _ in LITERAL.values()] + [PETO_PETO])


def weighted_of(sample: TwoArmSample, weight: Weight, *, strata: bool = True) -> WeightedResult | None:
    """The result, or None where there is none."""
    try:
        return weighted_logrank(
            sample.time,
            sample.event,
            sample.experimental,
            weight=weight,
            stratum=sample.stratum if strata else None,
        )
    except NotEstimable:
        return None


@given(two_arm_samples(), st.sampled_from(list(LITERAL)), st.booleans())
def test_score_and_variance_are_the_literal_ones(sample: TwoArmSample, name: str, strata: bool) -> None:
    weight, literal = LITERAL[name]
    score, variance = naive.weighted_logrank(
        sample.time.tolist(),
        sample.event.tolist(),
        sample.experimental.tolist(),
        literal,
        sample.stratum.tolist() if strata else None,
    )
    result = weighted_of(sample, weight, strata=strata)
    if result is None:
        assert variance == pytest.approx(0.0, abs=1e-20)
    else:
        assert [result.score, result.variance] == pytest.approx([score, variance], **CLOSE)


@given(two_arm_samples(), weights)
def test_swapping_the_arms_only_turns_the_sign(sample: TwoArmSample, weight: Weight) -> None:
    one = weighted_of(sample, weight)
    other = weighted_of(sample.but(experimental=~sample.experimental), weight)
    assert (one is None) == (other is None)
    if one and other:
        assert other.z == pytest.approx(-one.z, **CLOSE)


@given(two_arm_samples(), weights)
def test_only_the_order_of_the_times_matters(sample: TwoArmSample, weight: Weight) -> None:
    ranks = np.unique(sample.time, return_inverse=True)[1]
    one, other = weighted_of(sample, weight), weighted_of(sample.but(time=ranks**2 / 8 + 0.3), weight)
    assert (one is None) == (other is None)
    if one and other:
        assert [other.z, other.variance] == pytest.approx([one.z, one.variance], **CLOSE)


@given(two_arm_samples())
def test_equal_weights_are_the_logrank_test_and_its_steps_add_up(sample: TwoArmSample) -> None:
    result = weighted_of(sample, fleming_harrington(0, 0))
    if result:
        arguments = (sample.time, sample.event, sample.experimental)
        plain = logrank(*arguments, stratum=sample.stratum)
        assert result.z == pytest.approx(plain.z, **CLOSE)
        steps = logrank_steps(two_arm_events(*arguments, sample.stratum))
        assert [steps.observed.sum(), steps.expected.sum(), steps.variance.sum()] == pytest.approx(
            [plain.observed, plain.expected, plain.variance], **CLOSE
        )


@settings(max_examples=25)
@given(two_arm_samples())
def test_a_maximum_lies_between_one_test_and_the_bonferroni_bound(sample: TwoArmSample) -> None:
    shapes = [fleming_harrington(0, 0), fleming_harrington(1, 0), fleming_harrington(0, 1)]
    try:
        result = weighted_maximum(sample.time, sample.event, sample.experimental, weights=shapes)
    except NotEstimable:
        return
    smallest = min(test.p_two_sided for test in result.tests)
    assert smallest * (1 - 1e-9) <= result.p_two_sided <= min(1.0, 3 * smallest) * (1 + 1e-6)
    assert abs(result.z) == max(abs(test.z) for test in result.tests)


@settings(max_examples=25)
@given(two_arm_samples())
def test_a_maximum_of_one_test_or_of_copies_is_that_test(sample: TwoArmSample) -> None:
    one = weighted_of(sample, GEHAN_BRESLOW, strata=False)
    if one:
        arguments = (sample.time, sample.event, sample.experimental)
        for copies in (1, 3):
            result = weighted_maximum(*arguments, weights=[GEHAN_BRESLOW] * copies)
            assert result.p_two_sided == pytest.approx(one.p_two_sided, rel=1e-12)


@given(two_arm_samples(), weights)
def test_two_groups_are_the_two_arm_test_and_a_trend_over_them_too(
    sample: TwoArmSample, weight: Weight
) -> None:
    one = weighted_of(sample, weight)
    if one:
        arguments = (sample.time, sample.event, sample.experimental.astype(int))
        groups = groups_logrank(*arguments, stratum=sample.stratum, weight=weight)
        trend = trend_logrank(*arguments, stratum=sample.stratum, weight=weight)
        assert groups.degrees_of_freedom == 1
        assert [groups.chi_square, trend.chi_square] == pytest.approx(
            [one.chi_square] * 2, rel=1e-9, abs=1e-9
        )
        assert trend.z == pytest.approx(-one.z, rel=1e-9, abs=1e-9)


@given(two_arm_samples(), st.permutations([0, 1, 2]))
def test_names_of_the_groups_do_not_matter_and_rows_add_up(sample: TwoArmSample, names: list[int]) -> None:
    try:
        one = groups_logrank(sample.time, sample.event, sample.stratum)
    except NotEstimable:
        return
    other = groups_logrank(sample.time, sample.event, np.array(names)[sample.stratum])
    assert other.chi_square == pytest.approx(one.chi_square, rel=1e-8, abs=1e-10)
    assert one.expected.sum() == pytest.approx(one.observed.sum(), **CLOSE)
    assert one.covariance.sum(axis=0).tolist() == pytest.approx([0.0] * len(one.covariance), abs=1e-10)
