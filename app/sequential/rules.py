"""What a plan says about bounds, ready for computing: efficacy, futility, harm, and the looks ahead."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from scipy.special import ndtri

from app.model.extract import LookKind
from app.model.plan import Design, Efficacy, Harm, Sides
from app.model.values import Absent, Estimate
from app.sequential.density import Region
from app.sequential.family import FAMILY_NAMES, FixedFamily, fixed_family
from app.sequential.spending import SpendingFunction, harm_spending, spending_function

Direction = Literal[1, -1]

NO_SCORE_VARIANCE = Absent("the score variance is 0, so z does not correspond to a hazard ratio")


@dataclass(frozen=True)
class EfficacyRule:
    """How alpha is spent, on how many sides, and which way z points (`direction`: +1 bad event, -1 good).

    `carry_on` says what counts as spent so far: the alpha recorded at the looks ("nominal"), or the crossing
    probability of the bounds as used ("crossing"). `safety_spend` is the alpha of one side that a safety look
    costs.
    """

    spending: SpendingFunction | FixedFamily
    sides: Sides
    direction: Direction
    carry_on: Literal["nominal", "crossing"] = "nominal"
    safety_spend: float = 0.0

    @property
    def alpha_one_side(self) -> float:
        return self.spending.alpha

    def region(self, efficacy_z: Estimate, lower: float = -math.inf) -> Region:
        """Where the trial goes on: below the bound, or strictly between both when the test has two sides."""
        if isinstance(efficacy_z, Absent):
            return Region(lower)
        return Region(-efficacy_z if self.sides == 2 else lower, efficacy_z)


@dataclass(frozen=True)
class FutilitySpending:
    """A futility boundary that spends the type II error 1 - power under the effect solved for the power.

    `drift` is that effect: the mean of z at information I is drift * sqrt(I). Binding, the efficacy bounds
    count on a stop at it.
    """

    spending: SpendingFunction
    drift: float
    binding: bool = False


@dataclass(frozen=True)
class FutilityByConditionalPower:
    """Futility where conditional power at the final look, under the plan's hazard ratio, is below `limit`.

    `assumed_drift` is of the plan's hazard ratio, `drift` of the effect solved for the power, under which the
    type II error is counted. Never binding.
    """

    limit: float
    assumed_drift: float
    drift: float

    def bound(self, information: float, last_information: float, criterion: float) -> float:
        """The z with that conditional power, the last look held at `last_information` against `criterion`."""
        step = last_information - information
        score = (
            criterion * math.sqrt(last_information)
            - self.assumed_drift * step
            + float(ndtri(self.limit)) * math.sqrt(step)
        )
        return score / math.sqrt(information)


@dataclass(frozen=True)
class FutilityByHazardRatio:
    """Futility where the score's hazard ratio exp(-s z / sqrt I) is no better than `limit`. Never binding."""

    limit: float
    direction: Direction
    drift: float

    def bound(self, score_variance: Estimate) -> Estimate:
        if isinstance(score_variance, Absent):
            return score_variance
        return (
            -self.direction * math.log(self.limit) * math.sqrt(score_variance) + 0.0
        )  # no -0.0 at a limit of 1


FutilityRule = FutilitySpending | FutilityByConditionalPower | FutilityByHazardRatio


@dataclass(frozen=True)
class HarmRule:
    """How harm spends its own one-sided alpha.

    On `own_endpoint` its information and its z are not those of the test, and its event is a bad one. Alpha
    is spent by the clock of the test all the same: the plan foresees no total for that endpoint.
    """

    spending: SpendingFunction
    own_endpoint: bool = False

    def direction(self, of_the_test: Direction) -> Direction:
        """Which way z points: +1 where harm counts the bad events of its own endpoint."""
        return 1 if self.own_endpoint else of_the_test


@dataclass(frozen=True)
class LookAhead:
    """A look whose bounds are wanted. Correlations use `information`; error goes by `fraction` or `clock`.

    `score_variance` is the I of the hazard ratio at a bound: V observed for a look held, d p q for a planned
    one, or the reason why there is none. `clock` is the calendar fraction where the plan spends by the
    calendar. What begins with harm is of harm's own endpoint, where it has one; without it the information of
    that endpoint is taken to grow as that of the test does.
    """

    number: int
    kind: LookKind
    information: float
    fraction: float
    events: int
    score_variance: Estimate
    clock: float | None = None
    harm_information: float | None = None
    harm_score_variance: Estimate | None = None

    @property
    def final(self) -> bool:
        """Declared final, or at full information or time; a safety look has no part in the test."""
        return self.kind == "final" or (
            self.kind != "safety" and max(self.fraction, self.spending_time) >= 1.0
        )

    @property
    def spending_time(self) -> float:
        """By what error is spent: the calendar where the plan says so, else the information fraction."""
        return self.fraction if self.clock is None else self.clock


def efficacy_rule(design: Design, efficacy: Efficacy, direction: Direction) -> EfficacyRule:
    """The rule of a plan: its spending function or family at the level of one side, sides and direction."""
    return EfficacyRule(
        _spending(design, efficacy), design.sides, direction, design.carry_on, design.safety_spend
    )


def _spending(design: Design, efficacy: Efficacy) -> SpendingFunction | FixedFamily:
    if efficacy.spending in FAMILY_NAMES:
        return fixed_family(efficacy, design.alpha_one_side, design.sides, design.looks)
    return spending_function(efficacy, design.alpha_one_side)


def harm_rule(harm: Harm, plan_parameter: str) -> HarmRule:
    """The harm rule of a plan whose test is on the endpoint `plan_parameter`."""
    return HarmRule(harm_spending(harm), own_endpoint=harm.endpoint_parameter not in (None, plan_parameter))


def hazard_ratio_at(z: Estimate, score_variance: Estimate, direction: Direction) -> Estimate:
    """exp(-s z / sqrt(I)): the hazard ratio, experimental / control, whose score test would give this z."""
    if isinstance(z, Absent) or isinstance(score_variance, Absent):
        return z if isinstance(z, Absent) else score_variance
    if score_variance <= 0.0:
        return NO_SCORE_VARIANCE
    return math.exp(-direction * z / math.sqrt(score_variance))
