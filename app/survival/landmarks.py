"""Two arms compared by their survival at one time."""

from __future__ import annotations

import math

from scipy.special import ndtr

from app.errors import NotEstimable
from app.model.survival import Landmark, LandmarkComparison, LandmarkTest, SurvivalCurve
from app.model.values import Absent, Estimate
from app.survival.intervals import SCALES, two_sided_quantile
from app.survival.readings import landmark


def compare_landmarks(
    control: SurvivalCurve, experimental: SurvivalCurve, at: float, *, level: float = 0.95
) -> LandmarkComparison:
    """Compare survival at a time fixed in advance, experimental - control.

    Parameters
    ----------
    control, experimental : curves of `kaplan_meier`
    at : finite, >= 0 [unit of the curves' time]
    level : confidence level of the interval of the difference, between 0 and 1

    Returns
    -------
    LandmarkComparison
        both arms, difference [1] with standard error and limits, and a test on each scale.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.
    NotEstimable : one of the curves is not known at this time.

    Notes
    -----
    *Convention*: the difference is positive when more are event-free in the experimental arm. Its interval is
    difference +- z standard error, cut at -1 and 1, with Greenwood's variances added. The tests compare
    g(S) for g = identity, log, log(-log), logit and arcsin sqrt; in small samples the log(-log) test keeps
    its level best. Where an arm is at 0 no variance exists, and where an arm is at 1 only the identity has
    one. *Accuracy*: that of the curves.
    *Checked*: print (app/validation), R (tests/reference), a literal version (tests/naive.py).

    References
    ----------
    Klein, Logan, Harhoff & Andersen (2007), Statistics in Medicine 26, 4505-4519.

    Examples
    --------
    >>> from app.survival import kaplan_meier
    >>> one = kaplan_meier([1, 2, 3, 4], [True, False, True, True])
    >>> other = kaplan_meier([2, 3, 5, 6], [True, True, True, True])
    >>> compare_landmarks(one, other, 3).difference
    0.125
    """
    arms = landmark(control, at), landmark(experimental, at)
    shares = [_known(arm) for arm in arms]
    difference = shares[1] - shares[0]
    error = _error(arms)
    low, high = _limits(difference, error, level)
    return LandmarkComparison(
        at=at,
        control=arms[0],
        experimental=arms[1],
        difference=difference,
        std_error=error,
        ci_low=low,
        ci_high=high,
        level=level,
        tests=tuple(_test(scale, arms, error) for scale in SCALES),
    )


def _limits(difference: float, error: Estimate, level: float) -> tuple[Estimate, Estimate]:
    if isinstance(error, Absent):
        return error, error
    half = two_sided_quantile(level) * error
    return max(-1.0, difference - half), min(1.0, difference + half)


def _known(arm: Landmark) -> float:
    if isinstance(arm.survival, Absent):
        raise NotEstimable(arm.survival.reason)
    return arm.survival


def _error(arms: tuple[Landmark, Landmark]) -> Estimate:
    """Greenwood's variances added; none where an arm has none, or where both are at 1."""
    squares = 0.0
    for arm in arms:
        if isinstance(arm.std_error, Absent):
            return arm.std_error
        squares += arm.std_error**2
    return math.sqrt(squares) if squares else Absent("not estimable: no event fell before this time")


def _test(scale: str, arms: tuple[Landmark, Landmark], error: Estimate) -> LandmarkTest:
    """The difference of the transformed shares against its standard error by the delta method."""
    if isinstance(error, Absent):
        return LandmarkTest(scale, error, error)
    shares = [_known(arm) for arm in arms]
    if scale != "plain" and 1.0 in shares:
        at_one = Absent("not estimable on this scale: no event fell before this time in one arm")
        return LandmarkTest(scale, at_one, at_one)
    slopes = [SCALES[scale].slope(share) for share in shares]
    errors = [0.0 if isinstance(arm.std_error, Absent) else arm.std_error for arm in arms]
    variance = math.fsum((slope * one) ** 2 for slope, one in zip(slopes, errors, strict=True))
    distance = SCALES[scale].value(shares[1]) - SCALES[scale].value(shares[0])
    chi_square = distance**2 / variance
    return LandmarkTest(scale, chi_square, float(2.0 * ndtr(-math.sqrt(chi_square))))
