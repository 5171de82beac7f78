"""The hazard ratio of two arms by Cox's partial likelihood.

With one two-valued covariate each event time needs nothing but its counts: at a hazard ratio theta its number
of experimental events has a mean and a variance (see `tied_events`); the score is the sum of observed less
mean, the information the sum of the variances. The means run from a fewest to a most possible number as theta
runs from 0 to infinity, so the score has a root if and only if the observed number lies strictly between.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

from numpy.typing import ArrayLike

from app.errors import AccuracyNotReached, NotEstimable
from app.model.survival import CoxResult
from app.model.values import Counts, Floats
from app.survival.checked import checked_choice
from app.survival.comparison import EXPERIMENTAL, reason_arms_not_told_apart, two_arm_events
from app.survival.intervals import two_sided_quantile
from app.survival.risk_table import EventTable, RiskTable
from app.survival.tied_events import MOMENTS, possible

BLOCK = 65_536
MOST_STEPS = 60
LONGEST_STEP = 5.0
STEP_TOLERANCE = 1e-10
LARGEST_LOG_RATIO = 700.0  # the exponential of more is not a double


def cox_two_arms(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    level: float = 0.95,
) -> CoxResult:
    """Estimate the hazard ratio, experimental / control, by partial likelihood.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    experimental : bool array, shape (n,); False = control
    stratum : int array, shape (n,), codes from 0, optional; each stratum has a baseline hazard of its own
    ties : "Efron", "Breslow" or "exact"
    level : confidence level of the interval, between 0 and 1

    Returns
    -------
    CoxResult
        log hazard ratio, its standard error, hazard ratio and Wald limits, all [1].

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no event tells the arms apart, or all that do fell in one arm, so that the likelihood keeps
        rising as the ratio goes to 0 or to infinity - facts about the data.
    AccuracyNotReached : the iteration stopped before its tolerance.

    Notes
    -----
    *Convention*: a ratio below 1 says fewer events in the experimental arm, whether they are bad or good; at
    one time events precede censorings.
    *Accuracy*: Newton's method on the score with steps halved until its absolute value falls, stopped when a
    step is at most 1e-10; the next error is of the order of its square. Whether an estimate exists is decided
    by counting.
    *Checked*: by hand (tests/byhand), print (app/validation/survival_rows.py), a literal version
    (tests/naive.py), properties.

    References
    ----------
    Cox (1972), JRSS B 34, 187-220, which has the exact form too. Efron (1977), JASA 72, 557-565. Breslow
    (1974), Biometrics 30, 89-99.

    Examples
    --------
    >>> round(cox_two_arms([1, 2, 3, 4], [True] * 4, [False, True, False, True]).hazard_ratio, 6)
    0.390388
    """
    table = two_arm_events(time, event, experimental, stratum)
    return cox_two_arms_of(table, ties=ties, level=level)


def cox_two_arms_of(table: RiskTable | EventTable, *, ties: str = "Efron", level: float = 0.95) -> CoxResult:
    """The hazard ratio from a two-arm table already made; see `cox_two_arms`."""
    z = two_sided_quantile(level)
    log_ratio, information = maximise(two_arm_likelihood(table, ties))
    return _result(log_ratio, information, z, level, ties)


def _result(log_ratio: float, information: float, z: float, level: float, ties: str) -> CoxResult:
    """Estimate and Wald limits on the log scale."""
    std_error = 1.0 / math.sqrt(information)
    if abs(log_ratio) + z * std_error > LARGEST_LOG_RATIO:
        raise NotEstimable("no finite confidence interval: the data hardly bound the hazard ratio")
    return CoxResult(
        log_hazard_ratio=log_ratio,
        std_error=std_error,
        hazard_ratio=math.exp(log_ratio),
        ci_low=math.exp(log_ratio - z * std_error),
        ci_high=math.exp(log_ratio + z * std_error),
        level=level,
        ties=ties,
    )


@dataclass(frozen=True, eq=False)
class TwoArmLikelihood:
    """The partial likelihood of two arms, whose score is observed - expected experimental events.

    `moments` gives mean and variance of the experimental events at each time, see `tied_events`.
    """

    table: EventTable
    observed: int
    moments: Callable[[Counts, Counts, float], tuple[Floats, Floats]]

    def expected_and_variance(self, log_ratio: float) -> tuple[Floats, Floats]:
        """At each event time, shape (m,)."""
        return self.moments(self.table.at_risk, self.table.events, log_ratio)

    def score_and_information(self, log_ratio: float) -> tuple[float, float]:
        """Sums over all event times, block by block: a block's arrays stay in the processor's cache."""
        table, expected, information = self.table, 0.0, 0.0
        for start in range(0, table.time.size, BLOCK):
            block = slice(start, start + BLOCK)
            mean, variance = self.moments(table.at_risk[:, block], table.events[:, block], log_ratio)
            expected += float(mean.sum())
            information += float(variance.sum())
        return self.observed - expected, information


def two_arm_likelihood(table: RiskTable | EventTable, ties: str) -> TwoArmLikelihood:
    """The likelihood that has a maximum; NotEstimable when these data give no finite ratio."""
    checked_choice(ties, "ties", tuple(MOMENTS))
    events = table.at_events()
    fewest, most = (int(count.sum()) for count in possible(events.at_risk, events.events, ties))
    observed = int(events.events[EXPERIMENTAL].sum())
    if fewest == most:
        raise NotEstimable(reason_arms_not_told_apart(events))
    if observed in (fewest, most):
        arm, limit = ("control", "0") if observed == fewest else ("experimental", "infinity")
        raise NotEstimable(
            f"no finite estimate: every event with both arms at risk was in the {arm} arm, "
            f"so the likelihood rises as the hazard ratio goes to {limit}"
        )
    return TwoArmLikelihood(events, observed, MOMENTS[ties])


def maximise(likelihood: TwoArmLikelihood) -> tuple[float, float]:
    """Root of the score, which falls throughout, and the information there."""
    log_ratio = 0.0
    score, information = likelihood.score_and_information(log_ratio)
    for _ in range(MOST_STEPS):
        step = max(-LONGEST_STEP, min(LONGEST_STEP, score / information))
        if abs(step) <= STEP_TOLERANCE:
            return log_ratio + step, information
        log_ratio, score, information = _advance(likelihood, log_ratio, step, score)
    raise AccuracyNotReached(
        "the hazard ratio was not found",
        found=f"a last step of {abs(step):.1e} after {MOST_STEPS} steps",
        accepted=f"a step of at most {STEP_TOLERANCE}",
    )


def _advance(
    likelihood: TwoArmLikelihood, log_ratio: float, step: float, score: float
) -> tuple[float, float, float]:
    """Go the step, or the first half of it ... that brings the score nearer to 0."""
    for _ in range(MOST_STEPS):
        new_score, information = likelihood.score_and_information(log_ratio + step)
        if abs(new_score) < abs(score):
            break
        step /= 2.0
    return log_ratio + step, new_score, information
