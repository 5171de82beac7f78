"""Over-running: the looks after a crossing are shown beside it, and no bound of theirs is a test any more."""

from __future__ import annotations

from dataclasses import replace

from app.model.boundary import Bound, LookAsUsed
from app.model.look import LookResult
from app.model.values import Absent
from app.sequential.boundary import over_running


def held_until(last: int, past: tuple[LookAsUsed, ...]) -> tuple[LookAsUsed, ...]:
    """The looks as used, those after look `last` without a bound."""
    return tuple(each if each.number <= last else _untested(each, last, past) for each in past)


def tested_until(last: int, look: LookResult) -> LookResult:
    """The look without bounds after look `last`, held, here or to come."""
    look = replace(look, past=held_until(last, look.past), planned=())
    if last == look.number:
        return look
    return replace(look, bound=_no_bound(look.bound, _crossing_look(last, look.past), over_running(last)))


def _untested(held: LookAsUsed, last: int, past: tuple[LookAsUsed, ...]) -> LookAsUsed:
    none, crossing = over_running(last), _crossing_look(last, past)
    return replace(
        held,
        efficacy_z=none,
        efficacy_hazard_ratio=none,
        alpha_spent=crossing.alpha_spent,
        type_two_spent=crossing.type_two_spent,
        harm_alpha_spent=crossing.harm_alpha_spent,
        futility_z=None if held.futility_z is None else none,
        harm_z=None if held.harm_z is None else none,
    )


def _crossing_look(last: int, past: tuple[LookAsUsed, ...]) -> LookAsUsed:
    """The look after which nothing is spent any more."""
    return next(each for each in past if each.number == last)


def _no_bound(bound: Bound, crossing: LookAsUsed, reason: Absent) -> Bound:
    return replace(
        bound,
        alpha_spent=crossing.alpha_spent,
        alpha_spent_here=0.0,
        efficacy_z=reason,
        efficacy_p_one_sided=reason,
        efficacy_hazard_ratio=reason,
        futility_z=None if bound.futility_z is None else reason,
        type_two_spent=None if bound.type_two_spent is None else crossing.type_two_spent,
        futility_hazard_ratio=None if bound.futility_z is None else reason,
        harm_z=None if bound.harm_z is None else reason,
        harm_alpha_spent=None if bound.harm_alpha_spent is None else crossing.harm_alpha_spent,
        harm_hazard_ratio=None if bound.harm_z is None else reason,
    )
