"""A smooth curve through a cloud of points: least squares on natural cubic splines."""

from __future__ import annotations

import numpy as np

from app.model.values import Floats


def natural_spline(x: Floats, y: Floats, at: Floats, degrees: int) -> tuple[Floats, Floats]:
    """Fit y over x, both (n,), by a natural cubic spline with `degrees` coefficients; read it at `at`, (k,).

    Returns the values and their standard errors in units of the errors of y. Inner knots lie at the
    quantiles of x that cut it into degrees - 1 equal parts, outer ones at its ends, beyond which the curve
    is straight.

    Hastie & Tibshirani (1990), Generalized Additive Models, chapter 2.
    """
    found = knots_of(x, degrees)
    low, high = found[0], found[-1]
    knots = (found - low) / (high - low)
    design, wanted = (_basis((values - low) / (high - low), knots) for values in (x, at))
    orthogonal, triangular = np.linalg.qr(design)
    read = np.linalg.solve(triangular.T, wanted.T).T
    return read @ (orthogonal.T @ y), np.sqrt(np.sum(read**2, axis=1))


def knots_of(x: Floats, degrees: int) -> Floats:
    """The ends of x and the inner knots between them, in order; all differ where the spline can be fitted."""
    return np.asarray(np.quantile(x, np.arange(degrees) / (degrees - 1)), dtype=np.float64)


def _basis(x: Floats, knots: Floats) -> Floats:
    """1, x and truncated cubes combined so that the curve is straight beyond the outer knots, (n,
    degrees).
    """
    end, last_inner = knots[-1], knots[-2]

    def bent(knot: float) -> Floats:
        cubes = np.maximum(x - knot, 0.0) ** 3 - np.maximum(x - end, 0.0) ** 3
        return np.asarray(cubes / (end - knot), dtype=np.float64)

    columns = [np.ones(x.size), x, *(bent(knot) - bent(last_inner) for knot in knots[:-2])]
    return np.column_stack(columns)
