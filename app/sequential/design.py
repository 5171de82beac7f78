"""A plan's boundary before the first look, and what it costs beside a single look at the end."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.optimize import brentq
from scipy.special import ndtri

from app.errors import AccuracyNotReached, DesignInvalid
from app.model.boundary import Bound, PlannedBoundary
from app.model.plan import Design, Efficacy
from app.model.values import Absent
from app.sequential.boundary import EfficacyRule, LookAhead, bounds_ahead, efficacy_rule
from app.sequential.density import Region, crossing_probabilities


def planned_boundary(
    design: Design,
    efficacy: Efficacy,
    *,
    experimental_share: float,
    direction: Literal[1, -1],
    fractions: Sequence[float] | None = None,
    final: bool = False,
) -> PlannedBoundary:
    """The bounds of a plan at its looks or at chosen fractions, and what the plan's own looks cost.

    Parameters
    ----------
    design, efficacy : the plan's tables of the same names
    experimental_share : float in (0, 1), planned share of the experimental arm
    direction : +1 when the event is bad, -1 when it is good
    fractions : information fractions, positive and increasing; the plan's looks by default
    final : whether the last of them is final although it lies below 1, and spends all that is left

    Returns
    -------
    PlannedBoundary; its design numbers (noncentrality, power, inflation, expected fractions) are those of the
    plan's own looks whatever fractions are asked for.

    Raises
    ------
    DesignInvalid : fractions that are not positive and increasing, or a power not above alpha.

    Notes
    -----
    *Convention*: `noncentrality` is the mean of z at full information under which z crosses the efficacy
    bound (the favourable side of a two-sided test) with the plan's power. `inflation` = (noncentrality /
    (z(1 - a) + z(power)))^2, a of one side. Expected fractions count a crossing on either side as a stop.
    *Accuracy*: noncentrality to 1e-9.

    References
    ----------
    Lan & DeMets (1983), Biometrika 70, 659-663; Jennison & Turnbull (2000), chapters 2, 3 and 7.
    """
    rule = efficacy_rule(design, efficacy, direction)
    own = _planned_bounds(rule, design, design.looks, experimental_share, final=False)
    bounds = own
    if fractions is not None:
        _require_increasing(fractions)
        bounds = _planned_bounds(rule, design, fractions, experimental_share, final)
    cost = _Cost.of(rule, design, own)
    return PlannedBoundary(
        sides=design.sides,
        bounds=bounds,
        noncentrality=cost.noncentrality,
        power=design.power,
        inflation=cost.inflation,
        expected_fraction_null=cost.expected_fraction(0.0),
        expected_fraction_half=cost.expected_fraction(cost.noncentrality / 2.0),
        expected_fraction_design=cost.expected_fraction(cost.noncentrality),
    )


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


def crossing_power(bounds: Sequence[Bound], rule: EfficacyRule, noncentrality: float) -> float:
    """P(z first leaves the region through the efficacy bound) when z has this mean at full information."""
    crossings = crossing_probabilities(*_fractions_and_regions(bounds, rule), drift=noncentrality)
    return float(crossings.upper.sum())


def _planned_bounds(
    rule: EfficacyRule, design: Design, fractions: Sequence[float], experimental_share: float, final: bool
) -> tuple[Bound, ...]:
    return bounds_ahead(rule, (), planned_looks(design, fractions, experimental_share, final))


def _planned_look(
    design: Design, number: int, fraction: float, experimental_share: float, final: bool
) -> LookAhead:
    events = events_by(fraction, design.planned_events)
    if design.information == "score variance" and design.planned_score_variance is not None:
        planned, score_variance = design.planned_score_variance, fraction * design.planned_score_variance
    else:
        planned = float(design.planned_events)
        score_variance = events * experimental_share * (1.0 - experimental_share)
    return LookAhead(
        number=number,
        kind="final" if final else "planned",
        information=fraction * planned,
        fraction=fraction,
        events=events,
        score_variance=score_variance,
    )


@dataclass(frozen=True, eq=False)
class _Cost:
    """What a plan's looks cost beside one look at the end."""

    rule: EfficacyRule
    bounds: tuple[Bound, ...]
    noncentrality: float
    fixed_noncentrality: float

    @classmethod
    def of(cls, rule: EfficacyRule, design: Design, bounds: tuple[Bound, ...]) -> _Cost:
        if design.power <= design.alpha_one_side:
            raise DesignInvalid(
                "power not above alpha",
                where="the plan, [design]",
                found=f"power {design.power!r} with alpha {design.alpha!r}",
                accepted="a power above alpha and below 1",
                remedy="raise power",
            )
        fixed = float(ndtri(design.power) - ndtri(design.alpha_one_side))
        return cls(rule, bounds, _noncentrality(rule, bounds, design.power, fixed), fixed)

    @property
    def inflation(self) -> float:
        return (self.noncentrality / self.fixed_noncentrality) ** 2

    def expected_fraction(self, noncentrality: float) -> float:
        """Mean information fraction at the end: t_1 + the sum of P(going on past k) (t_k+1 - t_k)."""
        fractions, regions = _fractions_and_regions(self.bounds, self.rule)
        going_on = crossing_probabilities(fractions, regions, drift=noncentrality).going_on
        return float(fractions[0] + (going_on[:-1] * np.diff(fractions)).sum())


def _noncentrality(rule: EfficacyRule, bounds: Sequence[Bound], power: float, fixed: float) -> float:
    """Root of the power, bracketed from below by one look at the end, which no plan of this alpha beats."""

    def excess(noncentrality: float) -> float:
        return crossing_power(bounds, rule, noncentrality) - power

    low, high = fixed - 1e-6, fixed * 1.1 + 0.1
    while excess(high) < 0.0:
        low, high = high, high * 1.5
        if high > 100.0 * (1.0 + fixed):
            raise AccuracyNotReached("no effect reaches the plan's power", found=f"power {power!r}")
    return float(brentq(excess, low, high, xtol=1e-12, rtol=1e-14))


def _fractions_and_regions(
    bounds: Sequence[Bound], rule: EfficacyRule
) -> tuple[tuple[float, ...], tuple[Region, ...]]:
    regions = (
        Region() if isinstance(bound.efficacy_z, Absent) else rule.region(bound.efficacy_z)
        for bound in bounds
    )
    return tuple(bound.information_fraction for bound in bounds), tuple(regions)


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
