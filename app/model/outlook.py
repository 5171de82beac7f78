"""What going on would mean, and what the result says were the trial to end here."""

from __future__ import annotations

from dataclasses import dataclass

from app.model.values import Absent, Estimate


@dataclass(frozen=True)
class ConditionalPower:
    """Probability of crossing the efficacy bound later, given this look, under one effect.

    `noncentrality` is the mean of z at full information under the effect, `hazard_ratio` the same effect as
    experimental / control. `final_look` counts the final look only, `path` any planned look to come,
    `path_futility_obeyed` the same with a stop at each futility bound, None where the plan has no such
    boundary.
    """

    noncentrality: float
    hazard_ratio: Estimate
    final_look: Estimate
    path: Estimate
    path_futility_obeyed: Estimate | None


@dataclass(frozen=True)
class PredictivePower:
    """Conditional power at the final look, averaged over effects; `prior` is None without a prior."""

    flat: Estimate
    prior: Estimate | None


@dataclass(frozen=True)
class NextLook:
    """What the next planned look needs, were it held as planned.

    `new_events_z` is the z that the events between now and then must show by themselves for the bound to be
    met, `new_events_hazard_ratio` the same as a hazard ratio, `chance_*` the probability that it is met.
    """

    number: int
    information_fraction: float
    events: int
    efficacy_z: Estimate
    efficacy_hazard_ratio: Estimate
    futility_z: Estimate | None
    new_events_z: Estimate
    new_events_hazard_ratio: Estimate
    chance_design: Estimate
    chance_trend: Estimate
    chance_null: Estimate


@dataclass(frozen=True)
class Outlook:
    """Conditional power under the plan's effect, the trend and its limits, and no effect; what comes next.

    `criterion` is this trial's own last bound. `trend_low` is the less favourable limit. `next_look` is None
    where no planned look is to come.
    """

    design: ConditionalPower
    trend: ConditionalPower
    trend_low: ConditionalPower
    trend_high: ConditionalPower
    null: ConditionalPower
    criterion: Estimate
    predictive_power: PredictivePower
    next_look: NextLook | None


@dataclass(frozen=True)
class WhatIf:
    """Conditional power were a hazard ratio true that a reader chose: one for each reading of a view.

    It is no part of a look, of a view or of a sheet, and no record or entry has a place for it: a result that
    somebody asked about is never kept as if the trial had given it. `hazard_ratio` is experimental / control
    in each reading.
    """

    hazard_ratio: float
    readings: tuple[ConditionalPower | Absent, ...]


@dataclass(frozen=True)
class RepeatedInterval:
    """Interval of the hazard ratio that holds at this look whatever is decided; `level` is its confidence."""

    ci_low: Estimate
    ci_high: Estimate
    level: float


@dataclass(frozen=True)
class Stopping:
    """Inference were the trial to end here, by the stagewise ordering; ratios are experimental / control."""

    p_one_sided: Estimate
    median_unbiased_hazard_ratio: Estimate
    ci_low: Estimate
    ci_high: Estimate
    level: float
