"""A smooth curve through a cloud of points: least squares on natural cubic splines."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from app.model.values import Floats


def natural_spline(x: Floats, y: Floats, at: Floats, degrees: int) -> tuple[Floats, Floats]:
    """Fit y over x by least squares on a natural cubic spline, and read it.

    Parameters
    ----------
    x, y : float arrays, shape (n,), finite; the knots of x must differ from one another
    at : float array, shape (k,), where the curve is read
    degrees : coefficients of the curve, 3 or more

    Returns
    -------
    two float arrays, shape (k,) : the values, and their standard errors in units of the errors of y.

    Notes
    -----
    *Convention*: inner knots lie at the quantiles of x that cut it into degrees - 1 equal parts, outer ones
    at its ends, beyond which the curve is straight.
    *Accuracy*: within 1e-8 of least squares by a matrix library, relative, for 3 to 5 coefficients; the last
    bits do not depend on where the arrays lie in memory.
    *Checked*: against least squares on a literal basis (tests/unit/survival/test_natural_spline.py).

    References
    ----------
    Hastie & Tibshirani (1990), Generalized Additive Models, chapter 2.
    """
    found = knots_of(x, degrees)
    low, high = found[0], found[-1]
    knots = (found - low) / (high - low)
    design, wanted = (_basis((values - low) / (high - low), knots) for values in (x, at))
    fitted, squared = np.zeros(at.size), np.zeros(at.size)
    for direction, read in _orthogonal(design, wanted):
        fitted += read * np.sum(direction * y)
        squared += read**2
    return fitted, np.sqrt(squared)


def _orthogonal(design: list[Floats], wanted: list[Floats]) -> Iterator[tuple[Floats, Floats]]:
    """The columns of `design` made orthonormal, (n,), each with the same steps taken on `wanted`, (k,).

    Gram-Schmidt, each column twice, so that it is orthogonal to the last bits. By sums and not by a matrix
    library, whose last bits depend on where arrays lie in memory: reports must not.
    """
    done: list[tuple[Floats, Floats]] = []
    for column, read in zip(design, wanted, strict=True):
        for _ in range(2):
            for direction, of_direction in done:
                share = np.sum(direction * column)
                column, read = column - share * direction, read - share * of_direction
        size = np.sqrt(np.sum(column**2))
        done.append((column / size, read / size))
        yield done[-1]


def knots_of(x: Floats, degrees: int) -> Floats:
    """The ends of x and the inner knots between them, in order; all differ where the spline can be fitted."""
    return np.asarray(np.quantile(x, np.arange(degrees) / (degrees - 1)), dtype=np.float64)


def _basis(x: Floats, knots: Floats) -> list[Floats]:
    """1, x and truncated cubes combined so that the curve is straight beyond the outer knots, each (n,)."""
    end, last_inner = knots[-1], knots[-2]

    def bent(knot: float) -> Floats:
        cubes = np.maximum(x - knot, 0.0) ** 3 - np.maximum(x - end, 0.0) ** 3
        return np.asarray(cubes / (end - knot), dtype=np.float64)

    return [np.ones(x.size), x, *(bent(knot) - bent(last_inner) for knot in knots[:-2])]
