"""Cox's proportional-hazards model with covariates."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from app.errors import AccuracyNotReached, NotEstimable
from app.model.survival import BaselineHazard, ChiSquareTest, CoxEstimate, CoxModel
from app.model.values import Absent, Floats, read_only
from app.survival.checked import checked_choice
from app.survival.chi_square import chi_square_test
from app.survival.cox_data import CoxSubjects, cox_subjects
from app.survival.cox_moments import RiskSums, cox_moments, linear_predictor
from app.survival.intervals import two_sided_quantile
from app.survival.tied_sums import tied_sums

TIES = ("Efron", "Breslow", "exact")
MOST_STEPS = 50
MOST_HALVINGS = 30
STEP_TOLERANCE = 1e-9  # of a coefficient times the standard deviation of its covariate
RANK_TOLERANCE = 1e-11
SEPARATION_AFTER = 20  # steps after which a likelihood that still rises is looked at
SEPARATION_TOLERANCE = 1e-5


def cox_regression(
    time: ArrayLike,
    event: ArrayLike,
    covariates: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    level: float = 0.95,
) -> CoxModel:
    """Estimate the log hazard ratio per unit of each covariate by partial likelihood.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    covariates : float array, shape (n, p), finite; shape (n,) is one covariate
    stratum : int array, shape (n,), codes from 0, optional; each stratum has a baseline hazard of its own
    ties : "Efron", "Breslow" or "exact"
    level : confidence level of the intervals, between 0 and 1

    Returns
    -------
    CoxModel
        the estimate, shape (p,), with its covariance, or the reason there is none; log partial likelihood at
        0 and at the estimate; likelihood-ratio, score and Wald tests of all coefficients at 0.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : no event, a covariate that is constant or follows from the others among those at risk, or
        exact ties beyond the stated size - facts about the data.
    AccuracyNotReached : the iteration ran out of steps although an estimate may exist.

    Notes
    -----
    *Convention*: at one time events precede censorings. Where the likelihood keeps rising in some direction
    no finite estimate exists; the model says so and keeps the likelihood-ratio test (at the limit) and the
    score test.
    *Accuracy*: Newton's method on centred covariates, steps halved until the likelihood does not fall,
    stopped when no step exceeds 1e-9 standard deviations of its covariate; the next error is of the order of
    its square. A likelihood still rising after 20 steps is looked at: when every event has, up to 1e-5 of
    the range along the last step, the largest value among those at risk with it, there is no maximum.
    *Checked*: by hand (tests/byhand), print (app/validation), R and libraries (tests/reference), a literal
    version (tests/naive.py), `cox_two_arms`, properties.

    References
    ----------
    Cox (1972), JRSS B 34, 187-220. Efron (1977), JASA 72, 557-565. Breslow (1974), Biometrics 30, 89-99.
    Kalbfleisch & Prentice (1973), Biometrika 60, 267-278.

    Examples
    --------
    >>> model = cox_regression([1, 2, 3, 4], [True] * 4, [0, 1, 0, 1])
    >>> round(float(np.exp(model.estimate.coefficients[0])), 6)
    0.390388
    """
    checked_choice(ties, "ties", TIES)
    z = two_sided_quantile(level)
    subjects = cox_subjects(time, event, covariates, stratum)
    if not subjects.starts.size:
        raise NotEstimable("no event was observed" if subjects.size else "no subjects")
    start = Likelihood.at(subjects, np.zeros(subjects.n_covariates), ties)
    _require_independent(start)
    end, reason = _maximise(start)
    score = _chi_square(float(start.score @ np.linalg.solve(start.information, start.score)), start)
    return CoxModel(
        estimate=Absent(reason) if reason else _estimate(end, z, level),
        log_likelihood_at_zero=start.log_likelihood,
        log_likelihood=end.log_likelihood,
        likelihood_ratio=_chi_square(max(0.0, 2.0 * (end.log_likelihood - start.log_likelihood)), start),
        score=score,
        wald=Absent(reason) if reason else _wald(end),
        ties=ties,
        events=int(subjects.n_events.sum()),
    )


@dataclass(frozen=True, eq=False)
class Likelihood:
    """The log partial likelihood at some coefficients, its gradient, (p,), and information, (p, p)."""

    subjects: CoxSubjects
    ties: str
    coefficients: Floats
    log_likelihood: float
    score: Floats
    information: Floats

    @classmethod
    def at(cls, subjects: CoxSubjects, coefficients: Floats, ties: str) -> Likelihood:
        of_events = subjects.covariates[subjects.event_rows].sum(axis=0)
        log_likelihood, score = float(np.sum(of_events * coefficients)), of_events
        information = np.zeros((coefficients.size, coefficients.size))
        for _, moments in cox_moments(subjects, coefficients, ties):
            log_likelihood -= float(moments.log_denominator.sum())
            score = score - moments.mean.sum(axis=0)
            information += moments.variance.sum(axis=0)
        return cls(subjects, ties, coefficients, log_likelihood, score, information)


def _require_independent(start: Likelihood) -> None:
    """Refuse covariates whose coefficients the likelihood cannot tell apart."""
    variance = np.diag(start.information)
    spread = start.subjects.events * start.subjects.covariates.var(axis=0)
    constant = np.flatnonzero(variance <= RANK_TOLERANCE * spread)
    if constant.size:
        raise NotEstimable(
            f"covariate {constant[0]} is the same for all who are at risk together at any event"
        )
    scale = np.sqrt(variance)
    values = np.linalg.eigvalsh(start.information / np.outer(scale, scale))
    if values[0] < RANK_TOLERANCE * len(values):
        raise NotEstimable("a covariate follows from the others among those at risk")


def _maximise(here: Likelihood) -> tuple[Likelihood, str]:
    """The likelihood at its maximum; or as far as it rose, with the reason why there is none."""
    spread = here.subjects.covariates.std(axis=0)
    for number in range(MOST_STEPS):
        step = _newton_step(here)
        if np.max(np.abs(step) * spread) <= STEP_TOLERANCE:
            return _moved(here, step), ""
        if number >= SEPARATION_AFTER and _is_separated(here.subjects, step):
            return here, _no_finite_estimate(step, spread)
        here = _risen(here, step)
    raise AccuracyNotReached(
        "the coefficients were not found",
        found=f"a last step of {np.max(np.abs(step) * spread):.1e} deviations after {MOST_STEPS} steps",
        accepted=f"a step of at most {STEP_TOLERANCE}",
    )


def _newton_step(here: Likelihood) -> Floats:
    """The step in coefficients; by the generalised inverse once the information has all but vanished."""
    return np.asarray(np.linalg.lstsq(here.information, here.score, rcond=1e-15)[0], dtype=np.float64)


def _moved(here: Likelihood, step: Floats) -> Likelihood:
    return Likelihood.at(here.subjects, here.coefficients + step, here.ties)


def _risen(here: Likelihood, step: Floats) -> Likelihood:
    """Go the step, or the first half of it ... at which the likelihood does not fall."""
    for _ in range(MOST_HALVINGS):
        there = _moved(here, step)
        if there.log_likelihood >= here.log_likelihood - 1e-12 * abs(here.log_likelihood):
            break
        step = step / 2.0
    return there


def _is_separated(subjects: CoxSubjects, direction: Floats) -> bool:
    """Whether every event has the largest value along this direction among those at risk with it."""
    along = linear_predictor(subjects.covariates, direction)
    slack, later = SEPARATION_TOLERANCE * float(np.ptp(along)), -math.inf
    for block in subjects.blocks_from_the_end():
        first = subjects.starts[block.columns] - block.rows.start
        between = np.maximum.reduceat(along[block.rows], first)
        at_risk = np.maximum.accumulate(np.append(between, -math.inf if block.is_last else later)[::-1])[::-1]
        later = float(at_risk[0])
        events = np.repeat(at_risk[:-1], subjects.n_events[block.columns])
        rows = subjects.event_rows[subjects.first_events(block.columns)[0] :][: events.size]
        if np.any(along[rows] < events - slack):
            return False
    return True


def _no_finite_estimate(step: Floats, spread: Floats) -> str:
    moving = np.abs(step) * spread
    names = [f"{index}" for index in np.flatnonzero(moving > SEPARATION_TOLERANCE * moving.max())]
    which = f"covariate {names[0]}" if len(names) == 1 else f"covariates {', '.join(names)} together"
    return f"no finite estimate: the likelihood keeps rising with the coefficient of {which}"


def _estimate(end: Likelihood, z: float, level: float) -> CoxEstimate:
    covariance = np.linalg.inv(end.information)
    errors = np.sqrt(np.diag(covariance))
    return CoxEstimate(
        coefficients=read_only(end.coefficients, np.float64),
        std_errors=read_only(errors, np.float64),
        covariance=read_only(covariance, np.float64),
        ci_low=read_only(end.coefficients - z * errors, np.float64),
        ci_high=read_only(end.coefficients + z * errors, np.float64),
        level=level,
    )


def _wald(end: Likelihood) -> ChiSquareTest:
    return _chi_square(float(end.coefficients @ end.information @ end.coefficients), end)


def _chi_square(value: float, likelihood: Likelihood) -> ChiSquareTest:
    return chi_square_test(value, likelihood.coefficients.size)


def baseline_hazard(
    time: ArrayLike,
    event: ArrayLike,
    covariates: ArrayLike,
    coefficients: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
) -> BaselineHazard:
    """The cumulative hazard of a subject whose covariates are at their means, stratum by stratum.

    Parameters
    ----------
    time, event, covariates, stratum, ties : as in `cox_regression`
    coefficients : float array, shape (p,), the estimate of `cox_regression`

    Returns
    -------
    BaselineHazard
        a row per event time of each stratum, shape (m,).

    Notes
    -----
    *Convention*: at each event time the hazard grows by d / (sum of weights at risk) with Breslow's and exact
    ties, and by the sum over k < d of 1 / (sum of weights at risk - k/d of the events' weights) with Efron's.
    *Checked*: R (tests/reference), Nelson-Aalen where all coefficients are 0 (properties).

    References
    ----------
    Breslow (1972), discussion of Cox, JRSS B 34, 216-217. Efron (1977), JASA 72, 557-565.
    """
    checked_choice(ties, "ties", TIES)
    subjects = cox_subjects(time, event, covariates, stratum)
    given = np.asarray(coefficients, dtype=np.float64)
    if given.shape != (subjects.n_covariates,):
        raise ValueError(f"coefficients has shape {given.shape}; accepted: ({subjects.n_covariates},)")
    growth, sums = np.empty(subjects.starts.size), RiskSums(subjects, given)
    for block in subjects.blocks_from_the_end():
        _, total = sums.at_risk(block)
        d = subjects.n_events[block.columns].astype(np.float64)
        growth[block.columns] = d / total
        if ties == "Efron":
            _, of_events = sums.of_events(block)
            growth[block.columns] = tied_sums(np.maximum(d * total / of_events, d), d)[0] / total
    cumulative = np.empty(growth.size)
    for columns, _ in subjects.strata:
        cumulative[columns] = np.cumsum(growth[columns])
    return BaselineHazard(
        stratum=read_only(subjects.stratum, np.int64),
        time=read_only(subjects.time, np.float64),
        cumulative=read_only(cumulative * math.exp(-sums.log_scale), np.float64),
        at=read_only(subjects.means, np.float64),
    )
