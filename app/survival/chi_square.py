"""The chi-square test that many statistics end in."""

from __future__ import annotations

import numpy as np
from scipy.special import gammaincc

from app.errors import NotEstimable
from app.model.survival import ChiSquareTest
from app.model.values import Floats

RANK_TOLERANCE = 1e-10  # an eigenvalue below this share of the largest is 0


def chi_square_test(value: float, degrees: int) -> ChiSquareTest:
    """A chi-square on these degrees of freedom with the probability of a larger one."""
    return ChiSquareTest(float(value), degrees, float(gammaincc(degrees / 2.0, value / 2.0)))


def chi_square_of(score: Floats, covariance: Floats, reason: str) -> ChiSquareTest:
    """score' V^- score with the generalised inverse of V, on as many degrees of freedom as V has rank.

    NotEstimable, for this reason, where V is 0.
    """
    values, vectors = np.linalg.eigh(covariance)
    largest = float(values.max(initial=0.0))
    if largest <= 0.0:
        raise NotEstimable(reason)
    kept = values > RANK_TOLERANCE * largest
    along = vectors[:, kept].T @ score
    return chi_square_test(float(np.sum(along**2 / values[kept])), int(kept.sum()))
