"""What was crossed, decided on stored values and never on rounded ones."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.plan import Sides
from app.model.values import Absent

STANDING_CROSSINGS = ("efficacy", "control")


def crossed(z: float | None, bound: Bound | LookAsUsed, sides: Sides) -> Crossed:
    """What this look crosses: z at or beyond the bound, below it only where the test has two sides."""
    if z is None or isinstance(bound.efficacy_z, Absent):
        return "none"
    if z >= bound.efficacy_z:
        return "efficacy"
    return "control" if sides == 2 and z <= -bound.efficacy_z else "none"


def first_crossed(past: Sequence[LookAsUsed]) -> int | None:
    """Number of the first look held that crossed an efficacy bound, on either side."""
    return next((look.number for look in past if look.crossed in STANDING_CROSSINGS), None)


def verdict(past: Sequence[LookAsUsed], z: float | None, bound: Bound, sides: Sides) -> Verdict:
    """Where the test stands after this look. A first crossing stands whatever follows it."""
    here = crossed(z, bound, sides)
    first = first_crossed(past)
    if first is not None:
        return Verdict("none", first)
    return Verdict(here, bound.number if here in STANDING_CROSSINGS else None)
