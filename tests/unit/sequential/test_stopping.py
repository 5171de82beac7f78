"""Inference after a stop: what counts, what is left out, and how a drift becomes a ratio."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from scipy.special import ndtr

from app.errors import AccuracyNotReached
from app.model.boundary import LookAsUsed
from app.model.values import Absent
from app.sequential.density import Region
from app.sequential.stopping import Ended, stopping
from tests.sequential_plans import rule_named

RULE = rule_named("O'Brien-Fleming-type", 0.025)


def held(number: int, information: float, efficacy_z: float | Absent, **more: object) -> LookAsUsed:
    return LookAsUsed(
        number, "planned", information, int(information), information / 400, 1.0, efficacy_z, 0.01, False,
        **more,  # type: ignore[arg-type]
    )  # fmt: skip


FIRST, SECOND = held(1, 140.0, 3.61), held(2, 280.0, 2.44)


def test_without_earlier_looks_it_is_the_fixed_test_and_the_naive_interval() -> None:
    found = stopping([], 2.1, 400.0, RULE, 98.0)
    assert found.p_one_sided == pytest.approx(ndtr(-2.1), rel=1e-13)
    assert found.median_unbiased_hazard_ratio == pytest.approx(math.exp(-2.1 / math.sqrt(98.0)), rel=1e-11)
    margin = 1.959963984540054
    expected = [math.exp(-(2.1 + side) / math.sqrt(98.0)) for side in (margin, -margin)]
    assert [found.ci_low, found.ci_high] == pytest.approx(expected, rel=1e-10)
    assert found.level == pytest.approx(0.95, rel=1e-15)


def test_earlier_looks_pull_the_ratio_towards_one() -> None:
    found = stopping([FIRST], 2.6, 280.0, RULE, 69.0)
    naive = math.exp(-2.6 / math.sqrt(69.0))
    assert naive < found.median_unbiased_hazard_ratio < 1.0  # type: ignore[operator]
    assert found.ci_low < found.median_unbiased_hazard_ratio < found.ci_high  # type: ignore[operator]


def test_looks_that_could_not_stop_the_trial_are_left_out() -> None:
    safety = held(2, 150.0, Absent("a safety look has no efficacy bound"))
    assert stopping([FIRST, safety], 2.5, 280.0, RULE, 69.0) == stopping([FIRST], 2.5, 280.0, RULE, 69.0)


def test_non_binding_futility_and_harm_are_left_out_of_account() -> None:
    with_both = replace(FIRST, futility_z=0.5, harm_z=-2.0)
    assert stopping([with_both], 2.5, 280.0, RULE, 69.0) == stopping([FIRST], 2.5, 280.0, RULE, 69.0)


def test_binding_futility_counts() -> None:
    stopped_below = replace(FIRST, futility_z=0.5)
    with_it = stopping([stopped_below], 2.5, 280.0, RULE, 69.0, binding=True)
    without = stopping([FIRST], 2.5, 280.0, RULE, 69.0)
    assert with_it.p_one_sided < without.p_one_sided  # type: ignore[operator]


def test_two_sides_stop_on_both() -> None:
    one = stopping([held(1, 140.0, 1.5)], 1.0, 400.0, RULE, 98.0)
    two = stopping([held(1, 140.0, 1.5)], 1.0, 400.0, replace(RULE, sides=2), 98.0)
    assert two.p_one_sided < one.p_one_sided  # type: ignore[operator]


def test_when_the_event_is_good_the_ratio_is_turned_over() -> None:
    bad = stopping([FIRST], 2.5, 280.0, RULE, 69.0)
    good = stopping([FIRST], 2.5, 280.0, replace(RULE, direction=-1), 69.0)
    assert good.p_one_sided == bad.p_one_sided
    assert good.ci_low * bad.ci_high == pytest.approx(1.0, rel=1e-12)  # type: ignore[operator]
    assert good.ci_low < good.ci_high  # type: ignore[operator]


@pytest.mark.parametrize("variance", [0.0, Absent("no log-rank test")])
def test_without_score_variance_there_is_p_and_no_ratio(variance: float | Absent) -> None:
    found = stopping([FIRST], 2.5, 280.0, RULE, variance)
    assert isinstance(found.p_one_sided, float)
    assert isinstance(found.median_unbiased_hazard_ratio, Absent)
    assert isinstance(found.ci_low, Absent)


def test_a_larger_z_at_the_same_look_says_more() -> None:
    p = [stopping([FIRST, SECOND], z, 400.0, RULE, 98.0).p_one_sided for z in (-1.0, 1.0, 2.0, 3.0)]
    assert p == sorted(p, reverse=True)


def test_an_earlier_stop_says_more_than_a_later_one() -> None:
    early = stopping([FIRST], 2.5, 280.0, RULE, 69.0).p_one_sided
    late = stopping([FIRST, SECOND], 6.0, 400.0, RULE, 98.0).p_one_sided
    assert early < late  # type: ignore[operator]


def test_every_look_but_the_last_needs_a_region() -> None:
    with pytest.raises(ValueError, match="every look but the last needs a region"):
        Ended((0.5, 1.0), (), 2.0)


def test_an_end_that_no_effect_explains_is_not_answered() -> None:
    ended = Ended((1.0, 1.5), (Region(-math.inf, -100.0),), 2.0)
    with pytest.raises(AccuracyNotReached):
        ended.drift_with(0.025)
