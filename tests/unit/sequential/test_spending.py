"""Spending functions at their edges; their values stand in tests/published and tests/precise."""

from __future__ import annotations

import pytest

from app.model.plan import Efficacy
from app.sequential.spending import SMALLEST_SPEND, SPENDING_NAMES, spending_function
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
