"""Values as the record writes them: full precision, null for not asked, words for not estimable."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import Any

from app.model.values import Absent, Estimate

Record = dict[str, Any]

NO_STANDARD_ERROR = "no standard error or interval exists where the estimate is 0 or 1"


def not_estimable(reason: str) -> dict[str, str]:
    return {"not_estimable": reason}


def estimate(value: Estimate | None) -> float | dict[str, str] | None:
    """A number at full precision, the reason there is none, or null when it was not asked for."""
    if isinstance(value, Absent):
        return not_estimable(value.reason)
    return None if value is None else float(value)


def column(values: Iterable[Any], reason: str = NO_STANDARD_ERROR) -> list[Any]:
    """One array as a list; a place that is not estimable carries the reason instead of NaN."""
    return [
        not_estimable(reason) if isinstance(value, float) and math.isnan(value) else value
        for value in (value.item() if hasattr(value, "item") else value for value in values)
    ]
