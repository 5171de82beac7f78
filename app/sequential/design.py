"""A plan's boundary before the first look, and what it costs beside a single look at the end."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np

from app.errors import DesignInvalid
from app.model.boundary import Bound, Feasibility, LookChances, PlannedBoundary
from app.model.plan import Design, Efficacy, Futility, Harm, Plan
from app.sequential.density import Region, crossing_probabilities, start
from app.sequential.effect import (
    PlanRules,
    crossing_power,
    events_by,
    fixed_noncentrality,
    lower_stop,
    noncentrality_for_power,
    plan_rules,
    planned_looks,
    rules_of,
)
from app.sequential.sample_size import freedman_events, schoenfeld_events

__all__ = ["bounds_planned", "crossing_power", "events_by", "planned_boundary", "planned_looks"]


def planned_boundary(
    design: Design,
    efficacy: Efficacy,
    *,
    experimental_share: float,
    direction: Literal[1, -1],
    futility: Futility | None = None,
    harm: Harm | None = None,
    parameter: str = "",
    fractions: Sequence[float] | None = None,
    final: bool = False,
) -> PlannedBoundary:
    """The bounds of a plan at its looks or at chosen fractions, and what the plan's own looks cost.

    Parameters
    ----------
    design, efficacy, futility, harm : the plan's tables of the same names
    experimental_share : float in (0, 1), planned share of the experimental arm
    direction : +1 when the event is bad, -1 when it is good
    parameter : the endpoint of the test; harm on another one has no part in the chances
    fractions : information fractions, positive and increasing; the plan's looks by default
    final : whether the last of them is final although it lies below 1, and spends all that is left

    Returns
    -------
    PlannedBoundary; its design numbers (noncentrality, power, inflation, expected fractions, chances) are
    those of the plan's own looks whatever fractions are asked for.

    Raises
    ------
    DesignInvalid : fractions that are not positive and increasing, a power not above alpha, or a futility
        boundary that leaves efficacy too little room for the power.

    Notes
    -----
    *Convention*: `noncentrality` is the mean of z at full information under which z crosses the efficacy
    bound (the favourable side of a two-sided test) with the plan's power, futility obeyed. `inflation` =
    (noncentrality / (z(1 - a) + z(power)))^2, a of one side. Expected fractions count every crossing as a
    stop.
    *Accuracy*: noncentrality to 1e-9.

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Jennison & Turnbull (2000), chapters 2, 3 and 7.
    """
    rules = rules_of(
        design,
        efficacy,
        experimental_share=experimental_share,
        direction=direction,
        futility=futility,
        harm=harm,
        parameter=parameter,
    )
    own = rules.bounds((), planned_looks(design, design.looks, experimental_share, final=False))
    bounds = own
    if fractions is not None:
        _require_increasing(fractions)
        bounds = _bounds_at(rules, design, fractions, experimental_share, final)
    effect = noncentrality_for_power(rules.efficacy, design, experimental_share, futility)
    cost = _Cost(rules, own, effect)
    return PlannedBoundary(
        sides=design.sides,
        bounds=bounds,
        noncentrality=effect,
        power=design.power,
        inflation=(effect / fixed_noncentrality(design)) ** 2,
        expected_fraction_null=cost.expected_fraction(0.0),
        expected_fraction_half=cost.expected_fraction(effect / 2.0),
        expected_fraction_design=cost.expected_fraction(effect),
        chances_null=cost.chances(0.0),
        chances_half=cost.chances(effect / 2.0),
        chances_design=cost.chances(effect),
        feasibility=cost.feasibility(design, experimental_share),
    )


def bounds_planned(
    plan: Plan, fractions: Sequence[float] | None = None, *, final: bool = False
) -> tuple[Bound, ...]:
    """The bounds alone, at the plan's looks or at chosen fractions, as `planned_boundary` has them."""
    if fractions is None:
        fractions, final = plan.design.looks, False
    _require_increasing(fractions)
    return _bounds_at(plan_rules(plan), plan.design, fractions, plan.arms.experimental_share, final)


def _bounds_at(
    rules: PlanRules, design: Design, fractions: Sequence[float], experimental_share: float, final: bool
) -> tuple[Bound, ...]:
    """Bounds at chosen fractions, followed by the plan's later looks, so that the last is the trial's."""
    beyond = () if final else tuple(fraction for fraction in design.looks if fraction > fractions[-1])
    looks = planned_looks(design, (*fractions, *beyond), experimental_share, final)
    return rules.bounds((), looks)[: len(fractions)]


@dataclass(frozen=True, eq=False)
class _Cost:
    """What a plan's looks cost beside one look at the end, and how often each bound is crossed."""

    rules: PlanRules
    bounds: tuple[Bound, ...]
    noncentrality: float

    def expected_fraction(self, noncentrality: float) -> float:
        """Mean information fraction at the end: t_1 + the sum of P(going on past k) (t_k+1 - t_k)."""
        fractions = [bound.information_fraction for bound in self.bounds]
        regions = [self._region(bound) for bound in self.bounds]
        going_on = crossing_probabilities(fractions, regions, drift=noncentrality).going_on
        return float(fractions[0] + (going_on[:-1] * np.diff(fractions)).sum())

    def chances(self, noncentrality: float) -> tuple[LookChances, ...]:
        """First crossings look by look; z beyond both harm and futility counts as harm."""
        course, chances = start(noncentrality), []
        for bound in self.bounds:
            at, region = bound.information_fraction, self._region(bound)
            paths = course.before(at)
            lower, harm = paths.below(at, region.lower), paths.below(at, self._harm(bound))
            two_sided = self.rules.efficacy.sides == 2
            chances.append(
                LookChances(
                    number=bound.number,
                    efficacy=paths.above(at, region.upper),
                    futility=0.0 if two_sided else max(0.0, lower - harm),
                    harm=harm,
                    control=lower if two_sided else 0.0,
                )
            )
            course = course.then(at, region)
        return tuple(chances)

    def feasibility(self, design: Design, experimental_share: float) -> Feasibility:
        """The power that the planned hazard ratio and events have, and the events that the power needs."""
        scale = self.rules.scale
        needed = (self.noncentrality / math.log(design.hazard_ratio)) ** 2
        fixed = {
            "alpha_one_side": design.alpha_one_side,
            "power": design.power,
            "experimental_share": experimental_share,
        }
        planned = scale.noncentrality(design.hazard_ratio)
        return Feasibility(
            power_reached=crossing_power(self.bounds, self.rules.efficacy, planned),
            events_needed=math.ceil(round(needed / self._variance_per_event(design), 9)),
            schoenfeld_events=schoenfeld_events(design.hazard_ratio, **fixed),
            freedman_events=freedman_events(design.hazard_ratio, **fixed),
        )

    def _variance_per_event(self, design: Design) -> float:
        """p q, or what the plan's own score variance says of it."""
        return self.rules.scale.full_score_variance / design.planned_events

    def _region(self, bound: Bound) -> Region:
        """Where no bound stops the trial."""
        lower = max(lower_stop(bound.futility_z, bound), self._harm(bound))
        return self.rules.efficacy.region(bound.efficacy_z, lower)

    def _harm(self, bound: Bound) -> float:
        """The harm bound, where it is judged on the endpoint of the test."""
        on_this_endpoint = self.rules.harm is not None and not self.rules.harm.own_endpoint
        return lower_stop(bound.harm_z, bound) if on_this_endpoint else -math.inf


def _require_increasing(fractions: Sequence[float]) -> None:
    earlier = (0.0, *fractions)
    if not fractions or any(not here > before for before, here in zip(earlier, fractions, strict=False)):
        raise DesignInvalid(
            "information fractions out of order",
            where="the looks asked for",
            found=", ".join(f"{fraction:g}" for fraction in fractions) or "none",
            accepted="positive fractions, each above the one before",
            remedy="write them in increasing order",
        )
