"""A reading of a look: its one-directional results, were one arm or the other the experimental one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from scipy.special import ndtr

from app.model.boundary import Crossed, LookAsUsed, Verdict
from app.model.look import LookResult, Onwards
from app.model.plan import Plan
from app.model.survival import ArmComparison, LogrankResult
from app.model.values import Absent, Estimate
from app.sequential.boundary import over_running
from app.sequential.gatekeeping import gated_history, gated_verdict
from app.sequential.verdict import crossed, first_crossed, verdict


@dataclass(frozen=True)
class Reading:
    """The one-directional results, were `experimental` (an arm's value in this view) the experimental arm.

    `z_for_harm` is of harm's own endpoint, where it has one; `waits_for` names the hypothesis that must cross
    before this one is tested, None once it may be.
    """

    experimental: str
    z: Estimate
    p_one_sided: Estimate
    verdict: Verdict
    history: tuple[LookAsUsed, ...]
    onwards: Onwards
    z_for_harm: float | None = None
    waits_for: str | None = None

    def crossed_before(self, look: int) -> bool:
        """Whether it crossed at an earlier look: look `look` is over-running, with no second test."""
        first = self.verdict.first_crossed
        return first is not None and first < look


@dataclass(frozen=True)
class Gate:
    """What a hypothesis waits for, and the look that opened the way; None while it waits."""

    waits_for: str
    opened_at: int | None


@dataclass(frozen=True)
class _Side:
    """What was computed with one arm as the experimental one."""

    test: LogrankResult | Absent
    history: tuple[LookAsUsed, ...]
    onwards: Onwards
    z_for_harm: float | None


def true_reading(look: LookResult, plan: Plan, gate: Gate | None) -> Reading:
    return _reading(look, plan, plan.arms.experimental, _true_side(look), gate)


def both_readings(
    look: LookResult, plan: Plan, compared: ArmComparison, turned: bool, gates: Sequence[Gate | None]
) -> tuple[Reading, Reading]:
    """If A is experimental, if B is; `compared` is A against B, and bounds are the same in both."""
    true = _true_side(look)
    mirrored = replace(
        true,
        history=_turned_history(look, plan),
        onwards=look.mirrored_onwards,
        z_for_harm=_turned_z(true.z_for_harm),
    )
    first, second = (mirrored, true) if turned else (true, mirrored)
    return (
        _reading(look, plan, "A", replace(first, test=compared.logrank), gates[0]),
        _reading(look, plan, "B", replace(second, test=_turned(compared.logrank)), gates[1]),
    )


def _true_side(look: LookResult) -> _Side:
    return _Side(look.logrank, look.past, look.onwards, None if look.harm is None else look.harm.z)


def _turned_history(look: LookResult, plan: Plan) -> tuple[LookAsUsed, ...]:
    """The looks held as they would read were the arms exchanged: z turned, crossings decided anew.

    What the plan says of looks held before is said of experimental against control, whichever arm that is: it
    reads the same.
    """
    turned: list[LookAsUsed] = []
    for held in look.past:
        if held.number in look.held_before:
            turned.append(held)
            continue
        z, z_for_harm = _turned_z(held.z), _turned_z(held.z_for_harm)
        over = first_crossed(turned, binding=_is_binding(plan))
        here: Crossed = "none" if over else crossed(z, held, plan.design.sides, z_for_harm=z_for_harm)
        turned.append(replace(held, z=z, z_for_harm=z_for_harm, crossed=here))
    return tuple(turned)


def _turned_z(z: float | None) -> float | None:
    """From the other side; + 0.0 so that no -0.0 tells what was turned."""
    return None if z is None else -z + 0.0


def _turned(result: LogrankResult | Absent) -> LogrankResult | Absent:
    """z and its one-sided p from the other side."""
    if isinstance(result, Absent):
        return result
    return replace(result, z=-result.z + 0.0, p_one_sided=float(ndtr(result.z)))


def _reading(look: LookResult, plan: Plan, experimental: str, side: _Side, gate: Gate | None) -> Reading:
    test, sides = side.test, plan.design.sides
    z, p = (test, test) if isinstance(test, Absent) else (test.z, test.p_one_sided)
    known = None if isinstance(z, Absent) else z
    if gate is None:
        history, waits_for = side.history, None
        stands = verdict(
            history, known, look.bound, sides, binding=_is_binding(plan), z_for_harm=side.z_for_harm
        )
    else:
        history = gated_history(side.history, gate.opened_at, sides)
        stands = gated_verdict(side.history, known, look.bound, sides, gate.opened_at)
        waits_for = gate.waits_for if gate.opened_at is None else None
    onwards = _still_open(side.onwards, look, stands, waits_for)
    return Reading(experimental, z, p, stands, history, onwards, side.z_for_harm, waits_for)


def _still_open(onwards: Onwards, look: LookResult, stands: Verdict, waits_for: str | None) -> Onwards:
    """After a crossing nothing is left to be crossed; over-running, nothing is inferred a second time."""
    first = stands.first_crossed
    if waits_for is not None:
        return replace(onwards, stopping=Absent(f"this hypothesis waits for {waits_for}: it was not tested"))
    if first is None:
        return onwards
    if first == look.number:
        return replace(onwards, outlook=Absent(f"the boundary was crossed at look {first}: no later test"))
    over = over_running(first)
    return Onwards(over, over, over)


def _is_binding(plan: Plan) -> bool:
    """Whether a crossing of the futility bound ends the test."""
    return plan.futility is not None and plan.futility.binding
