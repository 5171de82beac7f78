"""The closed view of a look: one result, oriented of one arm against the other, named or lettered.

Unmasked the orientation is experimental against control. Masked it is A against B, whichever is experimental,
and every one-directional quantity stands in two readings: "if A is experimental", "if B is experimental".
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

from scipy.special import ndtr

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.look import ArmCounts, LookResult
from app.model.plan import Plan, Sides
from app.model.survival import CoxResult, LogrankResult, LogrankStratum, SurvivalCurve
from app.model.values import Absent, Estimate
from app.sequential.verdict import crossed, first_crossed, verdict

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
    """The one-directional results, were `experimental` (an arm's value in this view) the experimental arm."""

    experimental: str
    z: Estimate
    p_one_sided: Estimate
    verdict: Verdict
    history: tuple[LookAsUsed, ...]


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

    @property
    def of(self) -> ArmView:
        return self.arms[0]

    @property
    def against(self) -> ArmView:
        return self.arms[1]


def unmasked_view(look: LookResult, plan: Plan, letters: Letters) -> ClosedView:
    """Arms by name, experimental against control: the one true reading."""
    view = _view(look, plan, letters, masked=False, of="experimental")
    return replace(view, look=_without_second_test(look, view.readings[0].verdict))


def full_view(look: LookResult, plan: Plan) -> ClosedView:
    """What the trial file keeps: named arms, and each bound whatever was crossed before, so that it can be read both ways."""
    return _view(look, plan, Letters("A"), masked=False, of="experimental")


def masked_view(look: LookResult, plan: Plan, letters: Letters) -> ClosedView:
    """Arms by letter, A against B, with both readings. Nothing in it depends on which letter is which."""
    of: Role = "control" if letters.control == "A" else "experimental"
    return _view(look, plan, letters, masked=True, of=of)


def _view(look: LookResult, plan: Plan, letters: Letters, *, masked: bool, of: Role) -> ClosedView:
    against: Role = "control" if of == "experimental" else "experimental"
    turned = of == "control"
    arms = tuple(_arm(look, plan, letters, role, masked) for role in (of, against))
    true, mirrored = _reading(look, plan, turned=False), _reading(look, plan, turned=True)
    if masked:
        first, second = (mirrored, true) if turned else (true, mirrored)
        readings = (replace(first, experimental="A"), replace(second, experimental="B"))
    else:
        readings = (replace(true, experimental=plan.arms.experimental),)
    return ClosedView(
        plan=plan,
        look=look,
        masked=masked,
        arms=(arms[0], arms[1]),
        strata=_strata(look, turned),
        logrank=turn_logrank(look.logrank) if turned else look.logrank,
        logrank_unstratified=turn_logrank(look.logrank_unstratified) if turned else look.logrank_unstratified,
        cox=turn_cox(look.cox) if turned else look.cox,
        cox_unstratified=turn_cox(look.cox_unstratified) if turned else look.cox_unstratified,
        readings=readings,
    )


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


def turn_logrank(result: LogrankResult | Absent) -> LogrankResult | Absent:
    """The same test of the other arm: O and E become the other arm's, z changes sign."""
    if isinstance(result, Absent):
        return result
    events = sum(stratum.events for stratum in result.strata)
    return replace(
        result,
        observed=events - result.observed,
        expected=events - result.expected,
        z=-result.z,
        p_one_sided=float(ndtr(result.z)),
        strata=tuple(_turn_stratum(stratum) for stratum in result.strata),
    )


def _turn_stratum(stratum: LogrankStratum) -> LogrankStratum:
    return replace(
        stratum, observed=stratum.events - stratum.observed, expected=stratum.events - stratum.expected
    )


def turn_cox(result: CoxResult | Absent) -> CoxResult | Absent:
    """The same model with the arms exchanged: the log ratio changes sign, the rest follows from it."""
    if isinstance(result, Absent):
        return result
    log_low, log_high = -math.log(result.ci_high), -math.log(result.ci_low)
    return replace(
        result,
        log_hazard_ratio=-result.log_hazard_ratio,
        hazard_ratio=math.exp(-result.log_hazard_ratio),
        ci_low=math.exp(log_low),
        ci_high=math.exp(log_high),
    )


def _reading(look: LookResult, plan: Plan, *, turned: bool) -> Reading:
    """The verdicts as they are, or as they would be were the arms exchanged (bounds do not depend on z)."""
    if isinstance(look.logrank, Absent):
        z, p = look.logrank, look.logrank
    else:
        z = -look.logrank.z if turned else look.logrank.z
        p = float(ndtr(-z))
    history = _turn_history(look.past, plan.design.sides) if turned else look.past
    stands = verdict(history, None if isinstance(z, Absent) else z, look.bound, plan.design.sides)
    return Reading(experimental="", z=z, p_one_sided=p, verdict=stands, history=history)


def _turn_history(past: tuple[LookAsUsed, ...], sides: Sides) -> tuple[LookAsUsed, ...]:
    turned: list[LookAsUsed] = []
    for held in past:
        z = None if held.z is None else -held.z
        here: Crossed = "none" if first_crossed(turned) else crossed(z, held, sides)
        turned.append(replace(held, z=z, crossed=here))
    return tuple(turned)


def _without_second_test(look: LookResult, stands: Verdict) -> LookResult:
    """After a crossing the bound is no test any more: over-running is shown beside it (DESIGN: after a crossing)."""
    first = stands.first_crossed
    if first is None:
        return look
    if first == look.number:
        return replace(look, planned=())
    reason = Absent(f"the boundary was crossed at look {first}: over-running, with no second test")
    spent = look.past[-1].alpha_spent
    return replace(look, planned=(), bound=_no_bound(look.bound, spent, reason))


def _no_bound(bound: Bound, alpha_spent: float, reason: Absent) -> Bound:
    return replace(
        bound,
        alpha_spent=alpha_spent,
        alpha_spent_here=0.0,
        efficacy_z=reason,
        efficacy_p_one_sided=reason,
        efficacy_hazard_ratio=reason,
    )
