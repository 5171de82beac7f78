"""What was crossed, and that a first crossing stands."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from app.model.boundary import Bound, Crossed, LookAsUsed, Verdict
from app.model.plan import Sides
from app.model.values import Absent
from app.sequential.verdict import crossed, verdict

BOUND = Bound(2, 0.7, 280, False, 0.0074, 0.0072, 2.4406, 0.0073, 0.75)
LOOK = LookAsUsed(1, "planned", 140.0, 140, 0.35, 1.0, 3.6128, 0.00015, False)
NO_BOUND = replace(BOUND, efficacy_z=Absent("a safety look"))


@pytest.mark.parametrize(
    ("z", "sides", "expected"),
    [
        (2.4406, 1, "efficacy"),
        (math.nextafter(2.4406, 0.0), 1, "none"),
        (2.4406, 2, "efficacy"),
        (-2.4406, 2, "control"),
        (math.nextafter(-2.4406, 0.0), 2, "none"),
        (-5.0, 1, "none"),
        (None, 1, "none"),
    ],
)
def test_z_at_the_bound_crosses_it_and_one_bit_below_does_not(
    z: float | None, sides: Sides, expected: Crossed
) -> None:
    assert crossed(z, BOUND, sides) == expected


def test_where_there_is_no_bound_nothing_is_crossed() -> None:
    assert crossed(9.0, NO_BOUND, 2) == "none"


def test_a_crossing_now_is_the_first_when_none_came_before() -> None:
    assert verdict([LOOK], 3.0, BOUND, 1) == Verdict("efficacy", 2)
    assert verdict([LOOK], -3.0, BOUND, 2) == Verdict("control", 2)
    assert verdict([LOOK], 1.0, BOUND, 1) == Verdict("none", None)


@pytest.mark.parametrize("side", ["efficacy", "control"])
def test_a_first_crossing_stands_whatever_follows(side: Crossed) -> None:
    past = [replace(LOOK, crossed=side)]
    assert verdict(past, 3.0, BOUND, 2) == Verdict("none", 1)
    assert verdict(past, -1.0, NO_BOUND, 2) == Verdict("none", 1)


def test_a_harm_crossing_before_leaves_the_efficacy_bound_in_force() -> None:
    assert verdict([replace(LOOK, crossed="harm")], 3.0, BOUND, 1) == Verdict("efficacy", 2)


FULL = replace(BOUND, futility_z=0.9, harm_z=-2.1)


@pytest.mark.parametrize(
    ("z", "expected"),
    [(2.5, "efficacy"), (1.5, "none"), (0.9, "futility"), (-2.0, "futility"), (-2.1, "harm"), (-4.0, "harm")],
)
def test_below_lie_futility_and_further_below_harm(z: float, expected: Crossed) -> None:
    assert crossed(z, FULL, 1) == expected


def test_harm_may_be_judged_by_the_z_of_another_endpoint() -> None:
    assert crossed(1.5, FULL, 1, z_for_harm=-2.2) == "harm"
    assert crossed(-3.0, FULL, 1, z_for_harm=0.0) == "futility"
    assert crossed(2.5, FULL, 1, z_for_harm=-2.2) == "efficacy"


def test_a_bound_that_does_not_exist_is_not_crossed() -> None:
    none = Absent("no new information")
    assert crossed(-5.0, replace(BOUND, futility_z=none, harm_z=none), 1) == "none"


def test_a_final_look_crosses_efficacy_or_nothing() -> None:
    final = replace(FULL, final=True, futility_z=2.4406)
    assert crossed(2.4, final, 1) == "none"
    assert crossed(-4.0, final, 1) == "none"
    assert crossed(2.4406, final, 1) == "efficacy"


def test_harm_is_crossed_where_there_is_no_efficacy_bound() -> None:
    assert crossed(-2.5, replace(FULL, efficacy_z=Absent("a safety look"), futility_z=None), 1) == "harm"


@pytest.mark.parametrize(("binding", "first"), [(False, None), (True, 2)])
def test_a_futility_crossing_stands_only_where_it_is_binding(binding: bool, first: int | None) -> None:
    assert verdict([LOOK], 0.5, FULL, 1, binding=binding) == Verdict("futility", first)
    later = verdict([replace(LOOK, crossed="futility")], 3.0, FULL, 1, binding=binding)
    assert later == (Verdict("none", 1) if binding else Verdict("efficacy", 2))
