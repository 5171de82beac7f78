"""What must hold for every plan with futility or harm, whatever its numbers."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from app.model.boundary import Bound
from app.model.plan import Design, Futility, Harm
from app.model.values import Absent
from app.sequential.design import planned_boundary
from app.sequential.effect import planned_looks, rules_of
from app.sequential.spending import SPENDING_NAMES
from tests.sequential_plans import efficacy_named

names = st.sampled_from(SPENDING_NAMES)
alphas = st.floats(0.005, 0.1)
powers = st.floats(0.6, 0.95)
parameters = st.floats(-8.0, -1.0)
twentieths = st.lists(st.integers(3, 19), min_size=1, max_size=4, unique=True).map(sorted)


def design_of(alpha: float, power: float, steps: list[int]) -> Design:
    return Design(alpha, 1, power, 0.7, 400, (*(step / 20 for step in steps), 1.0))


def bounds_of(
    design: Design, name: str, futility: Futility | None, harm: Harm | None = None
) -> tuple[Bound, ...]:
    rules = rules_of(
        design,
        efficacy_named(name, design.alpha),
        experimental_share=0.5,
        direction=1,
        futility=futility,
        harm=harm,
    )
    return rules.bounds((), planned_looks(design, design.looks, 0.5, final=False))


@given(names, alphas, powers, parameters, twentieths)
def test_non_binding_futility_changes_no_efficacy_bound_and_spends_all_of_the_type_two_error(
    name: str, alpha: float, power: float, parameter: float, steps: list[int]
) -> None:
    design = design_of(alpha, power, steps)
    with_it = bounds_of(design, name, Futility("Hwang-Shih-DeCani", parameter=parameter))
    assert [bound.efficacy_z for bound in with_it] == [
        bound.efficacy_z for bound in bounds_of(design, name, None)
    ]
    assert with_it[-1].type_two_spent == pytest.approx(1.0 - power, abs=1e-9)
    assert with_it[-1].futility_z == with_it[-1].efficacy_z
    spent = [bound.type_two_spent for bound in with_it]
    assert spent == sorted(spent)  # type: ignore[type-var]


@given(names, alphas, powers, parameters, twentieths)
def test_binding_futility_never_raises_an_efficacy_bound(
    name: str, alpha: float, power: float, parameter: float, steps: list[int]
) -> None:
    design = design_of(alpha, power, steps)
    futility = Futility("Hwang-Shih-DeCani", parameter=parameter, binding=True)
    for plain, bound in zip(bounds_of(design, name, None), bounds_of(design, name, futility), strict=True):
        assert bound.efficacy_z <= plain.efficacy_z + 1e-12  # type: ignore[operator]


@given(names, alphas, powers, parameters, twentieths)
def test_futility_costs_information_and_saves_it_under_no_effect(
    name: str, alpha: float, power: float, parameter: float, steps: list[int]
) -> None:
    design, efficacy = design_of(alpha, power, steps), efficacy_named(name, alpha)
    futility = Futility("Hwang-Shih-DeCani", parameter=parameter)
    plain, with_it = (
        planned_boundary(design, efficacy, experimental_share=0.5, direction=1, futility=rule)
        for rule in (None, futility)
    )
    assert with_it.noncentrality >= plain.noncentrality - 1e-9  # type: ignore[operator]
    assert with_it.expected_fraction_null <= plain.expected_fraction_null + 1e-12  # type: ignore[operator]
    power_spent = math.fsum(chance.efficacy for chance in with_it.chances_design)
    assert power_spent == pytest.approx(power, abs=1e-9)


@given(st.sampled_from(["O'Brien-Fleming-type", "Pocock-type"]), alphas, st.floats(1e-4, 0.2), twentieths)
def test_harm_is_the_mirror_of_efficacy_at_its_own_alpha_and_changes_nothing_else(
    spending: str, alpha: float, harm_alpha: float, steps: list[int]
) -> None:
    design = design_of(alpha, 0.9, steps)
    with_it = bounds_of(design, "O'Brien-Fleming-type", None, Harm(spending, harm_alpha))
    mirror = bounds_of(replace(design, alpha=harm_alpha), spending, None)
    assert [bound.harm_z for bound in with_it] == [-bound.efficacy_z for bound in mirror]  # type: ignore[operator]
    assert [bound.harm_alpha_spent for bound in with_it] == [bound.alpha_spent for bound in mirror]
    without = bounds_of(design, "O'Brien-Fleming-type", None)
    assert [bound.efficacy_z for bound in with_it] == [bound.efficacy_z for bound in without]


@given(names, alphas, powers, st.floats(0.01, 0.6), twentieths)
def test_a_rule_on_conditional_power_gives_lower_bounds_for_lower_limits(
    name: str, alpha: float, power: float, limit: float, steps: list[int]
) -> None:
    design = design_of(alpha, power, steps)
    lower, higher = (
        bounds_of(design, name, Futility(rule="conditional power", limit=at)) for at in (limit / 2.0, limit)
    )
    pairs = [
        (low.futility_z, high.futility_z)
        for low, high in zip(lower[:-1], higher[:-1], strict=True)
        if not isinstance(high.futility_z, Absent)
    ]
    assume(pairs)
    assert all(low < high for low, high in pairs)  # type: ignore[operator]
