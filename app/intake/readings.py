"""One text of an extract as a number, a date or a censoring value; never a guess."""

from __future__ import annotations

import math
import re
from datetime import date

NO_NUMBER = math.nan
NO_DAY = -(2**62)  # stands for a date that is missing or unreadable, before any finding has been made of it
NO_CENSOR = -1

_NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?", re.ASCII)
_ISO_DAY = re.compile(r"\d{4}-\d{2}-\d{2}", re.ASCII)
_WHOLE = re.compile(r"\d{1,9}(\.0+)?", re.ASCII)
_EPOCH = date(1970, 1, 1).toordinal()


def is_blank(text: str) -> bool:
    """Nothing, or SAS's point for a missing number."""
    return text.strip() in ("", ".")


def number(text: str) -> float:
    """A decimal number with a point; NO_NUMBER otherwise (also for what no double can hold)."""
    text = text.strip()
    value = float(text) if _NUMBER.fullmatch(text) else NO_NUMBER
    return value if math.isfinite(value) else NO_NUMBER


def censor(text: str) -> int:
    """A whole number of at least 0 (0 is an event), also written 1.0; NO_CENSOR otherwise."""
    text = text.strip()
    return int(text.partition(".")[0]) if _WHOLE.fullmatch(text) else NO_CENSOR


def day(text: str) -> int:
    """Days since 1970-01-01 of a date written yyyy-mm-dd; NO_DAY otherwise."""
    text = text.strip()
    if not _ISO_DAY.fullmatch(text):
        return NO_DAY
    try:
        return day_of(date.fromisoformat(text))
    except ValueError:  # such as 2024-02-30
        return NO_DAY


def day_of(calendar_date: date) -> int:
    return calendar_date.toordinal() - _EPOCH


def date_of(days: int) -> date:
    return date.fromordinal(int(days) + _EPOCH)
