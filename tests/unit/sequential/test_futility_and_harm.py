"""Futility and harm beside efficacy: who counts on whom, when there is no bound, and what is reported."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from scipy.special import ndtr

from app.errors import DesignInvalid
from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Design, Efficacy, Futility, Harm
from app.model.values import Absent, Estimate
from app.sequential.boundary import LookAhead
from app.sequential.effect import PlanRules, effect_scale, planned_looks, rules_of

DESIGN = Design(0.025, 1, 0.9, 0.75, 533, (0.35, 0.7, 1.0))
EFFICACY = Efficacy("O'Brien-Fleming-type")
SPENDING = Futility("Hwang-Shih-DeCani", parameter=-3.0)
HARM = Harm("Pocock-type", 0.025)


def rules(
    futility: Futility | None = None, harm: Harm | None = None, design: Design = DESIGN, **more: str
) -> PlanRules:
    return rules_of(
        design, EFFICACY, experimental_share=0.5, direction=1, futility=futility, harm=harm, **more
    )


def planned(of: PlanRules, design: Design = DESIGN) -> tuple[Bound, ...]:
    return of.bounds((), planned_looks(design, design.looks, 0.5, final=False))


def look(number: int, events: int, kind: str = "planned", **more: object) -> LookAhead:
    return LookAhead(number, kind, float(events), events / 533, events, events / 4.0, **more)  # type: ignore[arg-type]


def used(bound: Bound, kind: str = "planned", **changes: object) -> LookAsUsed:
    """The bounds of a look, recorded as they were used."""
    recorded = LookAsUsed(
        number=bound.number,
        kind=kind,  # type: ignore[arg-type]
        information=float(bound.events),
        events=bound.events,
        fraction=bound.information_fraction,
        z=1.5,
        efficacy_z=bound.efficacy_z,
        alpha_spent=bound.alpha_spent,
        final=bound.final,
        futility_z=bound.futility_z,
        type_two_spent=bound.type_two_spent or 0.0,
        harm_z=bound.harm_z,
        harm_alpha_spent=bound.harm_alpha_spent or 0.0,
    )
    return replace(recorded, **changes)  # type: ignore[arg-type]


def number(z: Estimate | None) -> float:
    assert isinstance(z, float)
    return z


def reason(z: Estimate | None) -> str:
    assert isinstance(z, Absent)
    return z.reason


def efficacy_of(bounds: tuple[Bound, ...]) -> list[Estimate]:
    return [bound.efficacy_z for bound in bounds]


def test_non_binding_futility_and_harm_leave_the_efficacy_bounds_as_they_are() -> None:
    plain = planned(rules())
    assert efficacy_of(planned(rules(SPENDING, HARM))) == efficacy_of(plain)
    assert efficacy_of(plain) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)  # computed independently


def test_binding_futility_lets_the_last_efficacy_bound_down() -> None:
    plain, bound = planned(rules()), planned(rules(replace(SPENDING, binding=True)))
    assert bound[0].efficacy_z == plain[0].efficacy_z
    assert number(bound[2].efficacy_z) < number(plain[2].efficacy_z) - 0.01


def test_what_a_plan_does_not_have_is_not_asked_for() -> None:
    for bound in planned(rules()):
        assert (bound.futility_z, bound.type_two_spent, bound.futility_hazard_ratio) == (None, None, None)
        assert (bound.harm_z, bound.harm_alpha_spent, bound.harm_hazard_ratio) == (None, None, None)


def test_the_last_futility_bound_is_the_efficacy_bound_and_all_of_the_type_two_error_is_spent() -> None:
    bounds = planned(rules(SPENDING))
    assert bounds[-1].futility_z == bounds[-1].efficacy_z
    assert bounds[-1].type_two_spent == pytest.approx(0.1, abs=1e-9)
    assert all(number(bound.futility_z) < number(bound.efficacy_z) for bound in bounds[:-1])


def test_the_bounds_one_by_one_are_the_bounds_of_the_plan() -> None:
    of = rules(replace(SPENDING, binding=True), HARM)
    bounds = planned(of)
    past: list[LookAsUsed] = []
    for at, ahead in zip(bounds, planned_looks(DESIGN, DESIGN.looks, 0.5, final=False), strict=True):
        (bound,) = of.bounds(past, (ahead,))
        assert bound == at
        past.append(used(bound, information=ahead.information))


def test_a_final_look_earlier_than_planned_says_what_type_two_error_it_leaves() -> None:
    of = rules(SPENDING)
    first = planned(of)[0]
    (last,) = of.bounds([used(first)], (look(2, 400, kind="final"),))
    assert last.futility_z == last.efficacy_z
    assert number(last.type_two_spent) > 0.12  # fewer events than planned: less power


def test_futility_that_would_reach_efficacy_before_the_end_is_none_and_both_bounds_are_said() -> None:
    """Late in an over-run plan: the total was raised, so efficacy spends little, while futility is behind."""
    of = rules(SPENDING)
    (bound,) = of.bounds((), (look(1, 500),))
    assert number(bound.futility_z) < number(bound.efficacy_z)
    hasty = rules(Futility("Hwang-Shih-DeCani", parameter=2.0))
    (crossing,) = hasty.bounds((), (look(1, 520),))
    assert "the futility bound would lie at " in reason(crossing.futility_z)
    assert f"not below the efficacy bound at {crossing.efficacy_z:.3f}" in reason(crossing.futility_z)
    assert crossing.type_two_spent == 0.0


def test_futility_at_a_plan_that_never_reaches_its_power_is_refused_in_a_sentence() -> None:
    """Bound to stop, and with nearly all type II error spent at the start, few null paths reach the end."""
    design = replace(DESIGN, looks=(0.5, 0.97, 1.0))
    with pytest.raises(
        DesignInvalid, match="The futility boundary leaves efficacy too little room for the power"
    ):
        rules(Futility("Hwang-Shih-DeCani", parameter=60.0, binding=True), design=design)


def test_a_futility_look_spends_the_share_of_a_look_that_was_skipped() -> None:
    of = rules(SPENDING)
    (late,) = of.bounds((), (look(1, 374),))
    spending = of.futility.spending  # type: ignore[union-attr]
    assert late.type_two_spent == pytest.approx(spending(374 / 533), rel=1e-12)


def test_a_safety_look_has_harm_only() -> None:
    of = rules(SPENDING, HARM)
    (safety,) = of.bounds((), (look(1, 200, kind="safety"),))
    assert "no efficacy bound" in reason(safety.efficacy_z)
    assert "no futility bound" in reason(safety.futility_z)
    assert safety.type_two_spent == 0.0
    assert number(safety.harm_z) < -2.0
    assert safety.harm_alpha_spent == pytest.approx(of.harm.spending(200 / 533), rel=1e-13)  # type: ignore[union-attr]


def test_conditional_power_at_its_futility_bound_is_the_limit() -> None:
    limit = 0.2
    of = rules(Futility(rule="conditional power", limit=limit))
    bounds = planned(of)
    effect = effect_scale(DESIGN, 0.5, 1).noncentrality(DESIGN.hazard_ratio)
    criterion = number(bounds[-1].efficacy_z)
    for bound in bounds[:-1]:
        t = bound.information_fraction
        mean = number(bound.futility_z) * math.sqrt(t) + effect * (1.0 - t)
        assert ndtr((mean - criterion) / math.sqrt(1.0 - t)) == pytest.approx(limit, rel=1e-12)


def test_the_hazard_ratio_at_its_futility_bound_is_the_limit() -> None:
    bounds = planned(rules(Futility(rule="hazard ratio", limit=0.95)))
    assert [bound.futility_hazard_ratio for bound in bounds[:-1]] == pytest.approx([0.95, 0.95], rel=1e-12)
    at_one = planned(rules(Futility(rule="hazard ratio", limit=1.0)))
    assert [math.copysign(1.0, number(bound.futility_z)) for bound in at_one] == [1.0, 1.0, 1.0]


def test_without_score_variance_a_limit_on_the_hazard_ratio_has_no_bound() -> None:
    missing = Absent("no log-rank test")
    of = rules(Futility(rule="hazard ratio", limit=0.95))
    (bound,) = of.bounds((), (replace(look(1, 200), score_variance=missing),))
    assert bound.futility_z == missing


def test_a_limit_on_conditional_power_needs_a_last_bound() -> None:
    of = rules(Futility(rule="conditional power", limit=0.2))
    all_spent = LookAsUsed(1, "final", 150.0, 150, 0.28, 1.0, 2.0, 0.025, True)
    (bound,) = of.bounds([all_spent], (look(2, 300),))
    assert "no efficacy bound" in reason(bound.futility_z)


def test_a_rule_counts_its_type_two_error_under_the_effect_solved_for_the_power() -> None:
    bounds = planned(rules(Futility(rule="hazard ratio", limit=1.0)))
    spent = [number(bound.type_two_spent) for bound in bounds]
    assert spent == sorted(spent)
    assert spent[-1] == pytest.approx(0.1, abs=1e-9)


def test_harm_mirrors_a_one_sided_test_at_its_own_alpha() -> None:
    harmed = planned(rules(harm=HARM))
    mirror = rules_of(DESIGN, Efficacy("Pocock-type"), experimental_share=0.5, direction=1)
    assert [bound.harm_z for bound in harmed] == [-number(bound.efficacy_z) for bound in planned(mirror)]
    assert harmed[-1].harm_alpha_spent == 0.025


def test_harm_on_another_endpoint_goes_by_that_endpoints_information() -> None:
    of = rules(harm=Harm("Pocock-type", 0.025, "DEATH"), parameter="DEATHHF")
    first = look(1, 187, harm_information=40.0, harm_score_variance=10.0)
    second = look(2, 374, harm_information=90.0, harm_score_variance=22.0)
    bounds = of.bounds((), (first, second))
    same = rules(harm=HARM).bounds((), (look(1, 187), look(2, 374)))
    assert bounds[0].harm_z == same[0].harm_z  # a first bound has no correlation
    assert bounds[0].harm_hazard_ratio == pytest.approx(math.exp(-number(bounds[0].harm_z) / math.sqrt(10.0)))
    assert number(bounds[1].harm_z) != pytest.approx(number(same[1].harm_z), abs=1e-6)
    held = used(bounds[0], harm_information=40.0)
    assert of.bounds([held], (second,))[0].harm_z == bounds[1].harm_z


def test_no_new_event_of_the_harm_endpoint_means_no_harm_bound() -> None:
    of = rules(harm=Harm("Pocock-type", 0.025, "DEATH"), parameter="DEATHHF")
    (first,) = of.bounds((), (look(1, 187, harm_information=40.0),))
    (second,) = of.bounds([used(first, harm_information=40.0)], (look(2, 374, harm_information=40.0),))
    assert "no new information" in reason(second.harm_z)
    assert second.harm_alpha_spent == first.harm_alpha_spent
    assert isinstance(second.efficacy_z, float)


def test_the_plan_s_own_endpoint_named_for_harm_is_the_test_s() -> None:
    named = rules(harm=replace(HARM, endpoint_parameter="DEATHHF"), parameter="DEATHHF")
    assert named.harm is not None
    assert not named.harm.own_endpoint


def test_a_harm_spend_that_is_used_up_leaves_no_bound() -> None:
    of = rules(harm=HARM)
    done = used(planned(of)[0], harm_alpha_spent=0.025)
    (bound,) = of.bounds([done], (look(2, 374),))
    assert "alpha for harm" in reason(bound.harm_z)


def test_after_an_efficacy_crossing_neither_futility_nor_harm_is_tested_again() -> None:
    of = rules(SPENDING, HARM)
    first = used(planned(of)[0], crossed="efficacy")
    (bound,) = of.bounds([first], (look(2, 374),))
    for z in (bound.efficacy_z, bound.futility_z, bound.harm_z):
        assert "crossed at look 1" in reason(z)
    assert bound.type_two_spent == first.type_two_spent
    assert bound.harm_alpha_spent == first.harm_alpha_spent


def test_only_binding_futility_ends_the_test() -> None:
    stopped = used(planned(rules(SPENDING))[0], crossed="futility")
    (going_on,) = rules(SPENDING).bounds([stopped], (look(2, 374),))
    (ended,) = rules(replace(SPENDING, binding=True)).bounds([stopped], (look(2, 374),))
    assert isinstance(going_on.efficacy_z, float)
    assert "crossed at look 1" in reason(ended.efficacy_z)


def test_binding_futility_that_leaves_fewer_paths_than_alpha_leaves_no_bound_there() -> None:
    """A plan whose last looks nobody reaches under no effect: one bound is missing, not the whole answer."""
    binding = Futility(spending="Pocock-type", binding=True)
    of = rules_of(
        replace(DESIGN, looks=(0.5, 0.75, 1.0)), Efficacy("O'Brien-Fleming-type"),
        experimental_share=0.5, direction=1, futility=binding,
    )  # fmt: skip
    early, late, last = of.bounds((), (look(1, 267), look(2, 517), look(3, 533)))
    assert isinstance(early.efficacy_z, float)
    assert number(late.efficacy_z) > 0.0
    assert "come past binding futility to here" in reason(last.efficacy_z)
    assert last.alpha_spent == late.alpha_spent
