"""The closed view of a look: one result, oriented of one arm against the other, named or lettered.

Unmasked the orientation is experimental against control. Masked it is A against B, whichever is experimental,
and every one-directional quantity stands in two readings: "if A is experimental", "if B is experimental".
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal, TypeVar

from scipy.special import ndtr

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.look import ArmCounts, LookResult, Onwards
from app.model.plan import Hypothesis, Plan
from app.model.survival import ArmComparison, CoxResult, LogrankResult, Shape, SurvivalCurve
from app.model.values import Absent, Estimate
from app.sequential.gatekeeping import PRIMARY, gated_history, gated_verdict, in_testing_order, opened_at
from app.sequential.verdict import crossed, first_crossed, verdict

T = TypeVar("T")
Letter = Literal["A", "B"]
Role = Literal["control", "experimental"]


@dataclass(frozen=True)
class Letters:
    """Which letter the control arm carries, drawn when the plan was locked."""

    control: Letter

    @property
    def experimental(self) -> Letter:
        return "B" if self.control == "A" else "A"

    def of(self, role: Role) -> Letter:
        return self.control if role == "control" else self.experimental


@dataclass(frozen=True, eq=False)
class ArmView:
    """One arm as this view names it: by letter while masked, by the plan's value once unmasked."""

    letter: Letter
    value: str
    counts: ArmCounts
    curve: SurvivalCurve


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


@dataclass(frozen=True)
class HarmView:
    """Harm's own endpoint: counts in the order of the view's arms, tests as the view is oriented."""

    parameter: str
    information_used: float
    counts: tuple[ArmCounts, ArmCounts]
    logrank: LogrankResult | Absent
    stratum_labels: tuple[str, ...]
    cox: CoxResult | Absent


@dataclass(frozen=True)
class StratumView:
    """One stratum: pooled counts, and (subjects, events) of the arms in the order of the view."""

    label: str
    subjects: int
    events: int
    arms: tuple[tuple[int, int], tuple[int, int]]


@dataclass(frozen=True, eq=False)
class ClosedView:
    """A look as the closed side sees it. `arms[0]` is the one the orientation is of."""

    plan: Plan
    look: LookResult
    masked: bool
    arms: tuple[ArmView, ArmView]
    strata: tuple[StratumView, ...]
    logrank: LogrankResult | Absent
    logrank_unstratified: LogrankResult | Absent
    cox: CoxResult | Absent
    cox_unstratified: CoxResult | Absent
    readings: tuple[Reading, ...]
    shape: Shape
    harm: HarmView | None = None
    hypotheses: tuple[HypothesisView, ...] = ()

    @property
    def of(self) -> ArmView:
        return self.arms[0]

    @property
    def against(self) -> ArmView:
        return self.arms[1]


@dataclass(frozen=True, eq=False)
class HypothesisView:
    """A further hypothesis, seen as the plan's own endpoint is."""

    hypothesis: Hypothesis
    view: ClosedView


@dataclass(frozen=True)
class _Gate:
    """What a hypothesis waits for, and the look that opened the way; None while it waits."""

    waits_for: str
    opened_at: int | None


def unmasked_view(look: LookResult, plan: Plan, letters: Letters) -> ClosedView:
    """Arms by name, experimental against control: the one true reading."""
    return _without_second_tests(_whole(look, plan, letters, masked=False, of="experimental"))


def full_view(look: LookResult, plan: Plan) -> ClosedView:
    """What the trial file keeps: named arms, and every bound whatever was crossed, to be read both ways."""
    return _whole(look, plan, Letters("A"), masked=False, of="experimental")


def masked_view(look: LookResult, plan: Plan, letters: Letters) -> ClosedView:
    """Arms by letter, A against B, with both readings. Nothing in it depends on which letter is which."""
    of: Role = "control" if letters.control == "A" else "experimental"
    return _without_second_tests(_whole(_without_held_z(look), plan, letters, masked=True, of=of))


def _without_held_z(look: LookResult) -> LookResult:
    """The look without the z of looks held before: it is of experimental against control, by name.

    Beside a z of A against B its sign would say which letter is experimental.
    """
    before = look.held_before
    past = (replace(each, z=None) if each.number in before else each for each in look.past)
    return replace(look, past=tuple(past), held=tuple(replace(each, z=None) for each in look.held))


def _whole(look: LookResult, plan: Plan, letters: Letters, *, masked: bool, of: Role) -> ClosedView:
    """The plan's endpoint and each further hypothesis, none before the one that it waits for."""
    whole = _view(look, plan, letters, masked=masked, of=of)
    results = {each.hypothesis.name: each.result for each in look.hypotheses}
    opened = {PRIMARY: _opened(whole)}
    views: dict[str, HypothesisView] = {}
    for each in in_testing_order(plan.hypotheses):
        gates = (None, None) if each.after is None else _gates(each.after, opened[each.after])
        own = plan.for_hypothesis(each)
        view = _view(results[each.name], own, letters, masked=masked, of=of, gates=gates)
        views[each.name], opened[each.name] = HypothesisView(each, view), _opened(view)
    return replace(whole, hypotheses=tuple(views[each.name] for each in plan.hypotheses))


def _gates(waits_for: str, opened: Sequence[int | None]) -> tuple[_Gate, ...]:
    return tuple(_Gate(waits_for, at) for at in opened)


def _opened(view: ClosedView) -> tuple[int | None, ...]:
    """The look at which efficacy was crossed, in each reading."""
    return tuple(opened_at(each.history, each.verdict, view.look.number) for each in view.readings)


def _view(
    look: LookResult,
    plan: Plan,
    letters: Letters,
    *,
    masked: bool,
    of: Role,
    gates: Sequence[_Gate | None] = (None, None),
) -> ClosedView:
    against: Role = "control" if of == "experimental" else "experimental"
    turned = of == "control"
    compared = look.mirrored if turned else _experimental_against_control(look)
    shape = look.mirrored_shape if turned else look.shape
    return ClosedView(
        plan=plan,
        look=look,
        masked=masked,
        arms=(_arm(look, plan, letters, of, masked), _arm(look, plan, letters, against, masked)),
        strata=_strata(look, turned),
        logrank=compared.logrank,
        logrank_unstratified=compared.logrank_unstratified,
        cox=_lettered(compared.cox) if masked else compared.cox,
        cox_unstratified=_lettered(compared.cox_unstratified) if masked else compared.cox_unstratified,
        readings=_readings(look, plan, compared, turned, gates)
        if masked
        else (_true_reading(look, plan, gates[0]),),
        shape=_lettered_shape(shape) if masked else shape,
        harm=_harm(look, turned, masked),
    )


def _harm(look: LookResult, turned: bool, masked: bool) -> HarmView | None:
    harm = look.harm
    if harm is None:
        return None
    compared = harm.mirrored if turned else harm.compared
    counts = (harm.control, harm.experimental) if turned else (harm.experimental, harm.control)
    cox = _lettered(compared.cox) if masked else compared.cox
    return HarmView(harm.parameter, harm.information_used, counts, compared.logrank, harm.stratum_labels, cox)


def _experimental_against_control(look: LookResult) -> ArmComparison:
    return ArmComparison(look.logrank, look.logrank_unstratified, look.cox, look.cox_unstratified)


def _lettered_shape(shape: Shape) -> Shape:
    return replace(
        shape,
        proportionality=_lettered(shape.proportionality),
        residuals=_lettered(shape.residuals),
        ratio_over_time=_lettered(shape.ratio_over_time),
    )


def _lettered(found: T | Absent) -> T | Absent:
    """A reason that names the arms by their part names them by letter: the one compared is A."""
    if not isinstance(found, Absent):
        return found
    return Absent(found.reason.replace("the experimental arm", "arm A").replace("the control arm", "arm B"))


def _arm(look: LookResult, plan: Plan, letters: Letters, role: Role, masked: bool) -> ArmView:
    control = role == "control"
    name = plan.arms.control if control else plan.arms.experimental
    letter = letters.of(role)
    information = look.information
    return ArmView(
        letter=letter,
        value=letter if masked else name,
        counts=information.control if control else information.experimental,
        curve=look.control_curve if control else look.experimental_curve,
    )


def _strata(look: LookResult, turned: bool) -> tuple[StratumView, ...]:
    views = []
    for stratum in look.information.strata:
        experimental = (stratum.experimental_subjects, stratum.experimental_events)
        control = (stratum.subjects - experimental[0], stratum.events - experimental[1])
        arms = (control, experimental) if turned else (experimental, control)
        views.append(StratumView(stratum.label, stratum.subjects, stratum.events, arms))
    return tuple(views)


@dataclass(frozen=True)
class _Side:
    """What was computed with one arm as the experimental one."""

    test: LogrankResult | Absent
    history: tuple[LookAsUsed, ...]
    onwards: Onwards
    z_for_harm: float | None


def _true_side(look: LookResult) -> _Side:
    return _Side(look.logrank, look.past, look.onwards, None if look.harm is None else look.harm.z)


def _true_reading(look: LookResult, plan: Plan, gate: _Gate | None) -> Reading:
    return _reading(look, plan, plan.arms.experimental, _true_side(look), gate)


def _readings(
    look: LookResult, plan: Plan, compared: ArmComparison, turned: bool, gates: Sequence[_Gate | None]
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


def _turned_z(z: float | None) -> float | None:
    """From the other side; + 0.0 so that no -0.0 tells what was turned."""
    return None if z is None else -z + 0.0


def _turned(result: LogrankResult | Absent) -> LogrankResult | Absent:
    """z and its one-sided p from the other side."""
    if isinstance(result, Absent):
        return result
    return replace(result, z=-result.z + 0.0, p_one_sided=float(ndtr(result.z)))


def _reading(look: LookResult, plan: Plan, experimental: str, side: _Side, gate: _Gate | None) -> Reading:
    test, sides = side.test, plan.design.sides
    z, p = (test, test) if isinstance(test, Absent) else (test.z, test.p_one_sided)
    known = None if isinstance(z, Absent) else z
    if gate is None:
        history, waits_for = side.history, None
        stands = verdict(
            history, known, look.bound, sides, binding=is_binding(plan), z_for_harm=side.z_for_harm
        )
    else:
        history = gated_history(side.history, gate.opened_at, sides)
        stands = gated_verdict(side.history, known, look.bound, sides, gate.opened_at)
        waits_for = gate.waits_for if gate.opened_at is None else None
    onwards = _still_open(side.onwards, look, stands, waits_for)
    return Reading(experimental, z, p, stands, history, onwards, side.z_for_harm, waits_for)


def is_binding(plan: Plan) -> bool:
    """Whether a crossing of the futility bound ends the test."""
    return plan.futility is not None and plan.futility.binding


def _still_open(onwards: Onwards, look: LookResult, stands: Verdict, waits_for: str | None) -> Onwards:
    """After a crossing nothing is left to be crossed; over-running, nothing is inferred a second time."""
    first = stands.first_crossed
    if waits_for is not None:
        return replace(onwards, stopping=Absent(f"this hypothesis waits for {waits_for}: it was not tested"))
    if first is None:
        return onwards
    if first == look.number:
        return replace(onwards, outlook=Absent(f"the boundary was crossed at look {first}: no later test"))
    over = _over_running(first)
    return Onwards(over, over, over)


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
        over = first_crossed(turned, binding=is_binding(plan))
        here: Crossed = "none" if over else crossed(z, held, plan.design.sides, z_for_harm=z_for_harm)
        turned.append(replace(held, z=z, z_for_harm=z_for_harm, crossed=here))
    return tuple(turned)


def _without_second_tests(view: ClosedView) -> ClosedView:
    """Once every reading has crossed, no later bound is a test: over-running is shown beside the crossing."""
    hypotheses = tuple(replace(each, view=_without_second_tests(each.view)) for each in view.hypotheses)
    view = replace(view, hypotheses=hypotheses)
    firsts = [reading.verdict.first_crossed for reading in view.readings]
    known = [first for first in firsts if first is not None]
    if len(known) < len(firsts):
        return view
    last = max(known)
    readings = tuple(replace(each, history=_until(last, each.history)) for each in view.readings)
    look = replace(view.look, past=_until(last, view.look.past), planned=())
    if last < look.number:
        look = replace(look, bound=_no_bound(look.bound, _spent_by(last, look.past), _over_running(last)))
    return replace(view, look=look, readings=readings)


def _until(last: int, past: tuple[LookAsUsed, ...]) -> tuple[LookAsUsed, ...]:
    """The looks as used, those after look `last` without a bound."""
    return tuple(each if each.number <= last else _untested(each, last, past) for each in past)


def _untested(held: LookAsUsed, last: int, past: tuple[LookAsUsed, ...]) -> LookAsUsed:
    none, spent = _over_running(last), _spent_by(last, past)
    return replace(
        held,
        efficacy_z=none,
        efficacy_hazard_ratio=none,
        alpha_spent=spent,
        futility_z=None if held.futility_z is None else none,
        harm_z=None if held.harm_z is None else none,
    )


def _spent_by(last: int, past: tuple[LookAsUsed, ...]) -> float:
    return next(each.alpha_spent for each in past if each.number == last)


def _over_running(last: int) -> Absent:
    return Absent(f"the boundary was crossed at look {last}: over-running, with no second test")


def _no_bound(bound: Bound, alpha_spent: float, reason: Absent) -> Bound:
    return replace(
        bound,
        alpha_spent=alpha_spent,
        alpha_spent_here=0.0,
        efficacy_z=reason,
        efficacy_p_one_sided=reason,
        efficacy_hazard_ratio=reason,
        futility_z=None if bound.futility_z is None else reason,
        futility_hazard_ratio=None if bound.futility_z is None else reason,
        harm_z=None if bound.harm_z is None else reason,
        harm_hazard_ratio=None if bound.harm_z is None else reason,
    )
