"""A hazard ratio that a reader chose, read in every reading of a view. Nothing of it is kept."""

from __future__ import annotations

from app.model.outlook import ConditionalPower, WhatIf
from app.model.values import Absent
from app.review.onwards import power_under
from app.views.closed import ClosedView
from app.views.reading import Reading


def what_if(view: ClosedView, hazard_ratio: float) -> WhatIf:
    """Masked, the same ratio is experimental / control in each reading, whichever letter is which."""
    return WhatIf(hazard_ratio, tuple(_power(view, reading, hazard_ratio) for reading in view.readings))


def _power(view: ClosedView, reading: Reading, hazard_ratio: float) -> ConditionalPower | Absent:
    """Nothing where the outlook of this reading says nothing: no look is to come, or no later test."""
    outlook, look = reading.onwards.outlook, view.look
    if isinstance(outlook, Absent):
        return outlook
    return power_under(hazard_ratio, view.plan, reading.z, look.information, look.planned)
