"""Gray's test that the cumulative incidence of one cause is the same in all groups.

In the notation of Gray (1988) with rho = 0: at each event time group k has Y_k at risk, S_k is its
Kaplan-Meier curve of events of any cause, F_k its incidence of the cause. Everybody counts as at risk of the
cause who has not had it, those who had another event too: R_k = Y_k (1 - F_k(t-)) / S_k(t-). The score of
group k is the sum of d_k - d R_k / R. Its variance is that of a martingale with jumps at the events of
either kind (section 3).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.errors import NotEstimable
from app.model.survival import GrayResult
from app.model.values import Counts, Floats, read_only
from app.survival.checked import checked_codes, checked_times
from app.survival.chi_square import chi_square_of
from app.survival.incidence import checked_causes
from app.survival.risk_table import EventTable, event_table


def gray_test(
    time: ArrayLike,
    cause: ArrayLike,
    group: ArrayLike,
    *,
    of: int = 1,
    stratum: ArrayLike | None = None,
) -> GrayResult:
    """Test whether the cumulative incidence of one cause differs between groups.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    cause : int array, shape (n,); 0 = censored at `time`, 1, 2, ... = an event of that cause
    group : int array, shape (n,), codes from 0
    of : the cause whose incidence is compared, >= 1
    stratum : int array, shape (n,), codes from 0, optional; default is one stratum

    Returns
    -------
    GrayResult
        score of each group [events], shape (k,), covariance, shape (k, k), chi-square and p.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no event of the cause tells two groups apart.

    Notes
    -----
    *Convention*: at one time events precede censorings; rho = 0; scores and covariances are summed over
    strata. A positive score says more events of the cause than if the incidences were the same.
    *Accuracy*: sums of at most m terms; relative error below 1e-10.
    *Checked*: R's cmprsk (tests/reference), its level under no difference, properties.

    References
    ----------
    Gray (1988), Annals of Statistics 16, 1141-1154.
    """
    times = checked_times(time)
    causes = checked_causes(cause, times.size, of)
    groups, n_groups = checked_codes(group, "group", times.size)
    if groups is None:
        raise NotEstimable("no subjects")
    cell = 3 * groups.astype(np.int64) + (causes > 0) + (causes == of)
    table = event_table(times, causes > 0, cell, stratum)
    score, covariance = np.zeros(n_groups), np.zeros((n_groups, n_groups))
    for span in table.spans():
        part = _Paths.of(table, span, n_groups)
        score += part.score().sum(axis=1)
        covariance += part.covariance()
    test = chi_square_of(score, covariance, "no event of the cause tells two groups apart")
    return GrayResult(
        score=read_only(score, np.float64),
        covariance=read_only(covariance, np.float64),
        chi_square=test.chi_square,
        degrees_of_freedom=test.degrees_of_freedom,
        p=test.p,
    )


@dataclass(frozen=True, eq=False)
class _Paths:
    """One stratum at its event times, shape (groups, m): at risk, events of the cause and others, curves.

    `survival_before` is S_k(t-), `incidence_before` F_k(t-).
    """

    at_risk: Floats
    events: Floats
    others: Floats
    survival_before: Floats
    survival: Floats
    incidence_before: Floats

    @classmethod
    def of(cls, table: EventTable, span: slice, n_groups: int) -> _Paths:
        n = _cells(table.at_risk[:, span], n_groups).sum(axis=1)
        _, others, d = _cells(table.events[:, span], n_groups).transpose(1, 0, 2)
        survival = np.asarray(np.cumprod(1.0 - _share(d + others, n), axis=1), dtype=np.float64)
        before = _shifted(survival, 1.0)
        incidence = np.cumsum(before * _share(d, n), axis=1)
        return cls(n, d, others, before, survival, _shifted(incidence, 0.0))

    @cached_property
    def inflated(self) -> Floats:
        """Y_k / S_k(t-)."""
        return _share(self.at_risk, self.survival_before)

    @cached_property
    def pooled_growth(self) -> Floats:
        """Growth of the common incidence at each time, shape (m,)."""
        return _share(self.events.sum(axis=0), self.inflated.sum(axis=0))

    def score(self) -> Floats:
        """d_k - d R_k / R at each time."""
        still_at_risk = self.inflated * (1.0 - self.incidence_before)
        share = _share(still_at_risk, np.broadcast_to(still_at_risk.sum(axis=0), self.events.shape))
        score: Floats = self.events - self.events.sum(axis=0) * share
        return score

    def covariance(self) -> Floats:
        """The sum over the times of what each group's events add, shape (groups, groups)."""
        common_before = _shifted(np.cumsum(self.pooled_growth), 0.0)
        groups, m = self.events.shape
        total = np.zeros((groups, groups))
        for k in range(groups):
            pull = self._pull(k)  # how an event in group k moves each group's score at once
            drift = np.cumsum(pull * _share(self.pooled_growth, 1.0 - common_before), axis=1)
            rest = drift[:, -1:] - drift if m else drift  # ... and later
            ratio = _share(1.0 - common_before - self.pooled_growth, self.survival[k])
            fall = np.where(self.survival[k] > 0.0, 1.0 - ratio, 1.0)
            by_cause = pull + fall * rest
            by_others = ratio * rest
            total += (by_cause * self._weight_of_cause(k)) @ by_cause.T
            total += (by_others * self._weight_of_others(k)) @ by_others.T
        return total

    def _pull(self, k: int) -> Floats:
        share = _share(self.inflated, np.broadcast_to(self.inflated.sum(axis=0), self.events.shape))
        own = np.zeros(self.events.shape)
        own[k] = 1.0
        return np.where(self.at_risk[k] > 0.0, self.inflated[k] * (own - share), 0.0)

    def _weight_of_cause(self, k: int) -> Floats:
        """Variance of the growth of F_k by the cause, were it that of all; ties as in the hypergeometric."""
        d, before = self.events.sum(axis=0), self.survival_before[k]
        tied = 1.0 - _share(d - 1.0, self.inflated.sum(axis=0) * before - 1.0)
        weight: Floats = np.where(d > 1.0, tied, 1.0) * before * _share(self.pooled_growth, self.at_risk[k])
        return weight

    def _weight_of_others(self, k: int) -> Floats:
        """Variance of the fall of S_k by other causes."""
        d, n = self.others[k], self.at_risk[k]
        tied = np.where(d > 1.0, 1.0 - _share(d - 1.0, n - 1.0), 1.0)
        counted = self.survival[k] > 0.0
        weight: Floats = tied * self.survival_before[k] ** 2 * _share(d, n**2) * counted
        return weight


def _cells(counts: Counts, n_groups: int) -> Floats:
    """Counts by group and by how they leave: censored, other causes, this cause; shape (groups, 3, m)."""
    cells = np.zeros((3 * n_groups, counts.shape[1]))
    cells[: len(counts)] = counts
    return cells.reshape(n_groups, 3, -1)


def _share(part: NDArray[Any], whole: NDArray[Any]) -> Floats:
    """part / whole, 0 where the whole is 0."""
    share: Floats = np.divide(part, whole, out=np.zeros(part.shape), where=whole != 0.0)
    return share


def _shifted(values: NDArray[Any], start: float) -> Floats:
    """The values just before each time."""
    shifted = np.full(values.shape, start)
    shifted[..., 1:] = values[..., :-1]
    return shifted
