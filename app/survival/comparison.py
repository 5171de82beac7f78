"""Two arms compared by the log-rank score."""

from __future__ import annotations

import math
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import ndtr

from app.errors import NotEstimable
from app.model.survival import LogrankResult, LogrankStratum
from app.survival.risk_table import RiskTable, checked_flags, risk_table

CONTROL, EXPERIMENTAL = 0, 1

Direction = Literal[1, -1]


def two_arm_table(
    time: ArrayLike, event: ArrayLike, experimental: ArrayLike, stratum: ArrayLike | None = None
) -> RiskTable:
    """The risk table of two arms, row 0 control and row 1 experimental; domains as in `logrank`."""
    arm = checked_flags(experimental, "experimental", np.size(time))
    return risk_table(time, event, arm, stratum)


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
    return logrank_of(two_arm_table(time, event, experimental, stratum), direction=direction)


def logrank_of(table: RiskTable, *, direction: Direction = 1) -> LogrankResult:
    """The log-rank test from a two-arm table already made; see `logrank`."""
    if direction not in (1, -1):
        raise ValueError(f"direction is {direction!r}; accepted: 1 or -1")
    strata = tuple(_stratum_score(part) for part in table.strata())
    observed = math.fsum(part.observed for part in strata)
    expected = math.fsum(part.expected for part in strata)
    variance = math.fsum(part.variance for part in strata)
    if variance == 0.0:
        raise NotEstimable(reason_arms_not_told_apart(table))
    z = direction * (expected - observed) / math.sqrt(variance) + 0.0  # + 0.0 so that no -0.0 is shown
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


def reason_arms_not_told_apart(table: RiskTable) -> str:
    """Why nothing in these data compares the arms, in words."""
    if not table.subjects:
        return "no subjects"
    if not table.at_risk.any(axis=1).all():
        return "all subjects are in one arm"
    if not table.events.any():
        return "no event was observed"
    return "no event fell while both arms were at risk and would leave someone at risk"


def _stratum_score(table: RiskTable) -> LogrankStratum:
    """Observed, expected and variance of one stratum, from its event times."""
    at_events = table.with_events()
    n, d = at_events.at_risk.sum(axis=0), at_events.events.sum(axis=0)
    share, share_of_control = at_events.at_risk[EXPERIMENTAL] / n, at_events.at_risk[CONTROL] / n
    # Mantel (1966): hypergeometric; someone alone at risk has a share of 1 or 0, hence variance 0
    variance = d * share * share_of_control * ((n - d) / np.maximum(n - 1, 1))
    return LogrankStratum(
        stratum=int(table.stratum[0]),
        subjects=table.subjects,
        events=int(d.sum()),
        observed=float(at_events.events[EXPERIMENTAL].sum()),
        expected=float(np.sum(d * share)),
        variance=float(np.sum(variance)),
    )
