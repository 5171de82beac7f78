"""What the group-sequential core takes and returns."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from app.model.extract import LookKind
from app.model.values import Absent, Estimate

Crossed = Literal["none", "efficacy", "futility", "harm", "control"]
BELOW: tuple[Crossed, ...] = ("futility", "harm")
"""What is crossed below, on the side against experimental, and ends no test unless futility is binding."""

NOT_RECORDED = Absent("not recorded for this look")


@dataclass(frozen=True)
class LookAsUsed:
    """A look already held, with what its verdict rested on; never recomputed.

    `information` is what correlations use: events, or score variance where the plan says so. `alpha_spent` is
    cumulative, of one side. `efficacy_z` is Absent where the look had no efficacy bound. `futility_z` and
    `harm_z` are None where the plan had no such boundary. `harm_information` and `z_for_harm` are those of
    harm's own endpoint, None where it is judged on the plan's. `further` holds, by its parameter, what each
    further hypothesis used at this look.
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
    efficacy_hazard_ratio: Estimate = NOT_RECORDED
    futility_z: Estimate | None = None
    type_two_spent: float = 0.0
    harm_z: Estimate | None = None
    harm_alpha_spent: float = 0.0
    harm_information: float | None = None
    z_for_harm: float | None = None
    further: tuple[tuple[str, LookAsUsed], ...] = ()
    alpha_spent_here: float = 0.0

    def of(self, parameter: str) -> LookAsUsed | None:
        """What the hypothesis on this endpoint used at this look, where the plan then had it."""
        return dict(self.further).get(parameter)


@dataclass(frozen=True)
class Bound:
    """The boundary at one look. Alphas are of one side; `efficacy_z` is Absent where no bound exists.

    `events` is the smallest integer >= fraction * planned events for a planned look, the observed count for a
    look held. `efficacy_hazard_ratio` is experimental / control at the bound. `efficacy_b_value` is z
    sqrt(t). What belongs to futility or harm is None where the plan has no such boundary; `type_two_spent`
    and `harm_alpha_spent` are cumulative.
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
    futility_z: Estimate | None = None
    type_two_spent: float | None = None
    futility_hazard_ratio: Estimate | None = None
    harm_z: Estimate | None = None
    harm_alpha_spent: float | None = None
    harm_hazard_ratio: Estimate | None = None

    @property
    def efficacy_b_value(self) -> Estimate:
        """z sqrt(t) at the bound: on this scale a trial moves like Brownian motion (Lan & Wittes 1988)."""
        if isinstance(self.efficacy_z, Absent):
            return self.efficacy_z
        return self.efficacy_z * math.sqrt(self.information_fraction)


@dataclass(frozen=True)
class HeldCompared:
    """A look of the plan's [[held]] as it was used, beside what we compute for it."""

    number: int
    events: int
    source: str
    z: float | None
    efficacy_z: float | None
    alpha_spent: float
    computed_efficacy_z: Estimate
    computed_alpha_spent: float


@dataclass(frozen=True)
class Verdict:
    """Where the test stands: what was crossed at this look, and at the first look that crossed."""

    crossed: Crossed
    first_crossed: int | None


@dataclass(frozen=True)
class LookChances:
    """Probabilities of first crossing each bound at one look of a plan; `control` is of two-sided tests."""

    number: int
    efficacy: float
    futility: float
    harm: float
    control: float


@dataclass(frozen=True)
class Feasibility:
    """What the plan's hazard ratio and events come to beside its power.

    `events_needed` gives the power at these looks; Schoenfeld's and Freedman's are of one look at the end.
    """

    power_reached: float
    events_needed: int
    schoenfeld_events: float
    freedman_events: float


@dataclass(frozen=True)
class PlannedBoundary:
    """What `boundary` prints: the bounds of a plan at chosen fractions, and what the design needs.

    `noncentrality` is of z at full information, solved for the power with futility obeyed; `inflation` is
    maximum over fixed-sample information; the expected fractions and the chances look by look are under null,
    half and design effect.
    """

    sides: int
    bounds: tuple[Bound, ...]
    noncentrality: Estimate
    power: float
    inflation: Estimate
    expected_fraction_null: Estimate
    expected_fraction_half: Estimate
    expected_fraction_design: Estimate
    chances_null: tuple[LookChances, ...]
    chances_half: tuple[LookChances, ...]
    chances_design: tuple[LookChances, ...]
    feasibility: Feasibility
