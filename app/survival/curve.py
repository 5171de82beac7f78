"""The Kaplan-Meier curve of one group, its median, and the follow-up behind it."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.model.survival import SurvivalCurve
from app.model.values import Absent, Estimate, Floats, Ints
from app.survival.intervals import survival_limits
from app.survival.risk_table import checked_flags, checked_times, risk_table

FLAT_TOLERANCE = float(np.sqrt(np.finfo(np.float64).eps))  # a survival this near 0.5 is 0.5

NO_SUBJECTS = Absent("no subjects")
NOT_REACHED = Absent("not reached")
NO_INTERVAL = Absent("not estimable: the curve fell to 0 at its first event, where no interval exists")


def kaplan_meier(
    time: ArrayLike, event: ArrayLike, *, level: float = 0.95, interval: str = "log-log"
) -> SurvivalCurve:
    """Estimate the survival curve of one group, with pointwise confidence limits and its median.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    level : confidence level of the limits, between 0 and 1
    interval : scale of the limits: "plain", "log", "log-log", "logit" or "arcsine-square-root"

    Returns
    -------
    SurvivalCurve
        a row per distinct time, shape (m,): survival [1], its Greenwood standard error [1], limits [1]; the
        median and its Brookmeyer-Crowley limits [unit of time]. n = 0 gives a curve without rows.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.

    Notes
    -----
    *Convention*: events precede censorings at one time; the curve is right-continuous and ends at the last
    time. The standard error is NaN at survival 0; limits are NaN at survival 0 and at survival 1, for every
    scale. The median is the first time with survival below 0.5; where survival is exactly 0.5 (to 1.5e-8)
    until a further event, the middle of that stretch; where it is so until the last time, the start of the
    stretch, as its end is not known. Its limits read the confidence limits in the same way, so that of
    several crossings the first counts.
    *Accuracy*: a product and a sum of at most m terms; relative error below 1e-12 for m <= 1e3, 1e-10 for
    m <= 1e6.
    *Checked*: by hand (tests/byhand), print (app/validation/survival_rows.py), a literal version
    (tests/naive.py), properties.

    References
    ----------
    Kaplan & Meier (1958), JASA 53, 457-481. Greenwood (1926), Reports on Public Health 33. Kalbfleisch &
    Prentice (1980), The Statistical Analysis of Failure Time Data. Brookmeyer & Crowley (1982), Biometrics
    38, 29-41.

    Examples
    --------
    >>> curve = kaplan_meier([1, 2, 3, 4], [True, False, True, True])
    >>> curve.survival.tolist(), curve.median
    ([0.75, 0.75, 0.375, 0.0], 3.0)
    """
    table = risk_table(time, event)
    at_risk, events, censored = table.at_risk[0], table.events[0], table.censored[0]
    survival = np.cumprod((at_risk - events) / at_risk)
    error_of_log = _greenwood(at_risk, events)
    low, high = survival_limits(survival, error_of_log, level=level, interval=interval)
    return SurvivalCurve(
        time=_frozen(table.time),
        at_risk=_frozen(at_risk),
        events=_frozen(events),
        censored=_frozen(censored),
        survival=_frozen(survival),
        std_error=_frozen(survival * error_of_log),
        ci_low=_frozen(low),
        ci_high=_frozen(high),
        median=_first_below_half(table.time, survival, survival),
        median_ci_low=_first_below_half(table.time, low, survival),
        median_ci_high=_first_below_half(table.time, high, survival),
        level=level,
        interval=interval,
    )


def follow_up_median(time: ArrayLike, event: ArrayLike) -> Estimate:
    """Median follow-up by the reverse Kaplan-Meier method: censoring is the event, and an event censors.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there

    Returns
    -------
    float or Absent
        the time by which half would have been censored, had no event fallen [unit of time].

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.

    Notes
    -----
    *Convention*: subjects with an event at a time are still at risk of censoring at that time.
    *Accuracy*: a time of the sample, or the middle of two.
    *Checked*: Freireich's trial (app/validation/survival_rows.py), a literal version (tests/naive.py).

    References
    ----------
    Schemper & Smith (1996), Controlled Clinical Trials 17, 343-346.

    Examples
    --------
    >>> follow_up_median([1, 2, 3, 4], [True, False, False, False])
    3.0
    """
    times = checked_times(time)
    table = risk_table(times, ~checked_flags(event, "event", times.size))
    still_followed = np.cumprod((table.at_risk[0] - table.events[0]) / table.at_risk[0])
    return _first_below_half(table.time, still_followed, still_followed)


def _greenwood(at_risk: Ints, events: Ints) -> Floats:
    """Standard error of log S, shape (m,); NaN once nobody is left."""
    surviving = at_risk - events
    terms = np.divide(
        events, at_risk * surviving.astype(np.float64), out=np.full(events.size, np.nan), where=surviving > 0
    )
    # a last time with censorings only leaves nobody either, but adds no event and so no variance
    terms[events == 0] = 0.0
    error: Floats = np.sqrt(np.cumsum(terms))
    return error


def _first_below_half(time: Floats, values: Floats, survival: Floats) -> Estimate:
    """Where a curve, or a limit of it, first falls below 0.5; flat stretches as `kaplan_meier` says."""
    if time.size == 0:
        return NO_SUBJECTS
    at_or_below = np.flatnonzero(values < 0.5 + FLAT_TOLERANCE)
    if at_or_below.size == 0:
        never_existed = np.isnan(values).all() and survival[-1] == 0.0
        return NO_INTERVAL if never_existed else NOT_REACHED
    first = at_or_below[0]
    lower = at_or_below[values[at_or_below] < values[first]]
    if abs(values[first] - 0.5) < FLAT_TOLERANCE and lower.size:
        return float((time[first] + time[lower[0]]) / 2.0)
    return float(time[first])


def _frozen(array: NDArray[Any]) -> NDArray[Any]:
    """The same array, refusing writes from now on: records are shared."""
    array.flags.writeable = False
    return array
