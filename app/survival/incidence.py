"""Cumulative incidence of one cause of an event among others: never one minus a Kaplan-Meier curve."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.model.survival import CoxResult, Incidence
from app.model.values import Counts, Floats, read_only
from app.survival.checked import checked_codes, checked_times
from app.survival.cox import cox_two_arms
from app.survival.intervals import survival_limits
from app.survival.risk_table import event_table


def cumulative_incidence(
    time: ArrayLike,
    cause: ArrayLike,
    *,
    of: int = 1,
    level: float = 0.95,
    interval: str = "log-log",
) -> Incidence:
    """Estimate by when which share has had an event of one cause, others being in its way.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    cause : int array, shape (n,); 0 = censored at `time`, 1, 2, ... = an event of that cause
    of : the cause whose incidence is wanted, >= 1
    level : confidence level of the limits, between 0 and 1
    interval : scale of the limits, of 1 - incidence; as in `kaplan_meier`

    Returns
    -------
    Incidence
        a row per time with an event of any cause, shape (m,): incidence [1], its standard error and limits.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.

    Notes
    -----
    *Convention*: the incidence grows by S(t-) d / n, S the Kaplan-Meier curve of events of any cause; at one
    time events precede censorings. The variance is that of the delta method. Limits are NaN where the
    incidence is 0 or 1.
    *Accuracy*: sums of at most m terms; relative error below 1e-10 for m <= 1e6.
    *Checked*: by hand (tests/byhand), R's survival (tests/reference), a literal version (tests/naive.py),
    properties.

    References
    ----------
    Aalen & Johansen (1978), Scandinavian Journal of Statistics 5, 141-150. Variance: Dinse & Larson (1986),
    Biometrika 73, 379-386; Marubini & Valsecchi (1995), Analysing Survival Data, section 10.3.

    Examples
    --------
    >>> cumulative_incidence([1, 2, 3, 4], [1, 2, 0, 1]).incidence.tolist()
    [0.25, 0.25, 0.75]
    """
    times = checked_times(time)
    causes = checked_causes(cause, times.size, of)
    table = event_table(times, causes > 0, (causes > 0).astype(np.int8) + (causes == of))
    n, (_, others, d) = table.at_risk.sum(axis=0), _three_rows(table.events)
    after = np.cumprod((n - d - others) / n)
    before = np.append(1.0, after)[:-1]
    incidence = np.cumsum(before * d / n)
    # what is left of 1, so that it is 0 exactly when nobody is left, and 1 exactly before the first event
    without = np.where(incidence > 0.0, after + np.cumsum(before * others / n), 1.0)
    error = _delta_error(n, d, others, before, incidence)
    error_of_log = np.divide(error, without, out=np.zeros(error.size), where=without > 0.0)
    low, high = survival_limits(without, error_of_log, level=level, interval=interval)
    return Incidence(
        time=read_only(table.time, np.float64),
        at_risk=read_only(n, np.int64),
        events=read_only(d, np.int64),
        others=read_only(others, np.int64),
        incidence=read_only(incidence, np.float64),
        std_error=read_only(error, np.float64),
        ci_low=read_only(1.0 - high, np.float64),
        ci_high=read_only(1.0 - low, np.float64),
        level=level,
        interval=interval,
    )


def cause_specific_ratio(
    time: ArrayLike,
    cause: ArrayLike,
    experimental: ArrayLike,
    *,
    of: int = 1,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    level: float = 0.95,
) -> CoxResult:
    """The hazard ratio of one cause, experimental / control, with events of other causes as censorings.

    Time, cause and `of` as in `cumulative_incidence`, the rest as in `cox_two_arms`. It compares the rates
    among those still without any event; the incidence curves say how many come to have the event.

    Prentice et al. (1978), Biometrics 34, 541-554.
    """
    causes = checked_causes(cause, np.size(time), of)
    return cox_two_arms(time, causes == of, experimental, stratum=stratum, ties=ties, level=level)


def checked_causes(cause: ArrayLike, size: int, of: int) -> Counts:
    """Causes as integer codes, shape (size,), and `of` as one of the events' codes, or ValueError."""
    codes, _ = checked_codes(cause, "cause", size)
    if of < 1:
        raise ValueError(f"of is {of!r}; accepted: a cause from 1")
    return np.zeros(size, dtype=np.int64) if codes is None else codes.astype(np.int64)


def _three_rows(events: Counts) -> Counts:
    """Rows of the censored, of other causes and of this one; a cause that nobody has is a row of zeros."""
    rows = np.zeros((3, events.shape[1]), dtype=np.int64)
    rows[: len(events)] = events
    return rows


def _delta_error(n: Counts, d: Counts, others: Counts, before: Floats, incidence: Floats) -> Floats:
    """Standard error of the incidence at each time: Marubini & Valsecchi (1995), equation (10.12).

    Var F(t) = sum (F(t) - F(s))^2 all / (n (n - all)) + sum S(s-)^2 (n - d) d / n^3
               - 2 sum (F(t) - F(s)) S(s-) d / n^2   over event times s <= t, written out in powers of F(t).
    """
    everybody = (d + others).astype(np.float64)
    left = n - everybody
    # who are the last to leave change nothing afterwards: F(t) - F(s) is 0 for them
    greenwood = np.divide(everybody, n * left, out=np.zeros(left.size), where=left > 0.0)
    jump = before * d / (n.astype(np.float64) ** 2)
    squared = np.cumsum(greenwood)
    single = np.cumsum(greenwood * incidence + jump)
    constant = np.cumsum(
        greenwood * incidence**2
        + before**2 * (n - d) * d / n.astype(np.float64) ** 3
        + 2.0 * jump * incidence
    )
    variance = incidence**2 * squared - 2.0 * incidence * single + constant
    return np.asarray(np.sqrt(np.maximum(variance, 0.0)), dtype=np.float64)
