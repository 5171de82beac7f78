"""The hazard ratio of two arms by Cox's partial likelihood.

With one two-valued covariate the likelihood needs nothing but odds. Let theta be the hazard ratio, and let an
event fall while c control and e experimental subjects are at risk. The event is experimental with probability

    e theta / (c + e theta) = 1 / (1 + 1 / (odds theta)),    odds = e / c,

so the score is (experimental events) - (sum of these probabilities p), and the information is the sum of
p (1 - p). For tied events Efron takes the k-th of d of them (k = 0, 1, ..., d - 1) against the risk set less
k/d of those who have the event at this time, Breslow against the whole risk set.

Where c or e is 0 the probability is 1 or 0 whatever theta is: such events are taken off the sum beforehand.
What remains decides at once whether an estimate exists: the sum runs from 0 to the number of events as theta
runs from 0 to infinity, so the score has a root if and only if the experimental events among them are neither
none nor all.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.errors import AccuracyNotReached, NotEstimable
from app.model.survival import CoxResult
from app.model.values import Floats
from app.survival.comparison import CONTROL, EXPERIMENTAL, reason_arms_not_told_apart, two_arm_table
from app.survival.intervals import two_sided_quantile
from app.survival.risk_table import RiskTable

TIES = ("Efron", "Breslow")
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
    ties : "Efron" or "Breslow"
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
    Cox (1972), JRSS B 34, 187-220. Efron (1977), JASA 72, 557-565. Breslow (1974), Biometrics 30, 89-99.

    Examples
    --------
    >>> round(cox_two_arms([1, 2, 3, 4], [True] * 4, [False, True, False, True]).hazard_ratio, 6)
    0.390388
    """
    table = two_arm_table(time, event, experimental, stratum)
    return cox_two_arms_of(table, ties=ties, level=level)


def cox_two_arms_of(table: RiskTable, *, ties: str = "Efron", level: float = 0.95) -> CoxResult:
    """The hazard ratio from a two-arm table already made; see `cox_two_arms`."""
    z = two_sided_quantile(level)
    likelihood = _partial_likelihood(table, ties)
    log_ratio, information = _maximise(likelihood)
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
class _PartialLikelihood:
    """`odds_of_control`: c / e at each event with both arms at risk; `observed` of these are experimental."""

    odds_of_control: Floats
    observed: int

    def score_and_information(self, log_ratio: float) -> tuple[float, float]:
        probability = 1.0 / (1.0 + self.odds_of_control * math.exp(-log_ratio))
        score = self.observed - float(np.sum(probability))
        return score, float(np.sum(probability * (1.0 - probability)))


def _partial_likelihood(table: RiskTable, ties: str) -> _PartialLikelihood:
    """The odds at every event that tells the arms apart; NotEstimable when they give no finite ratio."""
    control, experimental = _at_risk_event_by_event(table.with_events(), ties)
    both = (control > 0.0) & (experimental > 0.0)
    certain = int(np.count_nonzero(~both & (experimental > 0.0)))
    observed = int(table.events[EXPERIMENTAL].sum()) - certain
    telling = int(np.count_nonzero(both))
    if not telling:
        raise NotEstimable(reason_arms_not_told_apart(table))
    if observed in (0, telling):
        arm, limit = ("control", "0") if observed == 0 else ("experimental", "infinity")
        raise NotEstimable(
            f"no finite estimate: every event with both arms at risk was in the {arm} arm, "
            f"so the likelihood rises as the hazard ratio goes to {limit}"
        )
    return _PartialLikelihood(control[both] / experimental[both], observed)


def _at_risk_event_by_event(table: RiskTable, ties: str) -> tuple[Floats, Floats]:
    """Control and experimental subjects that each event is compared with, shape (number of events,)."""
    if ties not in TIES:
        raise ValueError(f"ties is {ties!r}; accepted: {', '.join(map(repr, TIES))}")
    tied = table.events.sum(axis=0)
    at_risk = np.repeat(table.at_risk, tied, axis=1).astype(np.float64)
    if ties == "Efron":
        first = np.repeat(np.cumsum(tied) - tied, tied)
        fraction_gone = (np.arange(first.size) - first) / np.repeat(tied, tied)
        at_risk -= fraction_gone * np.repeat(table.events, tied, axis=1)
    return at_risk[CONTROL], at_risk[EXPERIMENTAL]


def _maximise(likelihood: _PartialLikelihood) -> tuple[float, float]:
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
    likelihood: _PartialLikelihood, log_ratio: float, step: float, score: float
) -> tuple[float, float, float]:
    """Go the step, or the first half of it ... that brings the score nearer to 0."""
    for _ in range(MOST_STEPS):
        new_score, information = likelihood.score_and_information(log_ratio + step)
        if abs(new_score) < abs(score):
            break
        step /= 2.0
    return log_ratio + step, new_score, information
