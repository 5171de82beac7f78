"""What is spent at a look, which look is final, and when there is no bound."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Efficacy
from app.model.values import Absent
from app.sequential.boundary import EfficacyRule, LookAhead, bounds_ahead, hazard_ratio_at, next_bound
from app.sequential.spending import spending_function

ALPHA = 0.025
PLANNED_EVENTS = 400
RULE = EfficacyRule(spending_function(Efficacy("O'Brien-Fleming-type"), ALPHA), 1, 1)
TWO_SIDED = replace(RULE, sides=2)


def look(
    number: int, events: int, *, kind: str = "planned", planned_events: int = PLANNED_EVENTS
) -> LookAhead:
    return LookAhead(number, kind, float(events), events / planned_events, events, events / 4.0)  # type: ignore[arg-type]


def used(bound: Bound, kind: str = "planned", **changes: object) -> LookAsUsed:
    """The bound of a look, recorded as it was used."""
    recorded = LookAsUsed(
        number=bound.number,
        kind=kind,  # type: ignore[arg-type]
        information=float(bound.events),
        events=bound.events,
        fraction=bound.information_fraction,
        z=1.0,
        efficacy_z=bound.efficacy_z,
        alpha_spent=bound.alpha_spent,
        alpha_spent_here=bound.alpha_spent_here,
        final=bound.final,
    )
    return replace(recorded, **changes)  # type: ignore[arg-type]


def reason(bound: Bound) -> str:
    assert isinstance(bound.efficacy_z, Absent)
    assert bound.efficacy_p_one_sided == bound.efficacy_hazard_ratio == bound.efficacy_z
    assert bound.alpha_spent_here == 0.0
    return bound.efficacy_z.reason


FIRST = next_bound(RULE, (), look(1, 140))
SECOND = next_bound(RULE, [used(FIRST)], look(2, 280))


def test_the_bounds_one_by_one_are_the_bounds_of_the_plan() -> None:
    third = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 400))
    planned = bounds_ahead(RULE, (), (look(1, 140), look(2, 280), look(3, 400)))
    assert planned == (FIRST, SECOND, third)
    assert third.final
    assert third.alpha_spent == ALPHA


def test_the_alpha_spent_here_is_what_the_function_allows_less_what_is_recorded() -> None:
    assert SECOND.alpha_spent == RULE.spending(0.7)
    assert SECOND.alpha_spent_here == RULE.spending(0.7) - RULE.spending(0.35)


def test_a_look_below_full_information_spends_all_only_when_declared_final() -> None:
    declared = next_bound(RULE, [used(FIRST)], look(2, 280, kind="final"))
    assert not SECOND.final
    assert declared.final
    assert declared.alpha_spent == ALPHA
    assert declared.efficacy_z == pytest.approx(1.9603, abs=5e-5)  # computed independently


def test_a_look_at_full_information_is_final_by_itself_whatever_it_was_declared() -> None:
    assert next_bound(RULE, [used(FIRST)], look(2, 400, kind="unplanned")).alpha_spent == ALPHA


def test_over_running_spends_alpha_once_only() -> None:
    last = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 420))
    assert last.final
    assert last.alpha_spent == ALPHA
    later = next_bound(RULE, [used(FIRST), used(SECOND), used(last)], look(4, 450))
    assert "all alpha is already spent" in reason(later)
    assert later.alpha_spent == ALPHA


def test_over_running_uses_the_information_there_is() -> None:
    at_plan = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 400))
    beyond = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 480))
    assert isinstance(at_plan.efficacy_z, float)
    assert isinstance(beyond.efficacy_z, float)
    assert beyond.efficacy_z > at_plan.efficacy_z  # less correlated with the looks before: more would cross


def test_a_safety_look_spends_nothing_and_its_share_is_caught_up() -> None:
    safety = next_bound(RULE, [used(FIRST)], look(2, 200, kind="safety"))
    assert "safety look" in reason(safety)
    assert safety.alpha_spent == FIRST.alpha_spent
    after = next_bound(RULE, [used(FIRST), used(safety, kind="safety", z=None)], look(3, 280))
    assert replace(after, number=2) == SECOND


def test_a_safety_look_at_full_information_stays_outside_the_test() -> None:
    safety = next_bound(RULE, [used(FIRST)], look(2, 400, kind="safety"))
    assert not safety.final
    assert "safety look" in reason(safety)


@pytest.mark.parametrize("events", [279, 280])
def test_a_count_at_or_below_an_earlier_look_brings_no_new_information(events: int) -> None:
    bound = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, events))
    assert "no new information since the looks before" in reason(bound)
    assert bound.alpha_spent == SECOND.alpha_spent


def test_a_final_look_without_new_information_has_no_boundary() -> None:
    bound = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 270, kind="final"))
    assert "no boundary exists and the result is descriptive" in reason(bound)
    assert bound.alpha_spent == SECOND.alpha_spent


def test_a_look_without_any_event_has_no_bound() -> None:
    assert "no new information" in reason(next_bound(RULE, (), look(1, 0)))


def test_a_count_that_fell_is_passed_over_afterwards() -> None:
    fallen = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 270))
    last = next_bound(RULE, [used(FIRST), used(SECOND), used(fallen)], look(4, 400))
    straight = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 400))
    assert last.efficacy_z == straight.efficacy_z


def test_nothing_is_unspent_when_the_planned_total_is_raised() -> None:
    bound = next_bound(RULE, [used(FIRST), used(SECOND)], look(3, 300, planned_events=800))
    assert "already spent" in reason(bound)
    assert bound.alpha_spent == SECOND.alpha_spent


def test_a_revised_total_keeps_the_bounds_used_and_the_information_recorded() -> None:
    past = [used(FIRST), used(SECOND)]
    bound = next_bound(RULE, past, look(3, 390, planned_events=520))
    assert bound.information_fraction == 0.75
    assert bound.efficacy_z == pytest.approx(2.6006, abs=5e-5)  # computed independently


def test_a_spend_that_no_double_can_hold_has_no_bound_and_says_so() -> None:
    bound = next_bound(RULE, (), look(1, 3, planned_events=1000))
    assert "less than a double can hold" in reason(bound)
    assert bound.alpha_spent == 0.0


def test_bounds_as_used_are_taken_as_given() -> None:
    rounded = used(FIRST, efficacy_z=3.0)
    bound = next_bound(RULE, [rounded], look(2, 280))
    assert isinstance(bound.efficacy_z, float)
    assert isinstance(SECOND.efficacy_z, float)
    assert bound.efficacy_z < SECOND.efficacy_z  # a lower first bound took more paths away


def test_after_a_crossing_there_is_no_second_test() -> None:
    bound = next_bound(RULE, [used(FIRST, crossed="efficacy")], look(2, 280))
    assert "crossed at look 1" in reason(bound)
    assert bound.alpha_spent == FIRST.alpha_spent


def test_a_harm_crossing_does_not_end_the_efficacy_test() -> None:
    assert next_bound(RULE, [used(FIRST, crossed="harm")], look(2, 280)) == SECOND


def test_the_nominal_p_and_the_hazard_ratio_are_those_of_the_bound() -> None:
    assert isinstance(FIRST.efficacy_z, float)
    assert FIRST.efficacy_p_one_sided == pytest.approx(
        math.erfc(FIRST.efficacy_z / math.sqrt(2.0)) / 2.0, rel=1e-12
    )
    assert FIRST.efficacy_hazard_ratio == pytest.approx(
        math.exp(-FIRST.efficacy_z / math.sqrt(35.0)), rel=1e-14
    )


def test_the_hazard_ratio_at_the_bound_is_above_one_when_the_event_is_good() -> None:
    bad, good = hazard_ratio_at(2.0, 25.0, 1), hazard_ratio_at(2.0, 25.0, -1)
    assert (bad, good) == pytest.approx((math.exp(-0.4), math.exp(0.4)), rel=1e-15)


def test_without_score_variance_the_bound_has_no_hazard_ratio() -> None:
    missing = Absent("no log-rank test")
    bound = next_bound(RULE, (), replace(look(1, 140), score_variance=missing))
    assert bound.efficacy_z == FIRST.efficacy_z
    assert bound.efficacy_hazard_ratio == missing
    assert isinstance(hazard_ratio_at(2.0, 0.0, 1), Absent)


def test_two_sides_stop_on_both_sides() -> None:
    """At a level where it shows: paths that left below the lower bound cannot cross the upper one later."""
    rule = EfficacyRule(spending_function(Efficacy("Pocock-type"), 0.1), 2, 1)
    fractions = (80, 160, 240, 320, 400)
    looks = [look(number, events) for number, events in enumerate(fractions, start=1)]
    two = [bound.efficacy_z for bound in bounds_ahead(rule, (), looks)]
    one = [bound.efficacy_z for bound in bounds_ahead(replace(rule, sides=1), (), looks)]
    assert two[0] == one[0]
    assert all(b < a for a, b in zip(one[2:], two[2:], strict=True))  # type: ignore[operator]


def test_past_bounds_whose_information_does_not_increase_are_a_bug_in_the_caller() -> None:
    with pytest.raises(ValueError, match="information must exceed"):
        next_bound(RULE, [used(SECOND), used(FIRST)], look(3, 400))
