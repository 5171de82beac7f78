"""Hazard ratios of two arms piece by piece: by period of time, and by subgroup with a test of interaction."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike

from app.errors import NotEstimable
from app.model.survival import (
    ChiSquareTest,
    CoxEstimate,
    CoxModel,
    CoxResult,
    InteractionResult,
    PeriodRatio,
)
from app.model.values import Absent
from app.survival.checked import checked_codes, checked_flags, checked_times
from app.survival.chi_square import chi_square_test
from app.survival.comparison import two_arm_events
from app.survival.cox import cox_two_arms, cox_two_arms_of
from app.survival.cox_regression import cox_regression
from app.survival.risk_table import EventTable


def period_ratios(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    *,
    cuts: Sequence[float],
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    level: float = 0.95,
) -> tuple[PeriodRatio, ...]:
    """The hazard ratio, experimental / control, in each period between cuts fixed in advance.

    Parameters
    ----------
    time, event, experimental, stratum, ties, level : as in `cox_two_arms`
    cuts : times > 0, increasing [unit of time]

    Returns
    -------
    tuple of PeriodRatio
        one more than there are cuts: from 0 to the first, ..., from the last on; each ratio or why there is
        none.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.

    Notes
    -----
    *Convention*: a period holds the events after its start up to and at its end. The partial likelihood is a
    product over event times, so the ratio of a period is that of its events, each among all then at risk. A
    ratio of a later period compares those who are left: not what randomisation made alike.
    *Checked*: R with split follow-up (tests/reference), properties.

    References
    ----------
    Anderson & Senthilselvan (1982), Applied Statistics 31, 44-51. Hernan (2010), Epidemiology 21, 13-15.
    """
    bounds = [0.0, *(float(cut) for cut in cuts), math.inf]
    if any(later <= earlier for earlier, later in pairwise(bounds)):
        raise ValueError(f"cuts is {list(cuts)!r}; accepted: increasing times > 0")
    table = two_arm_events(time, event, experimental, stratum)
    return tuple(_period(table, start, end, ties, level) for start, end in pairwise(bounds))


def _period(table: EventTable, start: float, end: float, ties: str, level: float) -> PeriodRatio:
    """An event at time 0 belongs to the first period."""
    inside = table.only(((table.time > start) | (start == 0.0)) & (table.time <= end))
    ratio = _ratio_or_reason(lambda: cox_two_arms_of(inside, ties=ties, level=level))
    return PeriodRatio(start, end, int(inside.events.sum()), ratio)


def _ratio_or_reason(estimate: Callable[[], CoxResult]) -> CoxResult | Absent:
    try:
        return estimate()
    except NotEstimable as reason:
        return Absent(reason.what)


def interaction(
    time: ArrayLike,
    event: ArrayLike,
    experimental: ArrayLike,
    subgroup: ArrayLike,
    *,
    stratum: ArrayLike | None = None,
    ties: str = "Efron",
    level: float = 0.95,
) -> InteractionResult:
    """The hazard ratio in each subgroup, and a test that it is the same in all.

    Parameters
    ----------
    time, event, experimental, stratum, ties, level : as in `cox_two_arms`
    subgroup : int array, shape (n,), codes from 0

    Returns
    -------
    InteractionResult
        a ratio per subgroup that holds a subject, or why there is none; likelihood-ratio and Wald tests of
        interaction on one less than the subgroups' degrees of freedom.

    Raises
    ------
    ValueError : an argument breaks a domain - a bug in the caller.
    NotEstimable : there are not two subgroups, or one of the two models cannot be estimated.

    Notes
    -----
    *Convention*: each subgroup's ratio is `cox_two_arms` of its subjects, stratified as the test is. The
    tests compare the model with subgroup, arm and arm within subgroup to that with subgroup and arm, both
    stratified as the test is. One test for all subgroups of a factor, not one for each.
    *Checked*: R (tests/reference).

    References
    ----------
    Pocock, Assmann, Enos & Kasten (2002), Statistics in Medicine 21, 2917-2930.
    """
    times = checked_times(time)
    events = checked_flags(event, "event", times.size)
    arm = checked_flags(experimental, "experimental", times.size)
    codes, _ = checked_codes(subgroup, "subgroup", times.size)
    present = np.unique(codes) if codes is not None else np.empty(0, dtype=np.int64)
    if codes is None or present.size < 2:
        raise NotEstimable("there are not two subgroups to compare")
    strata = None if stratum is None else np.asarray(stratum)

    def ratio(code: int) -> CoxResult | Absent:
        rows = np.flatnonzero(codes == code)
        inside = None if strata is None else strata[rows]
        return _ratio_or_reason(
            lambda: cox_two_arms(times[rows], events[rows], arm[rows], stratum=inside, ties=ties, level=level)
        )

    members = (codes[:, None] == present[1:]).astype(np.float64)
    alike = np.column_stack([arm, members])
    apart = np.column_stack([alike, members * arm[:, None]])
    smaller, larger = (
        cox_regression(times, events, columns, stratum=strata, ties=ties) for columns in (alike, apart)
    )
    return InteractionResult(
        subgroups=tuple(int(code) for code in present),
        ratios=tuple(ratio(int(code)) for code in present),
        likelihood_ratio=_rise(smaller, larger, present.size - 1),
        wald=_wald_of_last(larger.estimate, present.size - 1),
    )


def _rise(smaller: CoxModel, larger: CoxModel, degrees: int) -> ChiSquareTest:
    return chi_square_test(max(0.0, 2.0 * (larger.log_likelihood - smaller.log_likelihood)), degrees)


def _wald_of_last(estimate: CoxEstimate | Absent, degrees: int) -> ChiSquareTest | Absent:
    """All of the last coefficients at 0."""
    if isinstance(estimate, Absent):
        return estimate
    last = estimate.coefficients[-degrees:]
    covariance = estimate.covariance[-degrees:, -degrees:]
    return chi_square_test(float(last @ np.linalg.solve(covariance, last)), degrees)
