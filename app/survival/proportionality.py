"""Is the hazard ratio the same at all times? The score test, and the residuals behind it."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np
from numpy.typing import ArrayLike

from app.errors import NotEstimable
from app.model.survival import (
    ProportionalityResult,
    ProportionalityTests,
    RatioOverTime,
    ScaledResiduals,
    SmoothCurve,
)
from app.model.values import Absent, Floats, read_only
from app.survival.chi_square import chi_square_test
from app.survival.comparison import EXPERIMENTAL, two_arm_events
from app.survival.cox import maximise, two_arm_likelihood
from app.survival.cox_data import CoxSubjects, cox_subjects
from app.survival.cox_moments import CoxMoments, cox_moments
from app.survival.cox_regression import cox_regression
from app.survival.intervals import two_sided_quantile
from app.survival.natural_spline import knots_of, natural_spline
from app.survival.time_scales import event_times_on_scale

SMOOTH_DEGREES = 4
SMOOTH_POINTS = 40
RANK_TOLERANCE = 1e-12
LARGEST_EXPONENT = 700.0  # the largest double is exp(709.8)

ONE_TIME = "all events that tell the arms apart fell at one time, so nothing can change with time"


def proportionality(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    transform: str = "km",
) -> ProportionalityResult:
    """Test whether the hazard ratio of two arms changes with time.

    Parameters
    ----------
    time, event, experimental, stratum, ties : as in `cox_two_arms`
    transform : "identity", "log", "rank" or "km": the scale g of time on which a change would be a line

    Returns
    -------
    ProportionalityResult
        score [events x scale of g], chi-square on 1 degree of freedom, p, transform.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.
    NotEstimable : there is no finite hazard ratio, the events that tell the arms apart fall at one time, or
    an
        event at time 0 has no logarithm.

    Notes
    -----
    *Convention*: the score test of theta = 0 in exp((beta + theta g(t)) x) with beta estimated: the score is
    the sum over events of g (observed - expected), its information that of theta less what beta takes of it.
    An older form, from the correlation of scaled residuals with g, puts one average information for all times
    and gives other numbers. "km" is 1 - the Kaplan-Meier curve of all subjects just before t, "rank" the mean
    rank among all times. A positive score says that the hazard ratio grows with time.
    *Power*: low with few events. That no change is seen does not say that there is none.
    *Accuracy*: closed given the hazard ratio, which is found as in `cox_two_arms`; relative error below 1e-8.
    *Checked*: print (app/validation), R (tests/reference), a literal version (tests/naive.py), properties.

    References
    ----------
    Grambsch & Therneau (1994), Biometrika 81, 515-526. Schoenfeld (1982), Biometrika 69, 239-241.
    """
    table = two_arm_events(time, event, experimental, stratum)
    likelihood = two_arm_likelihood(table, ties)
    log_ratio, information = maximise(likelihood)
    expected, variance = likelihood.expected_and_variance(log_ratio)
    g = event_times_on_scale(table.time, time, event, transform)
    g = g - float(np.sum(g * variance)) / information  # centred, theta's information is what beta leaves
    score = float(np.sum(g * (table.events[EXPERIMENTAL] - expected)))
    left = float(np.sum(g * g * variance))
    if left <= RANK_TOLERANCE * information * float(np.max(np.abs(g))) ** 2:
        raise NotEstimable(ONE_TIME)
    test = chi_square_test(score * score / left, 1)
    return ProportionalityResult(score, test.chi_square, test.p, transform, ties)


def proportionality_tests(
    time: ArrayLike,
    event: ArrayLike,
    covariates: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    transform: str = "km",
) -> ProportionalityTests:
    """Test each covariate of a Cox model, and all together, for a coefficient that changes with time.

    Parameters, errors and method as in `proportionality`; covariates as in `cox_regression`.
    """
    fitted = _Fitted.of(time, event, covariates, stratum, ties, transform)
    p = fitted.coefficients.size
    score, crossed, squared = np.zeros(p), np.zeros((p, p)), np.zeros((p, p))
    information = np.zeros((p, p))
    for columns, moments, totals in fitted.moments():
        g = fitted.g[columns]
        score += (g[:, None] * (totals - moments.mean)).sum(axis=0)
        information += moments.variance.sum(axis=0)
        crossed += (g[:, None, None] * moments.variance).sum(axis=0)
        squared += (g[:, None, None] ** 2 * moments.variance).sum(axis=0)
    left = squared - crossed @ np.linalg.solve(information, crossed)
    scale = np.sqrt(np.diag(squared) + np.diag(information) * np.max(np.abs(fitted.g)) ** 2)
    if np.linalg.eigvalsh(left / np.outer(scale, scale))[0] <= RANK_TOLERANCE:
        raise NotEstimable("the events fell at too few times to tell how each coefficient changes")
    return ProportionalityTests(
        covariates=tuple(
            chi_square_test(one * one / value, 1) for one, value in zip(score, np.diag(left), strict=True)
        ),
        together=chi_square_test(float(score @ np.linalg.solve(left, score)), p),
        transform=transform,
        ties=ties,
    )


def scaled_residuals(
    time: ArrayLike,
    event: ArrayLike,
    covariates: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    transform: str = "km",
) -> ScaledResiduals:
    """Each event's estimate of the coefficients at its time, and a smooth curve through them.

    Parameters
    ----------
    time, event, covariates, stratum, ties : as in `cox_regression`; of two arms, `experimental` as covariate
    transform : as in `proportionality`

    Returns
    -------
    ScaledResiduals
        a row per event, shape (d,): time, time on its scale, residuals (d, p); a smooth curve per covariate,
        or why there is none.

    Raises
    ------
    ValueError, NotEstimable : as in `proportionality`.

    Notes
    -----
    *Convention*: coefficient + d V r, with r the event's covariates less their mean among those at risk (with
    ties, the mean over the tied events' denominators), V the covariance of the coefficients. The smooth is a
    natural cubic spline with 4 coefficients over the scale of time; its standard error takes d V for the
    variance of a residual.
    *Accuracy*: residuals to 1e-7, the smooth and its standard error to 1e-6, relative.
    *Checked*: R (tests/reference).

    References
    ----------
    Schoenfeld (1982), Biometrika 69, 239-241. Grambsch & Therneau (1994), Biometrika 81, 515-526.
    """
    fitted = _Fitted.of(time, event, covariates, stratum, ties, transform)
    subjects, p = fitted.subjects, fitted.coefficients.size
    expected, information = np.empty((subjects.starts.size, p)), np.zeros((p, p))
    for columns, moments, _ in fitted.moments():
        expected[columns] = moments.mean / subjects.n_events[columns, None]
        information += moments.variance.sum(axis=0)
    covariance = np.linalg.inv(information)
    column = np.repeat(np.arange(subjects.starts.size), subjects.n_events)
    raw = subjects.covariates[subjects.event_rows] - expected[column]
    residuals = fitted.coefficients + subjects.events * raw @ covariance
    order = np.argsort(subjects.time[column], kind="stable")
    event_times, on_scale = subjects.time[column][order], fitted.g[column][order]
    return ScaledResiduals(
        time=read_only(event_times, np.float64),
        on_scale=read_only(on_scale, np.float64),
        residuals=read_only(residuals[order], np.float64),
        coefficients=read_only(fitted.coefficients, np.float64),
        smooth=tuple(
            _smooth(event_times, on_scale, residuals[order, k], subjects.events * covariance[k, k])
            for k in range(p)
        ),
        transform=transform,
    )


def hazard_ratio_over_time(residuals: ScaledResiduals, *, level: float = 0.95) -> RatioOverTime:
    """Read the smooth of two arms' scaled residuals as a hazard ratio over time.

    Parameters
    ----------
    residuals : as `scaled_residuals` of `experimental` gives them
    level : confidence level of the limits at each time by itself, between 0 and 1

    Returns
    -------
    RatioOverTime
        time, events up to it, the smooth with its standard error, ratio and limits, shape (k,).

    Raises
    ------
    ValueError : level outside (0, 1) - a bug in the caller.
    NotEstimable : the events lie at too few times for a smooth, or its limits are wider than numbers go.

    Notes
    -----
    *Convention*: ratios are experimental / control. The limits are exp(smooth -+ z standard errors),
    pointwise. The curve describes; it tests nothing, and its ends rest on few events.
    *Accuracy*: ratios and limits to 1e-5, relative, as their logarithms are those of the smooth.
    *Checked*: R (tests/reference: the smooth and its standard error), by hand (tests/unit/survival).

    References
    ----------
    Grambsch & Therneau (1994), Biometrika 81, 515-526.
    """
    (smooth,) = residuals.smooth
    if isinstance(smooth, Absent):
        raise NotEstimable(smooth.reason)
    reach = two_sided_quantile(level) * smooth.std_error
    if float(np.max(np.abs(smooth.value) + reach)) > LARGEST_EXPONENT:
        raise NotEstimable("the limits of the smooth curve are wider than numbers go")
    return RatioOverTime(
        time=smooth.time,
        events=read_only(np.searchsorted(residuals.time, smooth.time, side="right"), np.int64),
        log_hazard_ratio=smooth.value,
        std_error=smooth.std_error,
        hazard_ratio=read_only(np.exp(smooth.value), np.float64),
        ci_low=read_only(np.exp(smooth.value - reach), np.float64),
        ci_high=read_only(np.exp(smooth.value + reach), np.float64),
        level=level,
    )


class _Fitted:
    """A Cox model at its estimate, with the event times on their scale."""

    def __init__(self, subjects: CoxSubjects, coefficients: Floats, g: Floats, ties: str) -> None:
        self.subjects, self.coefficients, self.g, self.ties = subjects, coefficients, g, ties

    @classmethod
    def of(
        cls,
        time: ArrayLike,
        event: ArrayLike,
        covariates: ArrayLike,
        stratum: ArrayLike | None,
        ties: str,
        transform: str,
    ) -> _Fitted:
        estimate = cox_regression(time, event, covariates, stratum=stratum, ties=ties).estimate
        if isinstance(estimate, Absent):
            raise NotEstimable(estimate.reason)
        subjects = cox_subjects(time, event, covariates, stratum)
        g = event_times_on_scale(subjects.time, time, event, transform)
        return cls(subjects, estimate.coefficients, g, ties)

    def moments(self) -> Iterator[tuple[slice, CoxMoments, Floats]]:
        """Block by block: its columns, their moments, and the covariate totals of their events."""
        subjects = self.subjects
        for block, moments in cox_moments(subjects, self.coefficients, self.ties):
            first = subjects.first_events(block.columns)
            end = first[-1] + subjects.n_events[block.columns.stop - 1]
            of_events = subjects.covariates[subjects.event_rows[first[0] : end]]
            yield block.columns, moments, np.add.reduceat(of_events, first - first[0], axis=0)


def _smooth(
    event_times: Floats, on_scale: Floats, residuals: Floats, variance: float
) -> SmoothCurve | Absent:
    """The spline at equal steps of the scale, with the standard error of its height."""
    places, first = np.unique(on_scale, return_index=True)
    too_few = places.size < SMOOTH_DEGREES + 1
    if too_few or np.unique(knots_of(on_scale, SMOOTH_DEGREES)).size < SMOOTH_DEGREES:
        return Absent(f"a smooth curve needs events spread over {SMOOTH_DEGREES + 1} times or more")
    at = np.linspace(on_scale.min(), on_scale.max(), SMOOTH_POINTS)
    value, error = natural_spline(on_scale, residuals, at, SMOOTH_DEGREES)
    return SmoothCurve(
        time=read_only(np.interp(at, places, event_times[first]), np.float64),
        on_scale=read_only(at, np.float64),
        value=read_only(value, np.float64),
        std_error=read_only(error * np.sqrt(variance), np.float64),
    )
