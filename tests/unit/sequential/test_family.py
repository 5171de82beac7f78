"""Fixed families at the plan's looks and at others; their constants stand in tests/published."""

from __future__ import annotations

import math

import pytest

from app.model.plan import Design, Efficacy, Sides
from app.model.values import Absent
from app.sequential.boundary import LookAhead, bounds_ahead, efficacy_rule
from app.sequential.family import FAMILY_NAMES, fixed_family, planned_constant
from tests.sequential_plans import looks_at

FIVE = (0.2, 0.4, 0.6, 0.8, 1.0)


def bounds_of(efficacy: Efficacy, fractions: tuple[float, ...], sides: Sides = 2) -> list[float | Absent]:
    rule = efficacy_rule(Design(0.025 * sides, sides, 0.9, 0.7, 400, FIVE), efficacy, 1)
    return [bound.efficacy_z for bound in bounds_ahead(rule, (), looks_at(fractions))]


def test_at_the_plan_s_looks_the_bounds_have_the_family_s_shape() -> None:
    constant = planned_constant(0.25, 0.025, 2, FIVE)
    expected = [constant * math.pow(fraction, -0.25) for fraction in FIVE]
    assert bounds_of(Efficacy("Wang-Tsiatis", shape=0.25), FIVE) == pytest.approx(expected, abs=1e-10)


@pytest.mark.parametrize(("name", "shape"), [("O'Brien-Fleming", 0.0), ("Pocock", 0.5)])
def test_two_families_are_wang_tsiatis_with_their_shape(name: str, shape: float) -> None:
    assert bounds_of(Efficacy(name), FIVE) == bounds_of(Efficacy("Wang-Tsiatis", shape=shape), FIVE)


def test_elsewhere_the_interim_bounds_keep_the_planned_constant_and_the_last_takes_up_what_is_left() -> None:
    constant = planned_constant(0.0, 0.025, 2, FIVE)
    *interim, last = bounds_of(Efficacy("O'Brien-Fleming"), (0.3, 0.5, 1.0))
    assert interim == pytest.approx([constant / math.sqrt(0.3), constant / math.sqrt(0.5)], rel=1e-14)
    assert isinstance(last, float)
    assert 1.96 < last < constant  # fewer looks than planned: more is left for the last


def test_haybittle_peto_holds_one_bound_until_the_end() -> None:
    *interim, last = bounds_of(Efficacy("Haybittle-Peto", interim_z=3.0), (1 / 3, 2 / 3, 1.0))
    assert interim == [3.0, 3.0]
    assert last == pytest.approx(1.975, abs=5e-4)  # computed independently


def test_the_alpha_spent_at_an_interim_look_is_its_crossing_probability() -> None:
    rule = efficacy_rule(Design(0.025, 1, 0.9, 0.7, 400, FIVE), Efficacy("Pocock"), 1)
    first = bounds_ahead(rule, (), looks_at([0.2, 1.0]))[0]
    assert first.alpha_spent == pytest.approx(first.efficacy_p_one_sided, rel=1e-13)


def test_more_looks_than_planned_never_spend_more_than_alpha() -> None:
    rule = efficacy_rule(Design(0.025, 1, 0.9, 0.7, 400, (0.5, 1.0)), Efficacy("Pocock"), 1)
    bounds = bounds_ahead(rule, (), looks_at([step / 10 for step in range(1, 11)]))
    spent = [bound.alpha_spent for bound in bounds]
    assert spent == sorted(spent)
    assert spent[-1] == 0.025
    assert isinstance(bounds[-1].efficacy_z, Absent)
    assert sum(bound.alpha_spent_here for bound in bounds) == pytest.approx(0.025, rel=1e-12)


def test_a_bound_too_far_out_for_a_double_is_no_bound() -> None:
    rule = efficacy_rule(Design(0.025, 1, 0.9, 0.7, 400, (0.5, 1.0)), Efficacy("O'Brien-Fleming"), 1)
    (bound,) = bounds_ahead(rule, (), [LookAhead(1, "planned", 0.002, 0.002, 1, 1.0)])
    assert isinstance(bound.efficacy_z, Absent)
    assert bound.alpha_spent == 0.0


@pytest.mark.parametrize(
    "efficacy", [Efficacy("Wang-Tsiatis"), Efficacy("Haybittle-Peto"), Efficacy("power")]
)
def test_a_family_without_its_key_is_a_bug_in_the_caller(efficacy: Efficacy) -> None:
    with pytest.raises(ValueError, match="spending must be one of"):
        fixed_family(efficacy, 0.025, 1, FIVE)


@pytest.mark.parametrize("name", FAMILY_NAMES)
def test_one_look_is_the_fixed_test(name: str) -> None:
    design = Design(0.025, 1, 0.9, 0.7, 400, (1.0,))
    rule = efficacy_rule(design, Efficacy(name, shape=0.3, interim_z=3.0), 1)
    (bound,) = bounds_ahead(rule, (), looks_at([1.0]))
    assert bound.efficacy_z == pytest.approx(1.959963984540054, abs=1e-12)
