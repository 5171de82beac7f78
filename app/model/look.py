"""Everything computed at one look, oriented experimental against control. Only views see it."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date

from app.model.boundary import Bound, HeldCompared, LookAsUsed, Verdict
from app.model.extract import Changes, Finding, LookKind, TimeUnit
from app.model.outlook import Outlook, RepeatedInterval, Stopping
from app.model.plan import Hypothesis
from app.model.survival import ArmComparison, CoxResult, LogrankResult, Shape, SurvivalCurve
from app.model.values import Absent, Estimate, Ints


@dataclass(frozen=True)
class ArmCounts:
    """Denominators of one arm; `person_time` is the sum of the times, in the time unit."""

    subjects: int
    events: int
    person_time: float
    follow_up_median: Estimate


@dataclass(frozen=True)
class StratumCounts:
    label: str
    subjects: int
    events: int
    experimental_subjects: int
    experimental_events: int


@dataclass(frozen=True)
class Information:
    """`fraction` = events / planned events. `variance_ratio` = V / (d p q), or why it does not exist."""

    subjects: int
    events: int
    fraction: float
    planned_events: int
    score_variance: Estimate
    variance_ratio: Estimate
    control: ArmCounts
    experimental: ArmCounts
    strata: tuple[StratumCounts, ...]


@dataclass(frozen=True, eq=False)
class CalendarCounts:
    """Cumulative pooled counts by day since 1970-01-01, for the accrual figure; arrays of shape (m,)."""

    day: Ints
    randomised: Ints
    events: Ints


@dataclass(frozen=True)
class Onwards:
    """What one reading says of going on and of ending here, its experimental arm against its control."""

    outlook: Outlook | Absent
    repeated_interval: RepeatedInterval | Absent
    stopping: Stopping | Absent


@dataclass(frozen=True)
class HarmResult:
    """Harm judged on an endpoint of its own: who was counted there, and the test, from the side of each arm.

    `information_used` is what its correlations use: events, or score variance where the plan says so.
    """

    parameter: str
    control: ArmCounts
    experimental: ArmCounts
    information_used: float
    stratum_labels: tuple[str, ...]
    compared: ArmComparison
    mirrored: ArmComparison  # control against experimental

    @property
    def z(self) -> float | None:
        test = self.compared.logrank
        return None if isinstance(test, Absent) else test.z


@dataclass(frozen=True, eq=False)
class HypothesisResult:
    """A further hypothesis at one look: what its own plan says of it, and nothing crossed while it waits."""

    hypothesis: Hypothesis
    result: LookResult


@dataclass(frozen=True, eq=False)
class LookResult:
    """One look under one plan: information, curves, tests, boundary. `past` are the looks as used.

    The first of `past` are the plan's [[held]] looks, which `held` compares with what we compute for them.
    """

    number: int
    kind: LookKind
    final: bool
    time_unit: TimeUnit
    cutoff: date | None
    extracted: date | None
    findings: tuple[Finding, ...]
    changes: Changes | None
    information: Information
    information_used: (
        float  # what correlations use of this look: events, or score variance where the plan says so
    )
    calendar: CalendarCounts | None
    logrank: LogrankResult | Absent
    logrank_unstratified: LogrankResult | Absent
    cox: CoxResult | Absent
    cox_unstratified: CoxResult | Absent
    mirrored: ArmComparison  # the same, control against experimental
    shape: Shape
    mirrored_shape: Shape  # control against experimental
    control_curve: SurvivalCurve
    experimental_curve: SurvivalCurve
    bound: Bound
    verdict: Verdict
    past: tuple[LookAsUsed, ...]
    planned: tuple[Bound, ...]  # bounds at the plan's looks still to come, were they held as planned
    onwards: Onwards
    mirrored_onwards: Onwards  # the same, control against experimental
    snapshot_digests: tuple[str, ...]
    plan_digest: str
    held: tuple[HeldCompared, ...] = ()
    harm: HarmResult | None = None  # where harm stands on an endpoint of its own
    hypotheses: tuple[HypothesisResult, ...] = ()

    @property
    def held_before(self) -> frozenset[int]:
        """Numbers of the looks held before, which have their z from the plan and not from a snapshot."""
        return frozenset(each.number for each in self.held)

    @property
    def cutoff_day(self) -> int | None:
        """The data cutoff as days since 1970-01-01."""
        return days_since_epoch(self.cutoff)


@dataclass(frozen=True, eq=False)
class PooledResult:
    """One look without arms: all that the open side can be told."""

    number: int
    kind: LookKind
    time_unit: TimeUnit
    cutoff: date | None
    extracted: date | None
    subjects: int
    events: int
    fraction: float
    planned_events: int
    person_time: float
    follow_up_median: Estimate
    strata: tuple[tuple[str, int, int], ...]  # label, subjects, events
    calendar: CalendarCounts | None
    curve: SurvivalCurve
    past: tuple[tuple[int, float, int], ...]  # number, fraction, events of earlier looks

    @property
    def cutoff_day(self) -> int | None:
        """The data cutoff as days since 1970-01-01."""
        return days_since_epoch(self.cutoff)


def days_since_epoch(day: date | None) -> int | None:
    return None if day is None else (day - date(1970, 1, 1)).days
