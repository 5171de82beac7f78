"""The time axis of curves: its unit, its ticks and where it ends."""

from __future__ import annotations

import math
from dataclasses import dataclass

from app.model.extract import TimeUnit
from app.model.survival import SurvivalCurve
from app.model.values import Floats
from app.sheets.words import DAYS_PER_MONTH

FEWEST_AT_RISK = 20
STEPS = (1, 2, 3, 6, 12, 24, 36, 60, 120)
PLAIN_STEPS = (1, 2, 5, 10, 20, 25, 50, 100, 200, 500, 1000, 2000, 5000)
MOST_TICKS = 7
MONTHS_PER_YEAR = 12.0


@dataclass(frozen=True)
class TimeAxis:
    """`scale` units of the data make one unit of display, whose name is `unit` ("months").

    `enough_at_risk` says whether the axis ends where too few are left, or shows all follow-up; `known` is how
    far every curve is observed, in the unit of display.
    """

    unit: str
    scale: float
    ticks: tuple[float, ...]
    enough_at_risk: bool
    known: float

    @property
    def end(self) -> float:
        return self.ticks[-1]

    @property
    def named(self) -> float:
        """What a sentence speaks of: the last whole year, else the last tick, that all curves reach."""
        last = max(tick for tick in self.ticks if tick <= max(self.known, self.ticks[0]))
        if self.unit == "months" and last >= MONTHS_PER_YEAR:
            return MONTHS_PER_YEAR * math.floor(last / MONTHS_PER_YEAR)
        return last or self.ticks[1]

    def shown(self, time: Floats) -> Floats:
        return time / self.scale


def display_unit(time_unit: TimeUnit) -> tuple[str, float]:
    """Days are shown as months of 30.4375 days; any other unit as it was given."""
    if time_unit == "days":
        return "months", DAYS_PER_MONTH
    return ("time units", 1.0) if time_unit == "as given" else (time_unit, 1.0)


def time_axis(curves: tuple[SurvivalCurve, ...], time_unit: TimeUnit) -> TimeAxis:
    """Ticks from 0 by a round step; the axis ends at the last tick with 20 at risk in each arm.

    Where not even the first tick has 20, it ends at the first tick at or after the last time.
    """
    unit, scale = display_unit(time_unit)
    reach = min(_last_time_with(curve, FEWEST_AT_RISK) for curve in curves) / scale
    known = min(_last_time_with(curve, 1) for curve in curves) / scale
    step = _step(reach, unit)
    if reach >= step:
        return TimeAxis(unit, scale, _ticks(step, math.floor(reach / step)), True, known)
    whole = max(_last_time_with(curve, 1) for curve in curves) / scale
    step = _step(whole, unit)
    return TimeAxis(unit, scale, _ticks(step, math.ceil(whole / step)), False, known)


def ticks_up_to(end: float, unit: str) -> tuple[float, ...]:
    """Round times from 0 that do not pass `end`, the last time shown; `end` itself where none is so small."""
    step = _step(end, unit)
    return _ticks(step, math.floor(end / step)) if end >= step else (0.0, end)


def _ticks(step: float, number: int) -> tuple[float, ...]:
    return tuple(index * step for index in range(max(1, number) + 1))


def _last_time_with(curve: SurvivalCurve, fewest: int) -> float:
    enough = curve.time[curve.at_risk >= fewest]
    return float(enough[-1]) if enough.size else 0.0


def _step(reach: float, unit: str) -> float:
    """The smallest round step with few enough ticks, however far the times reach."""
    steps = STEPS if unit == "months" else PLAIN_STEPS
    return next(float(step) for step in (*steps, *_beyond(steps[-1], reach)) if reach / step <= MOST_TICKS)


def _beyond(largest: float, reach: float) -> tuple[float, ...]:
    """1, 2, 5 and 10 times the largest step at the power of ten that `reach` asks for."""
    tens = math.floor(math.log10(max(1.0, reach / (largest * MOST_TICKS))))
    return tuple(largest * 10.0**tens * factor for factor in (1, 2, 5, 10, 20))
