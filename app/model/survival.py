"""What the survival estimators return."""

from __future__ import annotations

from dataclasses import dataclass

from app.model.values import Absent, Counts, Estimate, Floats


@dataclass(frozen=True, eq=False)
class SurvivalCurve:
    """A Kaplan-Meier curve: a row per distinct observed time (event or censoring), shape (m,), increasing.

    `at_risk` counts subjects just before the time; `events` and `censored` those at it (events first).
    `survival` is right-continuous. `std_error` is Greenwood's, of `survival`. Where a quantity is not
    estimable at a time (std_error and limits at survival 0, limits at survival 1) the array holds NaN; the
    record and the pages put the word in its place. Medians are in the unit of `time`.
    """

    time: Floats
    at_risk: Counts
    events: Counts
    censored: Counts
    survival: Floats
    std_error: Floats
    ci_low: Floats
    ci_high: Floats
    median: Estimate
    median_ci_low: Estimate
    median_ci_high: Estimate
    level: float
    interval: str


@dataclass(frozen=True)
class LogrankStratum:
    """One stratum: `observed` and `expected` events in the experimental arm, `variance` of the score."""

    stratum: int
    subjects: int
    events: int
    observed: float
    expected: float
    variance: float

    @property
    def contributes(self) -> bool:
        """False when no event fell while both arms were at risk: the stratum adds nothing."""
        return self.variance > 0


@dataclass(frozen=True)
class LogrankResult:
    """Observed and expected events of the experimental arm, variance of O - E, and z with its p-values.

    z = direction * (expected - observed) / sqrt(variance): positive favours experimental.
    """

    observed: float
    expected: float
    variance: float
    z: float
    chi_square: float
    p_one_sided: float
    p_two_sided: float
    strata: tuple[LogrankStratum, ...]


@dataclass(frozen=True, eq=False)
class LogrankSteps:
    """Each event time's share, shape (m,), stratum by stratum: `observed` and `expected` events in the
    experimental arm, `variance` of the score."""

    stratum: Counts
    time: Floats
    observed: Counts
    expected: Floats
    variance: Floats


@dataclass(frozen=True)
class CoxResult:
    """Hazard ratio experimental / control by partial likelihood; `std_error` is of the log."""

    log_hazard_ratio: float
    std_error: float
    hazard_ratio: float
    ci_low: float
    ci_high: float
    level: float
    ties: str


@dataclass(frozen=True)
class ArmComparison:
    """The plan's test and hazard ratio of one arm against the other, and both again without the strata."""

    logrank: LogrankResult | Absent
    logrank_unstratified: LogrankResult | Absent
    cox: CoxResult | Absent
    cox_unstratified: CoxResult | Absent
