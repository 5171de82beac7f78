"""Bounds at looks that fall where they fall: spent here, final looks, bounds as used.

See DEVELOPERS.md, Methods: boundary.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from scipy.special import ndtr

from app.model.boundary import Bound, LookAsUsed
from app.model.values import Absent, Estimate
from app.sequential.density import (
    Course,
    Paths,
    Region,
    lower_bound_for,
    start,
    upper_bound_for,
)
from app.sequential.family import FixedFamily
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
    hazard_ratio_at,
)
from app.sequential.spending import SMALLEST_SPEND
from app.sequential.verdict import first_crossed

__all__ = [
    "EfficacyRule",
    "LookAhead",
    "bounds_ahead",
    "efficacy_rule",
    "hazard_ratio_at",
    "next_bound",
    "over_running",
]

ROUNDING = 1e-10  # of what may be spent: integrals and sums of spends are not more exact than that
SAFETY = Absent("a safety look has no efficacy bound and spends no alpha")
SAFETY_AT_A_PRICE = Absent(
    "a safety look has no efficacy bound; it spends the alpha that the plan states for it"
)
SAFETY_WITHOUT_FUTILITY = Absent("a safety look has no futility bound and spends no type II error")
NO_NEW_INFORMATION = Absent("no new information since the looks before: nothing is spent, no bound exists")
NO_FINAL_BOUNDARY = Absent(
    "no new information at the final look: no boundary exists and the result is descriptive"
)
NOTHING_TO_SPEND = Absent("the alpha that may be spent by this information fraction is already spent")
ALL_SPENT = Absent("all alpha is already spent: no boundary exists and the result is descriptive")
SPEND_TOO_SMALL = Absent(
    f"the alpha to spend here is below {SMALLEST_SPEND:.0e}, less than a double can hold: no bound exists"
)
TOO_FEW_PATHS = Absent(
    "so few trials without effect come past binding futility to here that the alpha left would call a result "
    "of no benefit efficacy: no bound exists"
)
NO_TYPE_TWO_TO_SPEND = Absent(
    "the type II error that may be spent by this information fraction is already spent, or less than a "
    "double can hold: no futility bound exists"
)
NO_HARM_ALPHA_TO_SPEND = Absent(
    "the alpha for harm that may be spent by this information fraction is already spent, or less than a "
    "double can hold: no harm bound exists"
)
NO_HARM_EVENTS_PLANNED = Absent("the plan foresees no events of harm's own endpoint")
NO_CRITERION = Absent("the last look has no efficacy bound, so there is no conditional power to be limited")


def next_bound(
    rule: EfficacyRule,
    past: Sequence[LookAsUsed],
    look: LookAhead,
    *,
    futility: FutilityRule | None = None,
    harm: HarmRule | None = None,
) -> Bound:
    """The bound at one look, after the looks held (see `bounds_ahead`)."""
    return bounds_ahead(rule, past, (look,), futility=futility, harm=harm)[0]


def bounds_ahead(
    rule: EfficacyRule,
    past: Sequence[LookAsUsed],
    ahead: Sequence[LookAhead],
    *,
    futility: FutilityRule | None = None,
    harm: HarmRule | None = None,
) -> tuple[Bound, ...]:
    """Bounds at looks to come, after the looks held, were each to come as given.

    Parameters
    ----------
    rule : the efficacy rule of the plan in force
    past : looks held, in order; their bounds, information and error spent are taken as used, never recomputed
    ahead : looks to come, in order; where futility goes by conditional power, the last of them is the trial's
    futility, harm : the rules of these boundaries, in a one-sided plan that has them

    Returns
    -------
    tuple of Bound, one a look ahead; alphas of one side, z at full precision. A bound that does not exist is
    `Absent` with its reason; what belongs to a boundary that the plan does not have is None.

    Raises
    ------
    ValueError : the information of past looks that had a bound does not increase - a bug in the caller.
    AccuracyNotReached : the numerical method gave up; nothing is returned in its place.

    Notes
    -----
    *Convention*: spent here = max(0, f(t) - spent so far), so that the share of a look that was skipped is
    caught up; a final look spends all that is left; a look with no more information than an earlier one
    spends nothing; after a crossing there is no second test. The two-sided region is (-c, c), each side
    spending its own alpha. Efficacy ignores futility unless that is binding, and always ignores harm.
    Futility spends under the effect solved for the power and meets the efficacy bound at the final look;
    where it would meet it earlier there is no futility bound. Harm is the mirror of a one-sided test at its
    own alpha, and stands at safety looks too.
    *Accuracy*: 1e-10 in probability (stated), 1e-12 in z on the plans tested.
    *Checked*: against print (tests/published/test_sequential.py), other routes (tests/precise/), properties.

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Whitehead (1992), Controlled Clinical Trials 13, 106-121;
    Pampallona, Tsiatis & Kim (2001), Drug Information Journal 35, 1113-1121; DeMets & Ware (1982), Biometrika
    69, 661-663.
    """
    rules = _Rules(rule, futility, harm, _criterion(rule, past, ahead, futility))
    standing = _standing_after(rules, past)
    bounds = []
    for look in ahead:
        bound, standing = _bound_at(rules, standing, look)
        bounds.append(bound)
    return tuple(bounds)


@dataclass(frozen=True)
class _Rules:
    """All that decides bounds; `criterion` is the information and efficacy bound of the trial's last look."""

    efficacy: EfficacyRule
    futility: FutilityRule | None
    harm: HarmRule | None
    criterion: tuple[float, Estimate]

    @property
    def binding(self) -> bool:
        return isinstance(self.futility, FutilitySpending) and self.futility.binding


def _criterion(
    rule: EfficacyRule,
    past: Sequence[LookAsUsed],
    ahead: Sequence[LookAhead],
    futility: FutilityRule | None,
) -> tuple[float, Estimate]:
    """What a rule on conditional power is judged against; no other rule looks that far."""
    if isinstance(futility, FutilityByConditionalPower) and ahead:
        return ahead[-1].information, bounds_ahead(rule, past, ahead)[-1].efficacy_z
    return math.inf, NO_CRITERION


@dataclass(frozen=True, eq=False)
class _Standing:
    """What the looks so far leave for the next; information is the most that any of them held.

    `course` is under no effect and ends at efficacy and at binding futility; `course_under_effect` is under
    the effect that futility supposes and ends at both; `harm_course` is under no effect, turned upside down.
    """

    course: Course
    course_under_effect: Course
    harm_course: Course
    information: float = 0.0
    harm_information: float = 0.0
    alpha_spent: float = 0.0
    type_two_spent: float = 0.0
    harm_alpha_spent: float = 0.0
    crossed_at: int | None = None


def _standing_after(rules: _Rules, past: Sequence[LookAsUsed]) -> _Standing:
    """The looks held, as used; one without a bound stops nothing, so it leaves a course as it is."""
    course, harm_course = start(), start()
    under_effect = start(rules.futility.drift if rules.futility else 0.0)
    crossing = 0.0
    for look in past:
        if rules.efficacy.carry_on == "crossing" and not isinstance(look.efficacy_z, Absent):
            crossing += course.before(look.information).above(look.information, look.efficacy_z)
        lower = -math.inf if look.final else _finite(look.futility_z)
        stays = rules.efficacy.region(look.efficacy_z, lower if rules.binding else -math.inf)
        course = course.then(look.information, stays)
        if rules.futility is not None:
            stays = rules.efficacy.region(look.efficacy_z, lower)
            under_effect = under_effect.then(look.information, stays)
        if rules.harm is not None:
            of_harm = _harm_information(rules.harm, look)
            harm_course = harm_course.then(of_harm, Region(upper=-_finite(look.harm_z)))
    return _Standing(
        course,
        under_effect,
        harm_course,
        information=max((look.information for look in past), default=0.0),
        harm_information=max((_harm_information(rules.harm, look) for look in past), default=0.0),
        alpha_spent=_alpha_spent(rules.efficacy, past, crossing),
        type_two_spent=max((look.type_two_spent for look in past), default=0.0),
        harm_alpha_spent=max((look.harm_alpha_spent for look in past), default=0.0),
        crossed_at=first_crossed(past, binding=rules.binding),
    )


def _finite(z: Estimate | None) -> float:
    """A lower bound, or where there is none the place that nothing lies below."""
    return -math.inf if z is None or isinstance(z, Absent) else z


def _harm_information(rule: HarmRule | None, look: LookAsUsed | LookAhead) -> float:
    """What harm's correlations use: its own endpoint's, of which a look held without one had none."""
    if rule is None or not rule.own_endpoint:
        return look.information
    if look.harm_information is None:
        return 0.0 if isinstance(look, LookAsUsed) else look.information
    return look.harm_information


def _alpha_spent(rule: EfficacyRule, past: Sequence[LookAsUsed], crossing: float) -> float:
    """What is recorded as spent, or the crossing probability and what safety looks cost (key carry_on)."""
    if rule.carry_on == "nominal":
        return max((look.alpha_spent for look in past), default=0.0)
    return crossing + math.fsum(look.alpha_spent_here for look in past if look.kind == "safety")


@dataclass(frozen=True)
class _Side:
    """One bound at a look, its z or why there is none; what is spent by here, and of that here."""

    z: Estimate
    spent: float
    here: float = 0.0


def _bound_at(rules: _Rules, standing: _Standing, look: LookAhead) -> tuple[Bound, _Standing]:
    """The bounds at one look, and what stands after it."""
    untested = _why_untested(standing, look)
    efficacy = _efficacy_side(rules.efficacy, standing, look, untested)
    futility = _futility_side(rules, standing, look, efficacy, untested)
    harm = _harm_side(rules.harm, standing, look)
    bound = _bound(rules, look, efficacy, futility, harm)
    return bound, _stand(rules, standing, look, (efficacy, futility, harm))


def _why_untested(standing: _Standing, look: LookAhead) -> Absent | None:
    """Why this look is no test whatever is left to spend."""
    if look.kind == "safety":
        return SAFETY
    if standing.crossed_at is not None:
        return over_running(standing.crossed_at)
    if look.information <= standing.information:
        return NO_FINAL_BOUNDARY if look.final else NO_NEW_INFORMATION
    return None


def over_running(crossed_at: int) -> Absent:
    """Why nothing is tested after the look that crossed."""
    return Absent(f"the boundary was crossed at look {crossed_at}: over-running, with no second test")


def _efficacy_side(
    rule: EfficacyRule, standing: _Standing, look: LookAhead, untested: Absent | None
) -> _Side:
    if look.kind == "safety":
        return _safety_side(rule, standing)
    if untested is not None:
        return _Side(untested, standing.alpha_spent)
    paths = standing.course.before(look.information)
    if isinstance(rule.spending, FixedFamily) and not look.final:
        return _fixed_side(rule.spending, standing, look, paths)
    allowed = _allowed(rule, look)
    spend = allowed - standing.alpha_spent
    if _is_left(spend, allowed):
        z = upper_bound_for(paths, look.information, spend) if spend < paths.unstopped else -math.inf
        # a result that does not favour experimental is no efficacy, however few came so far
        return _Side(z, allowed, spend) if z > 0.0 else _Side(TOO_FEW_PATHS, standing.alpha_spent)
    if allowed < SMALLEST_SPEND:
        return _Side(SPEND_TOO_SMALL, standing.alpha_spent)
    return _Side(ALL_SPENT if look.final else NOTHING_TO_SPEND, standing.alpha_spent)


def _is_left(spend: float, allowed: float) -> bool:
    """Whether there is something to spend: more than a double can hold, and than what rounding leaves."""
    return spend >= SMALLEST_SPEND and spend > ROUNDING * allowed


def _allowed(rule: EfficacyRule, look: LookAhead) -> float:
    """Cumulative alpha of one side that may be spent by this look."""
    if look.final or isinstance(rule.spending, FixedFamily):
        return rule.alpha_one_side
    return rule.spending(look.spending_time)


def _safety_side(rule: EfficacyRule, standing: _Standing) -> _Side:
    """No efficacy bound; the stated alpha is spent, though never more than is left."""
    cost = max(0.0, min(rule.safety_spend, rule.alpha_one_side - standing.alpha_spent))
    return _Side(SAFETY_AT_A_PRICE if cost else SAFETY, standing.alpha_spent + cost, cost)


def _fixed_side(family: FixedFamily, standing: _Standing, look: LookAhead, paths: Paths) -> _Side:
    """The family's own bound, which spends its crossing probability, or the one that spends what is left."""
    left = family.alpha - standing.alpha_spent
    if not _is_left(left, family.alpha):
        return _Side(ALL_SPENT, standing.alpha_spent)
    z = family.interim_bound(look.fraction)
    crossing = paths.above(look.information, z)
    if crossing < SMALLEST_SPEND:
        return _Side(SPEND_TOO_SMALL, standing.alpha_spent)
    if crossing > left:
        return _Side(upper_bound_for(paths, look.information, left), family.alpha, left)
    return _Side(z, standing.alpha_spent + crossing, crossing)


def _futility_side(
    rules: _Rules, standing: _Standing, look: LookAhead, efficacy: _Side, untested: Absent | None
) -> _Side | None:
    """At the final look the efficacy bound itself; before it what the rule says, while that lies below."""
    if rules.futility is None:
        return None
    spent = standing.type_two_spent
    if untested is not None:
        return _Side(SAFETY_WITHOUT_FUTILITY if look.kind == "safety" else untested, spent)
    if look.final and isinstance(efficacy.z, Absent):
        return _Side(efficacy.z, spent)
    paths = standing.course_under_effect.before(look.information)
    z = efficacy.z if look.final else _interim_futility(rules, standing, look, efficacy, paths)
    here = 0.0 if isinstance(z, Absent) else paths.below(look.information, z)
    return _Side(z, spent + here, here)


def _interim_futility(
    rules: _Rules, standing: _Standing, look: LookAhead, efficacy: _Side, paths: Paths
) -> Estimate:
    """The futility bound of the rule, or why there is none."""
    upper = math.inf if isinstance(efficacy.z, Absent) else efficacy.z
    match rules.futility:
        case FutilitySpending() as rule:
            allowed = rule.spending(look.spending_time)
            spend = allowed - standing.type_two_spent
            if not _is_left(spend, allowed):
                return NO_TYPE_TWO_TO_SPEND
            enough = spend < paths.below(look.information, math.inf)
            z: Estimate = lower_bound_for(paths, look.information, spend) if enough else math.inf
        case FutilityByConditionalPower() as rule:
            z = _futility_by_conditional_power(rule, look, rules.criterion)
        case FutilityByHazardRatio() as rule:
            z = rule.bound(look.score_variance)
    return z if isinstance(z, Absent) or z < upper else _would_cross(z, upper)


def _futility_by_conditional_power(
    rule: FutilityByConditionalPower, look: LookAhead, criterion: tuple[float, Estimate]
) -> Estimate:
    last_information, last_z = criterion
    if isinstance(last_z, Absent):
        return NO_CRITERION
    return rule.bound(look.information, last_information, last_z)


def _would_cross(futility_z: float, efficacy_z: float) -> Absent:
    """Both bounds in words, because the one that is refused stands nowhere else."""
    where = f"at {futility_z:.3f}" if math.isfinite(futility_z) else "above every z"
    return Absent(
        f"the futility bound would lie {where}, not below the efficacy bound at {efficacy_z:.3f}: "
        "none is used here"
    )


def _harm_side(rule: HarmRule | None, standing: _Standing, look: LookAhead) -> _Side | None:
    """The mirror of a one-sided bound at harm's own alpha, by the information of harm's endpoint."""
    if rule is None:
        return None
    spent, information = standing.harm_alpha_spent, _harm_information(rule, look)
    if standing.crossed_at is not None:
        return _Side(over_running(standing.crossed_at), spent)
    if information <= standing.harm_information:
        return _Side(NO_NEW_INFORMATION, spent)
    allowed = rule.spending.alpha if look.final else rule.spending(look.spending_time)
    if not _is_left(allowed - spent, allowed):
        return _Side(NO_HARM_ALPHA_TO_SPEND, spent)
    paths = standing.harm_course.before(information)
    return _Side(-upper_bound_for(paths, information, allowed - spent), allowed, allowed - spent)


def _stand(
    rules: _Rules, standing: _Standing, look: LookAhead, sides: tuple[_Side, _Side | None, _Side | None]
) -> _Standing:
    """What stands after this look. A final futility bound is the efficacy bound: no region lies between."""
    efficacy, futility, harm = sides
    lower = -math.inf if futility is None or look.final else _finite(futility.z)
    tested, of_harm = look.kind != "safety", _harm_information(rules.harm, look)
    stays = rules.efficacy.region(efficacy.z, lower if rules.binding else -math.inf) if tested else Region()
    under_effect = rules.efficacy.region(efficacy.z, lower) if futility and tested else Region()
    return _Standing(
        standing.course.then(look.information, stays),
        standing.course_under_effect.then(look.information, under_effect),
        standing.harm_course.then(of_harm, Region(upper=-_finite(harm.z))) if harm else standing.harm_course,
        information=max(standing.information, look.information),
        harm_information=max(standing.harm_information, of_harm),
        alpha_spent=efficacy.spent,
        type_two_spent=futility.spent if futility else standing.type_two_spent,
        harm_alpha_spent=harm.spent if harm else standing.harm_alpha_spent,
        crossed_at=standing.crossed_at,
    )


def _bound(
    rules: _Rules, look: LookAhead, efficacy: _Side, futility: _Side | None, harm: _Side | None
) -> Bound:
    turn = rules.efficacy.direction
    return Bound(
        number=look.number,
        information_fraction=look.fraction,
        events=look.events,
        final=look.final,
        alpha_spent=efficacy.spent,
        alpha_spent_here=efficacy.here,
        efficacy_z=efficacy.z,
        efficacy_p_one_sided=efficacy.z if isinstance(efficacy.z, Absent) else float(ndtr(-efficacy.z)),
        efficacy_hazard_ratio=hazard_ratio_at(efficacy.z, look.score_variance, turn),
        futility_z=futility.z if futility else None,
        type_two_spent=futility.spent if futility else None,
        futility_hazard_ratio=hazard_ratio_at(futility.z, look.score_variance, turn) if futility else None,
        harm_z=harm.z if harm else None,
        harm_alpha_spent=harm.spent if harm else None,
        harm_hazard_ratio=_harm_ratio(rules.harm, look, harm.z, turn) if rules.harm and harm else None,
    )


def _harm_ratio(rule: HarmRule, look: LookAhead, z: Estimate, turn: Direction) -> Estimate:
    variance = look.harm_score_variance if rule.own_endpoint else look.score_variance
    if variance is None:
        return z if isinstance(z, Absent) else NO_HARM_EVENTS_PLANNED
    return hazard_ratio_at(z, variance, rule.direction(turn))
