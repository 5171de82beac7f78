"""What was crossed, decided on stored values and never on rounded ones."""

from __future__ import annotations

from collections.abc import Sequence

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.plan import Sides
from app.model.values import Absent, Estimate

STANDING_CROSSINGS = ("efficacy", "control")


def crossed(
    z: float | None, bound: Bound | LookAsUsed, sides: Sides, *, z_for_harm: float | None = None
) -> Crossed:
    """What this look crosses: z at or beyond a bound; of harm and futility, harm.

    `z_for_harm` is the z of harm's own endpoint, where it has one. A final look crosses efficacy, with two
    sides control, or nothing.
    """
    if _reaches(z, bound.efficacy_z):
        return "efficacy"
    if sides == 2:
        return "control" if _falls_to(z, bound.efficacy_z, turned=True) else "none"
    if bound.final:
        return "none"
    if _falls_to(z if z_for_harm is None else z_for_harm, bound.harm_z):
        return "harm"
    return "futility" if _falls_to(z, bound.futility_z) else "none"


def _reaches(z: float | None, bound: Estimate | None) -> bool:
    return not (z is None or bound is None or isinstance(bound, Absent)) and z >= bound


def _falls_to(z: float | None, bound: Estimate | None, *, turned: bool = False) -> bool:
    return not (z is None or bound is None or isinstance(bound, Absent)) and z <= (
        -bound if turned else bound
    )


def stands(crossing: Crossed, *, binding: bool = False) -> bool:
    """Whether this crossing ends the test: efficacy on either side, and futility where that is binding."""
    return crossing in STANDING_CROSSINGS or (binding and crossing == "futility")


def first_crossed(past: Sequence[LookAsUsed], *, binding: bool = False) -> int | None:
    """Number of the first look held whose crossing ended the test."""
    return next((look.number for look in past if stands(look.crossed, binding=binding)), None)


def verdict(
    past: Sequence[LookAsUsed],
    z: float | None,
    bound: Bound,
    sides: Sides,
    *,
    binding: bool = False,
    z_for_harm: float | None = None,
) -> Verdict:
    """Where the test stands after this look. A first crossing stands whatever follows it."""
    first = first_crossed(past, binding=binding)
    if first is not None:
        return Verdict("none", first)
    here = crossed(z, bound, sides, z_for_harm=z_for_harm)
    return Verdict(here, bound.number if stands(here, binding=binding) else None)
