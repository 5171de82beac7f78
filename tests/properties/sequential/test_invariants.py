"""What must hold for every plan, whatever its numbers."""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.special import ndtr, ndtri

from app.model.boundary import Bound, LookAsUsed
from app.model.plan import Sides
from app.sequential.boundary import LookAhead, bounds_ahead, next_bound
from app.sequential.density import Region, crossing_probabilities
from app.sequential.spending import SPENDING_NAMES
from tests.naive import two_look_boundary, two_look_crossing
from tests.sequential_plans import looks_at, rule_named

names = st.sampled_from(SPENDING_NAMES)
alphas = st.floats(1e-4, 0.2)
sides_of = st.sampled_from((1, 2))
percents = st.lists(st.integers(5, 99), min_size=1, max_size=5, unique=True).map(sorted)


def fractions_of(percents: list[int]) -> list[float]:
    return [*(percent / 100 for percent in percents), 1.0]


def z_of(bound: Bound) -> float:
    assert isinstance(bound.efficacy_z, float)
    return bound.efficacy_z


@given(names, alphas, sides_of)
def test_one_look_is_the_fixed_test(name: str, alpha: float, sides: Sides) -> None:
    (bound,) = bounds_ahead(rule_named(name, alpha, sides), (), looks_at([1.0]))
    assert z_of(bound) == pytest.approx(-ndtri(alpha), abs=1e-12)
    assert bound.alpha_spent == alpha


@given(names, alphas, sides_of, percents)
def test_spends_add_up_to_alpha_and_so_do_the_crossings(
    name: str, alpha: float, sides: Sides, percents: list[int]
) -> None:
    rule, fractions = rule_named(name, alpha, sides), fractions_of(percents)
    bounds = bounds_ahead(rule, (), looks_at(fractions))
    assert math.fsum(bound.alpha_spent_here for bound in bounds) == pytest.approx(alpha, rel=1e-13)
    crossings = crossing_probabilities(fractions, [rule.region(z_of(bound)) for bound in bounds])
    assert crossings.upper.sum() == pytest.approx(alpha, abs=1e-12)


@given(names, alphas, sides_of, percents, st.floats(1e-3, 1e4))
def test_the_unit_of_information_does_not_matter(
    name: str, alpha: float, sides: Sides, percents: list[int], scale: float
) -> None:
    rule, fractions = rule_named(name, alpha, sides), fractions_of(percents)
    plain = [z_of(bound) for bound in bounds_ahead(rule, (), looks_at(fractions))]
    scaled = [z_of(bound) for bound in bounds_ahead(rule, (), looks_at(fractions, scale))]
    assert scaled == pytest.approx(plain, abs=1e-11)


@given(names, alphas, sides_of, percents)
def test_at_the_first_bound_p_is_the_alpha_spent(
    name: str, alpha: float, sides: Sides, percents: list[int]
) -> None:
    first = bounds_ahead(rule_named(name, alpha, sides), (), looks_at(fractions_of(percents)))[0]
    assert first.efficacy_p_one_sided == pytest.approx(first.alpha_spent, rel=1e-12)
    assert first.efficacy_p_one_sided == float(ndtr(-z_of(first)))


@given(names, alphas, sides_of, percents, st.integers(1, 99))
def test_a_look_that_spends_nothing_changes_nothing_after_it(
    name: str, alpha: float, sides: Sides, percents: list[int], safety_percent: int
) -> None:
    rule, looks = rule_named(name, alpha, sides), looks_at(fractions_of(percents))
    safety = LookAhead(0, "safety", safety_percent / 100, safety_percent / 100, 0, 1.0)
    later = [look for look in looks if look.information > safety.information]
    held = [*(look for look in looks if look.information <= safety.information), safety, *later]
    with_it = bounds_ahead(rule, (), held)
    assert [bound for bound in with_it if bound.number] == list(bounds_ahead(rule, (), looks))


@given(names, alphas, sides_of, percents)
def test_looks_recorded_one_by_one_give_the_bounds_of_the_plan(
    name: str, alpha: float, sides: Sides, percents: list[int]
) -> None:
    rule, looks = rule_named(name, alpha, sides), looks_at(fractions_of(percents))
    past: list[LookAsUsed] = []
    for look in looks:
        bound = next_bound(rule, past, look)
        past.append(
            LookAsUsed(look.number, look.kind, look.information, look.events, look.fraction, 0.0,
                       bound.efficacy_z, bound.alpha_spent, bound.final)
        )  # fmt: skip
    assert [used.efficacy_z for used in past] == [bound.efficacy_z for bound in bounds_ahead(rule, (), looks)]


@given(names, alphas, percents)
def test_a_two_sided_bound_is_not_above_the_one_sided_bound_of_its_side(
    name: str, alpha: float, percents: list[int]
) -> None:
    """Paths that left below cannot cross above, so less is left to cross and the bound comes down."""
    looks = looks_at(fractions_of(percents))
    one = bounds_ahead(rule_named(name, alpha, 1), (), looks)
    two = bounds_ahead(rule_named(name, alpha, 2), (), looks)
    assert all(z_of(b) <= z_of(a) + 1e-12 for a, b in zip(one, two, strict=True))


@given(percents, st.data())
def test_the_mirror_image_has_mirrored_crossings(percents: list[int], data: st.DataObject) -> None:
    fractions = fractions_of(percents)
    upper = data.draw(st.lists(st.floats(0.5, 5.0), min_size=len(fractions), max_size=len(fractions)))
    lower = data.draw(st.lists(st.floats(-5.0, 0.4), min_size=len(fractions), max_size=len(fractions)))
    drift = data.draw(st.floats(-4.0, 4.0))
    there = crossing_probabilities(
        fractions, [Region(*b) for b in zip(lower, upper, strict=True)], drift=drift
    )
    mirrored = [Region(-high, -low) for low, high in zip(lower, upper, strict=True)]
    back = crossing_probabilities(fractions, mirrored, drift=-drift)
    assert back.lower.tolist() == pytest.approx(there.upper.tolist(), abs=1e-13)
    assert back.upper.tolist() == pytest.approx(there.lower.tolist(), abs=1e-13)


@given(names, alphas, sides_of, percents)
def test_power_grows_with_the_effect(name: str, alpha: float, sides: Sides, percents: list[int]) -> None:
    rule, fractions = rule_named(name, alpha, sides), fractions_of(percents)
    regions = [rule.region(z_of(bound)) for bound in bounds_ahead(rule, (), looks_at(fractions))]
    power = [
        crossing_probabilities(fractions, regions, drift=drift).upper.sum() for drift in (0.0, 0.5, 1.5, 3.0)
    ]
    assert all(less < more for less, more in pairwise(power))


@given(st.integers(1, 99))
def test_the_slow_two_look_crossing_has_the_closed_form_of_a_quadrant(percent: int) -> None:
    """P(Z1 < 0, Z2 > 0) = 1/4 - asin(r) / (2 pi) with r = sqrt(t) (Sheppard 1899)."""
    quadrant = 0.25 - math.asin(math.sqrt(percent / 100)) / (2.0 * math.pi)
    assert two_look_crossing(percent / 100, 0.0, 0.0) == pytest.approx(quadrant, abs=1e-5)


@pytest.mark.parametrize("name", SPENDING_NAMES)
@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize(("fraction", "alpha"), [(0.5, 0.025), (0.35, 0.1)])
def test_two_looks_agree_with_the_slow_boundary(
    name: str, sides: Sides, fraction: float, alpha: float
) -> None:
    rule = rule_named(name, alpha, sides)
    bounds = bounds_ahead(rule, (), looks_at([fraction, 1.0]))
    slow = two_look_boundary(fraction, bounds[0].alpha_spent, alpha, sides)
    assert (z_of(bounds[0]), z_of(bounds[1])) == pytest.approx(slow, abs=2e-5)


@given(names, alphas, percents)
def test_the_direction_turns_the_hazard_ratio_and_nothing_else(
    name: str, alpha: float, percents: list[int]
) -> None:
    rule, looks = rule_named(name, alpha, 1), looks_at(fractions_of(percents))
    bad, good = bounds_ahead(rule, (), looks), bounds_ahead(replace(rule, direction=-1), (), looks)
    for a, b in zip(bad, good, strict=True):
        assert isinstance(a.efficacy_hazard_ratio, float)
        assert isinstance(b.efficacy_hazard_ratio, float)
        assert a.efficacy_hazard_ratio * b.efficacy_hazard_ratio == pytest.approx(1.0, rel=1e-12)
        assert replace(b, efficacy_hazard_ratio=a.efficacy_hazard_ratio) == a
