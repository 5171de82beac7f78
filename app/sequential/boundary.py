"""Efficacy bounds at looks that fall where they fall: spent here, final looks, bounds as used.

See DEVELOPERS.md, Methods: boundary.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from scipy.special import ndtr

from app.model.boundary import Bound, LookAsUsed
from app.model.extract import LookKind
from app.model.plan import Design, Efficacy, Sides
from app.model.values import Absent, Estimate
from app.sequential.density import Course, Region, start, upper_bound_for
from app.sequential.spending import SMALLEST_SPEND, SpendingFunction, spending_function
from app.sequential.verdict import first_crossed

SAFETY = Absent("a safety look has no efficacy bound and spends no alpha")
NO_NEW_INFORMATION = Absent("no new information since the looks before: nothing is spent, no bound exists")
NO_FINAL_BOUNDARY = Absent(
    "no new information at the final look: no boundary exists and the result is descriptive"
)
NOTHING_TO_SPEND = Absent("the alpha that may be spent by this information fraction is already spent")
NO_SCORE_VARIANCE = Absent("the score variance is 0, so z does not correspond to a hazard ratio")
ALL_SPENT = Absent("all alpha is already spent: no boundary exists and the result is descriptive")
SPEND_TOO_SMALL = Absent(
    f"the alpha to spend here is below {SMALLEST_SPEND:.0e}, less than a double can hold: no bound exists"
)


@dataclass(frozen=True)
class EfficacyRule:
    """How alpha is spent, on how many sides, and which way z points (`direction`: +1 bad event, -1 good)."""

    spending: SpendingFunction
    sides: Sides
    direction: Literal[1, -1]

    @property
    def alpha_one_side(self) -> float:
        return self.spending.alpha

    def region(self, efficacy_z: float) -> Region:
        """Where the trial goes on: below the bound, or strictly between both when the test has two sides."""
        return Region(-efficacy_z if self.sides == 2 else -math.inf, efficacy_z)


@dataclass(frozen=True)
class LookAhead:
    """A look whose bound is wanted. Correlations use `information`; alpha is spent by `fraction`.

    `score_variance` is the I of the hazard ratio at the bound: V observed for a look held, d p q for a
    planned one, or the reason why there is none.
    """

    number: int
    kind: LookKind
    information: float
    fraction: float
    events: int
    score_variance: Estimate

    @property
    def final(self) -> bool:
        """Declared final, or at full information; a safety look has no part in the test."""
        return self.kind == "final" or (self.kind != "safety" and self.fraction >= 1.0)


def efficacy_rule(design: Design, efficacy: Efficacy, direction: Literal[1, -1]) -> EfficacyRule:
    """The rule of a plan: its spending function at the level of one side, its sides, its direction."""
    return EfficacyRule(spending_function(efficacy, design.alpha_one_side), design.sides, direction)


def next_bound(rule: EfficacyRule, past: Sequence[LookAsUsed], look: LookAhead) -> Bound:
    """The bound at one look, after the looks held (see `bounds_ahead`)."""
    return bounds_ahead(rule, past, (look,))[0]


def bounds_ahead(
    rule: EfficacyRule, past: Sequence[LookAsUsed], ahead: Sequence[LookAhead]
) -> tuple[Bound, ...]:
    """Bounds at looks to come, after the looks held, were each to come as given.

    Parameters
    ----------
    rule : the efficacy rule of the plan in force
    past : looks held, in order; their bounds, information and alpha are taken as used, never recomputed
    ahead : looks to come, in order

    Returns
    -------
    tuple of Bound, one a look ahead; alphas of one side, z at full precision. A bound that does not exist is
    `Absent` with its reason.

    Raises
    ------
    ValueError : the information of past looks that had a bound does not increase - a bug in the caller.
    AccuracyNotReached : the numerical method gave up; nothing is returned in its place.

    Notes
    -----
    *Convention*: spent here = max(0, f(t) - alpha recorded as spent); a final look spends all that is left;
    a look with no more information than an earlier one spends nothing; after a crossing there is no second
    test. The two-sided region is (-c, c), each side spending its own alpha.
    *Accuracy*: 1e-10 in probability (stated), 1e-12 in z on the plans tested.
    *Checked*: against print (tests/published/test_sequential.py), other routes (tests/precise/), properties.

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Whitehead (1992), Controlled Clinical Trials 13, 106-121.
    """
    standing = _standing_after(rule, past)
    bounds = []
    for look in ahead:
        bound, standing = _bound_at(rule, standing, look)
        bounds.append(bound)
    return tuple(bounds)


@dataclass(frozen=True, eq=False)
class _Standing:
    """What the looks so far leave for the next; `information` is the most that any of them held."""

    course: Course
    information: float = 0.0
    alpha_spent: float = 0.0
    crossed_at: int | None = None


def _standing_after(rule: EfficacyRule, past: Sequence[LookAsUsed]) -> _Standing:
    """The looks held, as used; one without a bound stops nothing, so it leaves the course as it is."""
    course = start()
    for look in past:
        if not isinstance(look.efficacy_z, Absent):
            course = course.then(look.information, rule.region(look.efficacy_z))
    return _Standing(
        course,
        information=max((look.information for look in past), default=0.0),
        alpha_spent=max((look.alpha_spent for look in past), default=0.0),
        crossed_at=first_crossed(past),
    )


def _bound_at(rule: EfficacyRule, standing: _Standing, look: LookAhead) -> tuple[Bound, _Standing]:
    """The bound at one look, and what stands after it."""
    spend = _spend_here(rule, standing, look)
    if isinstance(spend, Absent):
        bound = _absent_bound(look, standing.alpha_spent, spend)
        return bound, _stand(standing, look, standing.course, standing.alpha_spent)
    paths = standing.course.before(look.information)
    z = upper_bound_for(paths, look.information, spend)
    spent = rule.alpha_one_side if look.final else rule.spending(look.fraction)
    course = Course(paths, look.information, rule.region(z))
    return _bound(rule, look, spent, spend, z), _stand(standing, look, course, spent)


def _stand(standing: _Standing, look: LookAhead, course: Course, alpha_spent: float) -> _Standing:
    information = max(standing.information, look.information)
    return _Standing(course, information, alpha_spent, standing.crossed_at)


def _spend_here(rule: EfficacyRule, standing: _Standing, look: LookAhead) -> Estimate:
    """Alpha of one side to spend at this look, or why there is no bound at it."""
    if look.kind == "safety":
        return SAFETY
    if standing.crossed_at is not None:
        return Absent(
            f"the boundary was crossed at look {standing.crossed_at}: over-running, with no second test"
        )
    if look.information <= standing.information:
        return NO_FINAL_BOUNDARY if look.final else NO_NEW_INFORMATION
    allowed = rule.alpha_one_side if look.final else rule.spending(look.fraction)
    spend = allowed - standing.alpha_spent
    if spend >= SMALLEST_SPEND:
        return spend
    if allowed < SMALLEST_SPEND:
        return SPEND_TOO_SMALL
    return ALL_SPENT if look.final else NOTHING_TO_SPEND


def _absent_bound(look: LookAhead, alpha_spent: float, reason: Absent) -> Bound:
    return Bound(
        number=look.number,
        information_fraction=look.fraction,
        events=look.events,
        final=look.final,
        alpha_spent=alpha_spent,
        alpha_spent_here=0.0,
        efficacy_z=reason,
        efficacy_p_one_sided=reason,
        efficacy_hazard_ratio=reason,
    )


def _bound(rule: EfficacyRule, look: LookAhead, alpha_spent: float, spend: float, z: float) -> Bound:
    return Bound(
        number=look.number,
        information_fraction=look.fraction,
        events=look.events,
        final=look.final,
        alpha_spent=alpha_spent,
        alpha_spent_here=spend,
        efficacy_z=z,
        efficacy_p_one_sided=float(ndtr(-z)),
        efficacy_hazard_ratio=hazard_ratio_at(z, look.score_variance, rule.direction),
    )


def hazard_ratio_at(z: float, score_variance: Estimate, direction: Literal[1, -1]) -> Estimate:
    """exp(-s z / sqrt(I)): the hazard ratio, experimental / control, whose score test would give this z."""
    if isinstance(score_variance, Absent):
        return score_variance
    if score_variance <= 0.0:
        return NO_SCORE_VARIANCE
    return math.exp(-direction * z / math.sqrt(score_variance))
