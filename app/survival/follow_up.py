"""How complete the follow-up of a group is."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike

from app.errors import NotEstimable
from app.model.survival import Completeness
from app.survival.checked import checked_flags, checked_times


def completeness(time: ArrayLike, event: ArrayLike, potential: ArrayLike) -> Completeness:
    """Observed person-time as a share of what full follow-up to the cutoff would have given.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    potential : float array, shape (n,), finite, >= `time`: the time from each subject's start to the cutoff

    Returns
    -------
    Completeness
        observed and potential person-time [subjects x unit of time], and their ratio, 0-1.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no subjects, or all at time 0.

    Notes
    -----
    *Convention*: whoever had the event is complete: potential time ends with the event.
    *Accuracy*: two sums of n terms.
    *Checked*: by hand (tests/byhand), properties.

    References
    ----------
    Clark, Altman & De Stavola (2002), Lancet 359, 1309-1310.

    Examples
    --------
    >>> completeness([10, 4, 6], [True, False, False], [20, 8, 6]).share
    0.8333333333333334
    """
    times, could = checked_times(time), checked_times(potential)
    events = checked_flags(event, "event", times.size)
    if could.shape != times.shape:
        raise ValueError(f"potential has shape {could.shape}; accepted: {times.shape}, as time")
    short = np.flatnonzero(could < times)
    if short.size:
        raise ValueError(
            f"potential holds {could[short[0]]!r} at time {times[short[0]]!r}; accepted: at least as much"
        )
    observed = math.fsum(times)
    full = math.fsum(np.where(events, times, could))
    if full == 0.0:
        raise NotEstimable("no subjects" if not times.size else "no follow-up: every time is 0")
    return Completeness(observed=observed, potential=full, share=observed / full)
