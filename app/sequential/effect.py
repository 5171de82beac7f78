"""A plan's effect: as hazard ratio and as z, solved for the power, and the rules that rest on it.

`noncentrality` is the mean of z at full information under an effect; on the scale of fractions it is the
drift.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cache, lru_cache

from scipy.optimize import brentq
from scipy.special import ndtri

from app.errors import AccuracyNotReached, DesignInvalid
from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Design, Efficacy, Futility, Harm, Plan
from app.model.values import Absent
from app.sequential.boundary import TOO_FEW_PATHS, bounds_ahead
from app.sequential.density import Region, crossing_probabilities
from app.sequential.rules import (
    Direction,
    EfficacyRule,
    FutilityByConditionalPower,
    FutilityByHazardRatio,
    FutilityRule,
    FutilitySpending,
    HarmRule,
    LookAhead,
    efficacy_rule,
    harm_rule,
)
from app.sequential.spending import type_two_spending

_POWER_REACHED = 1e-9


@dataclass(frozen=True)
class EffectScale:
    """Between a hazard ratio and the mean of z at full information, where the score variance is I.

    `full_score_variance` is d p q with the planned events and allocation, or the planned score variance.
    """

    direction: Direction
    full_score_variance: float

    def noncentrality(self, hazard_ratio: float) -> float:
        """-s log(HR) sqrt(I): positive for a ratio that favours experimental (Schoenfeld 1981)."""
        return -self.direction * math.log(hazard_ratio) * math.sqrt(self.full_score_variance)

    def hazard_ratio(self, noncentrality: float) -> float:
        return math.exp(-self.direction * noncentrality / math.sqrt(self.full_score_variance))


@dataclass(frozen=True)
class PlanRules:
    """All rules of a plan, ready for `bounds_ahead`; futility carries the effect solved for the power."""

    efficacy: EfficacyRule
    futility: FutilityRule | None
    harm: HarmRule | None
    scale: EffectScale

    @property
    def binding(self) -> bool:
        """Whether a crossing of the futility bound ends the test."""
        return isinstance(self.futility, FutilitySpending) and self.futility.binding

    def bounds(self, past: Sequence[LookAsUsed], ahead: Sequence[LookAhead]) -> tuple[Bound, ...]:
        """The bounds of this plan at looks to come (see `bounds_ahead`)."""
        return bounds_ahead(self.efficacy, past, ahead, futility=self.futility, harm=self.harm)


def plan_rules(plan: Plan) -> PlanRules:
    """The rules that a whole plan lays down."""
    return rules_of(
        plan.design,
        plan.efficacy,
        experimental_share=plan.arms.experimental_share,
        direction=plan.endpoint.direction,
        futility=plan.futility,
        harm=plan.harm,
        parameter=plan.endpoint.parameter,
    )


@lru_cache(maxsize=64)
def rules_of(
    design: Design,
    efficacy: Efficacy,
    *,
    experimental_share: float,
    direction: Direction,
    futility: Futility | None = None,
    harm: Harm | None = None,
    parameter: str = "",
) -> PlanRules:
    """The rules of a plan's tables; `parameter` is the endpoint of the test. Kept, as the effect is searched.

    Raises
    ------
    DesignInvalid : a power not above alpha, or futility that leaves efficacy too little room for the power.
    """
    rule = efficacy_rule(design, efficacy, direction)
    scale = effect_scale(design, experimental_share, direction)
    by_futility = None
    if futility is not None:
        effect = noncentrality_for_power(rule, design, experimental_share, futility)
        by_futility = futility_rule(futility, design, scale, effect)
    by_harm = None if harm is None else harm_rule(harm, parameter)
    return PlanRules(rule, by_futility, by_harm, scale)


def full_information(design: Design) -> float:
    """Information at fraction 1 in the unit of correlations: planned events, or planned score variance."""
    if design.planned_score_variance is not None:
        return design.planned_score_variance
    return float(design.planned_events)


def effect_scale(design: Design, experimental_share: float, direction: Direction) -> EffectScale:
    if design.planned_score_variance is not None:
        return EffectScale(direction, design.planned_score_variance)
    return EffectScale(direction, design.planned_events * experimental_share * (1.0 - experimental_share))


def futility_rule(futility: Futility, design: Design, scale: EffectScale, effect: float) -> FutilityRule:
    """The futility rule of a plan, its type II error counted under this noncentrality."""
    unit = math.sqrt(full_information(design))
    if futility.spending is not None:
        return FutilitySpending(type_two_spending(futility, design.power), effect / unit, futility.binding)
    if futility.limit is None:
        raise ValueError(f"a futility rule needs a limit, got {futility!r}")
    if futility.rule == "conditional power":
        assumed = scale.noncentrality(design.hazard_ratio) / unit
        return FutilityByConditionalPower(futility.limit, assumed, effect / unit)
    return FutilityByHazardRatio(futility.limit, scale.direction, effect / unit)


def planned_looks(
    design: Design, fractions: Sequence[float], experimental_share: float, final: bool, first_number: int = 1
) -> tuple[LookAhead, ...]:
    """Looks held exactly at these fractions; I for the hazard ratio is d p q, or t times the planned V."""
    last = len(fractions) - 1
    return tuple(
        _planned_look(design, first_number + at, fraction, experimental_share, final and at == last)
        for at, fraction in enumerate(fractions)
    )


def events_by(fraction: float, planned_events: int) -> int:
    """Smallest whole number of events that reaches the fraction; 0.07 of 100 is 7, though 0.07 * 100 > 7."""
    return math.ceil(round(fraction * planned_events, 9))


def _planned_look(
    design: Design, number: int, fraction: float, experimental_share: float, final: bool
) -> LookAhead:
    """Before a look is held its calendar fraction is taken to be its information fraction."""
    events, planned = events_by(fraction, design.planned_events), design.planned_score_variance
    by_events = events * experimental_share * (1.0 - experimental_share)
    variance = by_events if planned is None else fraction * planned
    return LookAhead(
        number=number,
        kind="final" if final else "planned",
        information=fraction * full_information(design),
        fraction=fraction,
        events=events,
        score_variance=variance,
    )


def crossing_power(bounds: Sequence[Bound], rule: EfficacyRule, noncentrality: float) -> float:
    """P(z first leaves the region through the efficacy bound) when z has this mean at full information.

    Futility bounds are obeyed, harm bounds are not.
    """
    fractions = [bound.information_fraction for bound in bounds]
    regions = [futility_obeyed(bound, rule) for bound in bounds]
    return float(crossing_probabilities(fractions, regions, drift=noncentrality).upper.sum())


def futility_obeyed(bound: Bound, rule: EfficacyRule) -> Region:
    """Where the trial goes on when both the efficacy and the futility bound stop it."""
    return rule.region(bound.efficacy_z, lower_stop(bound.futility_z, bound))


def lower_stop(z: float | Absent | None, bound: Bound) -> float:
    """A lower bound before the final look; at the final look what is not efficacy ends the trial anyhow."""
    return -math.inf if z is None or isinstance(z, Absent) or bound.final else z


def fixed_noncentrality(design: Design) -> float:
    """z(1 - a) + z(power): what one look at the end needs, a of one side."""
    return float(ndtri(design.power) - ndtri(design.alpha_one_side))


@lru_cache(maxsize=64)
def noncentrality_for_power(
    rule: EfficacyRule, design: Design, experimental_share: float, futility: Futility | None = None
) -> float:
    """The mean of z at full information under which z crosses the efficacy bound with the plan's power.

    Notes
    -----
    *Convention*: on the planned looks; futility is obeyed, whether or not it is binding; harm is not. With
    two sides only the favourable one counts.
    *Accuracy*: 1e-9. The root is bracketed from below by one look at the end, which no plan of this alpha
    beats.

    Raises
    ------
    DesignInvalid : a power not above alpha, or futility that leaves efficacy too little room for the power.
    """
    _require_power_above_alpha(design)
    looks = planned_looks(design, design.looks, experimental_share, final=False)
    scale = effect_scale(design, experimental_share, rule.direction)
    by_efficacy = bounds_ahead(rule, (), looks)

    @cache  # the ends of the bracket and the root are asked for twice
    def excess(effect: float) -> float:
        if futility is None:
            return crossing_power(by_efficacy, rule, effect) - design.power
        by_futility = futility_rule(futility, design, scale, effect)
        bounds = bounds_ahead(rule, (), looks, futility=by_futility)
        if any(bound.efficacy_z is TOO_FEW_PATHS for bound in bounds):
            return 1.0 - design.power  # binding futility that high
        return _power_obeying_futility(bounds, rule, effect) - design.power

    low = fixed_noncentrality(design) - 1e-6
    effect = float(brentq(excess, low, _enough(excess, low, design.power), xtol=1e-12, rtol=1e-14))
    if abs(excess(effect)) > _POWER_REACHED:
        raise _never_reached(design.power)
    return effect


def _power_obeying_futility(bounds: Sequence[Bound], rule: EfficacyRule, effect: float) -> float:
    """What is not spent as type II error by the last look, which is known already where it is a test."""
    last = bounds[-1]
    if isinstance(last.efficacy_z, Absent) or last.type_two_spent is None:
        return crossing_power(bounds, rule, effect)
    return 1.0 - last.type_two_spent


def _enough(excess: Callable[[float], float], low: float, power: float) -> float:
    """An effect that has more than the power wanted."""
    high = low * 1.1 + 0.1
    while excess(high) < 0.0:
        high *= 1.5
        if high > 100.0 * (1.0 + low):
            raise AccuracyNotReached("no effect reaches the plan's power", found=f"power {power!r}")
    return high


def _require_power_above_alpha(design: Design) -> None:
    if design.power <= design.alpha_one_side:
        raise DesignInvalid(
            "power not above alpha",
            where="the plan, [design]",
            found=f"power {design.power!r} with alpha {design.alpha!r}",
            accepted="a power above alpha and below 1",
            remedy="raise power",
        )


def _never_reached(power: float) -> DesignInvalid:
    return DesignInvalid(
        "the futility boundary leaves efficacy too little room for the power",
        where="the plan, [futility]",
        found=f"no effect with power {power!r} at the plan's looks",
        accepted="a futility boundary that lies below efficacy at each look before the last",
        remedy="let futility spend later, make it non-binding, or leave out a look",
    )
