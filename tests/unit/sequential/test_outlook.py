"""What going on would mean: which effects, which looks, and what the next one needs."""

from __future__ import annotations

import math
from dataclasses import replace
from statistics import NormalDist

import pytest

from app.model.boundary import Bound
from app.model.outlook import ConditionalPower, Outlook
from app.model.plan import Design, Efficacy, Futility
from app.model.values import Absent
from app.sequential.boundary import bounds_ahead
from app.sequential.effect import EffectScale, planned_looks, rules_of
from app.sequential.outlook import (
    Held,
    Prior,
    conditional_power,
    conditional_power_at,
    outlook,
    repeated_interval,
)
from app.validation.outlook_rows import CONDITIONAL_POWER, FIXED
from app.validation.outlook_rows import DESIGN as DESIGN_EFFECT
from tests.sequential_plans import rule_named

DESIGN = Design(0.025, 1, 0.9, 0.75, 400, (0.5, 0.75, 1.0))
RULES = rules_of(
    DESIGN,
    Efficacy("O'Brien-Fleming-type"),
    experimental_share=0.5,
    direction=1,
    futility=Futility("Hwang-Shih-DeCani", parameter=-3.0),
)
PLANNED = RULES.bounds((), planned_looks(DESIGN, DESIGN.looks, 0.5, final=False))
HELD = Held(0.5, 1.5, 49.0)


def asked(held: Held = HELD, ahead: tuple[Bound, ...] = PLANNED[1:], **more: object) -> Outlook:
    found = outlook(
        held,
        ahead,
        RULES.efficacy,
        RULES.scale,
        planned_hazard_ratio=0.75,
        level=0.95,
        **more,  # type: ignore[arg-type]
    )
    assert isinstance(found, Outlook)
    return found


def chosen(hazard_ratio: float) -> ConditionalPower:
    found = conditional_power(HELD, PLANNED[1:], RULES.efficacy, RULES.scale, hazard_ratio)
    assert isinstance(found, ConditionalPower)
    return found


def test_effects_are_named_by_their_hazard_ratio_and_mean_of_z() -> None:
    found = asked()
    assert found.design.hazard_ratio == 0.75
    assert found.design.noncentrality == pytest.approx(-math.log(0.75) * 10.0, rel=1e-14)
    assert found.null.noncentrality == 0.0
    assert found.trend.noncentrality == pytest.approx(1.5 / math.sqrt(0.5), rel=1e-14)
    assert found.trend.hazard_ratio == pytest.approx(math.exp(-1.5 / 7.0), rel=1e-14)


def test_the_trend_comes_with_the_limits_of_its_interval() -> None:
    found = asked()
    assert found.trend_low.noncentrality == pytest.approx((1.5 - 1.959964) / math.sqrt(0.5), abs=1e-6)
    assert found.trend_high.hazard_ratio == pytest.approx(math.exp(-(1.5 + 1.959964) / 7.0), abs=1e-6)
    assert found.trend_low.path < found.trend.path < found.trend_high.path  # type: ignore[operator]


def test_the_plan_s_own_ratio_chosen_gives_the_very_numbers_of_the_design() -> None:
    assert chosen(0.75) == asked().design
    assert chosen(1.0) == asked().null
    assert chosen(0.9) != asked().design


def test_a_chosen_ratio_has_its_effect_by_the_plan_s_information() -> None:
    power = chosen(0.9)
    assert power.hazard_ratio == 0.9
    assert power.noncentrality == pytest.approx(-math.log(0.9) * 10.0, rel=1e-14)  # d p q = 100


@pytest.mark.parametrize("hazard_ratio", [0.05, 0.5, 0.8, 1.0, 1.3, 20.0])
def test_the_final_look_under_a_chosen_ratio_is_the_closed_formula(hazard_ratio: float) -> None:
    """Lan, Simon & Halperin (1982) in B-values, with the normal distribution of the standard library."""
    t, criterion = 0.5, PLANNED[-1].efficacy_z
    assert isinstance(criterion, float)
    b_value = 1.5 * math.sqrt(t)
    drift = -math.log(hazard_ratio) * math.sqrt(400 * 0.25)
    expected = NormalDist().cdf((b_value + drift * (1 - t) - criterion) / math.sqrt(1 - t))
    assert chosen(hazard_ratio).final_look == pytest.approx(expected, abs=1e-14)


@pytest.mark.parametrize("line", CONDITIONAL_POWER.strip().splitlines())
def test_a_chosen_ratio_gives_the_check_values_of_its_effect(line: str) -> None:
    """The rows of app/validation/outlook_rows.py: computed independently, by recursive quadrature."""
    z, t, null, _, design, _ = map(float, line.split())
    scale, last = RULES.scale, replace(PLANNED[-1], efficacy_z=FIXED)
    for ratio, expected in ((1.0, null), (scale.hazard_ratio(DESIGN_EFFECT), design)):
        power = conditional_power(Held(t, z, 49.0), (last,), RULES.efficacy, scale, ratio)
        assert isinstance(power, ConditionalPower)
        assert power.final_look == pytest.approx(expected, abs=5e-5)
        assert power.path == pytest.approx(expected, abs=5e-5)


def test_no_look_to_come_leaves_nothing_to_ask_about() -> None:
    found = conditional_power(HELD, (), RULES.efficacy, RULES.scale, 0.8)
    assert found == Absent("no planned look is to come")


def test_the_criterion_is_this_trials_own_last_bound() -> None:
    found = asked()
    assert found.criterion == PLANNED[-1].efficacy_z
    assert found.null.final_look == conditional_power_at(1.5, 0.5, PLANNED[-1].efficacy_z, 1.0, 0.0)  # type: ignore[arg-type]


def test_a_path_crosses_at_least_as_often_as_the_last_look_alone() -> None:
    for power in (asked().design, asked().trend, asked().null):
        assert power.final_look < power.path  # type: ignore[operator]


def test_obeying_futility_only_costs() -> None:
    for power in (asked().design, asked().null):
        assert power.path_futility_obeyed < power.path  # type: ignore[operator]


def test_without_futility_there_is_nothing_to_obey() -> None:
    plain = tuple(replace(bound, futility_z=None) for bound in PLANNED[1:])
    assert asked(ahead=plain).design.path_futility_obeyed is None


def test_with_one_look_to_come_all_three_are_one() -> None:
    found = asked(ahead=PLANNED[2:]).design
    assert found.path == pytest.approx(found.final_look, rel=1e-13)
    assert found.path_futility_obeyed == pytest.approx(found.final_look, rel=1e-13)


def test_without_a_look_to_come_there_is_no_outlook() -> None:
    found = outlook(HELD, (), RULES.efficacy, RULES.scale, planned_hazard_ratio=0.75, level=0.95)
    assert found == Absent("no planned look is to come")


def test_a_last_look_without_a_bound_has_no_conditional_power_of_its_own() -> None:
    spent = replace(PLANNED[-1], efficacy_z=Absent("all alpha is already spent"))
    found = asked(ahead=(PLANNED[1], spent))
    assert isinstance(found.criterion, Absent)
    assert isinstance(found.design.final_look, Absent)
    assert isinstance(found.predictive_power.flat, Absent)
    assert isinstance(found.design.path, float)


def test_a_strong_prior_decides_predictive_power_and_a_vague_one_does_not() -> None:
    flat = asked().predictive_power
    assert flat.prior is None
    strong = asked(prior=Prior(0.75, 1e-6)).predictive_power
    assert strong.prior == pytest.approx(asked().design.final_look, abs=1e-6)
    vague = asked(prior=Prior(0.75, 1e6)).predictive_power
    assert vague.prior == pytest.approx(flat.flat, abs=1e-9)


def test_new_events_with_the_z_needed_bring_the_next_look_to_its_bound() -> None:
    next_look = asked().next_look
    assert next_look is not None
    assert (next_look.number, next_look.events) == (2, 300)
    needed = next_look.new_events_z
    assert isinstance(needed, float)
    score = 1.5 * math.sqrt(0.5) + needed * math.sqrt(0.25)
    assert score / math.sqrt(0.75) == pytest.approx(next_look.efficacy_z, rel=1e-13)  # type: ignore[arg-type]
    assert next_look.new_events_hazard_ratio == pytest.approx(math.exp(-needed / 5.0), rel=1e-13)
    assert next_look.chance_null < next_look.chance_trend  # type: ignore[operator]
    assert next_look.chance_design == pytest.approx(
        conditional_power_at(1.5, 0.5, next_look.efficacy_z, 0.75, asked().design.noncentrality),  # type: ignore[arg-type]
        rel=1e-13,
    )


def test_a_next_look_without_a_bound_says_why() -> None:
    nothing = Absent("the alpha that may be spent is already spent")
    found = asked(ahead=(replace(PLANNED[1], efficacy_z=nothing), PLANNED[2])).next_look
    assert found is not None
    assert found.new_events_z == found.chance_design == found.new_events_hazard_ratio == nothing


def test_the_direction_turns_every_hazard_ratio_and_no_probability() -> None:
    turned_rule, turned_scale = replace(RULES.efficacy, direction=-1), EffectScale(-1, 100.0)
    found = outlook(HELD, PLANNED[1:], turned_rule, turned_scale, planned_hazard_ratio=1 / 0.75, level=0.95)
    assert isinstance(found, Outlook)
    assert found.design.path == pytest.approx(asked().design.path, rel=1e-12)
    assert found.trend.hazard_ratio == pytest.approx(math.exp(1.5 / 7.0), rel=1e-13)


def test_a_repeated_interval_leaves_out_one_exactly_when_the_bound_is_crossed() -> None:
    rule = rule_named("O'Brien-Fleming-type", 0.025)
    (bound,) = bounds_ahead(rule, (), planned_looks(DESIGN, (0.5,), 0.5, final=False))
    c = bound.efficacy_z
    assert isinstance(c, float)
    met = repeated_interval(c, bound, rule, 49.0)
    assert met.ci_high == 1.0
    assert met.ci_low == pytest.approx(math.exp(-2.0 * c / 7.0), rel=1e-14)
    assert met.level == pytest.approx(0.95, rel=1e-15)
    good = repeated_interval(c, bound, replace(rule, direction=-1), 49.0)
    assert good.ci_low == 1.0


def test_without_a_bound_or_variance_there_is_no_repeated_interval() -> None:
    rule = rule_named("O'Brien-Fleming-type", 0.025)
    safety = Absent("a safety look has no efficacy bound")
    none = repeated_interval(1.0, replace(PLANNED[0], efficacy_z=safety), rule, 49.0)
    assert (none.ci_low, none.ci_high) == (safety, safety)
    missing = Absent("no log-rank test")
    assert repeated_interval(1.0, PLANNED[0], rule, missing).ci_low == missing
