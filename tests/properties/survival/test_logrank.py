"""What holds for every log-rank test."""

from __future__ import annotations

import math
from collections.abc import Callable
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from app.errors import NotEstimable
from app.model.survival import LogrankResult
from app.survival import logrank, logrank_of, two_arm_table
from tests import naive
from tests.strategies import TwoArmSample, two_arm_samples, whole_days

EXACT = {"rel": 1e-12, "abs": 1e-12}


def result_of(sample: TwoArmSample, *, strata: bool = True, direction: int = 1) -> LogrankResult | str:
    """The result, or the reason there is none."""
    try:
        return logrank(
            sample.time,
            sample.event,
            sample.experimental,
            stratum=sample.stratum if strata else None,
            direction=direction,  # type: ignore[arg-type]
        )
    except NotEstimable as reason:
        return reason.what


def score(result: LogrankResult) -> float:
    return result.expected - result.observed


def compare(
    one: LogrankResult | str,
    other: LogrankResult | str,
    holds: Callable[[LogrankResult, LogrankResult], None],
) -> None:
    """Both have no result, or both have one and the claim holds."""
    if isinstance(one, str) or isinstance(other, str):
        assert isinstance(one, str)
        assert isinstance(other, str)
    else:
        holds(one, other)


def same(one: LogrankResult, other: LogrankResult) -> None:
    assert other.z == pytest.approx(one.z, **EXACT)
    assert [other.observed, other.expected, other.variance] == pytest.approx(
        [one.observed, one.expected, one.variance], **EXACT
    )


@given(two_arm_samples(), st.booleans())
def test_sums_are_the_literal_ones(sample: TwoArmSample, strata: bool) -> None:
    observed, expected, variance = naive.logrank(
        sample.time.tolist(),
        sample.event.tolist(),
        sample.experimental.tolist(),
        sample.stratum.tolist() if strata else None,
    )
    result = result_of(sample, strata=strata)
    if isinstance(result, str):
        assert variance == 0
    else:
        assert result.observed == observed
        assert result.expected == pytest.approx(float(expected), rel=1e-13)
        assert result.variance == pytest.approx(float(variance), rel=1e-13)
        assert result.chi_square == pytest.approx(float((expected - observed) ** 2 / variance), **EXACT)
        assert result.z == pytest.approx(float(expected - observed) / math.sqrt(variance), **EXACT)


@given(two_arm_samples())
def test_strata_add_up(sample: TwoArmSample) -> None:
    result = result_of(sample)
    if isinstance(result, LogrankResult):
        assert sum(part.subjects for part in result.strata) == sample.size
        assert sum(part.events for part in result.strata) == sample.event.sum()
        assert [part.stratum for part in result.strata] == np.unique(sample.stratum).tolist()
        for total, name in (
            (result.observed, "observed"),
            (result.expected, "expected"),
            (result.variance, "variance"),
        ):
            assert total == pytest.approx(sum(getattr(part, name) for part in result.strata), **EXACT)


@given(two_arm_samples())
def test_each_stratum_alone_is_its_share(sample: TwoArmSample) -> None:
    table = two_arm_table(sample.time, sample.event, sample.experimental, sample.stratum)
    whole = result_of(sample)
    for part in table.strata():
        alone = result_of(sample.rows(np.flatnonzero(sample.stratum == part.stratum[0])))
        if isinstance(alone, LogrankResult):
            assert isinstance(whole, LogrankResult)
            assert alone.strata[0] in whole.strata


@given(two_arm_samples())
def test_observed_and_expected_of_both_arms_are_the_events(sample: TwoArmSample) -> None:
    def holds(one: LogrankResult, other: LogrankResult) -> None:
        assert one.observed + other.observed == sample.event.sum()
        assert one.expected + other.expected == pytest.approx(sample.event.sum(), **EXACT)

    compare(result_of(sample), result_of(sample.but(experimental=~sample.experimental)), holds)


@given(two_arm_samples())
def test_swapping_the_arms_only_flips_the_sign(sample: TwoArmSample) -> None:
    def holds(one: LogrankResult, other: LogrankResult) -> None:
        assert other.z == pytest.approx(-one.z, **EXACT)
        assert other.variance == pytest.approx(one.variance, **EXACT)
        assert other.p_two_sided == pytest.approx(one.p_two_sided, rel=1e-10)
        assert other.p_one_sided + one.p_one_sided == pytest.approx(1.0, rel=1e-12)

    compare(result_of(sample), result_of(sample.but(experimental=~sample.experimental)), holds)


@given(two_arm_samples())
def test_a_good_event_only_flips_the_sign(sample: TwoArmSample) -> None:
    def holds(one: LogrankResult, other: LogrankResult) -> None:
        assert other.z == -one.z
        assert (other.observed, other.expected, other.variance) == (one.observed, one.expected, one.variance)

    compare(result_of(sample), result_of(sample, direction=-1), holds)


@given(two_arm_samples(), st.randoms(use_true_random=False))
def test_order_of_the_rows_does_not_matter(sample: TwoArmSample, random: object) -> None:
    order = np.array(random.sample(range(sample.size), sample.size))  # type: ignore[attr-defined]
    compare(result_of(sample), result_of(sample.rows(order)), same)


@given(two_arm_samples())
def test_only_the_order_of_the_times_matters(sample: TwoArmSample) -> None:
    ranks = np.unique(sample.time, return_inverse=True)[1]
    compare(result_of(sample), result_of(sample.but(time=ranks**2 / 8 + 0.3)), same)


@given(two_arm_samples(whole_days))
def test_whole_days_in_another_unit_give_the_same_test(sample: TwoArmSample) -> None:
    # whole days are counted, other times sorted: both ways must give the same table
    compare(result_of(sample), result_of(sample.but(time=sample.time / 30.4375)), same)


@given(two_arm_samples())
def test_names_of_the_strata_do_not_matter(sample: TwoArmSample) -> None:
    compare(result_of(sample), result_of(sample.but(stratum=7 - 3 * sample.stratum)), same)


@given(two_arm_samples(), st.booleans(), st.booleans())
def test_a_stratum_of_one_adds_nothing(sample: TwoArmSample, event: bool, experimental: bool) -> None:
    larger = TwoArmSample(
        np.append(sample.time, 5.0),
        np.append(sample.event, event),
        np.append(sample.experimental, experimental),
        np.append(sample.stratum, 3),
    )

    def holds(one: LogrankResult, other: LogrankResult) -> None:
        assert score(other) == pytest.approx(score(one), **EXACT)
        assert other.variance == one.variance
        assert not other.strata[-1].contributes

    compare(result_of(sample), result_of(larger), holds)


@given(two_arm_samples())
def test_a_copy_of_the_trial_as_further_strata_doubles_score_and_variance(sample: TwoArmSample) -> None:
    copied = sample.rows(np.tile(np.arange(sample.size), 2))
    copied = copied.but(stratum=np.concatenate([sample.stratum, sample.stratum + 3]))

    def holds(one: LogrankResult, other: LogrankResult) -> None:
        assert score(other) == pytest.approx(2 * score(one), **EXACT)
        assert other.variance == pytest.approx(2 * one.variance, **EXACT)

    compare(result_of(sample), result_of(copied), holds)


@given(two_arm_samples())
def test_every_subject_twice_doubles_the_score_but_not_quite_the_variance(sample: TwoArmSample) -> None:
    # with n at risk, (n - d) / (n - 1) becomes (2n - 2d) / (2n - 1): the term grows by 4 (n - 1) / (2n - 1)
    twice = result_of(sample.rows(np.tile(np.arange(sample.size), 2)), strata=False)
    once = result_of(sample, strata=False)
    if isinstance(once, LogrankResult):
        assert isinstance(twice, LogrankResult)
        assert score(twice) == pytest.approx(2 * score(once), **EXACT)
        assert twice.variance == pytest.approx(float(variance_of_the_doubled(sample)), rel=1e-12)
        assert twice.variance <= 2 * once.variance


def variance_of_the_doubled(sample: TwoArmSample) -> Fraction:
    total = Fraction(0)
    for at in np.unique(sample.time[sample.event]):
        here = sample.time == at
        n, n1 = int((sample.time >= at).sum()), int((sample.experimental & (sample.time >= at)).sum())
        d = int((here & sample.event).sum())
        if n > 1:
            once = Fraction(d * n1 * (n - n1) * (n - d), n * n * (n - 1))
            total += once * Fraction(4 * (n - 1), 2 * n - 1)
    return total


@given(two_arm_samples())
def test_a_table_made_once_serves_both_directions(sample: TwoArmSample) -> None:
    table = two_arm_table(sample.time, sample.event, sample.experimental, sample.stratum)
    direct = result_of(sample)
    if isinstance(direct, LogrankResult):
        assert logrank_of(table) == direct
