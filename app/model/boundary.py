"""What the group-sequential core takes and returns."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from app.model.extract import LookKind
from app.model.values import Absent, Estimate

Crossed = Literal["none", "efficacy", "futility", "harm", "control"]


@dataclass(frozen=True)
class LookAsUsed:
    """A look already held, with what its verdict rested on; never recomputed.

    `information` is what correlations use: events, or score variance where the plan says so.
    `alpha_spent` is cumulative, of one side. `efficacy_z` is Absent where the look had no efficacy bound.
    """

    number: int
    kind: LookKind
    information: float
    events: int
    fraction: float
    z: float | None
    efficacy_z: Estimate
    alpha_spent: float
    final: bool
    crossed: Crossed = "none"
    efficacy_hazard_ratio: Estimate = Absent("not recorded for this look")


@dataclass(frozen=True)
class Bound:
    """The boundary at one look. Alphas are of one side; `efficacy_z` is Absent where no bound exists.

    `events` is the smallest integer >= fraction * planned events for a planned look, the observed count for
    a look held. `efficacy_hazard_ratio` is experimental / control at the bound.
    """

    number: int
    information_fraction: float
    events: int
    final: bool
    alpha_spent: float
    alpha_spent_here: float
    efficacy_z: Estimate
    efficacy_p_one_sided: Estimate
    efficacy_hazard_ratio: Estimate


@dataclass(frozen=True)
class Verdict:
    """Where the test stands: what was crossed at this look, and at the first look that crossed."""

    crossed: Crossed
    first_crossed: int | None


@dataclass(frozen=True)
class PlannedBoundary:
    """What `boundary` prints: the bounds of a plan at chosen fractions, and what the design needs.

    `noncentrality` is of z at full information, solved for the power; `inflation` is maximum over
    fixed-sample information; the expected fractions are under null, half and design effect.
    """

    sides: int
    bounds: tuple[Bound, ...]
    noncentrality: Estimate
    power: float
    inflation: Estimate
    expected_fraction_null: Estimate
    expected_fraction_half: Estimate
    expected_fraction_design: Estimate
