"""Three other ways to the probability of first leaving a region: none shares a line with app/sequential.

Each returns (upwards, downwards) at the last look only, having stayed inside at the looks before.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from functools import cache

import mpmath
import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

Bounds = Sequence[tuple[float, float]]


def nested_integrals(information: Sequence[float], bounds: Bounds, drift: float) -> tuple[float, float]:
    """Integrals inside integrals by adaptive quadrature at 20 digits; looks up to three."""
    with mpmath.workdps(20):
        upper = _nested(information, bounds, mpmath.mpf(drift), len(information) - 1, upwards=True)
        lower = _nested(information, bounds, mpmath.mpf(drift), len(information) - 1, upwards=False)
        return float(upper), float(lower)


def _nested(
    information: Sequence[float], bounds: Bounds, drift: mpmath.mpf, last: int, *, upwards: bool
) -> mpmath.mpf:
    times = [mpmath.mpf(0), *map(mpmath.mpf, information)]

    def leave(score: mpmath.mpf) -> mpmath.mpf:
        step = times[last + 1] - times[last]
        bound = bounds[last][1 if upwards else 0]
        if math.isinf(bound):
            return mpmath.mpf(0)
        distance = bound * mpmath.sqrt(times[last + 1]) - score - drift * step
        return mpmath.ncdf((-distance if upwards else distance) / mpmath.sqrt(step))

    def stay(look: int, score: mpmath.mpf) -> mpmath.mpf:
        if look == last:
            return leave(score)
        step = times[look + 1] - times[look]
        deviation = mpmath.sqrt(step)
        middle = score + drift * step
        low = max(bounds[look][0] * mpmath.sqrt(times[look + 1]), middle - 9 * deviation)
        high = min(bounds[look][1] * mpmath.sqrt(times[look + 1]), middle + 9 * deviation)
        if low >= high:
            return mpmath.mpf(0)
        return mpmath.quad(
            lambda s: mpmath.npdf(s, middle, deviation) * stay(look + 1, s),
            mpmath.linspace(low, high, 3),
            method="gauss-legendre",
            maxdegree=5,
        )

    return stay(0, mpmath.mpf(0))


def multivariate_normal(
    information: Sequence[float], bounds: Bounds, drift: float, seed: int
) -> tuple[float, float]:
    """Rectangle probabilities of z with correlations sqrt(I_i / I_j), by the general library."""
    from scipy.stats import multivariate_normal as normal

    times = np.asarray(information)
    shorter, longer = np.minimum.outer(times, times), np.maximum.outer(times, times)
    law = normal(
        drift * np.sqrt(times),
        np.sqrt(shorter / longer),
        maxpts=2_000_000,
        abseps=1e-9,
        releps=0.0,
        seed=seed,
    )
    low, high = (np.array(side) for side in zip(*bounds, strict=True))

    def rectangle(last_low: float, last_high: float) -> float:
        from_, to = np.append(low[:-1], last_low), np.append(high[:-1], last_high)
        return float(law.cdf(to, lower_limit=from_))

    return rectangle(high[-1], 40.0), rectangle(-40.0, low[-1])


def backward_induction(
    information: Sequence[float], bounds: Bounds, drift: float, intervals: int = 400
) -> tuple[float, float]:
    """From the last look back to the first, on Clenshaw-Curtis nodes of each region.

    A value is carried backwards (what is the chance of leaving at the last look, from here?), where the
    program carries a density forwards.
    """
    times = [0.0, *information]
    last = len(information)
    score = _region_nodes(times, bounds, last - 1, intervals)
    step = times[last] - times[last - 1]
    low, high = (bound * math.sqrt(times[last]) for bound in bounds[last - 1])
    upper = ndtr((score + drift * step - high) / math.sqrt(step))
    lower = ndtr((low - score - drift * step) / math.sqrt(step))
    for look in range(last - 1, 0, -1):
        step = times[look] - times[look - 1]
        before = _region_nodes(times, bounds, look - 1, intervals)
        weight = _region_weights(times, bounds, look, intervals)
        distance = (score[None, :] - before[:, None] - drift * step) / math.sqrt(step)
        kernel = np.exp(-distance * distance / 2.0) / math.sqrt(2.0 * math.pi * step) * weight
        upper, lower, score = kernel @ upper, kernel @ lower, before
    return float(upper[0]), float(lower[0])


def _extent(times: Sequence[float], bounds: Bounds, look: int) -> tuple[float, float]:
    """Score limits of the region, fourteen standard deviations where it has none."""
    scale = math.sqrt(times[look])
    return max(bounds[look - 1][0], -14.0) * scale, min(bounds[look - 1][1], 14.0) * scale


def _region_nodes(times: Sequence[float], bounds: Bounds, look: int, intervals: int) -> NDArray[np.float64]:
    if look == 0:
        return np.zeros(1)
    low, high = _extent(times, bounds, look)
    return low + (high - low) * (1.0 - _clenshaw_curtis(intervals)[0]) / 2.0


def _region_weights(times: Sequence[float], bounds: Bounds, look: int, intervals: int) -> NDArray[np.float64]:
    low, high = _extent(times, bounds, look)
    return (high - low) / 2.0 * _clenshaw_curtis(intervals)[1]


@cache
def _clenshaw_curtis(intervals: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Nodes cos(k pi / n) on [-1, 1] and their weights (Clenshaw & Curtis 1960); n even."""
    angle = np.pi * np.arange(intervals + 1) / intervals
    order = np.arange(1, intervals // 2 + 1)
    factor = np.where(order == intervals // 2, 1.0, 2.0) / (4.0 * order**2 - 1.0)
    weight = 1.0 - np.cos(2.0 * np.outer(angle, order)) @ factor
    weight *= 2.0 / intervals
    weight[[0, -1]] /= 2.0
    return np.cos(angle), weight
