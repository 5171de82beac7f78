"""Planned boundaries at the plan's looks and elsewhere, and what a plan's looks cost."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from app.errors import DesignInvalid
from app.model.boundary import PlannedBoundary
from app.model.plan import Design, Efficacy
from app.sequential.boundary import efficacy_rule
from app.sequential.design import crossing_power, events_by, planned_boundary

DESIGN = Design(0.025, 1, 0.9, 0.75, 533, (0.35, 0.7, 1.0))
OBRIEN_FLEMING_TYPE = Efficacy("O'Brien-Fleming-type")


def boundary(design: Design = DESIGN, **asked: object) -> PlannedBoundary:
    return planned_boundary(design, OBRIEN_FLEMING_TYPE, experimental_share=0.5, direction=1, **asked)  # type: ignore[arg-type]


def bounds_of(planned: PlannedBoundary) -> list[object]:
    return [bound.efficacy_z for bound in planned.bounds]


def test_the_plans_own_looks_end_in_a_final_one() -> None:
    planned = boundary()
    assert bounds_of(planned) == pytest.approx([3.6128, 2.4406, 2.0002], abs=5e-5)  # computed independently
    assert [bound.final for bound in planned.bounds] == [False, False, True]
    assert [bound.events for bound in planned.bounds] == [187, 374, 533]


def test_at_chosen_fractions_nothing_is_final_unless_said() -> None:
    asked = boundary(fractions=(0.3, 0.6))
    assert bounds_of(asked) == pytest.approx([3.9286, 2.6700], abs=5e-5)  # computed independently
    final = boundary(fractions=(0.35, 0.7), final=True)
    assert bounds_of(final) == pytest.approx([3.6128, 1.9603], abs=5e-5)  # computed independently
    assert [bound.final for bound in final.bounds] == [False, True]


def test_the_cost_is_that_of_the_plans_own_looks_whatever_is_asked() -> None:
    asked, own = boundary(fractions=(0.3, 0.6)), boundary()
    assert (asked.noncentrality, asked.inflation) == (own.noncentrality, own.inflation)
    assert asked.expected_fraction_design == own.expected_fraction_design


def test_one_look_costs_nothing() -> None:
    planned = boundary(replace(DESIGN, looks=(1.0,)))
    assert planned.noncentrality == pytest.approx(1.959963984540054 + 1.2815515655446004, abs=1e-9)
    assert planned.inflation == pytest.approx(1.0, abs=1e-9)
    assert planned.expected_fraction_null == planned.expected_fraction_design == 1.0


@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize("power", [0.1, 0.8, 0.999])
def test_the_noncentrality_gives_the_power(sides: int, power: float) -> None:
    design = replace(DESIGN, sides=sides, power=power, looks=(0.2, 0.25, 0.8, 1.0))  # type: ignore[arg-type]
    planned = boundary(design)
    rule = efficacy_rule(design, OBRIEN_FLEMING_TYPE, 1)
    assert isinstance(planned.noncentrality, float)
    assert crossing_power(planned.bounds, rule, planned.noncentrality) == pytest.approx(power, abs=1e-11)


def test_expected_information_falls_with_the_effect() -> None:
    planned = boundary()
    assert (
        0.35
        < planned.expected_fraction_design
        < planned.expected_fraction_half
        < planned.expected_fraction_null
        < 1.0  # type: ignore[operator]
    )


def test_the_hazard_ratio_uses_d_p_q_with_the_allocation_of_the_plan() -> None:
    planned = planned_boundary(DESIGN, OBRIEN_FLEMING_TYPE, experimental_share=2 / 3, direction=-1)
    first = planned.bounds[0]
    assert isinstance(first.efficacy_z, float)
    assert first.efficacy_hazard_ratio == pytest.approx(math.exp(first.efficacy_z / math.sqrt(187 * 2 / 9)))


def test_planned_score_variance_takes_the_place_of_d_p_q() -> None:
    design = replace(DESIGN, information="score variance", planned_score_variance=100.0)
    first = boundary(design).bounds[0]
    assert isinstance(first.efficacy_z, float)
    assert first.efficacy_hazard_ratio == pytest.approx(math.exp(-first.efficacy_z / math.sqrt(35.0)))


@pytest.mark.parametrize(
    ("fraction", "planned", "events"),
    [
        (0.07, 100, 7),
        (3 * 0.2, 100, 60),
        (1 / 3, 300, 100),
        (0.35, 533, 187),
        (1.0, 533, 533),
        (0.001, 533, 1),
    ],
)
def test_the_events_of_a_fraction_are_the_smallest_whole_number_that_reaches_it(
    fraction: float, planned: int, events: int
) -> None:
    assert events_by(fraction, planned) == events


@pytest.mark.parametrize("fractions", [(0.6, 0.3), (0.5, 0.5), (0.0, 0.5), (-0.1,), ()])
def test_fractions_out_of_order_get_a_sentence(fractions: tuple[float, ...]) -> None:
    with pytest.raises(DesignInvalid, match="Information fractions out of order in the looks asked for"):
        boundary(fractions=fractions)


def test_a_power_not_above_alpha_gets_a_sentence() -> None:
    with pytest.raises(DesignInvalid, match=r"Power not above alpha in the plan, \[design\]"):
        boundary(replace(DESIGN, power=0.025))
