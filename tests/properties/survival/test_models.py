"""What holds for every model with covariates, and for the test of proportional hazards."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from app.errors import NotEstimable
from app.model.survival import CoxModel
from app.model.values import Absent, Floats
from app.survival import (
    baseline_hazard,
    cox_regression,
    cox_two_arms,
    logrank,
    nelson_aalen,
    proportionality,
    proportionality_tests,
)
from tests import naive
from tests.strategies import TwoArmSample, two_arm_samples, whole_days

ties = st.sampled_from(["Efron", "Breslow", "exact"])
LOOSE = {"rel": 1e-7, "abs": 1e-7}


def model_of(sample: TwoArmSample, covariates: Floats, ties: str) -> CoxModel | None:
    try:
        return cox_regression(sample.time, sample.event, covariates, stratum=sample.stratum, ties=ties)
    except NotEstimable:
        return None


def covariates_of(sample: TwoArmSample) -> Floats:
    second = np.sin(np.arange(sample.size) * 1.7) + 0.3 * sample.time / (1 + sample.time.max())
    return np.column_stack([sample.experimental.astype(float), second])


def literal(sample: TwoArmSample, covariates: Floats, coefficients: Floats, ties: str) -> float:
    predictor = ((covariates - covariates.mean(axis=0)) @ coefficients).tolist()
    return naive.log_partial_likelihood(
        sample.time.tolist(), sample.event.tolist(), predictor, sample.stratum.tolist(), ties
    )


@settings(max_examples=40)
@given(two_arm_samples(st.integers(0, 30).map(float)), ties)
def test_the_likelihood_is_the_literal_one_and_highest_at_the_estimate(
    sample: TwoArmSample, ties: str
) -> None:
    covariates = covariates_of(sample)
    model = model_of(sample, covariates, ties)
    if model is None:
        return
    zero = np.zeros(2)
    assert model.log_likelihood_at_zero == pytest.approx(literal(sample, covariates, zero, ties), rel=1e-10)
    if isinstance(model.estimate, Absent):
        return
    best = model.estimate.coefficients
    assert model.log_likelihood == pytest.approx(literal(sample, covariates, best, ties), rel=1e-9, abs=1e-9)
    for step in (np.array([0.01, 0.0]), np.array([0.0, 0.01])):
        around = [literal(sample, covariates, best + sign * step, ties) for sign in (-1, 1)]
        assert max(around) <= model.log_likelihood + 1e-9


@settings(max_examples=40)
@given(two_arm_samples(), ties)
def test_one_two_valued_covariate_is_the_two_arm_ratio(sample: TwoArmSample, ties: str) -> None:
    model = model_of(sample, sample.experimental.astype(float), ties)
    try:
        ratio = cox_two_arms(
            sample.time, sample.event, sample.experimental, stratum=sample.stratum, ties=ties
        )
    except NotEstimable:
        assert model is None or isinstance(model.estimate, Absent)
        return
    assert model is not None
    assert not isinstance(model.estimate, Absent)
    assert model.estimate.coefficients[0] == pytest.approx(ratio.log_hazard_ratio, **LOOSE)
    assert model.estimate.std_errors[0] == pytest.approx(ratio.std_error, **LOOSE)


@settings(max_examples=40)
@given(two_arm_samples())
def test_the_score_test_with_exact_ties_is_the_logrank_test(sample: TwoArmSample) -> None:
    try:
        test = logrank(sample.time, sample.event, sample.experimental, stratum=sample.stratum)
    except NotEstimable:
        return
    model = model_of(sample, sample.experimental.astype(float), "exact")
    assert model is not None
    assert model.score.chi_square == pytest.approx(test.chi_square, rel=1e-9, abs=1e-11)


@settings(max_examples=40)
@given(two_arm_samples(), ties, st.floats(0.1, 20.0), st.floats(-5.0, 5.0))
def test_units_of_a_covariate_move_only_its_coefficient(
    sample: TwoArmSample, ties: str, factor: float, shift: float
) -> None:
    covariates = covariates_of(sample)
    one = model_of(sample, covariates, ties)
    other = model_of(sample, covariates * [1.0, factor] + [0.0, shift], ties)
    if one is None or other is None or isinstance(one.estimate, Absent) or isinstance(other.estimate, Absent):
        return
    assert other.estimate.coefficients[1] * factor == pytest.approx(
        one.estimate.coefficients[1], rel=1e-5, abs=1e-6
    )
    assert other.log_likelihood == pytest.approx(one.log_likelihood, rel=1e-8, abs=1e-8)


@settings(max_examples=40)
@given(two_arm_samples())
def test_without_covariate_effects_the_baseline_is_the_nelson_aalen_hazard(sample: TwoArmSample) -> None:
    found = baseline_hazard(sample.time, sample.event, sample.experimental, [0.0], ties="Breslow")
    hazard = nelson_aalen(sample.time, sample.event)
    at = np.searchsorted(hazard.time, found.time)
    assert found.cumulative.tolist() == pytest.approx(hazard.hazard[at].tolist(), rel=1e-12)


@settings(max_examples=40)
@given(two_arm_samples(whole_days), st.sampled_from(["identity", "km"]))
def test_proportionality_is_the_literal_score_test(sample: TwoArmSample, transform: str) -> None:
    try:
        ours = proportionality(sample.time, sample.event, sample.experimental, transform=transform)
        ratio = cox_two_arms(sample.time, sample.event, sample.experimental)
    except NotEstimable:
        return

    def scale(at: float) -> float:
        if transform == "identity":
            return at
        return 1.0 - float(naive.pooled_survival_before(sample.time.tolist(), sample.event.tolist(), at))

    theirs = naive.proportionality(
        sample.time.tolist(),
        sample.event.tolist(),
        sample.experimental.tolist(),
        ratio.log_hazard_ratio,
        scale,
    )
    assert ours.chi_square == pytest.approx(theirs, rel=1e-6, abs=1e-7)


@settings(max_examples=40)
@given(two_arm_samples(), st.sampled_from(["identity", "rank", "km"]))
def test_both_ways_to_the_test_of_proportionality_agree(sample: TwoArmSample, transform: str) -> None:
    arguments = {"stratum": sample.stratum, "transform": transform}
    try:
        one = proportionality(sample.time, sample.event, sample.experimental, **arguments)
        other = proportionality_tests(sample.time, sample.event, sample.experimental, **arguments)
    except NotEstimable:
        return
    assert other.together.chi_square == pytest.approx(one.chi_square, rel=1e-5, abs=1e-6)


@settings(max_examples=40)
@given(two_arm_samples(), st.sampled_from(["rank", "km"]))
def test_proportionality_by_ranks_knows_only_the_order_of_times(sample: TwoArmSample, transform: str) -> None:
    ranks = np.unique(sample.time, return_inverse=True)[1]
    arguments = (sample.event, sample.experimental)
    try:
        one = proportionality(sample.time, *arguments, transform=transform)
        other = proportionality(ranks * 2.5 + 1.0, *arguments, transform=transform)
        swapped = proportionality(sample.time, sample.event, ~sample.experimental, transform=transform)
    except NotEstimable:
        return
    assert other.chi_square == pytest.approx(one.chi_square, rel=1e-9, abs=1e-9)
    assert swapped.chi_square == pytest.approx(one.chi_square, rel=1e-6, abs=1e-8)
    assert swapped.score == pytest.approx(-one.score, rel=1e-6, abs=1e-6)
