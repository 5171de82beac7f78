"""Sums over ties against 50 digits, and the joint normal probability against other routes."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import ndtr
from scipy.stats import multivariate_normal

from app.model.values import Floats
from app.survival.joint_normal import chance_of_one_above, chance_of_one_beyond
from app.survival.tied_sums import tied_log_sum, tied_sums

TIES = [(1, 1), (2.5, 2), (16.2, 1), (17, 2), (20, 20), (20.3, 3), (100, 50), (1000, 983), (33.3, 17)]
LARGE = [(1e6, 2), (1e6, 1000), (1e6, 999_999), (12345.67, 8), (1e9, 3), (5e3, 4990), (1e300, 5)]


@pytest.mark.parametrize(("x", "d"), [*TIES, *LARGE])
def test_sums_over_tied_events(x: float, d: float) -> None:
    first, second = tied_sums(np.array([x]), np.array([float(d)]))
    total = tied_log_sum(np.array([x]), np.array([float(d)]))
    with mpmath.workdps(400 if x > 1e20 else 50):
        at = mpmath.mpf(x)
        one = at * (mpmath.psi(0, at + 1) - mpmath.psi(0, at - d + 1))
        two = at**2 * (mpmath.psi(1, at - d + 1) - mpmath.psi(1, at + 1))
        logs = mpmath.loggamma(at + 1) - mpmath.loggamma(at - d + 1) - d * mpmath.log(at)
        assert abs(first[0] / one - 1) < 1e-13
        assert abs(second[0] / two - 1) < 1e-13
        assert abs(total[0] - logs) < 2e-15 * d + 1e-13 * abs(logs)


def correlation(size: int, seed: int) -> Floats:
    loadings = np.random.default_rng(seed).normal(size=(size, size + 1))
    covariance = loadings @ loadings.T
    error = np.sqrt(np.diag(covariance))
    return covariance / np.outer(error, error)


@pytest.mark.parametrize("size", [2, 3, 4])
@pytest.mark.parametrize("limit", [0.5, 2.0, 3.5])
def test_joint_normal_against_multivariate_normal_integration(size: int, limit: float) -> None:
    matrix = correlation(size, seed=size)
    inside = multivariate_normal(np.zeros(size), matrix, abseps=1e-9, releps=1e-9, maxpts=2_000_000)
    both = 1.0 - inside.cdf(np.full(size, limit), lower_limit=np.full(size, -limit), rng=1)
    above = 1.0 - inside.cdf(np.full(size, limit), rng=1)
    found = chance_of_one_beyond(limit, matrix), chance_of_one_above(limit, matrix)
    for chance, theirs in zip(found, (both, above), strict=True):
        assert chance.value == pytest.approx(theirs, rel=1e-4, abs=2e-8)
        assert chance.error < 1e-4 * chance.value


def test_joint_normal_of_two_against_a_single_integral_far_in_the_tail() -> None:
    # P(|Z1| > c or |Z2| > c) = 2 P(Z1 > c) + 2 integral over |z| <= c of phi(z) P(Z2 > c | z) ...
    limit, r = 6.0, 0.8
    with mpmath.workdps(30):
        spread = mpmath.sqrt(1 - r**2)
        outside = mpmath.quad(
            lambda z: (
                mpmath.npdf(z)
                * (mpmath.ncdf((r * z - limit) / spread) + mpmath.ncdf((-r * z - limit) / spread))
            ),
            [-limit, 0, limit],
        )
        theirs = float(2 * mpmath.ncdf(-limit) + outside)
    found = chance_of_one_beyond(limit, np.array([[1.0, r], [r, 1.0]]))
    assert found.value == pytest.approx(theirs, rel=1e-5)


@settings(max_examples=20)
@given(st.floats(0.0, 8.0), st.integers(1, 5))
def test_variables_that_are_all_one_or_apart(limit: float, size: int) -> None:
    tail = 2 * ndtr(-limit)
    assert chance_of_one_beyond(limit, np.ones((size, size))).value == pytest.approx(tail, rel=1e-12)
    apart = -math.expm1(size * math.log1p(-tail)) if tail < 1 else 1.0
    assert chance_of_one_beyond(limit, np.eye(size)).value == pytest.approx(apart, rel=1e-4)


def test_the_largest_of_four_tests_of_the_leukaemia_trial_by_simulation() -> None:
    # correlations of Fleming-Harrington (0,0), (1,0), (0,1), (1,1) there; 4 million draws, seed fixed
    matrix = np.array(
        [
            [1.0, 0.95664504, 0.82572046, 0.90589677],
            [0.95664504, 1.0, 0.62562962, 0.76230978],
            [0.82572046, 0.62562962, 1.0, 0.95003949],
            [0.90589677, 0.76230978, 0.95003949, 1.0],
        ]
    )
    values, vectors = np.linalg.eigh(matrix)
    root = vectors * np.sqrt(np.maximum(values, 0.0))
    draws = np.random.default_rng(5).normal(size=(2_000_000, 4)) @ root.T
    share = float((np.abs(draws).max(axis=1) > 2.5).mean())
    found = chance_of_one_beyond(2.5, matrix).value
    assert abs(found - share) < 4 * math.sqrt(share * (1 - share) / 2_000_000)


def test_more_variables_than_the_lattice_has_steps_are_refused() -> None:
    with pytest.raises(ValueError, match="correlation is of 13 variables; accepted: 1 to 12"):
        chance_of_one_beyond(1.0, np.eye(13))
