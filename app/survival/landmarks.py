"""Two arms compared by their survival at one time."""

from __future__ import annotations

import math

from scipy.special import ndtr

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
        both arms, difference [1] with standard error and limits, and a test on each scale; what does not
        exist, as where a curve is not known at this time, is the reason why.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.

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
    z = two_sided_quantile(level)
    arms = landmark(control, at), landmark(experimental, at)
    error = _error(arms)
    difference = _difference(arms)
    low, high = _limits(difference, error, z)
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


Arms = tuple[Landmark, Landmark]


def _difference(arms: Arms) -> Estimate:
    control, experimental = (arm.survival for arm in arms)
    if isinstance(control, Absent):
        return control
    return experimental if isinstance(experimental, Absent) else experimental - control


def _limits(difference: Estimate, error: Estimate, z: float) -> tuple[Estimate, Estimate]:
    if isinstance(difference, Absent) or isinstance(error, Absent):
        missing = difference if isinstance(difference, Absent) else error
        return missing, missing
    return max(-1.0, difference - z * error), min(1.0, difference + z * error)


def _error(arms: Arms) -> Estimate:
    """Greenwood's variances added; none where an arm has none, or where both are at 1."""
    errors = []
    for arm in arms:
        if isinstance(arm.std_error, Absent):
            return arm.std_error
        errors.append(arm.std_error)
    return math.hypot(*errors) or Absent("not estimable: no event fell before this time")


def _test(scale: str, arms: Arms, error: Estimate) -> LandmarkTest:
    """The difference of the transformed shares against its standard error by the delta method."""
    if isinstance(error, Absent):
        return LandmarkTest(scale, error, error)
    pairs = [
        (arm.survival, arm.std_error)
        for arm in arms
        if not isinstance(arm.survival, Absent) and not isinstance(arm.std_error, Absent)
    ]
    if scale != "plain" and any(share == 1.0 for share, _ in pairs):
        at_one = Absent("not estimable on this scale: no event fell before this time in one arm")
        return LandmarkTest(scale, at_one, at_one)
    variance = math.fsum((SCALES[scale].slope(share) * one) ** 2 for share, one in pairs)
    control, experimental = (SCALES[scale].value(share) for share, _ in pairs)
    chi_square = (experimental - control) ** 2 / variance
    return LandmarkTest(scale, chi_square, float(2.0 * ndtr(-math.sqrt(chi_square))))
