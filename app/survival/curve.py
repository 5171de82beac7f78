"""The Kaplan-Meier curve of one group, its median, and the follow-up behind it."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from app.model.survival import SurvivalCurve
from app.model.values import Absent, Counts, Estimate, Floats
from app.survival.checked import checked_flags, checked_times
from app.survival.intervals import survival_limits
from app.survival.risk_table import RiskTable, risk_table

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
    return _curve(risk_table(time, event), level, interval)


def _curve(table: RiskTable, level: float, interval: str) -> SurvivalCurve:
    """The curve of the one group and stratum of this table."""
    at_risk, events, censored = table.at_risk[0], table.events[0], table.censored[0]
    survival = product_limit(at_risk, events)
    error_of_log = greenwood(at_risk, events)
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
        median=first_below(0.5, table.time, survival, survival),
        median_ci_low=first_below(0.5, table.time, low, survival),
        median_ci_high=first_below(0.5, table.time, high, survival),
        level=level,
        interval=interval,
    )


def kaplan_meier_by_arm(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    level: float = 0.95,
    interval: str = "log-log",
) -> tuple[SurvivalCurve, SurvivalCurve]:
    """The curves of the control and of the experimental arm; see `kaplan_meier`."""
    arm = checked_flags(experimental, "experimental", np.size(time))
    table = risk_table(time, event, stratum=arm)  # as strata the arms have columns of their own
    first_experimental = int(np.searchsorted(table.stratum, 1))
    return (
        _curve(table.only(slice(first_experimental)), level, interval),
        _curve(table.only(slice(first_experimental, None)), level, interval),
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
    return first_below(0.5, table.time, still_followed, still_followed)


def product_limit(at_risk: Counts, events: Counts) -> Floats:
    """Survival just after each time, shape (m,)."""
    survival = (at_risk - events) / at_risk
    return np.cumprod(survival, out=survival)


def greenwood(at_risk: Counts, events: Counts) -> Floats:
    """Standard error of log S, shape (m,); NaN once nobody is left after an event."""
    terms = at_risk.astype(np.float64)
    terms *= at_risk - events
    terms[-1:][terms[-1:] == 0.0] = np.nan  # only the last time can leave nobody
    np.divide(events, terms, out=terms)
    return np.sqrt(np.cumsum(terms, out=terms), out=terms)


def first_below(target: float, time: Floats, values: Floats, survival: Floats) -> Estimate:
    """Where a curve, or a limit of it, first falls below the target; flat stretches as in `kaplan_meier`."""
    if time.size == 0:
        return NO_SUBJECTS
    reached = values < target + FLAT_TOLERANCE
    first = int(np.argmax(reached))
    if not reached[first]:
        never_existed = np.isnan(values).all() and survival[-1] == 0.0
        return NO_INTERVAL if never_existed else NOT_REACHED
    if abs(values[first] - target) < FLAT_TOLERANCE:
        lower = values[first:] < values[first]
        end = int(np.argmax(lower))
        if lower[end]:
            return float((time[first] + time[first + end]) / 2.0)
    return float(time[first])


def _frozen(array: NDArray[Any]) -> NDArray[Any]:
    """The same array, refusing writes from now on: records are shared."""
    array.flags.writeable = False
    return array
