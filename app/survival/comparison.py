"""Two arms compared by the log-rank score."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr

from app.errors import NotEstimable
from app.model.survival import LogrankResult, LogrankSteps, LogrankStratum
from app.survival.checked import checked_flags
from app.survival.risk_table import EventTable, RiskTable, event_table, risk_table

CONTROL, EXPERIMENTAL = 0, 1

Direction = Literal[1, -1]


def two_arm_table(
    time: ArrayLike, event: ArrayLike, experimental: ArrayLike, stratum: ArrayLike | None = None
) -> RiskTable:
    """The risk table of two arms, row 0 control and row 1 experimental; domains as in `logrank`."""
    arm = checked_flags(experimental, "experimental", np.size(time))
    return risk_table(time, event, arm, stratum)


def two_arm_events(
    time: ArrayLike, event: ArrayLike, experimental: ArrayLike, stratum: ArrayLike | None = None
) -> EventTable:
    """`two_arm_table(...).at_events()`, made without the times of censorings: all that the tests read."""
    arm = checked_flags(experimental, "experimental", np.size(time))
    return event_table(time, event, arm, stratum)


def logrank(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    direction: Direction = 1,
) -> LogrankResult:
    """Compare two arms by the log-rank score, summed over strata.

    Parameters
    ----------
    time : float array, shape (n,), finite, >= 0, in any one unit
    event : bool array, shape (n,); True = event at `time`, False = censored there
    experimental : bool array, shape (n,); False = control
    stratum : int array, shape (n,), codes from 0, optional; default is one stratum
    direction : 1 when the event is bad, -1 when it is good

    Returns
    -------
    LogrankResult
        observed and expected [events in the experimental arm], variance [events squared], z [1], and the same
        per stratum that holds a subject, in the order of the codes.

    Raises
    ------
    ValueError : an argument breaks a domain above - a bug in the caller.
    NotEstimable : the variance is 0, as no event tells the arms apart - a fact about the data.

    Notes
    -----
    *Convention*: z = direction (expected - observed) / sqrt(variance), so z > 0 favours the experimental arm;
    at one time events precede censorings; hypergeometric variance; a stratum in which no event fell while
    both arms were at risk adds nothing to expected - observed nor to the variance. p_one_sided = P(Z >= z),
    p_two_sided = P(|Z| >= |z|), Z standard normal.
    *Accuracy*: sums of at most n rational terms; relative error below 1e-12 for n <= 1e6.
    *Checked*: by hand (tests/byhand), print (app/validation/survival_rows.py), a literal version
    (tests/naive.py), properties.

    References
    ----------
    Mantel (1966), Cancer Chemotherapy Reports 50, 163-170. Peto & Peto (1972), JRSS A 135, 185-207. Strata:
    Mantel & Haenszel (1959), JNCI 22, 719-748.

    Examples
    --------
    >>> result = logrank([1, 2, 3, 4], [True] * 4, [False, False, True, True])
    >>> result.observed, round(result.expected, 6), round(result.variance, 6)
    (2.0, 3.166667, 0.472222)
    >>> result.z > 0
    True
    """
    return logrank_of(two_arm_events(time, event, experimental, stratum), direction=direction)


def logrank_of(table: RiskTable | EventTable, *, direction: Direction = 1) -> LogrankResult:
    """The log-rank test from a two-arm table already made; see `logrank`."""
    strata = tuple(_stratum_scores(table.at_events()))
    observed = math.fsum(part.observed for part in strata)
    expected = math.fsum(part.expected for part in strata)
    variance = math.fsum(part.variance for part in strata)
    if variance == 0.0:
        raise NotEstimable(reason_arms_not_told_apart(table))
    z = signed_z(observed - expected, variance, direction)
    return LogrankResult(
        observed=observed,
        expected=expected,
        variance=variance,
        z=z,
        chi_square=(observed - expected) ** 2 / variance,
        p_one_sided=float(ndtr(-z)),  # not 1 - ndtr(z), which is 0 from z = 8.3 on
        p_two_sided=float(2.0 * ndtr(-abs(z))),
        strata=strata,
    )


def signed_z(score: float, variance: float, direction: Direction) -> float:
    """z of observed - expected events: positive favours the experimental arm."""
    if direction not in (1, -1):
        raise ValueError(f"direction is {direction!r}; accepted: 1 or -1")
    return direction * -score / math.sqrt(variance) + 0.0  # + 0.0 so that no -0.0 is shown


def reason_arms_not_told_apart(table: RiskTable | EventTable) -> str:
    """Why nothing in these data compares the arms, in words."""
    at_events = table.at_events()
    if not at_events.subjects.any():
        return "no subjects"
    if not at_events.subjects.any(axis=1).all():
        return "all subjects are in one arm"
    if not at_events.time.size:
        return "no event was observed"
    return "no event fell while both arms were at risk and would leave someone at risk"


def logrank_steps(table: RiskTable | EventTable) -> LogrankSteps:
    """What each event time adds to the log-rank test, experimental arm, stratum by stratum.

    Sums over any of its columns are observed, expected and variance of those times; see `logrank`.

    Examples
    --------
    >>> steps = logrank_steps(two_arm_table([1, 2, 3, 4], [True] * 4, [False, False, True, True]))
    >>> steps.observed.tolist(), steps.expected.round(3).tolist(), steps.variance.round(3).tolist()
    ([0, 0, 1, 1], [0.5, 0.667, 1.0, 1.0], [0.25, 0.222, 0.0, 0.0])
    """
    at_events = table.at_events()
    n, d = at_events.at_risk_in_all, at_events.events_in_all
    expected = at_events.at_risk[EXPERIMENTAL] / n
    share_of_control = at_events.at_risk[CONTROL] / n  # 1 - share would lose digits where few are in control
    expected *= d
    # Mantel (1966): hypergeometric; someone alone at risk has a share of 1 or 0, hence variance 0
    variance = np.multiply(expected, share_of_control, out=share_of_control)
    tied = np.flatnonzero(d > 1)
    variance[tied] *= (n[tied] - d[tied]) / (n[tied] - 1)
    return LogrankSteps(
        stratum=at_events.stratum,
        time=at_events.time,
        observed=at_events.events[EXPERIMENTAL],
        expected=expected,
        variance=variance,
    )


def _stratum_scores(table: EventTable) -> Iterator[LogrankStratum]:
    """Observed, expected and variance of each stratum, from its event times."""
    steps = logrank_steps(table)
    for index, span in enumerate(table.spans()):
        yield LogrankStratum(
            stratum=int(table.strata[index]),
            subjects=int(table.subjects[:, index].sum()),
            events=int(table.events[:, span].sum()),
            observed=float(steps.observed[span].sum()),
            expected=float(steps.expected[span].sum()),
            variance=float(steps.variance[span].sum()),
        )
