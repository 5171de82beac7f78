"""Several groups compared by (weighted) log-rank scores: any difference, and a trend."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr

from app.errors import NotEstimable
from app.model.survival import GroupsResult, TrendResult
from app.model.values import Floats, read_only
from app.survival.chi_square import RANK_TOLERANCE, chi_square_of
from app.survival.risk_table import EventTable, event_table
from app.survival.weights import LOG_RANK, Weight


def groups_logrank(
    time: ArrayLike,
    event: ArrayLike,
    group: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    weight: Weight = LOG_RANK,
) -> GroupsResult:
    """Test whether any of several groups differs, by (weighted) log-rank scores summed over strata.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    group : int array, shape (n,), codes from 0
    stratum : int array, shape (n,), codes from 0, optional; default is one stratum
    weight : one of app.survival.weights

    Returns
    -------
    GroupsResult
        observed and expected weighted events of each group, shape (k,), covariance of the scores, shape (k,
        k), chi-square with its degrees of freedom, p.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no event tells any two groups apart.

    Notes
    -----
    *Convention*: chi-square = U' V^- U with the generalised inverse of V; its degrees of freedom are the rank
    of V: one less than the groups that can be compared.
    *Accuracy*: sums of at most n terms; relative error below 1e-11.
    *Checked*: print (app/validation), R (tests/reference), a literal version (tests/naive.py), properties.

    References
    ----------
    Peto & Peto (1972), JRSS A 135, 185-207.

    Examples
    --------
    >>> result = groups_logrank([1, 2, 3, 4, 5, 6], [True] * 6, [0, 0, 1, 1, 2, 2])
    >>> result.degrees_of_freedom, result.expected.sum().round(12)
    (2, np.float64(6.0))
    """
    observed, expected, covariance = _scores(event_table(time, event, group, stratum), weight)
    test = chi_square_of(observed - expected, covariance, "no event tells two groups apart")
    return GroupsResult(
        observed=read_only(observed, np.float64),
        expected=read_only(expected, np.float64),
        covariance=read_only(covariance, np.float64),
        chi_square=test.chi_square,
        degrees_of_freedom=test.degrees_of_freedom,
        p=test.p,
    )


def trend_logrank(
    time: ArrayLike,
    event: ArrayLike,
    group: ArrayLike,
    *,
    scores: ArrayLike | None = None,
    stratum: ArrayLike | None = None,
    weight: Weight = LOG_RANK,
) -> TrendResult:
    """Test for a trend over ordered groups, by the scores given to them.

    Parameters
    ----------
    time, event, group, stratum, weight : as in `groups_logrank`
    scores : float array, shape (k,), a score for each group; default is the codes 0, 1, ..., k - 1

    Returns
    -------
    TrendResult
        the scores used, sum of scores (observed - expected), its variance, z [1], two-sided p.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no event tells groups of different scores apart.

    Notes
    -----
    *Convention*: z > 0 says that events come earlier in groups with a higher score.
    *Checked*: print (app/validation), R's Cox score test with exact ties (tests/reference), properties.

    References
    ----------
    Tarone (1975), Biometrika 62, 679-682.
    """
    observed, expected, covariance = _scores(event_table(time, event, group, stratum), weight)
    given = np.arange(observed.size) if scores is None else np.asarray(scores)
    if given.shape != observed.shape:
        raise ValueError(f"scores has shape {given.shape}; accepted: {observed.shape}, one for each group")
    centred = given.astype(np.float64) - given.mean()
    score = float(np.sum(centred * (observed - expected)))
    variance = float(centred @ covariance @ centred)
    if variance <= RANK_TOLERANCE * float(np.trace(covariance)) * float(np.sum(centred**2)):
        raise NotEstimable("no event tells groups of different scores apart")
    z = score / math.sqrt(variance)
    return TrendResult(
        scores=read_only(given, np.float64),
        score=score,
        variance=variance,
        z=z,
        chi_square=z * z,
        p_two_sided=float(2.0 * ndtr(-abs(z))),
    )


def _scores(table: EventTable, weight: Weight) -> tuple[Floats, Floats, Floats]:
    """Observed and expected weighted events, shape (k,), and the covariance of their difference, (k, k)."""
    n, d, at_events = table.at_risk_in_all, table.events_in_all, weight.at_events(table)
    share = table.at_risk / n
    spread = at_events**2 * d * (n - d) / np.maximum(n - 1.0, 1.0)
    covariance = np.diag((spread * share).sum(axis=1)) - (share * spread) @ share.T
    return (at_events * table.events).sum(axis=1), (at_events * d * share).sum(axis=1), covariance
