"""Families, futility and harm over random plans: each bound is crossed as often as it should be."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import pytest

from app.model.boundary import Bound
from app.model.plan import Design, Efficacy, Futility, Harm, Sides
from app.model.values import Absent
from app.sequential.effect import noncentrality_for_power, planned_looks, rules_of
from app.sequential.family import FAMILY_NAMES, planned_constant
from tests.precise.sequential_routes import backward_induction, multivariate_normal, nested_integrals
from tests.sequential_plans import SPENDINGS, efficacy_named, quick_then_slow

REACHED = 1e-12  # in probability; the program states 1e-10


def fractions_of(draw: np.random.Generator, looks: int) -> tuple[float, ...]:
    """Distinct twentieths, ending at 1."""
    twentieths = np.sort(draw.choice(np.arange(2, 20), looks - 1, replace=False)).tolist()
    return (*(step / 20 for step in twentieths), 1.0)


def number(z: float | Absent | None) -> float:
    """A bound, minus infinity where there is none."""
    return -math.inf if z is None or isinstance(z, Absent) else z


def leaving(
    fractions: Sequence[float], bounds: Sequence[tuple[float, float]], drift: float
) -> list[tuple[float, float]]:
    """First crossings upwards and downwards at each look, by backward induction where there are bounds."""
    kept = [at for at, (low, high) in enumerate(bounds) if math.isfinite(low) or math.isfinite(high)]
    found = [(0.0, 0.0)] * len(bounds)
    for place, at in enumerate(kept):
        so_far = kept[: place + 1]
        found[at] = backward_induction(
            [fractions[k] for k in so_far], [bounds[k] for k in so_far], drift, 600
        )
    return found


@dataclass(frozen=True)
class FutilityPlan:
    """A one-sided plan with futility by spending, drawn at random."""

    design: Design
    efficacy: Efficacy
    futility: Futility

    @classmethod
    def random(cls, looks: int, binding: bool, seed: int) -> FutilityPlan:
        draw = np.random.default_rng([looks, binding, seed])
        alpha, power = float(draw.uniform(0.005, 0.1)), float(draw.uniform(0.7, 0.95))
        design = Design(alpha, 1, power, 0.7, 400, fractions_of(draw, looks))
        spending = efficacy_named(str(draw.choice(SPENDINGS)), alpha)
        slow = Futility("Hwang-Shih-DeCani", parameter=float(draw.uniform(-6.0, -2.0)), binding=binding)
        return cls(
            design,
            spending,
            slow if draw.uniform() < 0.5 else Futility("O'Brien-Fleming-type", binding=binding),
        )

    @property
    def effect(self) -> float:
        rule = rules_of(self.design, self.efficacy, experimental_share=0.5, direction=1).efficacy
        return noncentrality_for_power(rule, self.design, 0.5, self.futility)

    @property
    def bounds(self) -> tuple[Bound, ...]:
        rules = rules_of(
            self.design, self.efficacy, experimental_share=0.5, direction=1, futility=self.futility
        )
        return rules.bounds((), planned_looks(self.design, self.design.looks, 0.5, final=False))


@pytest.mark.parametrize("binding", [False, True])
@pytest.mark.parametrize("looks", [2, 3, 5])
@pytest.mark.parametrize("seed", quick_then_slow(2, 20))
def test_futility_and_efficacy_are_crossed_as_often_as_they_spend(
    looks: int, binding: bool, seed: int
) -> None:
    plan = FutilityPlan.random(looks, binding, seed)
    bounds, fractions = plan.bounds, plan.design.looks
    last = len(bounds) - 1
    stops = [
        (-math.inf if at == last else number(bound.futility_z), number(bound.efficacy_z))
        for at, bound in enumerate(bounds)
    ]
    under_effect = leaving(fractions, stops, plan.effect)
    assert math.fsum(up for up, _ in under_effect) == pytest.approx(plan.design.power, abs=1e-9)
    spent = np.cumsum([down for _, down in under_effect])[:-1].tolist()
    assert spent == pytest.approx([bound.type_two_spent for bound in bounds[:-1]], abs=REACHED)
    assert bounds[-1].type_two_spent == pytest.approx(1.0 - plan.design.power, abs=1e-9)
    under_none = leaving(fractions, stops if binding else [(-math.inf, high) for _, high in stops], 0.0)
    assert [up for up, _ in under_none] == pytest.approx(
        [bound.alpha_spent_here for bound in bounds], abs=REACHED
    )


@pytest.mark.parametrize("seed", quick_then_slow(1, 5))
def test_two_looks_with_futility_agree_with_nested_integrals(seed: int) -> None:
    plan = FutilityPlan.random(2, True, seed)
    first, second = plan.bounds
    bounds = [(number(first.futility_z), number(first.efficacy_z)), (-math.inf, number(second.efficacy_z))]
    expected, _ = nested_integrals(plan.design.looks, bounds, 0.0)
    assert expected == pytest.approx(second.alpha_spent_here, abs=REACHED)


@pytest.mark.parametrize("spending", ["O'Brien-Fleming-type", "Pocock-type"])
@pytest.mark.parametrize("looks", [2, 4, 8])
@pytest.mark.parametrize("seed", quick_then_slow(1, 10))
def test_harm_bounds_are_crossed_as_often_as_they_spend(spending: str, looks: int, seed: int) -> None:
    draw = np.random.default_rng([looks, len(spending), seed])
    fractions = fractions_of(draw, looks)
    design = Design(0.025, 1, 0.9, 0.7, 400, fractions)
    rules = rules_of(
        design,
        Efficacy("O'Brien-Fleming-type"),
        experimental_share=0.5,
        direction=1,
        harm=Harm(spending, float(draw.uniform(0.001, 0.2))),
    )
    bounds = rules.bounds((), planned_looks(design, fractions, 0.5, final=False))
    stops = [(number(bound.harm_z), math.inf) for bound in bounds]
    crossed = np.cumsum([down for _, down in leaving(fractions, stops, 0.0)]).tolist()
    assert crossed == pytest.approx([bound.harm_alpha_spent for bound in bounds], abs=REACHED)


@pytest.mark.parametrize("name", FAMILY_NAMES)
@pytest.mark.parametrize("sides", [1, 2])
@pytest.mark.parametrize("looks", [2, 3, 6])
@pytest.mark.parametrize("seed", quick_then_slow(1, 8))
def test_a_fixed_family_is_crossed_with_probability_alpha_in_all(
    name: str, sides: Sides, looks: int, seed: int
) -> None:
    """At the plan's looks, and at others that the plan did not foresee."""
    draw = np.random.default_rng([looks, sides, len(name), seed])
    alpha = float(draw.uniform(0.01, 0.1))
    efficacy = Efficacy(name, shape=float(draw.uniform(-0.2, 0.6)), interim_z=3.0)
    design = Design(alpha * sides, sides, 0.9, 0.7, 400, fractions_of(draw, looks))
    rules = rules_of(design, efficacy, experimental_share=0.5, direction=1)
    for fractions in (design.looks, fractions_of(draw, looks)):
        bounds = rules.bounds((), planned_looks(design, fractions, 0.5, final=False))
        high = [number(bound.efficacy_z) for bound in bounds]
        stops = [(-c if sides == 2 else -math.inf, c) for c in high]
        crossed = [up for up, _ in leaving(fractions, stops, 0.0)]
        assert crossed == pytest.approx([bound.alpha_spent_here for bound in bounds], abs=REACHED)
        assert math.fsum(crossed) == pytest.approx(alpha, abs=REACHED)


@pytest.mark.parametrize(
    ("shape", "sides", "looks"),
    [
        (0.0, 2, 2),
        (0.25, 1, 2),
        (-0.5, 1, 3),
        (0.5, 2, 3),
        pytest.param(0.25, 2, 5, marks=pytest.mark.slow),
    ],
)
def test_a_constant_agrees_with_the_multivariate_normal(shape: float, sides: Sides, looks: int) -> None:
    """P(inside at every look) = 1 - alpha; the general library's integration errs by up to 1e-7 here."""
    fractions = [look / looks for look in range(1, looks + 1)]
    constant = planned_constant(shape, 0.05, sides, fractions)
    high = [constant * math.pow(fraction, shape - 0.5) for fraction in fractions]
    stops = [(-c if sides == 2 else -40.0, c) for c in high]
    crossed = 0.0
    for at in range(looks):
        up, down = multivariate_normal(fractions[: at + 1], stops[: at + 1], 0.0, seed=at)
        crossed += up + (down if sides == 2 else 0.0)
    assert crossed == pytest.approx(0.05 * sides, abs=5e-7)
