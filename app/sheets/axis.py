"""The time axis of curves: its unit, its ticks and where it ends."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from app.model.extract import TimeUnit
from app.model.survival import SurvivalCurve
from app.model.values import Floats
from app.sheets.words import DAYS_PER_MONTH

FEWEST_AT_RISK = 20
STEPS = (1, 2, 3, 6, 12, 24, 36, 60, 120)
PLAIN_STEPS = (1, 2, 5, 10, 20, 25, 50, 100, 200, 500, 1000, 2000, 5000)
MOST_TICKS = 7


@dataclass(frozen=True)
class TimeAxis:
    """`scale` units of the data make one unit of display, whose name is `unit` ("months")."""

    unit: str
    scale: float
    ticks: tuple[float, ...]

    @property
    def end(self) -> float:
        return self.ticks[-1]

    def shown(self, time: Floats) -> Floats:
        return time / self.scale


def display_unit(time_unit: TimeUnit) -> tuple[str, float]:
    """Days are shown as months of 30.4375 days; any other unit as it was given."""
    if time_unit == "days":
        return "months", DAYS_PER_MONTH
    return ("time units", 1.0) if time_unit == "as given" else (time_unit, 1.0)


def time_axis(curves: tuple[SurvivalCurve, ...], time_unit: TimeUnit) -> TimeAxis:
    """Ticks from 0 by a round step; the axis ends at the last tick with 20 at risk in each arm.

    With fewer than 20 in an arm to begin with, it ends at the first tick at or after the last time.
    """
    unit, scale = display_unit(time_unit)
    reach = min(_last_time_with(curve, FEWEST_AT_RISK) for curve in curves) / scale
    whole = max(float(curve.time[-1]) for curve in curves) / scale
    step = _step(reach or whole, unit)
    last = int(np.floor(reach / step)) if reach >= step else int(np.ceil(whole / step))
    return TimeAxis(unit, scale, tuple(float(index * step) for index in range(max(1, last) + 1)))


def _last_time_with(curve: SurvivalCurve, fewest: int) -> float:
    enough = curve.time[curve.at_risk >= fewest]
    return float(enough[-1]) if enough.size else 0.0


def _step(reach: float, unit: str) -> float:
    steps = STEPS if unit == "months" else PLAIN_STEPS
    return float(next((step for step in steps if reach / step <= MOST_TICKS), steps[-1]))
