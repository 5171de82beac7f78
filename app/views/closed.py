"""The closed view of a look: one result, oriented of one arm against the other, named or lettered.

Unmasked the orientation is experimental against control. Masked it is A against B, whichever is experimental,
and every one-directional quantity stands in two readings: "if A is experimental", "if B is experimental".
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Literal, TypeVar

from app.model.look import ArmCounts, LookResult
from app.model.plan import Hypothesis, Plan
from app.model.survival import ArmComparison, CoxResult, LogrankResult, Shape, SurvivalCurve
from app.model.values import Absent
from app.sequential.gatekeeping import PRIMARY, in_testing_order, opened_at
from app.views.over_running import held_until, tested_until
from app.views.reading import Gate, Reading, both_readings, true_reading

T = TypeVar("T")
Letter = Literal["A", "B"]
Role = Literal["control", "experimental"]


NO_GATES: tuple[Gate | None, ...] = (None, None)


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

    @property
    def is_over(self) -> bool:
        """True when every reading has crossed: no bound ahead is a test any more."""
        return all(reading.verdict.first_crossed is not None for reading in self.readings)


@dataclass(frozen=True, eq=False)
class HypothesisView:
    """A further hypothesis, seen as the plan's own endpoint is."""

    hypothesis: Hypothesis
    view: ClosedView


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
    opened = {PRIMARY: _opened(whole, NO_GATES)}
    views: dict[str, HypothesisView] = {}
    for each in in_testing_order(plan.hypotheses):
        gates = NO_GATES if each.after is None else _gates(each.after, opened[each.after])
        own = plan.for_hypothesis(each)
        view = _view(results[each.name], own, letters, masked=masked, of=of, gates=gates)
        views[each.name], opened[each.name] = HypothesisView(each, view), _opened(view, gates)
    return replace(whole, hypotheses=tuple(views[each.name] for each in plan.hypotheses))


def _gates(waits_for: str, opened: Sequence[int | None]) -> tuple[Gate | None, ...]:
    return tuple(Gate(waits_for, at) for at in opened)


def _opened(view: ClosedView, gates: Sequence[Gate | None]) -> tuple[int | None, ...]:
    """The look that opens the gate for what waits for this, in each reading; not before its own did."""
    own = (0 if gate is None else gate.opened_at or 0 for gate in gates)
    return tuple(
        opened_at(each.history, each.verdict, view.look.number, gate=gate)
        for each, gate in zip(view.readings, own, strict=False)
    )


def _view(
    look: LookResult,
    plan: Plan,
    letters: Letters,
    *,
    masked: bool,
    of: Role,
    gates: Sequence[Gate | None] = NO_GATES,
) -> ClosedView:
    against: Role = "control" if of == "experimental" else "experimental"
    turned = of == "control"
    compared = look.mirrored if turned else _experimental_against_control(look)
    shape = look.mirrored_shape if turned else look.shape
    readings: tuple[Reading, ...] = (true_reading(look, plan, gates[0]),)
    if masked:
        readings = both_readings(look, plan, compared, turned, gates)
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
        readings=readings,
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


def _without_second_tests(view: ClosedView) -> ClosedView:
    """Once every reading has crossed, no later bound is a test: over-running is shown beside the crossing."""
    hypotheses = tuple(replace(each, view=_without_second_tests(each.view)) for each in view.hypotheses)
    view = replace(view, hypotheses=hypotheses)
    firsts = [each.verdict.first_crossed for each in view.readings]
    known = [first for first in firsts if first is not None]
    if len(known) < len(firsts):
        return view
    last = max(known)
    readings = tuple(replace(each, history=held_until(last, each.history)) for each in view.readings)
    return replace(view, look=tested_until(last, view.look), readings=readings)
