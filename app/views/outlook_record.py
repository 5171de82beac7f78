"""The record of going on and of ending here."""

from __future__ import annotations

from dataclasses import fields

from app.model.outlook import (
    ConditionalPower,
    NextLook,
    Outlook,
    PredictivePower,
    RepeatedInterval,
    Stopping,
    WhatIf,
)
from app.model.values import Absent
from app.record.numbers import Record, estimate, not_estimable
from app.record.schema import CONDITIONAL_POWER, EFFECTS, NEXT_LOOK


def outlook_record(outlook: Outlook | Absent) -> Record:
    """Going on: conditional and predictive power, and what the next look would need."""
    if isinstance(outlook, Absent):
        return not_estimable(outlook.reason)
    return {
        "conditional_power": {effect: _power(getattr(outlook, effect)) for effect in EFFECTS},
        "criterion": estimate(outlook.criterion),
        "predictive_power": part_record(outlook.predictive_power),
        "next_look": None if outlook.next_look is None else _next_look(outlook.next_look),
    }


def chosen_record(asked: WhatIf) -> Record:
    """Conditional power under a ratio that was asked about, in the one reading of an unmasked view."""
    (power,) = asked.readings
    return not_estimable(power.reason) if isinstance(power, Absent) else _power(power)


def _power(power: ConditionalPower) -> Record:
    return {name: estimate(getattr(power, name)) for name in CONDITIONAL_POWER}


def _next_look(ahead: NextLook) -> Record:
    counted = {"number": ahead.number, "events": ahead.events}
    named = (name for name in NEXT_LOOK if name not in counted and name != "chance")
    numbers = {name: estimate(getattr(ahead, name)) for name in named}
    chance = {effect: estimate(getattr(ahead, f"chance_{effect}")) for effect in ("design", "trend", "null")}
    return {**counted, **numbers, "chance": chance}


def part_record(part: PredictivePower | RepeatedInterval | Stopping | Absent) -> Record:
    """A record whose fields carry the names of the record, or the reason why there is none."""
    if isinstance(part, Absent):
        return not_estimable(part.reason)
    return {item.name: estimate(getattr(part, item.name)) for item in fields(part)}
