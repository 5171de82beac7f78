"""Six subjects, every intermediate in fractions.

control       2    3     5+
experimental  3    3+    6          (+ censored; the censoring at 3 is still at risk for the events at 3)

time   at risk (control, experimental)   events (control, experimental)
   2   6 (3, 3)                          1 (1, 0)
   3   5 (2, 3)                          2 (1, 1)
   5   2 (1, 1)                          0
   6   1 (0, 1)                          1 (0, 1)
"""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest

from app.model.values import Absent
from app.survival import (
    GEHAN_BRESLOW,
    PETO_PETO,
    cox_regression,
    cox_two_arms,
    cumulative_incidence,
    fleming_harrington,
    follow_up_median,
    groups_logrank,
    kaplan_meier,
    logrank,
    nelson_aalen,
    restricted_mean,
    trend_logrank,
    two_arm_table,
    weighted_logrank,
)
from tests import naive

TIME = [2.0, 3.0, 5.0, 3.0, 3.0, 6.0]
EVENT = [True, True, False, True, False, True]
EXPERIMENTAL = [False, False, False, True, True, True]
STRATUM = [0, 1, 0, 0, 1, 1]

EXACT = {"rel": 1e-14, "abs": 1e-15}


def exactly(*values: Fraction) -> object:
    return pytest.approx([float(value) for value in values], **EXACT)


def arm(experimental: bool) -> tuple[list[float], list[bool]]:
    chosen = [i for i in range(6) if EXPERIMENTAL[i] is experimental]
    return [TIME[i] for i in chosen], [EVENT[i] for i in chosen]


def test_risk_table_counts_both_arms_at_each_time() -> None:
    table = two_arm_table(TIME, EVENT, EXPERIMENTAL)
    assert table.time.tolist() == [2, 3, 5, 6]
    assert table.at_risk.tolist() == [[3, 2, 1, 0], [3, 3, 1, 1]]
    assert table.events.tolist() == [[1, 1, 0, 0], [0, 1, 0, 1]]
    assert table.censored.tolist() == [[0, 0, 1, 0], [0, 1, 0, 0]]


def test_curve_of_the_control_arm() -> None:
    curve = kaplan_meier(*arm(False))
    assert curve.time.tolist() == [2, 3, 5]
    assert curve.at_risk.tolist() == [3, 2, 1]
    assert curve.events.tolist() == [1, 1, 0]
    assert curve.censored.tolist() == [0, 0, 1]
    survival = [1 - Fraction(1, 3), (1 - Fraction(1, 3)) * (1 - Fraction(1, 2)), Fraction(1, 3)]
    assert curve.survival.tolist() == exactly(*survival)
    greenwood = [Fraction(1, 3 * 2), Fraction(1, 3 * 2) + Fraction(1, 2 * 1), Fraction(2, 3)]
    variance = [s * s * g for s, g in zip(survival, greenwood, strict=True)]
    assert variance == [Fraction(2, 27)] * 3
    assert (curve.std_error**2).tolist() == exactly(*variance)
    assert curve.median == 3.0


def test_log_log_limits_of_the_control_arm() -> None:
    # log(-log S) has standard error sqrt(sum) / |log S|; the limits are S to the power exp(-+z times that)
    curve = kaplan_meier(*arm(False))
    z = 1.959963984540054
    power = math.exp(z * math.sqrt(Fraction(1, 6)) / -math.log(2 / 3))
    assert curve.ci_low[0] == pytest.approx((2 / 3) ** power, **EXACT)
    assert curve.ci_high[0] == pytest.approx((2 / 3) ** (1 / power), **EXACT)


def test_curve_of_the_experimental_arm_reaches_zero_where_no_error_exists() -> None:
    curve = kaplan_meier(*arm(True))
    assert curve.time.tolist() == [3, 6]
    assert curve.at_risk.tolist() == [3, 1]
    assert curve.censored.tolist() == [1, 0]
    assert curve.survival.tolist() == exactly(Fraction(2, 3), Fraction(0))
    assert curve.std_error[0] ** 2 == pytest.approx(float(Fraction(4, 9) * Fraction(1, 6)), **EXACT)
    assert np.isnan([curve.std_error[1], curve.ci_low[1], curve.ci_high[1]]).all()
    assert curve.median == 6.0


def test_follow_up_keeps_the_tied_death_at_risk() -> None:
    assert follow_up_median(*arm(False)) == 5.0  # one censoring, at 5, of one at risk
    assert follow_up_median(*arm(True)) == Absent("not reached")  # one censoring, at 3, of three at risk


def test_logrank_sums() -> None:
    result = logrank(TIME, EVENT, EXPERIMENTAL)
    expected = Fraction(1 * 3, 6) + Fraction(2 * 3, 5) + Fraction(1 * 1, 1)
    variance = Fraction(1 * 3 * 3 * 5, 6**2 * 5) + Fraction(2 * 3 * 2 * 3, 5**2 * 4) + 0
    assert (expected, variance) == (Fraction(27, 10), Fraction(61, 100))
    assert [result.observed, result.expected, result.variance] == exactly(Fraction(2), expected, variance)
    assert result.z == pytest.approx(7 / math.sqrt(61), **EXACT)  # (27/10 - 2) / sqrt(61/100)
    assert result.chi_square == pytest.approx(49 / 61, **EXACT)
    assert result.p_two_sided == pytest.approx(math.erfc(7 / math.sqrt(61) / math.sqrt(2)), rel=1e-13)
    assert result.p_one_sided == pytest.approx(result.p_two_sided / 2, **EXACT)


def test_stratified_logrank_sums() -> None:
    # stratum 0: control 2, 5+, experimental 3        stratum 1: control 3, experimental 3+, 6
    result = logrank(TIME, EVENT, EXPERIMENTAL, stratum=STRATUM)
    first, second = result.strata
    assert [first.observed, first.expected, first.variance] == exactly(
        Fraction(1),
        Fraction(1, 3) + Fraction(1, 2),
        Fraction(1 * 1 * 2 * 2, 3**2 * 2) + Fraction(1 * 1 * 1 * 1, 2**2 * 1),
    )
    assert [second.observed, second.expected, second.variance] == exactly(
        Fraction(1), Fraction(2, 3) + Fraction(1), Fraction(1 * 2 * 1 * 2, 3**2 * 2) + 0
    )
    assert [(s.stratum, s.subjects, s.events) for s in result.strata] == [(0, 3, 2), (1, 3, 2)]
    assert [result.observed, result.expected, result.variance] == exactly(
        Fraction(2), Fraction(5, 2), Fraction(25, 36)
    )
    assert result.z == pytest.approx(3 / 5, **EXACT)


def test_cox_with_efron_ties_solves_its_score_equation() -> None:
    # 1 = t/(1+t) + 3t/(2+3t) + 5t/(3+5t), as the second event at 3 meets 2 - 1/2 control and 3 - 1/2
    # experimental, and the event at 6 is certain; cleared of fractions, 15 t^3 + 17 t^2 - 3 = 0
    result = cox_two_arms(TIME, EVENT, EXPERIMENTAL)
    theta = Fraction(result.hazard_ratio)
    assert abs(float(15 * theta**3 + 17 * theta**2 - 3)) < 1e-13
    shares = [theta / (1 + theta), 3 * theta / (2 + 3 * theta), 5 * theta / (3 + 5 * theta)]
    information = sum(share * (1 - share) for share in shares)
    assert result.std_error == pytest.approx(1 / math.sqrt(information), rel=1e-10)
    assert result.log_hazard_ratio == pytest.approx(math.log(theta), **EXACT)
    assert result.ci_low == pytest.approx(theta * math.exp(-1.959963984540054 * result.std_error), rel=1e-13)
    assert result.ci_high == pytest.approx(theta * math.exp(1.959963984540054 * result.std_error), rel=1e-13)


def test_cox_with_breslow_ties_solves_its_score_equation() -> None:
    # 1 = t/(1+t) + 2 * 3t/(2+3t), hence 6 t^2 + 3 t - 2 = 0
    result = cox_two_arms(TIME, EVENT, EXPERIMENTAL, ties="Breslow")
    assert result.hazard_ratio == pytest.approx((math.sqrt(57) - 3) / 12, rel=1e-13)


def test_the_literal_versions_give_the_same_fractions() -> None:
    control, experimental = naive.kaplan_meier(*arm(False)), naive.kaplan_meier(*arm(True))
    assert [tuple(row) for row in control] == [
        (2.0, 3, 1, 0, Fraction(2, 3), Fraction(1, 6)),
        (3.0, 2, 1, 0, Fraction(1, 3), Fraction(2, 3)),
        (5.0, 1, 0, 1, Fraction(1, 3), Fraction(2, 3)),
    ]
    assert [row.survival for row in experimental] == [Fraction(2, 3), Fraction(0)]
    assert [row.variance_of_log for row in experimental] == [Fraction(1, 6), None]
    assert (naive.median(control), naive.median(experimental)) == (3.0, 6.0)
    assert (naive.follow_up_median(*arm(False)), naive.follow_up_median(*arm(True))) == (5.0, None)
    assert naive.logrank(TIME, EVENT, EXPERIMENTAL) == (2, Fraction(27, 10), Fraction(61, 100))
    assert naive.logrank(TIME, EVENT, EXPERIMENTAL, STRATUM) == (2, Fraction(5, 2), Fraction(25, 36))
    terms = naive.partial_likelihood_terms(TIME, EVENT, EXPERIMENTAL)
    assert sorted(terms) == [(0, 1), (Fraction(3, 2), Fraction(5, 2)), (2, 3), (3, 3)]
    log_ratio, _ = naive.cox(TIME, EVENT, EXPERIMENTAL, ties="Breslow")
    assert math.exp(log_ratio) == pytest.approx((math.sqrt(57) - 3) / 12, rel=1e-12)
    assert naive.merge_near_ties([0.3, 0.1 + 0.2, 1.0]) == [0.3, 0.3, 1.0]


def test_weighted_sums() -> None:
    # just before 2, 3, 6 the pooled curve is 1, 5/6, 1/2; O - E is 0 - 1/2, 1 - 6/5, 1 - 1; V is 1/4, 9/25, 0
    early = weighted_logrank(TIME, EVENT, EXPERIMENTAL, weight=fleming_harrington(1, 0))
    assert [early.score, early.variance] == exactly(
        -Fraction(1, 2) - Fraction(5, 6) * Fraction(1, 5), Fraction(1, 4) + Fraction(25, 36) * Fraction(9, 25)
    )
    at_risk = weighted_logrank(TIME, EVENT, EXPERIMENTAL, weight=GEHAN_BRESLOW)
    assert [at_risk.score, at_risk.variance] == exactly(Fraction(-3 - 1), Fraction(9 + 9))
    peto = weighted_logrank(TIME, EVENT, EXPERIMENTAL, weight=PETO_PETO)
    first, second = 1 - Fraction(1, 7), (1 - Fraction(1, 7)) * (1 - Fraction(2, 6))
    assert [peto.score, peto.variance] == exactly(
        -first / 2 - second / 5, first**2 / 4 + second**2 * Fraction(9, 25)
    )


def test_cumulative_hazard_and_restricted_mean_of_the_control_arm() -> None:
    hazard = nelson_aalen(*arm(False))
    assert hazard.hazard.tolist() == exactly(Fraction(1, 3), Fraction(5, 6), Fraction(5, 6))
    assert (hazard.std_error**2).tolist() == exactly(Fraction(1, 9), Fraction(13, 36), Fraction(13, 36))
    # the curve is 1 to 2, 2/3 to 3, 1/3 to 5; after the events at 2 and 3 its areas to 4 are 1 and 1/3
    mean = restricted_mean(kaplan_meier(*arm(False)), 4.0)
    assert mean.mean == pytest.approx(3.0, **EXACT)
    assert mean.std_error**2 == pytest.approx(float(Fraction(1, 6) + Fraction(1, 9) / 2), **EXACT)


def test_cox_with_exact_ties_solves_its_score_equation() -> None:
    # of the 10 pairs at risk at 3, 1 holds no experimental subject, 6 hold one and 3 hold two; the event
    # at 6 is certain: 1 = t/(1+t) + (6t + 6t^2)/(1 + 6t + 3t^2), cleared of fractions 6 t^3 + 9 t^2 - 1 = 0
    result = cox_two_arms(TIME, EVENT, EXPERIMENTAL, ties="exact")
    theta = Fraction(result.hazard_ratio)
    assert abs(float(6 * theta**3 + 9 * theta**2 - 1)) < 1e-14
    model = cox_regression(TIME, EVENT, [float(x) for x in EXPERIMENTAL], ties="exact")
    assert model.score.chi_square == pytest.approx(49 / 61, rel=1e-13)  # the log-rank test


def test_incidence_of_one_cause_among_two() -> None:
    # causes: 1 in control, 2 experimental; at risk 6, 5, 1 at times 2, 3, 6, events (1, 0), (1, 1), (0, 1)
    cause = [1 + x if e else 0 for e, x in zip(EVENT, EXPERIMENTAL, strict=True)]
    found = cumulative_incidence(TIME, cause)
    assert found.incidence.tolist() == exactly(Fraction(1, 6), Fraction(1, 3), Fraction(1, 3))
    other = cumulative_incidence(TIME, cause, of=2)
    assert other.incidence.tolist() == exactly(Fraction(0), Fraction(1, 6), Fraction(2, 3))
    # at 2: (5/6)(1/6)/6, the binomial variance
    assert found.std_error[0] ** 2 == pytest.approx(5 / 216, **EXACT)


def test_trend_and_groups_are_the_two_arm_test() -> None:
    groups = groups_logrank(TIME, EVENT, [int(x) for x in EXPERIMENTAL])
    assert groups.chi_square == pytest.approx(49 / 61, rel=1e-13)
    assert groups.covariance.ravel().tolist() == exactly(*(Fraction(s * 61, 100) for s in (1, -1, -1, 1)))
    assert trend_logrank(TIME, EVENT, [int(x) for x in EXPERIMENTAL]).z == pytest.approx(-7 / math.sqrt(61))


def test_the_further_literal_versions_give_the_same_fractions() -> None:
    score, variance = naive.weighted_logrank(TIME, EVENT, EXPERIMENTAL, lambda n, d, before: float(before))
    assert [score, variance] == exactly(-Fraction(2, 3), Fraction(1, 2))
    assert naive.cumulative_hazard(*arm(False))[1] == (Fraction(5, 6), Fraction(13, 36))
    assert naive.restricted_mean(*arm(False), 4.0) == pytest.approx((3.0, 2 / 9), **EXACT)
    cause = [1 + x if e else 0 for e, x in zip(EVENT, EXPERIMENTAL, strict=True)]
    assert naive.cumulative_incidence(TIME, cause, 2)[-1] == (6.0, Fraction(2, 3))
    # at coefficient 0: 6, then 5 and 4 (Efron: 5 and 5 - 1), then 1; exact: 10 pairs
    zero = [0.0] * 6
    efron = naive.log_partial_likelihood(TIME, EVENT, zero, [0] * 6, "Efron")
    assert efron == pytest.approx(-math.log(6 * 5 * 4))
    exact = naive.log_partial_likelihood(TIME, EVENT, zero, [0] * 6, "exact")
    assert exact == pytest.approx(-math.log(6 * 10))
