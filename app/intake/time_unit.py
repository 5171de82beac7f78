"""The unit of the analysis value: as the extract says it, else as its dates show it, else as given."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import get_args

import numpy as np

from app.intake import readings
from app.intake.findings import finding
from app.intake.rows import EndpointRows
from app.model.extract import Finding, TimeUnit
from app.model.values import Bools

DAYS_IN: Mapping[TimeUnit, float] = {"days": 1.0, "weeks": 7.0, "months": 30.4375, "years": 365.25}

_IN_WORDS = re.compile(r"(?:\(|\bin )(day|week|month|year)s?\b", re.IGNORECASE)
TIME_UNITS: tuple[TimeUnit, ...] = get_args(TimeUnit)
_SHORT = {
    "d": "days",
    "wk": "weeks",
    "w": "weeks",
    "mo": "months",
    "m": "months",
    "yr": "years",
    "y": "years",
}


def time_unit(endpoint: EndpointRows) -> TimeUnit:
    """AVALU, then PARAM ("... (days)", "... in weeks"), then agreement with the dates; else `as given`."""
    for unit in (_by_column(endpoint), _by_description(endpoint)):
        if unit is not None:
            return unit
    agree = agreeing(endpoint, "days")
    return "days" if agree is not None and agree.mean() > 0.5 else "as given"


def _by_column(endpoint: EndpointRows) -> TimeUnit | None:
    column = endpoint.rows.parts.get("unit")
    units = {_unit(text) for text in column.texts if not readings.is_blank(text)} if column else set()
    return units.pop() if len(units) == 1 else None


def _unit(text: str) -> TimeUnit | None:
    word = text.strip().lower()
    for unit in TIME_UNITS:
        if word in (unit, unit.removesuffix("s")) or _SHORT.get(word) == unit:
            return unit
    return None


def _by_description(endpoint: EndpointRows) -> TimeUnit | None:
    column = endpoint.rows.parts.get("parameter_text")
    if column is None or len(column.texts) != 1:
        return None
    told = _IN_WORDS.search(column.texts[0])
    return _unit(told[1]) if told else None


def agreeing(endpoint: EndpointRows, unit: TimeUnit) -> Bools | None:
    """Where the time is that of the dates: to the day, or to a tenth of a longer unit and one day.

    None when the dates cannot tell. Rows without a date, with an end before the start or without a time above
    0 do not disagree: another finding tells of them.
    """
    by_dates = endpoint.days_by_dates
    if by_dates is None or unit == "as given" or not (by_dates >= 1).any():
        return None
    scale = DAYS_IN[unit]
    tolerance = 0.0 if unit == "days" else 1.0 + 0.1 * scale
    unknown = (by_dates < 1) | ~(endpoint.time > 0)
    close: Bools = np.abs(endpoint.time * scale - by_dates) <= tolerance
    agreed: Bools = unknown | close
    return agreed


def time_findings(endpoint: EndpointRows) -> Iterator[Finding]:
    """A doubt for each file with times that are not those of their dates."""
    unit = time_unit(endpoint)
    by_dates = endpoint.days_by_dates
    if by_dates is None:
        return
    if unit == "as given":
        yield _unit_unknown(endpoint)
        return
    agree = agreeing(endpoint, unit)
    if agree is None:
        return
    start, end = (endpoint.rows.choice.parts[part] for part in ("start", "end"))
    yield from endpoint.rows.findings(
        ~agree,
        "time-disagrees-with-dates",
        "doubt",
        "time that disagrees with its dates",
        endpoint.rows.choice.parts["time"],
        accepted=f"{end} - {start} + 1 days" + ("" if unit == "days" else f", in {unit}"),
        remedy="the time is analysed as given; ask the data centre which is right",
        value=lambda row: f"{endpoint.time[row]:g} against {by_dates[row]}",
    )


def _unit_unknown(endpoint: EndpointRows) -> Finding:
    return finding(
        "time-unit-unknown",
        "doubt",
        "unit of the time not known",
        endpoint.rows.where("time"),
        "no unit in AVALU or PARAM, and most times are not the days between the dates",
        "days, weeks, months or years",
        "the time is analysed as given; have the unit written in AVALU",
    )
