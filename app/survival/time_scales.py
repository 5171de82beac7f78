"""Scales of time on which a hazard ratio may be thought to change along a straight line."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from app.errors import NotEstimable
from app.model.values import Floats
from app.survival.checked import checked_choice
from app.survival.risk_table import event_table, risk_table

TRANSFORMS = ("identity", "log", "rank", "km")


def event_times_on_scale(event_times: Floats, time: ArrayLike, event: ArrayLike, transform: str) -> Floats:
    """The event times, shape (m,), on a scale that the whole sample `time`, `event`, shape (n,), may set.

    "rank" is the mean rank among all times, "km" is 1 - the Kaplan-Meier curve of all subjects just before.
    NotEstimable where an event at time 0 has no logarithm.
    """
    checked_choice(transform, "transform", TRANSFORMS)
    if transform == "identity":
        return event_times
    if transform == "log":
        if event_times.size and event_times.min() == 0.0:
            raise NotEstimable("an event at time 0 has no place on the log scale of time")
        return np.log(event_times)
    return _ranks(event_times, time, event) if transform == "rank" else _fallen(event_times, time, event)


def _ranks(event_times: Floats, time: ArrayLike, event: ArrayLike) -> Floats:
    table = risk_table(time, event)
    before = table.at_risk[0, :1] - table.at_risk[0]
    ranks: Floats = before + (table.events[0] + table.censored[0] + 1) / 2.0
    return np.take(ranks, np.searchsorted(table.time, event_times))


def _fallen(event_times: Floats, time: ArrayLike, event: ArrayLike) -> Floats:
    table = event_table(time, event)
    survival = np.cumprod((table.at_risk[0] - table.events[0]) / table.at_risk[0])
    before = np.append(1.0, survival)[:-1]
    fallen: Floats = 1.0 - before
    return fallen if event_times is table.time else fallen[np.searchsorted(table.time, event_times)]
