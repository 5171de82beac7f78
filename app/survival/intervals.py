"""Pointwise confidence limits of a survival curve on five scales.

Each kind takes survival S strictly between 0 and 1, shape (m,), the standard error of log S, and the normal
quantile; it returns lower and upper limits of S.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from scipy.special import expit, logit, ndtri

from app.model.values import Floats
from app.survival.checked import checked_choice, checked_level

BLOCK = 65_536

Limits = tuple[Floats, Floats]


def plain(survival: Floats, error: Floats, z: float) -> Limits:
    """S -+ z se(S), cut at 0 and 1."""
    half = z * error * survival
    return np.maximum(survival - half, 0.0), np.minimum(survival + half, 1.0)


def log(survival: Floats, error: Floats, z: float) -> Limits:
    """On log S, cut at 1."""
    return survival * np.exp(-z * error), np.minimum(survival * np.exp(z * error), 1.0)


def log_log(survival: Floats, error: Floats, z: float) -> Limits:
    """On log(-log S), Kalbfleisch & Prentice (1980): S to the power exp(+-z se / log S)."""
    log_survival = np.log(survival)
    factor = np.exp(z * error / -log_survival)
    return np.exp(log_survival * factor), np.exp(log_survival / factor)


def logit_scale(survival: Floats, error: Floats, z: float) -> Limits:
    """On log(S / (1 - S))."""
    centre, half = logit(survival), z * error / (1.0 - survival)
    return expit(centre - half), expit(centre + half)


def arcsine_square_root(survival: Floats, error: Floats, z: float) -> Limits:
    """On arcsin sqrt(S), Borgan & Liestol (1990), cut at the ends of the scale."""
    centre = np.arcsin(np.sqrt(survival))
    half = 0.5 * z * error * np.sqrt(survival / (1.0 - survival))
    low, high = np.maximum(centre - half, 0.0), np.minimum(centre + half, np.pi / 2)
    return np.sin(low) ** 2, np.sin(high) ** 2


KINDS: MappingProxyType[str, Callable[[Floats, Floats, float], Limits]] = MappingProxyType(
    {
        "plain": plain,
        "log": log,
        "log-log": log_log,
        "logit": logit_scale,
        "arcsine-square-root": arcsine_square_root,
    }
)


@dataclass(frozen=True)
class Scale:
    """A transform of survival strictly between 0 and 1, and its slope: the delta method's factor."""

    value: Callable[[float], float]
    slope: Callable[[float], float]


SCALES: MappingProxyType[str, Scale] = MappingProxyType(
    {
        "plain": Scale(lambda s: s, lambda s: 1.0),
        "log": Scale(math.log, lambda s: 1.0 / s),
        "log-log": Scale(lambda s: math.log(-math.log(s)), lambda s: 1.0 / (s * math.log(s))),
        "logit": Scale(lambda s: math.log(s / (1.0 - s)), lambda s: 1.0 / (s * (1.0 - s))),
        "arcsine-square-root": Scale(
            lambda s: math.asin(math.sqrt(s)), lambda s: 0.5 / math.sqrt(s * (1.0 - s))
        ),
    }
)
"""The scale of each kind of limits, for a single survival."""


def survival_limits(survival: Floats, error: Floats, *, level: float, interval: str) -> Limits:
    """Limits of a curve where 0 < S < 1, NaN elsewhere: no standard error exists at 0, and at 1 it is 0.

    `survival` never rises; `error` is the standard error of log S. Raises ValueError for an unknown kind or a
    level outside (0, 1).
    """
    limits = KINDS[checked_choice(interval, "interval", tuple(KINDS))]
    z = two_sided_quantile(level)
    low, high = np.full((2, survival.size), np.nan)
    first = int(np.count_nonzero(survival == 1.0))
    last = int(np.count_nonzero(survival > 0.0))
    for start in range(first, last, BLOCK):  # a block's arrays stay in the processor's cache
        block = slice(start, min(start + BLOCK, last))
        low[block], high[block] = limits(survival[block], error[block], z)
    return low, high


def two_sided_quantile(level: float) -> float:
    """The z with P(|Z| <= z) = level: 1.96 for 0.95."""
    return -float(ndtri((1.0 - checked_level(level)) / 2.0))
