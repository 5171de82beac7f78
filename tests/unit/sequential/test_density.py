"""The recursion at the edges of its domain; its numbers stand in tests/precise."""

from __future__ import annotations

import math

import pytest
from scipy.special import ndtr, ndtri

from app.errors import AccuracyNotReached
from app.sequential.density import Region, crossing_probabilities, start, upper_bound_for

NORMAL_975 = 1.959963984540054  # any table of the normal distribution


def test_one_look_is_a_normal_tail() -> None:
    crossings = crossing_probabilities([7.0], [Region(-1.0, 2.0)], drift=0.3)
    mean = 0.3 * math.sqrt(7.0)
    assert crossings.upper[0] == pytest.approx(ndtr(mean - 2.0), rel=1e-14)
    assert crossings.lower[0] == pytest.approx(ndtr(-1.0 - mean), rel=1e-14)


def test_a_region_without_bounds_leaves_every_other_look_as_it_is() -> None:
    bounded = (Region(-math.inf, 3.0), Region(-math.inf, 2.0))
    between = (bounded[0], Region(), bounded[1])
    without = crossing_probabilities([0.4, 1.0], bounded)
    with_it = crossing_probabilities([0.4, 0.7, 1.0], between)
    assert with_it.upper.tolist() == [without.upper[0], 0.0, without.upper[1]]


def test_a_bound_found_from_no_earlier_look_is_the_normal_quantile() -> None:
    assert upper_bound_for(start().before(3.0), 3.0, 0.025) == pytest.approx(NORMAL_975, abs=1e-14)


def test_a_first_bound_holds_down_to_the_smallest_double() -> None:
    z = upper_bound_for(start().before(1.0), 1.0, 1e-307)
    assert z == pytest.approx(-ndtri(1e-307), rel=1e-13)


def test_a_bound_is_found_although_the_first_guess_has_no_probability_left() -> None:
    course = start().then(0.5, Region(-math.inf, 1.0))
    z = upper_bound_for(course.before(0.50001), 0.50001, 1e-12)
    assert course.before(0.50001).above(0.50001, z) == pytest.approx(1e-12, rel=1e-10)
    assert 1.0 < z < 1.03


def test_more_spend_than_paths_are_left_is_not_answered() -> None:
    course = start().then(0.5, Region(-math.inf, -1.0))
    with pytest.raises(AccuracyNotReached, match="The bound was not found in the look at information 1"):
        upper_bound_for(course.before(1.0), 1.0, 0.2)


@pytest.mark.parametrize(
    "information", [[0.0, 1.0], [0.5, 0.5], [0.5, 0.4], [-1.0, 1.0], [float("nan"), 1.0]]
)
def test_information_that_does_not_increase_is_a_bug_in_the_caller(information: list[float]) -> None:
    with pytest.raises(ValueError, match="information must exceed"):
        crossing_probabilities(information, [Region(-math.inf, 2.0)] * 2)


def test_a_region_must_have_an_inside() -> None:
    with pytest.raises(ValueError, match="lower < upper"):
        Region(2.0, 2.0)


def test_looks_too_close_for_the_quadrature_are_refused_in_a_sentence() -> None:
    with pytest.raises(AccuracyNotReached, match="Two looks lie too close together"):
        crossing_probabilities([0.5, 0.5 + 1e-10], [Region(-math.inf, 2.0)] * 2)


def test_doubling_the_nodes_moves_nothing() -> None:
    information = [0.01, 0.3, 0.305, 0.9, 1.0]
    regions = [
        Region(-4.0, 5.0),
        Region(-1.0, 3.0),
        Region(-0.5, 2.8),
        Region(-math.inf, 2.2),
        Region(2.0, 2.1),
    ]
    once = crossing_probabilities(information, regions, drift=1.5)
    twice = crossing_probabilities(information, regions, drift=1.5, refinement=2)
    assert once.upper.tolist() == pytest.approx(twice.upper.tolist(), abs=1e-13)
    assert once.lower.tolist() == pytest.approx(twice.lower.tolist(), abs=1e-13)
