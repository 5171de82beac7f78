"""Spending functions at their edges; their values stand in tests/published and tests/precise."""

from __future__ import annotations

import pytest

from app.model.plan import Efficacy, Futility, Harm
from app.sequential.spending import (
    SMALLEST_SPEND,
    SPENDING_NAMES,
    harm_spending,
    spending_function,
    type_two_spending,
)
from tests.sequential_plans import efficacy_named


@pytest.mark.parametrize("name", SPENDING_NAMES)
@pytest.mark.parametrize("alpha", [1e-4, 0.025, 0.1, 0.2])
def test_nothing_is_spent_at_the_start_and_exactly_alpha_from_full_information_on(
    name: str, alpha: float
) -> None:
    spending = spending_function(efficacy_named(name, alpha), alpha)
    assert spending(0.0) == 0.0
    assert spending(1.0) == alpha
    assert spending(1.2) == alpha


@pytest.mark.parametrize("name", SPENDING_NAMES)
def test_spending_never_falls(name: str) -> None:
    spending = spending_function(efficacy_named(name, 0.025), 0.025)
    spent = [spending(percent / 100) for percent in range(101)]
    assert spent == sorted(spent)


def test_a_spend_that_no_double_can_hold_is_zero() -> None:
    spending = spending_function(Efficacy("O'Brien-Fleming-type"), 0.025)
    assert spending(0.0034) == 0.0
    assert spending(0.004) > SMALLEST_SPEND


def test_an_unknown_name_is_a_bug_in_the_caller() -> None:
    with pytest.raises(ValueError, match="spending must be one of"):
        spending_function(Efficacy("Pocock"), 0.025)


@pytest.mark.parametrize("alpha", [0.0, -0.1, 0.5, float("nan")])
def test_an_alpha_outside_its_domain_is_a_bug_in_the_caller(alpha: float) -> None:
    with pytest.raises(ValueError, match="alpha_one_side must lie in"):
        spending_function(Efficacy("Pocock-type"), alpha)


@pytest.mark.parametrize("parameter", [-2000.0, -1e-14, 0.0, 1e-14, 1e-320, 2000.0])
def test_hwang_shih_decani_holds_at_every_parameter(parameter: float) -> None:
    spending = spending_function(Efficacy("Hwang-Shih-DeCani", parameter=parameter), 0.025)
    spent = [spending(percent / 100) for percent in range(101)]
    assert spent == sorted(spent)
    assert spent[-1] == 0.025
    if abs(parameter) < 1.0:
        assert spent[50] == pytest.approx(0.0125, rel=1e-12)  # nearly linear


def test_a_table_is_read_along_straight_lines_from_nothing() -> None:
    points = ((0.4, 0.004), (0.8, 0.004), (1.0, 0.025))
    spending = spending_function(Efficacy("table", points=points), 0.025)
    spent = [spending(fraction) for fraction in (0.2, 0.4, 0.6, 0.8, 0.9, 1.0)]
    assert spent == pytest.approx([0.002, 0.004, 0.004, 0.004, 0.0145, 0.025], rel=1e-12)


@pytest.mark.parametrize("name", ["power", "Hwang-Shih-DeCani", "table"])
def test_a_function_without_its_key_is_a_bug_in_the_caller(name: str) -> None:
    with pytest.raises(ValueError, match="with the key it needs"):
        spending_function(Efficacy(name), 0.025)


def test_futility_spends_one_minus_the_power() -> None:
    spending = type_two_spending(Futility("power", exponent=2.0), 0.9)
    assert spending(0.5) == pytest.approx(0.025, rel=1e-12)
    assert spending(1.0) == pytest.approx(0.1, rel=1e-15)


@pytest.mark.parametrize(
    ("futility", "power"), [(Futility(rule="hazard ratio", limit=1.0), 0.9), (Futility("Pocock-type"), 1.0)]
)
def test_futility_without_spending_or_power_is_a_bug_in_the_caller(futility: Futility, power: float) -> None:
    with pytest.raises(ValueError, match="futility needs spending and a power"):
        type_two_spending(futility, power)


def test_harm_spends_its_own_alpha() -> None:
    assert harm_spending(Harm("Pocock-type", 0.05))(1.0) == 0.05
