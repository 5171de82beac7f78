"""Each event time's part of Cox's partial likelihood: its log, and mean and variance of the covariates.

With weights w = exp(covariates . coefficients), sums over those at risk and d events at the time,

Breslow   d times: log sum w, the weighted mean P of the covariates, their weighted variance;
Efron     k = 0, ..., d - 1: the same with the share k/d of the events' weights taken out. As for two arms
(see
          `tied_events`) the sums are closed: with x = d (sum w) / (sum w of the events) and Q the events' own
          mean, the k-th mean is Q + (P - Q) / (1 - k/x), and second moments likewise;
exact     all subsets of d of those at risk, weighted by the products of their w: the log of their sum and its
          derivatives, by adding one subject after the other to the sums of all smaller sizes.

Exact: Gail, Lubin & Rubinstein (1981), Biometrika 68, 703-707.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from app.errors import NotEstimable
from app.model.values import Floats, Ints
from app.survival.cox_data import CoxBlock, CoxSubjects
from app.survival.tied_sums import tied_log_sum, tied_sums

MOST_EXACT_SUBJECTS = 20_000
MOST_EXACT_SUMS = 2_000_000


@dataclass(frozen=True, eq=False)
class CoxMoments:
    """At each event time: log of the denominators, (m,); mean summed over events, (m, p); variance, (m, p,
    p).
    """

    log_denominator: Floats
    mean: Floats
    variance: Floats


def cox_moments(
    subjects: CoxSubjects, coefficients: Floats, ties: str
) -> Iterator[tuple[CoxBlock, CoxMoments]]:
    """The moments of block after block at these coefficients, shape (p,).

    NotEstimable where exact ties would take too long.
    """
    if ties == "exact" and subjects.n_events.max(initial=1) > 1:
        yield from _exact(subjects, coefficients)
        return
    sums = RiskSums(subjects, coefficients)
    for block in subjects.blocks_from_the_end():
        yield block, _moments_of(sums, block, ties)


def _moments_of(sums: RiskSums, block: CoxBlock, ties: str) -> CoxMoments:
    subjects = sums.subjects
    share, total = sums.at_risk(block)
    n_events = subjects.n_events[block.columns]
    d = n_events.astype(np.float64)
    with np.errstate(divide="ignore"):  # weights that vanish make the likelihood 0: the step is halved
        log_denominator = d * (np.log(total) + sums.log_scale)
    mean, variance = d[:, None] * share.mean, d[:, None, None] * share.variance()
    tied = np.flatnonzero(n_events > 1)
    if ties == "Efron" and tied.size:
        events, events_total = sums.of_events(block)
        x = np.maximum(d[tied] * total[tied] / events_total[tied], d[tied])
        log_denominator[tied] += tied_log_sum(x, d[tied])
        mean[tied], variance[tied] = _efron(share.at(tied), events.at(tied), x, d[tied])
    return CoxMoments(log_denominator, mean, variance)


def linear_predictor(covariates: Floats, coefficients: Floats) -> Floats:
    """Covariates . coefficients, shape (n,), summed column by column."""
    predictor: Floats = covariates[:, 0] * coefficients[0]
    for column, coefficient in zip(covariates.T[1:], coefficients[1:], strict=True):
        predictor += column * coefficient
    return predictor


@dataclass(frozen=True, eq=False)
class _Weighted:
    """Weighted mean, (m, p), and second moment, (m, p, p), of the covariates."""

    mean: Floats
    second: Floats

    def at(self, columns: Ints) -> _Weighted:
        return _Weighted(self.mean[columns], self.second[columns])

    def variance(self) -> Floats:
        variance: Floats = self.second - self.mean[:, :, None] * self.mean[:, None, :]
        return variance


class RiskSums:
    """Weighted sums over those at risk, carried from block to block; weights are scaled by the largest."""

    def __init__(self, subjects: CoxSubjects, coefficients: Floats) -> None:
        self.subjects = subjects
        self.coefficients = coefficients
        self.log_scale = _largest_predictor(subjects, coefficients)
        self.carried: list[float] = []
        self.weight = np.empty(0)

    def at_risk(self, block: CoxBlock) -> tuple[_Weighted, Floats]:
        """Mean, second moment and total weight of those at risk at each column of the block."""
        covariates = self.subjects.covariates[block.rows]
        self.weight = np.exp(linear_predictor(covariates, self.coefficients) - self.log_scale)
        first = self.subjects.starts[block.columns] - block.rows.start
        later = iter([] if block.is_last else self.carried)
        carried = []

        def sums(values: Floats) -> Floats:
            sums = np.cumsum(np.add.reduceat(values, first)[::-1])[::-1] + next(later, 0.0)
            carried.append(float(sums[0]))
            return sums

        moments = _weighted_moments(sums, covariates, self.weight)
        self.carried = carried
        return moments

    def of_events(self, block: CoxBlock) -> tuple[_Weighted, Floats]:
        """The same of those with the event at each column of the block `at_risk` was last asked for."""
        first = self.subjects.first_events(block.columns)
        end = first[-1] + self.subjects.n_events[block.columns.stop - 1]
        rows = self.subjects.event_rows[first[0] : end]
        weight = self.weight[rows - block.rows.start]

        def sums(values: Floats) -> Floats:
            return np.asarray(np.add.reduceat(values, first - first[0]), dtype=np.float64)

        return _weighted_moments(sums, self.subjects.covariates[rows], weight)


def _largest_predictor(subjects: CoxSubjects, coefficients: Floats) -> float:
    """At least the largest covariates . coefficients, so that no weight overflows."""
    if not coefficients.any():
        return 0.0
    return max(
        float(linear_predictor(subjects.covariates[block.rows], coefficients).max())
        for block in subjects.blocks_from_the_end()
    )


def _weighted_moments(
    sums: Callable[[Floats], Floats], covariates: Floats, weight: Floats
) -> tuple[_Weighted, Floats]:
    """Mean and second moment with these weights, and their total, each at the event times."""
    total = sums(weight)
    p, m = covariates.shape[1], total.size
    mean, second = np.empty((m, p)), np.empty((m, p, p))
    for k, column in enumerate(covariates.T):
        weighted = weight * column
        mean[:, k] = sums(weighted) / total
        for other in range(k + 1):
            second[:, k, other] = sums(weighted * covariates[:, other]) / total
            second[:, other, k] = second[:, k, other]
    return _Weighted(mean, second), total


def _efron(at_risk: _Weighted, events: _Weighted, x: Floats, d: Floats) -> tuple[Floats, Floats]:
    """Sums over k of the k-th mean and the k-th variance."""
    first, second = tied_sums(x, d)
    apart = at_risk.mean - events.mean
    mean = d[:, None] * events.mean + apart * first[:, None]
    crossed = events.mean[:, :, None] * apart[:, None, :]
    variance = (
        d[:, None, None] * events.variance()
        + (at_risk.second - events.second - crossed - crossed.transpose(0, 2, 1)) * first[:, None, None]
        - apart[:, :, None] * apart[:, None, :] * second[:, None, None]
    )
    return mean, variance


def _exact(subjects: CoxSubjects, coefficients: Floats) -> Iterator[tuple[CoxBlock, CoxMoments]]:
    """One pass from the last subject of each stratum to the first; each column reads the sums of its size."""
    largest = int(subjects.n_events.max())
    _require_small(subjects.size, largest)
    p = subjects.n_covariates
    for block in subjects.blocks_from_the_end():
        m = block.columns.stop - block.columns.start
        moments = CoxMoments(np.empty(m), np.empty((m, p)), np.empty((m, p, p)))
        risk = linear_predictor(subjects.covariates[block.rows], coefficients)
        if block.is_last:
            of_stratum = linear_predictor(subjects.covariates[block.stratum], coefficients)
            sums, scale = _SubsetSums(p, largest), _scale(of_stratum, largest)
        upper = block.rows.stop
        for index in range(m - 1, -1, -1):
            column = block.columns.start + index
            joining = slice(int(subjects.starts[column]), upper)
            local = slice(joining.start - block.rows.start, joining.stop - block.rows.start)
            sums.add(np.exp(risk[local] + scale), subjects.covariates[joining])
            size, upper = int(subjects.n_events[column]), joining.start
            log_sum, moments.mean[index], moments.variance[index] = sums.read(size)
            moments.log_denominator[index] = log_sum - size * scale
        yield block, moments


def _require_small(subjects: int, largest: int) -> None:
    if subjects > MOST_EXACT_SUBJECTS or subjects * (largest + 1) > MOST_EXACT_SUMS:
        raise NotEstimable(
            f"exact ties take too long with {subjects:,} subjects and up to {largest:,} events at one time "
            f"(at most {MOST_EXACT_SUBJECTS:,} subjects and {MOST_EXACT_SUMS:,} sums); take Efron's treatment"
        )


def _scale(risk: Floats, largest: int) -> float:
    """A log factor for all weights that keeps the sums over large subsets within doubles."""
    top = float(risk.max())
    return math.log(largest / float(np.exp(risk - top).sum())) - top


class _SubsetSums:
    """Sums over all subsets of each size of the product of weights, times 1, times the subset's covariate
    total, and times its square: shape (1 + p + p^2, largest + 1)."""

    def __init__(self, p: int, largest: int) -> None:
        self.p = p
        self.sums = np.zeros((1 + p + p * p, largest + 1))
        self.sums[0, 0] = 1.0

    def add(self, weights: Floats, covariates: Floats) -> None:
        """Let each of these subjects join: a subset of one more is one of before, with or without them."""
        p = self.p
        for weight, x in zip(weights, covariates, strict=True):
            joined = self.sums[:, :-1].copy()
            ones, totals, squares = joined[0], joined[1 : 1 + p], joined[1 + p :].reshape(p, p, -1)
            squares += x[:, None, None] * totals[None] + totals[:, None] * x[None, :, None]
            squares += x[:, None, None] * x[None, :, None] * ones
            totals += x[:, None] * ones
            self.sums[:, 1:] += weight * joined

    def read(self, size: int) -> tuple[float, Floats, Floats]:
        """Log of the sum, mean and variance of the subset's total, for subsets of this size."""
        one, *rest = self.sums[:, size]
        mean = np.array(rest[: self.p]) / one
        second = np.array(rest[self.p :]).reshape(self.p, self.p) / one
        return float(np.log(one)), mean, second - np.outer(mean, mean)
