"""Two arms compared by weighted log-rank tests, and by the largest of several."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr

from app.errors import NotEstimable
from app.model.survival import WeightedMaximum, WeightedResult
from app.model.values import Floats
from app.survival.comparison import (
    Direction,
    logrank_steps,
    reason_arms_not_told_apart,
    signed_z,
    two_arm_events,
)
from app.survival.joint_normal import chance_of_one_above, chance_of_one_beyond
from app.survival.risk_table import EventTable, RiskTable
from app.survival.weights import Weight


def weighted_logrank(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    weight: Weight,
    stratum: ArrayLike | None = None,
    direction: Direction = 1,
) -> WeightedResult:
    """Compare two arms by a weighted log-rank score, summed over strata.

    Parameters
    ----------
    time, event, experimental, stratum, direction : as in `logrank`
    weight : one of app.survival.weights, or `fleming_harrington(rho, gamma)`

    Returns
    -------
    WeightedResult
        score = sum of weight (observed - expected) [weighted events], its variance, z [1] and p-values.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.
    NotEstimable : the variance is 0, as no event tells the arms apart or only events of weight 0 do.

    Notes
    -----
    *Convention*: z = -direction score / sqrt(variance): positive favours the experimental arm. Variance = sum
    of weight^2 times the hypergeometric variance. Weights come from both arms together, stratum by stratum.
    *Accuracy*: sums of at most n terms; relative error below 1e-11 for n <= 1e6.
    *Checked*: by hand, print (app/validation), R (tests/reference), a literal version (tests/naive.py),
    properties.

    References
    ----------
    Those of each weight in app/survival/weights.py; Fleming & Harrington (1991), Counting Processes and
    Survival Analysis, chapter 7.

    Examples
    --------
    >>> from app.survival.weights import GEHAN_BRESLOW
    >>> arms = [False, False, True, True]
    >>> result = weighted_logrank([1, 2, 3, 4], [True] * 4, arms, weight=GEHAN_BRESLOW)
    >>> result.score, round(result.variance, 6)
    (-4.0, 6.0)
    """
    table = two_arm_events(time, event, experimental, stratum)
    return weighted_logrank_of(table, weight, direction=direction)


def weighted_logrank_of(
    table: RiskTable | EventTable, weight: Weight, *, direction: Direction = 1
) -> WeightedResult:
    """The weighted test from a two-arm table already made; see `weighted_logrank`."""
    (test,), _ = _tests(table.at_events(), [weight], direction)
    return test


def weighted_maximum(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    weights: Sequence[Weight],
    stratum: ArrayLike | None = None,
    direction: Direction = 1,
) -> WeightedMaximum:
    """Compare two arms by the largest of several weighted log-rank statistics, with its joint normal p.

    Parameters
    ----------
    time, event, experimental, stratum, direction : as in `logrank`
    weights : one to twelve weights

    Returns
    -------
    WeightedMaximum
        each test, their correlation, the z that is largest in absolute value with its sign, the two-sided p,
        and the one-sided p of the largest z in favour of the experimental arm.

    Raises
    ------
    ValueError, NotEstimable : as in `weighted_logrank`.

    Notes
    -----
    *Convention*: under no difference the statistics are taken as jointly normal with covariances sum of
    weight_1 weight_2 times the hypergeometric variance. A maximum answers whether there is a difference of
    some shape; it has no single ratio to go with it, and weights that count late events can favour an arm
    that does harm early (Freidlin & Korn 2019).
    *Accuracy*: see `joint_normal`; `p_error` says the error of the p-values' integration.
    *Checked*: R (tests/reference), multivariate normal integrals, properties.

    References
    ----------
    Lee (1996), Biometrics 52, 721-725. Lin et al. (2020), Statistics in Biopharmaceutical Research 12,
    187-198. Roychoudhury et al. (2021), Statistics in Biopharmaceutical Research. Freidlin & Korn (2019),
    Journal of Clinical Oncology 37, 3455-3459.
    """
    table = two_arm_events(time, event, experimental, stratum)
    return weighted_maximum_of(table, weights, direction=direction)


def weighted_maximum_of(
    table: RiskTable | EventTable, weights: Sequence[Weight], *, direction: Direction = 1
) -> WeightedMaximum:
    """The largest of several tests from a two-arm table already made; see `weighted_maximum`."""
    tests, covariance = _tests(table.at_events(), weights, direction)
    error = np.sqrt(np.diag(covariance))
    correlation = covariance / np.outer(error, error)
    largest = max((test.z for test in tests), key=abs)
    highest = max(test.z for test in tests)
    two_sided, one_sided = (
        chance_of_one_beyond(abs(largest), correlation),
        chance_of_one_above(highest, correlation),
    )
    return WeightedMaximum(
        tests=tests,
        correlation=correlation,
        z=largest,
        p_two_sided=two_sided.value,
        p_one_sided=one_sided.value,
        p_error=max(two_sided.error, one_sided.error),
    )


def _tests(
    table: EventTable, weights: Sequence[Weight], direction: Direction
) -> tuple[tuple[WeightedResult, ...], Floats]:
    """Each test, and the covariance of their scores, shape (weights, weights)."""
    steps = logrank_steps(table)
    if not steps.variance.any():
        raise NotEstimable(reason_arms_not_told_apart(table))
    at_events = np.array([weight.at_events(table) for weight in weights])
    scores = (at_events * (steps.observed - steps.expected)).sum(axis=1)
    covariance = np.array([[np.sum(a * b * steps.variance) for b in at_events] for a in at_events])
    tests = tuple(
        _result(weight, float(score), float(variance), direction)
        for weight, score, variance in zip(weights, scores, np.diag(covariance), strict=True)
    )
    return tests, covariance


def _result(weight: Weight, score: float, variance: float, direction: Direction) -> WeightedResult:
    if variance == 0.0:
        raise NotEstimable(f"the {weight.name} weight is 0 at every event that tells the arms apart")
    z = signed_z(score, variance, direction)
    return WeightedResult(
        name=weight.name,
        rho=weight.rho,
        gamma=weight.gamma,
        score=score,
        variance=variance,
        z=z,
        chi_square=score * score / variance,
        p_one_sided=float(ndtr(-z)),
        p_two_sided=float(2.0 * ndtr(-abs(z))),
    )
