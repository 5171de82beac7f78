"""What holds for every hazard ratio of two arms."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import NotEstimable
from app.model.survival import CoxResult
from app.survival import cox_two_arms
from tests import naive
from tests.strategies import TwoArmSample, any_time, two_arm_samples

CLOSE = {"rel": 1e-9, "abs": 1e-9}
ties = st.sampled_from(["Efron", "Breslow"])


def ratio_of(sample: TwoArmSample, *, strata: bool = True, ties: str = "Efron") -> CoxResult | str:
    """The result, or the reason there is none."""
    try:
        return cox_two_arms(
            sample.time,
            sample.event,
            sample.experimental,
            stratum=sample.stratum if strata else None,
            ties=ties,
        )
    except NotEstimable as reason:
        return reason.what


def compare(
    one: CoxResult | str, other: CoxResult | str, holds: Callable[[CoxResult, CoxResult], None]
) -> None:
    """Both have no result, or both have one and the claim holds."""
    if isinstance(one, str) or isinstance(other, str):
        assert isinstance(one, str)
        assert isinstance(other, str)
    else:
        holds(one, other)


def same(one: CoxResult, other: CoxResult) -> None:
    assert other.log_hazard_ratio == pytest.approx(one.log_hazard_ratio, **CLOSE)
    assert other.std_error == pytest.approx(one.std_error, **CLOSE)


@given(two_arm_samples(), st.booleans(), ties)
def test_estimate_is_the_literal_one(sample: TwoArmSample, strata: bool, ties: str) -> None:
    result = ratio_of(sample, strata=strata, ties=ties)
    if isinstance(result, CoxResult):
        log_ratio, std_error = naive.cox(
            sample.time.tolist(),
            sample.event.tolist(),
            sample.experimental.tolist(),
            sample.stratum.tolist() if strata else None,
            ties,
        )
        assert result.log_hazard_ratio == pytest.approx(log_ratio, **CLOSE)
        assert result.std_error == pytest.approx(std_error, **CLOSE)


@given(two_arm_samples(), ties)
def test_no_estimate_is_said_exactly_where_the_likelihood_has_no_inner_maximum(
    sample: TwoArmSample, ties: str
) -> None:
    terms = naive.partial_likelihood_terms(
        sample.time.tolist(), sample.event.tolist(), sample.experimental.tolist(), ties=ties
    )
    observed = int((sample.event & sample.experimental).sum())
    at_zero = sum(1 for term in terms if term.control == 0)  # the expected number as the ratio goes to 0
    at_infinity = sum(1 for term in terms if term.experimental > 0)
    has_maximum = at_zero < observed < at_infinity
    assert isinstance(ratio_of(sample, strata=False, ties=ties), CoxResult) is has_maximum


@given(two_arm_samples(), ties)
def test_swapping_the_arms_inverts_the_ratio(sample: TwoArmSample, ties: str) -> None:
    def holds(one: CoxResult, other: CoxResult) -> None:
        assert other.log_hazard_ratio == pytest.approx(-one.log_hazard_ratio, **CLOSE)
        assert other.std_error == pytest.approx(one.std_error, **CLOSE)
        assert other.ci_low == pytest.approx(1 / one.ci_high, rel=1e-8)

    swapped = sample.but(experimental=~sample.experimental)
    compare(ratio_of(sample, ties=ties), ratio_of(swapped, ties=ties), holds)


@given(two_arm_samples(), ties, st.randoms(use_true_random=False))
def test_order_of_the_rows_does_not_matter(sample: TwoArmSample, ties: str, random: object) -> None:
    order = np.array(random.sample(range(sample.size), sample.size))  # type: ignore[attr-defined]
    compare(ratio_of(sample, ties=ties), ratio_of(sample.rows(order), ties=ties), same)


@given(two_arm_samples(), ties)
def test_only_the_order_of_the_times_matters(sample: TwoArmSample, ties: str) -> None:
    ranks = np.unique(sample.time, return_inverse=True)[1]
    compare(ratio_of(sample, ties=ties), ratio_of(sample.but(time=ranks**2 / 8 + 0.3), ties=ties), same)


@given(two_arm_samples(), st.booleans(), st.booleans())
def test_a_stratum_of_one_adds_nothing(sample: TwoArmSample, event: bool, experimental: bool) -> None:
    larger = TwoArmSample(
        np.append(sample.time, 5.0),
        np.append(sample.event, event),
        np.append(sample.experimental, experimental),
        np.append(sample.stratum, 3),
    )
    compare(ratio_of(sample), ratio_of(larger), same)


@given(two_arm_samples(), ties)
def test_a_copy_of_the_trial_as_further_strata_halves_the_variance(sample: TwoArmSample, ties: str) -> None:
    copied = sample.rows(np.tile(np.arange(sample.size), 2))
    copied = copied.but(stratum=np.concatenate([sample.stratum, sample.stratum + 3]))
    compare(ratio_of(sample, ties=ties), ratio_of(copied, ties=ties), same_with_half_the_variance)


@given(two_arm_samples())
def test_every_subject_twice_halves_the_variance_under_breslow_ties(sample: TwoArmSample) -> None:
    # not under Efron's, where a doubled event is a new tie
    twice = sample.rows(np.tile(np.arange(sample.size), 2))
    compare(ratio_of(sample, ties="Breslow"), ratio_of(twice, ties="Breslow"), same_with_half_the_variance)


def same_with_half_the_variance(one: CoxResult, other: CoxResult) -> None:
    assert other.log_hazard_ratio == pytest.approx(one.log_hazard_ratio, **CLOSE)
    assert other.std_error == pytest.approx(one.std_error / math.sqrt(2), **CLOSE)


@given(two_arm_samples(any_time))
def test_without_ties_efron_and_breslow_agree(sample: TwoArmSample) -> None:
    untied = sample.but(time=np.unique(sample.time, return_inverse=True)[1] * 40.0 + np.arange(sample.size))
    compare(ratio_of(untied, ties="Efron"), ratio_of(untied, ties="Breslow"), same)
