"""Two hazard ratios that a log-rank test gives without a model: Peto's one-step and Pike's."""

from __future__ import annotations

import math

from app.errors import NotEstimable
from app.model.survival import LogrankResult, RatioEstimate
from app.survival.intervals import two_sided_quantile


def peto_one_step(result: LogrankResult, *, level: float = 0.95) -> RatioEstimate:
    """The hazard ratio exp((O - E) / V), experimental / control, from a log-rank test.

    Notes
    -----
    *Convention*: the standard error of its log is 1 / sqrt(V). It is one Newton step from a ratio of 1 and
    differs from Cox's estimate when the ratio is far from 1 or the arms are of unequal size.
    *Checked*: print (app/validation).

    References
    ----------
    Peto et al. (1977), British Journal of Cancer 35, 1-39. Yusuf et al. (1985), Progress in Cardiovascular
    Diseases 27, 335-371.
    """
    log_ratio = (result.observed - result.expected) / result.variance
    return _ratio("Peto one-step", log_ratio, 1.0 / math.sqrt(result.variance), level)


def pike_ratio(result: LogrankResult, *, level: float = 0.95) -> RatioEstimate:
    """The ratio of observed to expected events, experimental / control, from a log-rank test.

    Raises
    ------
    NotEstimable : an arm has no event, so that the ratio is 0 or infinite.

    Notes
    -----
    *Convention*: the standard error of its log is sqrt(1/E1 + 1/E0). It lies nearer to 1 than Cox's estimate.
    *Checked*: print (app/validation).

    References
    ----------
    Pike (1972), discussion of Peto & Peto, JRSS A 135, 201-203. Berry, Kitchin & Mock (1991), Statistics in
    Medicine 10, 749-755.
    """
    events = sum(stratum.events for stratum in result.strata)
    observed = result.observed, events - result.observed
    expected = result.expected, events - result.expected
    if min(observed) == 0.0:
        raise NotEstimable("no event in one of the arms")
    log_ratio = math.log(observed[0] / expected[0]) - math.log(observed[1] / expected[1])
    return _ratio("Pike", log_ratio, math.hypot(*(1.0 / math.sqrt(one) for one in expected)), level)


def _ratio(name: str, log_ratio: float, std_error: float, level: float) -> RatioEstimate:
    half = two_sided_quantile(level) * std_error
    return RatioEstimate(
        name=name,
        log_hazard_ratio=log_ratio,
        std_error=std_error,
        hazard_ratio=math.exp(log_ratio),
        ci_low=math.exp(log_ratio - half),
        ci_high=math.exp(log_ratio + half),
        level=level,
    )
