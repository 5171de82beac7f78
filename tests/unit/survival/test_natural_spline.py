"""The smooth of residuals: least squares on natural cubic splines, the same bits wherever its arrays lie."""

from __future__ import annotations

import numpy as np
import pytest

from app.model.values import Floats
from app.survival.natural_spline import knots_of, natural_spline

DRAW = np.random.default_rng(3)
X = np.sort(DRAW.exponential(size=211))
Y = DRAW.normal(size=211)
AT = np.linspace(X[0], X[-1], 37)


def shifted(values: Floats, by: int) -> Floats:
    """The same values, beginning so many doubles further into a block of memory."""
    block = np.empty(values.size + by)
    block[by:] = values
    return block[by:]


def literal_basis(x: Floats, knots: Floats) -> Floats:
    """Hastie, Tibshirani & Friedman (2009), The Elements of Statistical Learning, equations 5.4 and 5.5."""
    d = [
        (np.maximum(x - k, 0) ** 3 - np.maximum(x - knots[-1], 0) ** 3) / (knots[-1] - k) for k in knots[:-1]
    ]
    return np.column_stack([np.ones(x.size), x, *(each - d[-1] for each in d[:-1])])


@pytest.mark.parametrize("degrees", [3, 4, 5])
def test_the_smooth_is_the_literal_least_squares_fit(degrees: int) -> None:
    knots = knots_of(X, degrees)
    design, wanted = literal_basis(X, knots), literal_basis(AT, knots)
    literal, *_ = np.linalg.lstsq(design, Y, rcond=None)
    errors = np.sqrt(np.einsum("ki,ij,kj->k", wanted, np.linalg.inv(design.T @ design), wanted))
    fitted, std_error = natural_spline(X, Y, AT, degrees)
    assert fitted == pytest.approx(wanted @ literal, rel=1e-8, abs=1e-10)
    assert std_error == pytest.approx(errors, rel=1e-8)


def test_a_straight_line_is_fitted_by_itself() -> None:
    fitted, _ = natural_spline(X, 2.0 - 3.0 * X, AT, 4)
    assert fitted == pytest.approx(2.0 - 3.0 * AT, abs=1e-12)


@pytest.mark.parametrize("by", range(1, 9))
def test_the_last_bits_do_not_depend_on_where_the_arrays_lie(by: int) -> None:
    """A report is the same bytes in every process; a matrix library's sums follow the memory."""
    here = natural_spline(X, Y, AT, 4)
    there = natural_spline(shifted(X, by), shifted(Y, by), shifted(AT, by), 4)
    assert [part.tobytes() for part in here] == [part.tobytes() for part in there]
