"""The group-sequential core against nested integrals, the multivariate normal and backward induction."""

from __future__ import annotations

import math
from dataclasses import dataclass
from itertools import pairwise

import mpmath
import numpy as np
import pytest

from app.model.plan import Design, Efficacy, Sides
from app.sequential.boundary import EfficacyRule, LookAhead, bounds_ahead
from app.sequential.density import Crossings, Region, crossing_probabilities
from app.sequential.design import planned_boundary
from app.sequential.spending import SPENDING_NAMES, spending_function
from tests.precise.sequential_routes import backward_induction, multivariate_normal, nested_integrals
from tests.sequential_plans import looks_at, quick_then_slow, rule_named

STATED = 1e-10  # in probability
REACHED = 1e-13  # what the program does on all of these plans


@dataclass(frozen=True)
class Plan:
    """A random course of looks: any information, regions of one kind, any drift."""

    information: tuple[float, ...]
    bounds: tuple[tuple[float, float], ...]
    drift: float

    @classmethod
    def random(cls, looks: int, kind: str, seed: int) -> Plan:
        draw = np.random.default_rng([looks, len(kind), seed])
        information = np.cumsum(10.0 ** draw.uniform(-2.0, 0.0, looks)) * 10.0 ** draw.uniform(-1.0, 3.0)
        upper = draw.uniform(1.0, 4.5, looks)
        lower = {
            "efficacy": np.full(looks, -math.inf),
            "two-sided": -upper,
            "futility": draw.uniform(-3, 0.8, looks),
        }
        drift = draw.uniform(-3.0, 4.0) / math.sqrt(information[-1])
        bounds = zip(lower[kind].tolist(), upper.tolist(), strict=True)
        return cls(tuple(information.tolist()), tuple(bounds), float(drift))

    def crossings(self, refinement: int = 1) -> Crossings:
        regions = [Region(*bound) for bound in self.bounds]
        return crossing_probabilities(self.information, regions, drift=self.drift, refinement=refinement)

    def leaving_at_the_last_look(self) -> tuple[float, float]:
        crossings = self.crossings()
        return float(crossings.upper[-1]), float(crossings.lower[-1])


KINDS = pytest.mark.parametrize("kind", ["efficacy", "two-sided", "futility"])


@KINDS
@pytest.mark.parametrize("looks", [1, 2])
@pytest.mark.parametrize("seed", range(5))
def test_one_and_two_looks_agree_with_nested_integrals(looks: int, kind: str, seed: int) -> None:
    plan = Plan.random(looks, kind, seed)
    expected = nested_integrals(plan.information, plan.bounds, plan.drift)
    assert plan.leaving_at_the_last_look() == pytest.approx(expected, abs=REACHED)


@KINDS
@pytest.mark.slow
@pytest.mark.parametrize("seed", range(3))
def test_three_looks_agree_with_nested_integrals(kind: str, seed: int) -> None:
    plan = Plan.random(3, kind, seed)
    expected = nested_integrals(plan.information, plan.bounds, plan.drift)
    assert plan.leaving_at_the_last_look() == pytest.approx(expected, abs=REACHED)


@pytest.mark.parametrize(("first", "second"), [(4.0, 8.0), (7.0, 7.5), (2.0, 9.0), (12.0, 8.5)])
def test_tails_smaller_than_rounding_of_one_keep_their_digits(first: float, second: float) -> None:
    plan = Plan((0.4, 1.0), ((-math.inf, first), (-math.inf, second)), 0.0)
    expected, _ = nested_integrals(plan.information, plan.bounds, 0.0)
    assert expected < 1e-13
    assert plan.leaving_at_the_last_look()[0] == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("kind", ["two-sided", "futility"])
@pytest.mark.parametrize("looks", [2, 3, 4])
@pytest.mark.parametrize("seed", quick_then_slow(1, 8))
def test_up_to_four_looks_agree_with_the_multivariate_normal(looks: int, kind: str, seed: int) -> None:
    """The general library's integration carries an error of its own: up to 1.2e-7 on these plans."""
    plan = Plan.random(looks, kind, seed)
    expected = multivariate_normal(plan.information, plan.bounds, plan.drift, seed)
    assert plan.leaving_at_the_last_look() == pytest.approx(expected, abs=5e-7)


@KINDS
@pytest.mark.parametrize("looks", [3, 4, 5, 8, 13])
@pytest.mark.parametrize("seed", quick_then_slow(2, 20))
def test_many_looks_agree_with_backward_induction(looks: int, kind: str, seed: int) -> None:
    plan = Plan.random(looks, kind, seed)
    expected = backward_induction(plan.information, plan.bounds, plan.drift)
    assert plan.leaving_at_the_last_look() == pytest.approx(expected, abs=REACHED)


@KINDS
@pytest.mark.slow
@pytest.mark.parametrize("looks", [20, 30, 50])
@pytest.mark.parametrize("seed", range(8))
def test_up_to_fifty_looks_agree_with_backward_induction(looks: int, kind: str, seed: int) -> None:
    plan = Plan.random(looks, kind, seed)
    expected = backward_induction(plan.information, plan.bounds, plan.drift, intervals=800)
    assert plan.leaving_at_the_last_look() == pytest.approx(expected, abs=REACHED)


@KINDS
@pytest.mark.parametrize("looks", [2, 6, 15])
@pytest.mark.parametrize("seed", quick_then_slow(2, 15))
def test_doubling_the_grid_moves_no_probability(looks: int, kind: str, seed: int) -> None:
    plan = Plan.random(looks, kind, seed)
    once, twice = plan.crossings(), plan.crossings(refinement=2)
    assert once.upper.tolist() == pytest.approx(twice.upper.tolist(), abs=REACHED)
    assert once.lower.tolist() == pytest.approx(twice.lower.tolist(), abs=REACHED)


@dataclass(frozen=True)
class Spend:
    """A spending plan whose bounds are solved, then integrated again by the other route."""

    name: str
    alpha: float
    sides: Sides
    fractions: tuple[float, ...]

    @classmethod
    def random(cls, looks: int, seed: int) -> Spend:
        """Fractions are distinct hundredths ending at 1; alpha of one side from 1e-4 to 0.2."""
        draw = np.random.default_rng([looks, seed])
        hundredths = np.sort(draw.choice(np.arange(1, 100), looks - 1, replace=False)).tolist()
        fractions = (*(percent / 100 for percent in hundredths), 1.0)
        alpha = float(10.0 ** draw.uniform(-4.0, math.log10(0.2)))
        sides: Sides = 1 if draw.uniform() < 0.5 else 2
        return cls(str(draw.choice(SPENDING_NAMES)), alpha, sides, fractions)

    def worst_difference(self) -> float:
        """Largest distance between alpha spent at a look and its crossing probability by another route."""
        rule = rule_named(self.name, self.alpha, self.sides)
        found = bounds_ahead(rule, (), looks_at(self.fractions))
        held = [bound for bound in found if isinstance(bound.efficacy_z, float)]
        information = [bound.information_fraction for bound in held]
        regions = [rule.region(bound.efficacy_z) for bound in held if isinstance(bound.efficacy_z, float)]
        bounds = [(region.lower, region.upper) for region in regions]
        return max(
            abs(
                backward_induction(information[: at + 1], bounds[: at + 1], 0.0, 600)[0]
                - bound.alpha_spent_here
            )
            for at, bound in enumerate(held)
        )


@pytest.mark.parametrize("looks", [2, 3, 5, 10])
@pytest.mark.parametrize("seed", quick_then_slow(2, 25))
def test_each_bound_is_crossed_with_the_probability_spent_on_it(looks: int, seed: int) -> None:
    assert Spend.random(looks, seed).worst_difference() < REACHED


@pytest.mark.slow
@pytest.mark.parametrize("looks", [20, 50])
@pytest.mark.parametrize("seed", range(3))
def test_each_of_many_bounds_is_crossed_with_the_probability_spent_on_it(looks: int, seed: int) -> None:
    assert Spend.random(looks, seed).worst_difference() < REACHED


@pytest.mark.parametrize("name", SPENDING_NAMES)
@pytest.mark.parametrize("alpha", [1e-4, 0.025, 0.2])
@pytest.mark.parametrize("sides", [1, 2])
def test_looks_that_lie_close_together_keep_their_bounds(name: str, alpha: float, sides: Sides) -> None:
    assert Spend(name, alpha, sides, (0.01, 0.5, 0.505, 0.51, 1.0)).worst_difference() < REACHED


def test_looks_one_part_in_a_million_apart_keep_their_bounds() -> None:
    fractions = (0.5, 0.500001, 1.0)
    rule = EfficacyRule(spending_function(Efficacy("Pocock-type"), 0.025), 1, 1)
    looks = tuple(LookAhead(at, "planned", t, t, at, 1.0) for at, t in enumerate(fractions, start=1))
    bounds = [bound.efficacy_z for bound in bounds_ahead(rule, (), looks)]
    without = [bound.efficacy_z for bound in bounds_ahead(rule, (), (looks[0], looks[2]))]
    assert bounds[2] == pytest.approx(without[1], abs=1e-5)


def test_fifty_looks_spend_alpha_to_the_stated_accuracy() -> None:
    for sides in (1, 2):
        rule = EfficacyRule(spending_function(Efficacy("O'Brien-Fleming-type"), 0.025), sides, 1)
        looks = tuple(LookAhead(at, "planned", float(at), at / 50, at, 1.0) for at in range(1, 51))
        regions = [
            rule.region(b.efficacy_z)
            for b in bounds_ahead(rule, (), looks)
            if isinstance(b.efficacy_z, float)
        ]
        crossings = crossing_probabilities([float(at) for at in range(1, 51)], regions, refinement=2)
        assert crossings.upper.sum() == pytest.approx(0.025, abs=STATED)


@pytest.mark.parametrize("alpha", [1e-4, 0.005, 0.025, 0.1])
@pytest.mark.parametrize("fraction", [0.004, 0.01, 0.2, 0.35, 0.5, 0.505, 0.99])
def test_spending_agrees_with_its_formula_at_fifty_digits(alpha: float, fraction: float) -> None:
    with mpmath.workdps(50):
        t, level = mpmath.mpf(fraction), mpmath.mpf(alpha)
        quantile = mpmath.sqrt(2) * mpmath.erfinv(1 - level)
        obrien_fleming = float(mpmath.erfc(quantile / mpmath.sqrt(2 * t)))
        pocock = float(level * mpmath.log(1 + (mpmath.e - 1) * t))
    assert spending_function(Efficacy("Pocock-type"), alpha)(fraction) == pytest.approx(pocock, rel=1e-14)
    # far out a tail multiplies the rounding of its argument: relative error z^2 units in the last place
    assert spending_function(Efficacy("O'Brien-Fleming-type"), alpha)(fraction) == pytest.approx(
        obrien_fleming, rel=1e-12
    )


@pytest.mark.parametrize("key", [-30.0, -4.0, -0.3, 0.5, 1.0, 3.0, 30.0])
@pytest.mark.parametrize("fraction", [0.004, 0.01, 0.2, 0.35, 0.5, 0.505, 0.99])
def test_families_of_functions_agree_with_their_formula_at_fifty_digits(key: float, fraction: float) -> None:
    with mpmath.workdps(50):
        t, g, level = mpmath.mpf(fraction), mpmath.mpf(key), mpmath.mpf(0.025)
        hwang = float(level * (1 - mpmath.exp(-g * t)) / (1 - mpmath.exp(-g)))
        power = float(level * t ** abs(g))
    by_hwang = spending_function(Efficacy("Hwang-Shih-DeCani", parameter=key), 0.025)
    by_power = spending_function(Efficacy("power", exponent=abs(key)), 0.025)
    assert by_hwang(fraction) == pytest.approx(hwang, rel=1e-14)
    assert by_power(fraction) == pytest.approx(power, rel=1e-14)


@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize("fractions", [(0.35, 0.7, 1.0), (0.1, 0.5, 0.55, 0.9, 1.0)])
def test_the_noncentrality_gives_the_power_and_expected_fractions_by_another_route(
    sides: Sides, fractions: tuple[float, ...]
) -> None:
    design = Design(0.05, sides, 0.85, 0.7, 400, fractions)
    planned = planned_boundary(design, Efficacy("Pocock-type"), experimental_share=0.5, direction=1)
    z = [bound.efficacy_z for bound in planned.bounds if isinstance(bound.efficacy_z, float)]
    bounds = [(-c if sides == 2 else -math.inf, c) for c in z]
    assert isinstance(planned.noncentrality, float)
    leaving = [
        backward_induction(fractions[: at + 1], bounds[: at + 1], planned.noncentrality)
        for at in range(len(z))
    ]
    assert math.fsum(upper for upper, _ in leaving) == pytest.approx(0.85, abs=1e-11)
    stopped = np.cumsum([upper + lower for upper, lower in leaving]).tolist()
    expected = fractions[0] + math.fsum(
        (1.0 - gone) * (after - before)
        for gone, (before, after) in zip(stopped, pairwise(fractions), strict=False)
    )
    assert planned.expected_fraction_design == pytest.approx(expected, abs=1e-11)
