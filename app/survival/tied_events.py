"""How many of the events at one time are experimental: mean and variance at a given log hazard ratio.

Let c control and e experimental subjects be at risk, d_c and d_e of them have the event, d = d_c + d_e, and
let theta be the hazard ratio. Under a partial likelihood the number of experimental events at this time has

Breslow   d P and d P (1 - P), with P = e theta / (c + e theta);
Efron     the sums over k = 0, ..., d - 1 of P_k and P_k (1 - P_k), the k-th with (1 - k/d) of those who have
          the event at this time taken out of the risk set by the share k/d: c - k d_c/d, e - k d_e/d;
exact     the noncentral hypergeometric distribution: weight C(e, j) C(c, d - j) theta^j for j experimental.

All three agree for one event. Efron's sums are closed: with Q the share of theta d_e in d_c + theta d_e and
x = d (c + e theta) / (d_c + d_e theta), P_k = Q + (P - Q) / (1 - k/x), see `tied_sums`.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from types import MappingProxyType

import numpy as np

from app.model.values import Counts, Floats, Ints
from app.survival.tied_sums import tied_sums

CONTROL, EXPERIMENTAL = 0, 1

Moments = tuple[Floats, Floats]


def breslow(at_risk: Counts, events: Counts, log_ratio: float) -> Moments:
    """Mean and variance at each time, shape (m,); counts of shape (2, m)."""
    share, rest = _shares(at_risk, log_ratio)
    d = events[CONTROL] + events[EXPERIMENTAL]
    share *= d
    return share, share * rest


def efron(at_risk: Counts, events: Counts, log_ratio: float) -> Moments:
    """Mean and variance at each time, shape (m,); counts of shape (2, m)."""
    mean, rest = _shares(at_risk, log_ratio)
    variance = np.multiply(mean, rest, out=rest)
    tied = np.flatnonzero(events[CONTROL] + events[EXPERIMENTAL] > 1)
    if tied.size:
        mean[tied], variance[tied] = _efron_sums(at_risk[:, tied], events[:, tied], log_ratio)
    return mean, variance


def exact(at_risk: Counts, events: Counts, log_ratio: float) -> Moments:
    """Mean and variance at each time, shape (m,); counts of shape (2, m)."""
    mean, rest = _shares(at_risk, log_ratio)
    variance = np.multiply(mean, rest, out=rest)
    tied = np.flatnonzero(events[CONTROL] + events[EXPERIMENTAL] > 1)
    if tied.size:
        d = events[CONTROL, tied] + events[EXPERIMENTAL, tied]
        mean[tied], variance[tied] = _hypergeometric(at_risk[:, tied], d, log_ratio)
    return mean, variance


MOMENTS: MappingProxyType[str, Callable[[Counts, Counts, float], Moments]] = MappingProxyType(
    {"Efron": efron, "Breslow": breslow, "exact": exact}
)


def possible(at_risk: Counts, events: Counts, ties: str) -> tuple[Floats, Floats]:
    """The means as the ratio goes to 0 and to infinity: the fewest and the most experimental events."""
    d = events[CONTROL] + events[EXPERIMENTAL]
    if ties == "exact":
        return np.maximum(d - at_risk[CONTROL], 0), np.minimum(d, at_risk[EXPERIMENTAL])
    return np.where(at_risk[CONTROL] > 0, 0, d), np.where(at_risk[EXPERIMENTAL] > 0, d, 0)


def _weighted(counts: Counts, log_ratio: float) -> tuple[Floats, Floats]:
    """Control and experimental counts, weighted 1 : theta without overflow."""
    return counts[CONTROL] * math.exp(min(-log_ratio, 0.0)), counts[EXPERIMENTAL] * math.exp(
        min(log_ratio, 0.0)
    )


def _shares(counts: Counts, log_ratio: float) -> tuple[Floats, Floats]:
    """Experimental and control share of the weighted counts; each on its own, so that both keep digits."""
    control, experimental = _weighted(counts, log_ratio)
    total = control + experimental
    return np.divide(experimental, total, out=experimental), np.divide(control, total, out=control)


def _efron_sums(at_risk: Counts, events: Counts, log_ratio: float) -> Moments:
    """The sums of the module's head, for d > 1."""
    d = (events[CONTROL] + events[EXPERIMENTAL]).astype(np.float64)
    share, rest = _shares(at_risk, log_ratio)
    share_of_events, rest_of_events = _shares(events, log_ratio)
    x = d * sum(_weighted(at_risk, log_ratio)) / sum(_weighted(events, log_ratio))
    first, second = tied_sums(np.maximum(x, d), d)  # x is d when all have the event, whatever rounding says
    # P - Q from the smaller pair of shares, which lose fewer digits
    apart = np.where(share < rest, share - share_of_events, rest_of_events - rest)
    mean = d * share_of_events + apart * first
    variance = (
        d * share_of_events * rest_of_events
        + apart * (rest_of_events - share_of_events) * first
        - apart**2 * second
    )
    return mean, variance


def _hypergeometric(at_risk: Counts, d: Counts, log_ratio: float) -> Moments:
    """Mean and variance of the noncentral hypergeometric distribution, by its weights."""
    control, experimental = at_risk
    fewest = np.maximum(d - control, 0).astype(np.int64)
    values = np.minimum(d, experimental) - fewest + 1
    starts = np.cumsum(values) - values
    j = np.arange(values.sum()) - np.repeat(starts - fewest, values)
    c, e, n = (np.repeat(count.astype(np.float64), values) for count in (control, experimental, d))
    with np.errstate(divide="ignore", invalid="ignore"):  # the first value of each time follows no other
        step = np.log((e - j + 1) * (n - j + 1) / (j * (c - n + j))) + log_ratio
    weight = np.exp(_running_within(step, starts, values))
    total = np.add.reduceat(weight, starts)
    mean = np.add.reduceat(weight * j, starts) / total
    away = j - np.repeat(mean, values)
    return mean, np.add.reduceat(weight * away * away, starts) / total


def _running_within(step: Floats, starts: Ints, sizes: Ints) -> Floats:
    """Running sums of the log weights within each time, less their largest, so that none overflows."""
    step[starts] = 0.0
    totals = np.add.reduceat(step, starts)
    step[starts[1:]] = -totals[:-1]  # takes the running sum back to about 0, which keeps its digits
    running = np.cumsum(step)
    running -= np.repeat(np.maximum.reduceat(running, starts), sizes)
    return running
