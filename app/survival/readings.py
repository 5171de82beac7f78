"""What a survival curve says at times, and times at which it says something."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.model.survival import CountsAt, Landmark, LogLogCurve, Quantile, SurvivalCurve
from app.model.values import Absent, Estimate, Floats
from app.survival.checked import checked_times
from app.survival.curve import NO_SUBJECTS, first_below

NO_LIMITS_AT_ONE = Absent(
    "not estimable: no event fell before this time, so the interval has no width to show"
)
NO_LIMITS_AT_ZERO = Absent("not estimable: nobody was left without the event")


def not_followed(at: float, curve: SurvivalCurve) -> Absent:
    """Why a curve says nothing about a time beyond its end."""
    return Absent(
        f"not estimable: nobody is followed to time {at:g}, and the curve ends above 0 at {curve.time[-1]:g}"
    )


def reaches(curve: SurvivalCurve, at: float) -> bool:
    """Whether the curve is known up to a time: somebody was followed so far, or nobody was left before."""
    return bool(curve.time.size and (at <= curve.time[-1] or curve.survival[-1] == 0.0))


def landmark(curve: SurvivalCurve, at: float) -> Landmark:
    """Survival at a time fixed in advance, with its standard error and the limits of the curve there.

    Parameters
    ----------
    curve : a curve of `kaplan_meier`
    at : finite, >= 0 [unit of the curve's time]

    Returns
    -------
    Landmark
        survival just after the events at that time; each part that does not exist is the reason why.

    Notes
    -----
    *Convention*: the curve is right-continuous. Beyond the last time the curve is unknown, unless it fell to
    0. *Accuracy*: that of the curve.
    *Checked*: print (app/validation), R (tests/reference), a literal version (tests/naive.py).

    References
    ----------
    Klein, Logan, Harhoff & Andersen (2007), Statistics in Medicine 26, 4505-4519.

    Examples
    --------
    >>> from app.survival import kaplan_meier
    >>> landmark(kaplan_meier([1, 2, 3, 4], [True, False, True, True]), 3).survival
    0.375
    """
    checked_times([at])
    if not curve.time.size:
        return Landmark(at, *(NO_SUBJECTS,) * 4)
    if not reaches(curve, at):
        return Landmark(at, *(not_followed(at, curve),) * 4)
    index = int(np.searchsorted(curve.time, at, side="right")) - 1
    if index < 0 or curve.survival[index] == 1.0:
        return Landmark(at, 1.0, 0.0, NO_LIMITS_AT_ONE, NO_LIMITS_AT_ONE)
    if curve.survival[index] == 0.0:
        return Landmark(at, 0.0, *(NO_LIMITS_AT_ZERO,) * 3)
    columns = (curve.survival, curve.std_error, curve.ci_low, curve.ci_high)
    return Landmark(at, *(float(column[index]) for column in columns))


def quantile(curve: SurvivalCurve, share: float) -> Quantile:
    """The time by which a share of the subjects has had the event, with its Brookmeyer-Crowley limits.

    Parameters
    ----------
    curve : a curve of `kaplan_meier`
    share : between 0 and 1; 0.5 is the median

    Returns
    -------
    Quantile
        times [unit of the curve's time], or "not reached".

    Notes
    -----
    *Convention*: as for the median in `kaplan_meier`, with 1 - share in the place of one half.
    *Checked*: R (tests/reference), properties.

    References
    ----------
    Brookmeyer & Crowley (1982), Biometrics 38, 29-41.

    Examples
    --------
    >>> from app.survival import kaplan_meier
    >>> quantile(kaplan_meier([1, 2, 3, 4], [True, False, True, True]), 0.25).time
    2.0
    """
    if not 0.0 < share < 1.0:
        raise ValueError(f"share is {share!r}; accepted: a number between 0 and 1")

    def read(values: Floats) -> Estimate:
        return first_below(1.0 - share, curve.time, values, curve.survival)

    return Quantile(share, read(curve.survival), read(curve.ci_low), read(curve.ci_high))


def counts_at(curve: SurvivalCurve, times: ArrayLike) -> CountsAt:
    """At risk just before each time, events and censorings before it: the three add up to the subjects.

    Parameters
    ----------
    curve : a curve of `kaplan_meier`
    times : float array, shape (k,), finite, >= 0, in any order [unit of the curve's time]

    Examples
    --------
    >>> from app.survival import kaplan_meier
    >>> counts = counts_at(kaplan_meier([1, 2, 3, 4], [True, False, True, True]), [0, 2, 2.5])
    >>> counts.at_risk.tolist(), counts.events.tolist(), counts.censored.tolist()
    ([4, 3, 2], [0, 1, 1], [0, 0, 1])
    """
    at = checked_times(times)
    before = np.searchsorted(curve.time, at, side="left")
    events, censored = (
        np.concatenate(([0], np.cumsum(counts, dtype=np.int64)))[before]
        for counts in (curve.events, curve.censored)
    )
    subjects = int(curve.at_risk[0]) if curve.time.size else 0
    return CountsAt(at, subjects - events - censored, events, censored)


def log_log_curve(curve: SurvivalCurve) -> LogLogCurve:
    """log(-log S) against log t at the event times: parallel for two arms under proportional hazards.

    Times at which S is 1 or 0, and time 0, have no place on these scales and are left out.

    References
    ----------
    Kay (1977), Applied Statistics 26, 227-237 (the plot for checking proportional hazards).
    """
    shown = (curve.events > 0) & (curve.survival > 0.0) & (curve.survival < 1.0) & (curve.time > 0.0)
    return LogLogCurve(
        time=curve.time[shown],
        log_time=np.log(curve.time[shown]),
        log_minus_log=np.log(-np.log(curve.survival[shown])),
    )
