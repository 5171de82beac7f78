"""The lanes of the Boundary sheet: each look as a gauge, z against its bounds."""

from __future__ import annotations

from app.model.boundary import BELOW, Bound, Crossed, LookAsUsed
from app.model.values import Absent, Estimate
from app.sheets.blocks import Lane, Span
from app.sheets.further import is_harm_elsewhere
from app.sheets.words import turned, z_number, z_places
from app.views.closed import ClosedView


def boundary_lanes(view: ClosedView) -> tuple[Lane, ...]:
    past = tuple(_past_lane(view, held) for held in view.readings[0].history)
    ahead = () if view.is_over else view.look.planned
    return (*past, _lane_now(view), *(_planned_lane(view, bound) for bound in ahead))


def _past_lane(view: ClosedView, held: LookAsUsed) -> Lane:
    upper, lower = _bounds_shown(view, held.z, held.efficacy_z, held.number)
    firsts = {reading.verdict.first_crossed for reading in view.readings}
    return Lane(
        look=held.number,
        fraction=held.fraction,
        state="past",
        final=held.final,
        z=z_shown(held.z, held.efficacy_z),
        upper=upper,
        lower=lower,
        crossed=held.number in firsts or _crossed_below_at(view, held.number),
        futility=_lower_shown(held.futility_z, held.final),
        harm=_harm_shown(view, held.harm_z),
    )


def _crossed_below_at(view: ClosedView, look: int) -> bool:
    """Whether a look held crossed futility or harm, in any reading."""
    held = (each for reading in view.readings for each in reading.history)
    below = (each.crossed for each in held if each.number == look)
    return any(crossed in BELOW and _is_in_lane(view, crossed) for crossed in below)


def _is_in_lane(view: ClosedView, crossed: Crossed) -> bool:
    """False of harm that another z than the lane's has crossed."""
    return crossed != "none" and not (crossed == "harm" and is_harm_elsewhere(view))


def _lane_now(view: ClosedView) -> Lane:
    look, z = view.look, z_now(view)
    upper, lower = _bounds_shown(view, z, look.bound.efficacy_z, look.number)
    crossed = any(_is_in_lane(view, each.verdict.crossed) for each in view.readings)
    fraction, shown = look.bound.information_fraction, z_shown(z, look.bound.efficacy_z)
    below = _below_shown(view, look.bound)
    return Lane(look.number, fraction, "now", look.final, shown, upper, lower, crossed, *below)


def _planned_lane(view: ClosedView, bound: Bound) -> Lane:
    upper, lower = _bounds_shown(view, None, bound.efficacy_z, bound.number)
    fraction, below = bound.information_fraction, _below_shown(view, bound)
    return Lane(bound.number, fraction, "planned", bound.final, None, upper, lower, False, *below)


def _below_shown(view: ClosedView, bound: Bound) -> tuple[Span | None, Span | None]:
    """The futility and the harm bound of a lane."""
    return _lower_shown(bound.futility_z, bound.final), _harm_shown(view, bound.harm_z)


def _harm_shown(view: ClosedView, z: Estimate | None) -> Span | None:
    """Not in the lane of another z than the one it is for."""
    return None if is_harm_elsewhere(view) else _lower_shown(z, final=False)


def _lower_shown(z: Estimate | None, final: bool) -> Span | None:
    """A bound below; at a final look what is not efficacy has no zone of its own."""
    return None if z is None or isinstance(z, Absent) or final else z_number(z)


def z_now(view: ClosedView) -> float | None:
    z = view.readings[0].z
    return None if isinstance(z, Absent) else z


def z_shown(z: float | None, bound: Estimate) -> Span | None:
    return None if z is None else z_number(z, places=z_places(z, bound))


def bound_places(z: float | None, bound: Estimate) -> int:
    """The places of a bound beside the z of its look, if it has one yet."""
    return 3 if z is None else z_places(z, bound)


def _bounds_shown(
    view: ClosedView, z: float | None, bound: Estimate, look: int
) -> tuple[Span | None, Span | None]:
    """The bounds a lane draws: none where none exists, or where that reading had crossed before this look."""
    if isinstance(bound, Absent):
        return None, None
    places = bound_places(z, bound)
    upper, lower = z_number(bound, places=places), turned(bound, places)
    if view.masked and view.plan.design.sides == 1:
        tested = [not reading.crossed_before(look) for reading in view.readings]
        return (upper if tested[0] else None), (lower if tested[1] else None)
    if view.readings[0].crossed_before(look):
        return None, None
    return upper, (lower if view.plan.design.sides == 2 else None)
