"""How likely it is that one of several correlated normal variables goes beyond a limit.

The event "some |Z_i| > c" is split by the first i that does: |Z_1| > c; |Z_2| > c and |Z_1| <= c; and so on.
Each part is a small probability on its own, never one minus a large one, so that tails keep their digits. A
part is integrated over the unit cube after Genz (1992): each variable, given those before it, is drawn from
its own interval, and the integrand is the product of the intervals' probabilities. The points are a rank-1
lattice with square roots of primes as steps, folded so that the integrand is periodic, under a few fixed
shifts; the spread over the shifts gives the error. Nothing is random: the same arguments give the same bits.

Genz (1992), Journal of Computational and Graphical Statistics 1, 141-149.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from scipy.special import ndtr, ndtri

from app.model.values import Floats

PRIMES = (2, 3, 5, 7, 11, 13, 17, 19, 23, 29, 31)
MOST_VARIABLES = len(PRIMES) + 1
POINTS = 8191
SHIFTS = 8
GOLDEN = (math.sqrt(5.0) - 1.0) / 2.0
DETERMINED = 1e-7  # a standard deviation this small: the variable follows from those before it


class Chance(NamedTuple):
    """A probability and the standard error of its integration."""

    value: float
    error: float


def chance_of_one_beyond(limit: float, correlation: Floats) -> Chance:
    """P(some |Z_i| > limit), limit >= 0, for standard normal Z with this correlation, shape (k, k), k <=
    12.
    """
    return _sum_of_parts(-limit, limit, correlation, tails=2)


def chance_of_one_above(limit: float, correlation: Floats) -> Chance:
    """P(some Z_i > limit) for standard normal Z with this correlation, shape (k, k), k <= 12."""
    return _sum_of_parts(-math.inf, limit, correlation, tails=1)


def _sum_of_parts(low: float, high: float, correlation: Floats, *, tails: int) -> Chance:
    """Z and -Z are alike, so that the lower of two tails doubles the upper."""
    size = correlation.shape[0]
    if not 1 <= size <= MOST_VARIABLES:
        raise ValueError(f"correlation is of {size} variables; accepted: 1 to {MOST_VARIABLES}")
    parts = [Chance(float(ndtr(-high)), 0.0)]
    for last in range(1, size):
        order = [last, *range(last)]  # the one beyond first, then those that stay inside
        parts.append(_part(low, high, correlation[np.ix_(order, order)]))
    value = tails * math.fsum(part.value for part in parts)
    return Chance(min(1.0, value), tails * math.sqrt(math.fsum(part.error**2 for part in parts)))


def _part(low: float, high: float, correlation: Floats) -> Chance:
    """P(Z_0 > high and low < Z_j <= high for j > 0)."""
    factor = _factor(correlation)
    means = []
    for shift in range(SHIFTS):
        points = _lattice(len(factor) - 1, (shift + 0.5) / SHIFTS)
        means.append(float(_integrand(points, low, high, factor).mean()))
    return Chance(float(np.mean(means)), float(np.std(means, ddof=1) / math.sqrt(SHIFTS)))


def _factor(correlation: Floats) -> Floats:
    """The lower triangular root; a row that follows from those above it has 0 on the diagonal."""
    size = correlation.shape[0]
    factor = np.zeros((size, size))
    for i in range(size):
        for j in range(i):
            rest = correlation[i, j] - np.sum(factor[i, :j] * factor[j, :j])
            factor[i, j] = rest / factor[j, j] if factor[j, j] > 0.0 else 0.0
        left = 1.0 - np.sum(factor[i, :i] ** 2)
        factor[i, i] = math.sqrt(left) if left > DETERMINED**2 else 0.0
    return factor


def _lattice(dimensions: int, shift: float) -> Floats:
    """Points of the unit cube, shape (dimensions, points); folding at 1/2 makes the integrand periodic."""
    steps = np.sqrt(np.array(PRIMES[:dimensions], dtype=np.float64))[:, None]
    offsets = shift + GOLDEN * np.arange(dimensions)[:, None]
    return np.abs(2.0 * np.mod(steps * np.arange(1, POINTS + 1) + offsets, 1.0) - 1.0)


def _integrand(points: Floats, low: float, high: float, factor: Floats) -> Floats:
    """The product of the conditional probabilities, at each point."""
    tail = float(ndtr(-high))
    drawn = [-ndtri(points[0] * tail)]
    value = np.full(points.shape[1], tail)
    for j in range(1, len(factor)):
        centre = sum(factor[j, i] * drawn[i] for i in range(j))
        if factor[j, j] == 0.0:
            value *= (low < centre) & (centre <= high)
            drawn.append(np.zeros_like(value))
            continue
        below = ndtr((low - centre) / factor[j, j])
        above = ndtr((high - centre) / factor[j, j])
        value *= above - below
        if j < len(factor) - 1:
            drawn.append(ndtri(np.clip(below + points[j] * (above - below), 1e-300, 1.0 - 1e-16)))
    return value
