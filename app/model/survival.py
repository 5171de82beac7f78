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

    """One stratum's share: `observed` and `expected` events in the experimental arm, `variance` of the
    score.
    """

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


@dataclass(frozen=True)
class WeightedResult:
    """A weighted log-rank test: score = sum of weight (O - E) of the experimental arm, its variance, z and p.

    z = -direction score / sqrt(variance): positive favours experimental. `rho` and `gamma` are those of
    Fleming-Harrington weights.
    """

    name: str
    rho: float | None
    gamma: float | None
    score: float
    variance: float
    z: float
    chi_square: float
    p_one_sided: float
    p_two_sided: float


@dataclass(frozen=True, eq=False)
class WeightedMaximum:
    """The largest of several weighted tests; `z` is the one largest in absolute value, with its sign.

    `p_two_sided` is of |z|; `p_one_sided` of the largest z in favour of experimental; `p_error` is the
    standard error of their numerical integration.
    """

    tests: tuple[WeightedResult, ...]
    correlation: Floats
    z: float
    p_two_sided: float
    p_one_sided: float
    p_error: float


@dataclass(frozen=True)
class Landmark:
    """Survival of one arm at a time, with the curve's standard error and limits there, or why there is
    none.
    """

    at: float
    survival: Estimate
    std_error: Estimate
    ci_low: Estimate
    ci_high: Estimate


@dataclass(frozen=True)
class LandmarkTest:
    """No difference at the landmark, tested on one scale of survival; 1 degree of freedom."""

    scale: str
    chi_square: Estimate
    p_two_sided: Estimate


@dataclass(frozen=True)
class LandmarkComparison:
    """Survival at one time, experimental - control; what cannot be compared is the reason why."""

    at: float
    control: Landmark
    experimental: Landmark
    difference: Estimate
    std_error: Estimate
    ci_low: Estimate
    ci_high: Estimate
    level: float
    tests: tuple[LandmarkTest, ...]


@dataclass(frozen=True)
class Quantile:
    """The time by which `share` of the subjects has had the event."""

    share: float
    time: Estimate
    ci_low: Estimate
    ci_high: Estimate


@dataclass(frozen=True, eq=False)
class CountsAt:
    """At risk just before each time, events and censorings before it, shape (k,); they add up to the
    subjects.
    """

    time: Floats
    at_risk: Counts
    events: Counts
    censored: Counts


@dataclass(frozen=True, eq=False)
class LogLogCurve:
    """log(-log S) against log t at event times with 0 < S < 1 and t > 0, shape (m,)."""

    time: Floats
    log_time: Floats
    log_minus_log: Floats


@dataclass(frozen=True, eq=False)
class CumulativeHazard:
    """A Nelson-Aalen estimate: a row per distinct observed time, shape (m,). Limits are NaN while it is 0."""

    time: Floats
    at_risk: Counts
    events: Counts
    hazard: Floats
    std_error: Floats
    ci_low: Floats
    ci_high: Floats
    level: float
    interval: str


@dataclass(frozen=True)
class Completeness:
    """Person-time observed, person-time that full follow-up to the cutoff would have given, their ratio
    0-1.
    """

    observed: float
    potential: float
    share: float


@dataclass(frozen=True)
class RestrictedMean:
    """Mean time without the event up to `at`, and its standard error, in the unit of `at`."""

    at: float
    mean: float
    std_error: float


@dataclass(frozen=True)
class RestrictedMeanRatio:
    """A ratio experimental / control with its limits."""

    ratio: float
    ci_low: float
    ci_high: float


@dataclass(frozen=True)
class RestrictedMeanComparison:
    """Restricted means up to `at`: experimental - control, and the ratios of the means and of the times
    lost.
    """

    at: float
    control: RestrictedMean
    experimental: RestrictedMean
    difference: float
    std_error: float
    ci_low: float
    ci_high: float
    level: float
    z: float
    p_two_sided: float
    ratio: RestrictedMeanRatio | Absent
    ratio_of_time_lost: RestrictedMeanRatio | Absent


@dataclass(frozen=True, eq=False)
class GroupsResult:
    """Several groups, shape (k,): weighted observed and expected events, covariance of O - E, shape (k,
    k).
    """

    observed: Floats
    expected: Floats
    covariance: Floats
    chi_square: float
    degrees_of_freedom: int
    p: float


@dataclass(frozen=True, eq=False)
class TrendResult:
    """A trend over groups with `scores`, shape (k,): z > 0 when events come earlier at higher scores."""

    scores: Floats
    score: float
    variance: float
    z: float
    chi_square: float
    p_two_sided: float


@dataclass(frozen=True)
class RatioEstimate:
    """A hazard ratio experimental / control by the method `name`; `std_error` is of the log."""

    name: str
    log_hazard_ratio: float
    std_error: float
    hazard_ratio: float
    ci_low: float
    ci_high: float
    level: float


@dataclass(frozen=True)
class PermutationResult:
    """p-values among `seen` allocations; the errors are Monte Carlo standard errors, 0 when all were
    listed.
    """

    p_one_sided: float
    p_two_sided: float
    error_one_sided: float
    error_two_sided: float
    seen: int
    listed_all: bool


@dataclass(frozen=True)
class ChiSquareTest:
    """A chi-square with its degrees of freedom and the probability of a larger one."""

    chi_square: float
    degrees_of_freedom: int
    p: float


@dataclass(frozen=True, eq=False)
class CoxEstimate:
    """Log hazard ratios per unit of each covariate, shape (p,), with Wald limits and covariance, shape (p,
    p).
    """

    coefficients: Floats
    std_errors: Floats
    covariance: Floats
    ci_low: Floats
    ci_high: Floats
    level: float


@dataclass(frozen=True, eq=False)
class CoxModel:
    """A proportional-hazards model; without a finite estimate the likelihood-ratio and score tests stand."""

    estimate: CoxEstimate | Absent
    log_likelihood_at_zero: float
    log_likelihood: float
    likelihood_ratio: ChiSquareTest
    score: ChiSquareTest
    wald: ChiSquareTest | Absent
    ties: str
    events: int


@dataclass(frozen=True, eq=False)
class BaselineHazard:
    """Cumulative hazard at each event time of each stratum, shape (m,), with covariates at `at`, shape
    (p,).
    """

    stratum: Counts
    time: Floats
    cumulative: Floats
    at: Floats


@dataclass(frozen=True)
class ProportionalityResult:
    """A change of the hazard ratio of two arms along `transform` of time; a positive score: it grows."""

    score: float
    chi_square: float
    p: float
    transform: str
    ties: str


@dataclass(frozen=True)
class ProportionalityTests:
    """A change with time of each coefficient of a Cox model, and of all together."""

    covariates: tuple[ChiSquareTest, ...]
    together: ChiSquareTest
    transform: str
    ties: str


@dataclass(frozen=True, eq=False)
class SmoothCurve:
    """A smooth over a scale of time, shape (k,), with the standard error of its height.

    `time` is where each place of the scale lies, between events along a straight line.
    """

    time: Floats
    on_scale: Floats
    value: Floats
    std_error: Floats


@dataclass(frozen=True, eq=False)
class ScaledResiduals:
    """Scaled Schoenfeld residuals in the order of time: a row per event, (d,) and (d, p); a smooth for each
    of p.
    """

    time: Floats
    on_scale: Floats
    residuals: Floats
    coefficients: Floats
    smooth: tuple[SmoothCurve | Absent, ...]
    transform: str


@dataclass(frozen=True, eq=False)
class RatioOverTime:
    """The smooth of two arms' scaled residuals as a hazard ratio over time, shape (k,), pointwise limits.

    `events` are those up to and at each time; `log_hazard_ratio` and `std_error` are of the smooth itself.
    """

    time: Floats
    events: Counts
    log_hazard_ratio: Floats
    std_error: Floats
    hazard_ratio: Floats
    ci_low: Floats
    ci_high: Floats
    level: float


@dataclass(frozen=True)
class PeriodRatio:
    """The hazard ratio of the events in (start, end], or why there is none."""

    start: float
    end: float
    events: int
    ratio: CoxResult | Absent


@dataclass(frozen=True)
class InteractionResult:
    """The hazard ratio in each subgroup (by its code), and tests that all are one."""

    subgroups: tuple[int, ...]
    ratios: tuple[CoxResult | Absent, ...]
    likelihood_ratio: ChiSquareTest
    wald: ChiSquareTest | Absent


@dataclass(frozen=True, eq=False)
class Incidence:
    """Cumulative incidence of one cause among others: a row per time with an event of any cause, shape (m,).

    `at_risk` counts those without any event just before; `events` those of this cause, `others` of the
    others.
    """

    time: Floats
    at_risk: Counts
    events: Counts
    others: Counts
    incidence: Floats
    std_error: Floats
    ci_low: Floats
    ci_high: Floats
    level: float
    interval: str


@dataclass(frozen=True, eq=False)
class GrayResult:
    """Gray's test that the incidence of a cause is the same in all groups: scores, (k,), their covariance,
    (k, k).
    """

    score: Floats
    covariance: Floats
    chi_square: float
    degrees_of_freedom: int
    p: float


@dataclass(frozen=True, eq=False)
class Shape:
    """How one arm differs from the other beyond one ratio; None is what the plan does not ask for.

    Descriptive: nothing of it is adjusted for looks.
    """

    proportionality: ProportionalityResult | Absent
    residuals: ScaledResiduals | Absent
    ratio_over_time: RatioOverTime | Absent
    restricted_mean: RestrictedMeanComparison | Absent | None
    weighted: tuple[WeightedResult | Absent, ...] | None
    weighted_maximum: WeightedMaximum | Absent | None
    landmarks: tuple[LandmarkComparison, ...] | None
