"""Carrying on: what counts as spent, safety looks at a price, and alpha spent by the calendar."""

from __future__ import annotations

from dataclasses import replace

import pytest

from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Efficacy
from app.model.values import Absent
from app.sequential.boundary import EfficacyRule, LookAhead, bounds_ahead, next_bound
from app.sequential.density import crossing_probabilities
from app.sequential.spending import spending_function

RULE = EfficacyRule(spending_function(Efficacy("O'Brien-Fleming-type"), 0.025), 1, 1)
BY_CROSSING = replace(RULE, carry_on="crossing")


def look(number: int, events: int, kind: str = "planned", **more: object) -> LookAhead:
    return LookAhead(number, kind, float(events), events / 400, events, events / 4.0, **more)  # type: ignore[arg-type]


def used(bound: Bound, kind: str = "planned", **changes: object) -> LookAsUsed:
    recorded = LookAsUsed(
        bound.number, kind, float(bound.events), bound.events, bound.information_fraction, 1.0,  # type: ignore[arg-type]
        bound.efficacy_z, bound.alpha_spent, bound.final, alpha_spent_here=bound.alpha_spent_here,
    )  # fmt: skip
    return replace(recorded, **changes)  # type: ignore[arg-type]


FIRST = next_bound(RULE, (), look(1, 140))
CHARTER = used(FIRST, efficacy_z=3.61, alpha_spent=0.0002)  # a bound and a spend as a charter rounds them


def test_nominally_the_alpha_recorded_counts_as_spent() -> None:
    bound = next_bound(RULE, [CHARTER], look(2, 280))
    assert bound.alpha_spent_here == RULE.spending(0.7) - 0.0002


def test_by_crossing_the_bounds_as_used_count_with_their_own_probability() -> None:
    bound = next_bound(BY_CROSSING, [CHARTER], look(2, 280))
    crossing = crossing_probabilities([140.0], [RULE.region(3.61)]).upper[0]
    assert bound.alpha_spent_here == pytest.approx(RULE.spending(0.7) - crossing, rel=1e-12)
    assert bound.alpha_spent == RULE.spending(0.7)


def test_by_crossing_rounded_bounds_add_up_to_alpha_again() -> None:
    """The last bound is that of a trial whose charter rounded the first two."""
    second = used(next_bound(RULE, [CHARTER], look(2, 280)), efficacy_z=2.44)
    last = next_bound(BY_CROSSING, [CHARTER, second], look(3, 400))
    assert isinstance(last.efficacy_z, float)
    regions = [RULE.region(z) for z in (3.61, 2.44, last.efficacy_z)]
    assert crossing_probabilities([140.0, 280.0, 400.0], regions).upper.sum() == pytest.approx(
        0.025, abs=1e-13
    )


def test_both_rules_agree_where_bounds_were_used_as_solved() -> None:
    nominal = next_bound(RULE, [used(FIRST)], look(2, 280))
    crossing = next_bound(BY_CROSSING, [used(FIRST)], look(2, 280))
    assert crossing.efficacy_z == pytest.approx(nominal.efficacy_z, abs=1e-12)


def test_a_safety_look_costs_the_alpha_that_the_plan_states() -> None:
    priced = replace(RULE, safety_spend=0.0001)
    safety = next_bound(priced, [used(FIRST)], look(2, 200, kind="safety"))
    assert isinstance(safety.efficacy_z, Absent)
    assert "the alpha that the plan states" in safety.efficacy_z.reason
    assert safety.alpha_spent == FIRST.alpha_spent + 0.0001
    assert safety.alpha_spent_here == 0.0001
    after = next_bound(priced, [used(FIRST), used(safety, kind="safety")], look(3, 280))
    assert after.alpha_spent_here == pytest.approx(RULE.spending(0.7) - safety.alpha_spent, rel=1e-12)


@pytest.mark.parametrize("rule", [RULE, BY_CROSSING])
def test_the_price_of_a_safety_look_is_gone_under_both_rules(rule: EfficacyRule) -> None:
    priced = replace(rule, safety_spend=0.001)
    safety = used(next_bound(priced, [used(FIRST)], look(2, 200, kind="safety")), kind="safety")
    last = next_bound(priced, [used(FIRST), safety], look(3, 400))
    assert isinstance(last.efficacy_z, float)
    regions = [RULE.region(FIRST.efficacy_z), RULE.region(last.efficacy_z)]
    assert crossing_probabilities([140.0, 400.0], regions).upper.sum() == pytest.approx(0.024, abs=1e-12)


def test_a_safety_look_never_costs_more_than_is_left() -> None:
    spent = used(FIRST, alpha_spent=0.0249)
    safety = next_bound(replace(RULE, safety_spend=0.001), [spent], look(2, 200, kind="safety"))
    assert safety.alpha_spent == pytest.approx(0.025, abs=1e-15)


def test_by_the_calendar_alpha_goes_by_time_and_correlations_by_information() -> None:
    by_time = bounds_ahead(RULE, (), [look(1, 140, clock=0.5), look(2, 280, clock=0.6)])
    assert [bound.alpha_spent for bound in by_time] == [RULE.spending(0.5), RULE.spending(0.6)]
    assert [bound.information_fraction for bound in by_time] == [0.35, 0.7]
    by_events = bounds_ahead(RULE, (), [look(1, 200), look(2, 240)])
    assert by_time[0].efficacy_z == pytest.approx(by_events[0].efficacy_z, abs=1e-12)
    assert by_time[1].efficacy_z != pytest.approx(by_events[1].efficacy_z, abs=1e-3)


def test_the_planned_end_is_final_whatever_the_events() -> None:
    assert look(3, 350, clock=1.0).final
    assert not look(3, 350, clock=0.99).final
    assert not look(3, 350, "safety", clock=1.2).final
    last = next_bound(RULE, [used(FIRST)], look(3, 350, clock=1.0))
    assert last.alpha_spent == 0.025


def test_the_price_of_nothing_new_is_still_the_price() -> None:
    """A safety look at an event count that fell spends its stated alpha all the same."""
    safety = next_bound(replace(RULE, safety_spend=0.0001), [used(FIRST)], look(2, 130, kind="safety"))
    assert safety.alpha_spent_here == 0.0001


def test_a_safety_look_costs_what_it_says_whatever_a_charter_recorded_before_it() -> None:
    """Spent by crossing: neither what was recorded of a rounded bound nor its difference is the price."""
    charter = used(FIRST, efficacy_z=2.9, alpha_spent=0.0001)
    safety = used(next_bound(BY_CROSSING, [charter], look(2, 200, kind="safety")), kind="safety")
    with_it = next_bound(BY_CROSSING, [charter, safety], look(3, 280))
    without = next_bound(BY_CROSSING, [charter], look(3, 280))
    assert with_it.efficacy_z == pytest.approx(without.efficacy_z, abs=1e-12)
    priced = replace(BY_CROSSING, safety_spend=0.001)
    paid = used(next_bound(priced, [charter], look(2, 200, kind="safety")), kind="safety")
    assert paid.alpha_spent_here == 0.001
    dearer = next_bound(priced, [charter, paid], look(3, 280))
    assert dearer.alpha_spent_here == pytest.approx(without.alpha_spent_here - 0.001, abs=1e-12)


@pytest.mark.parametrize("rule", [RULE, BY_CROSSING])
def test_what_rounding_leaves_of_alpha_is_not_spent(rule: EfficacyRule) -> None:
    """A second final look, after one that spent all: no bound from a spend of 1e-17."""
    last = used(next_bound(rule, [used(FIRST)], look(2, 300, kind="final")), kind="final")
    again = next_bound(rule, [used(FIRST), last], look(3, 400, kind="final"))
    assert isinstance(again.efficacy_z, Absent)
    assert "already spent" in again.efficacy_z.reason
